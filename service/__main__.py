"""python -m service: settings from the environment, then gunicorn."""

import os
import sys

from service.edge.settings import BadSetting, read_settings
from service.edge.threads import limit_threads


def main() -> int:
    """Start the service; a bad setting is one line on standard error and status 2."""
    limit_threads(os.environ)
    try:
        settings, strangers = read_settings(os.environ)
    except BadSetting as error:
        sys.stderr.write(f"The service does not start: {error}\n")
        return 2
    for line in strangers:
        sys.stderr.write(f"Ignored: {line}.\n")
    from service.edge.server import Server  # noqa: PLC0415 - numpy may be imported only after limit_threads

    Server(settings).run()
    return 0


if __name__ == "__main__":
    sys.exit(main())
