"""The application for a WSGI server that is started by other means: service.wsgi:app."""

import os

from service.edge.settings import read_settings
from service.edge.threads import limit_threads

limit_threads(os.environ)

from service.edge.app import create_app  # noqa: E402 - numpy may be imported only after limit_threads

app = create_app(read_settings(os.environ)[0])
