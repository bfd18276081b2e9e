"""The composition root: settings in, WSGI application out."""

from collections.abc import Callable
from typing import Any

from flask import Flask
from flask.sessions import NullSession, SessionInterface

import service.endpoints  # noqa: F401 - importing the package registers every endpoint
from service.edge.document import document
from service.edge.mount import MountedCatalogue, MountedEndpoint, mount
from service.edge.operations.process import Operations
from service.edge.problems import Problems, register
from service.edge.respond import Responder
from service.edge.settings import Settings
from service.endpoints.declaration import CATALOGUES, ENDPOINTS


class _NoSession(SessionInterface):
    """The service keeps nothing between requests; without this flask would open a session for each."""

    null = NullSession()

    def open_session(self, app: Flask, request: Any) -> NullSession:  # noqa: ARG002
        return self.null

    def is_null_session(self, obj: object) -> bool:  # noqa: ARG002
        return True

    def save_session(self, app: Flask, session: Any, response: Any) -> None:
        """Save nothing."""


class Service(Flask):
    """Flask without what a stateless service does not need."""

    session_interface = _NoSession()

    def ensure_sync(self, func: Callable[..., Any]) -> Callable[..., Any]:
        """Views are plain functions: no inspection on every request."""
        return func


def create_app(settings: Settings | None = None) -> Service:
    """Make the application."""
    settings = settings or Settings()
    app = Service("service", static_folder=None)
    app.url_map.merge_slashes = False
    app.url_map.redirect_defaults = False
    responder = Responder(settings.allowed_origins, settings.max_age_seconds)
    problems = Problems(responder)
    register(app, problems)
    endpoints = [MountedEndpoint(declared, settings, responder, problems) for declared in ENDPOINTS]
    catalogues = [MountedCatalogue(declared, responder, problems) for declared in CATALOGUES]
    for endpoint in endpoints:
        mount(app, endpoint.path, endpoint.declared.compute.__name__, endpoint.view, endpoint.methods)
    for listed in catalogues:
        mount(app, listed.declared.path, listed.declared.read.__name__, listed.view, READ)
    _mount_operations(app, Operations(responder, lambda: document(endpoints, catalogues), default_document))
    return app


READ = ["GET", "HEAD", "OPTIONS"]


def _mount_operations(app: Flask, operations: Operations) -> None:
    mount(app, "/health/{probe}", "health", operations.health, READ)
    mount(app, "/problems/{name}", "problem", operations.problem, READ)
    for name in operations.documents:
        app.add_url_rule(
            f"/{name}",
            name.replace(".", "_"),
            operations.document,
            defaults={"name": name},
            methods=READ,
            provide_automatic_options=False,
        )


def default_document() -> dict[str, Any]:
    """Make the document with the default limits: what openapi.yaml holds."""
    responder = Responder((), 0)
    problems = Problems(responder)
    return document(
        [MountedEndpoint(declared, Settings(), responder, problems) for declared in ENDPOINTS],
        [MountedCatalogue(declared, responder, problems) for declared in CATALOGUES],
    )
