"""Write openapi.yaml anew, after a declaration has changed: python -m tests.contract.write_openapi."""

from pathlib import Path

from service.edge.app import default_document
from service.edge.operations.process import print_yaml

if __name__ == "__main__":
    (Path(__file__).parent.parent.parent / "openapi.yaml").write_bytes(print_yaml(default_document()))
