"""The application: a page of the night, a page for each candidate, and rows for the table.

Every address begins with the token. Nothing here writes; every answer forbids caching, framing and other origins.
"""

from __future__ import annotations

import math
import secrets
from collections.abc import Callable
from functools import cached_property
from pathlib import Path
from typing import Any

from jinja2 import ChoiceLoader, Environment, FileSystemLoader
from starlette.applications import Starlette
from starlette.exceptions import HTTPException
from starlette.middleware import Middleware
from starlette.middleware.trustedhost import TrustedHostMiddleware
from starlette.requests import Request
from starlette.responses import HTMLResponse, JSONResponse, PlainTextResponse, Response
from starlette.routing import Mount, Route
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from orchil.errors import OrchilError
from orchil.registry import Registry
from orchil.report.candidate import Neighbours, read_candidate
from orchil.report.charts import library
from orchil.report.night import read_night
from orchil.report.page import environment, page_data, script, style
from orchil.report.panels import Panels
from orchil.report.points import points
from orchil.report.table import Range, Wish, rows
from orchil.store import Store

PAGE = 25
HOSTS = ("127.0.0.1", "localhost", "[::1]")

HEADERS = {
    # Vega compiles the expressions of a chart to functions: its script must be allowed to.
    "Content-Security-Policy": "default-src 'none'; script-src 'self' 'unsafe-eval'; style-src 'self' 'unsafe-inline'; "
    "img-src 'self' data:; connect-src 'self'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'",
    "Cache-Control": "no-store",
    "Referrer-Policy": "no-referrer",
    "X-Content-Type-Options": "nosniff",
    "Cross-Origin-Resource-Policy": "same-origin",
}


class Headers:
    """Adds :data:`HEADERS` to every answer."""

    def __init__(self, app: ASGIApp) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass the request on and dress the answer."""

        async def dressed(message: Message) -> None:
            if message["type"] == "http.response.start":
                extra = [(name.lower().encode(), value.encode()) for name, value in HEADERS.items()]
                message = {**message, "headers": [*message.get("headers", []), *extra]}
            await send(message)

        await self._app(scope, receive, dressed)


class Pages:
    """The handlers; Starlette runs them in threads, and each query has a connection of its own."""

    def __init__(self, store: Store, registry: Registry) -> None:
        self._store = store
        self._registry = registry

    @cached_property
    def _templates(self) -> Environment:
        ours = FileSystemLoader(Path(__file__).parent / "templates")
        base = environment()
        assert base.loader is not None
        return base.overlay(loader=ChoiceLoader([ours, base.loader]))

    def home(self, request: Request) -> Response:
        """The night: brief, funnel, table, plot."""
        night = read_night(self._store, self._registry)
        data = page_data(night, mode="live", rows=[], pages=[])
        return self._html("home.html", night=night, data=data)

    def candidate(self, request: Request) -> Response:
        """One candidate; relatives are looked for among the best of now."""
        night = read_night(self._store, self._registry)
        neighbours = Neighbours(self._store, self._registry.offers.structures)
        found = read_candidate(self._store, night, Panels(self._registry), neighbours, request.path_params["key"])
        if found is None:
            raise HTTPException(404, "there is no candidate of this id")
        return self._html("candidate_page.html", night=night, c=found, link="{}".format)

    def rows(self, request: Request) -> Response:
        """One page of the table."""
        asked = request.query_params
        found = rows(self._store.query, _wish(asked))
        panels = Panels(self._registry)
        drawn = [row | {"svg": panels.drawing(row["smiles"])} for row in found.rows]
        return JSONResponse({"rows": drawn, "total": found.total})

    def points(self, request: Request) -> Response:
        """The best candidates that have both quantities."""
        asked = request.query_params
        return JSONResponse(points(self._store.query, asked.get("x", ""), asked.get("y", "")))

    def _html(self, name: str, **values: Any) -> HTMLResponse:
        return HTMLResponse(self._templates.get_template(name).render(**values))


def make_app(store: Store, registry: Registry, token: str) -> Starlette:
    """The application over an open store; whoever does not know the token sees nothing."""
    pages = Pages(store, registry)
    routes = [
        Route("/", pages.home),
        Route("/candidate/{key:int}", pages.candidate),
        Route("/rows", pages.rows),
        Route("/points", pages.points),
        Route("/assets/page.css", _text(style, "text/css")),
        Route("/assets/page.js", _text(script, "text/javascript")),
        Route("/assets/charts.js", _text(library, "text/javascript")),
    ]
    inner = Starlette(routes=routes, exception_handlers=_HANDLERS)
    outer = Starlette(
        routes=[Mount("/{token}", app=Guard(inner, token))],
        middleware=[Middleware(Headers), Middleware(TrustedHostMiddleware, allowed_hosts=list(HOSTS))],
    )
    # A redirect to another spelling of an address would tell that there is something.
    inner.router.redirect_slashes = outer.router.redirect_slashes = False
    return outer


class Guard:
    """Lets through only what knows the token."""

    def __init__(self, app: ASGIApp, token: str) -> None:
        self._app = app
        self._token = token

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Compare in constant time."""
        given = str(scope.get("path_params", {}).get("token", ""))
        if secrets.compare_digest(given.encode(), self._token.encode()):
            await self._app(scope, receive, send)
        else:
            await PlainTextResponse("not found\n", 404)(scope, receive, send)


def _text(content: Callable[[], str], kind: str) -> Callable[[Request], Response]:
    def answer(_: Request) -> Response:
        return Response(content(), media_type=kind)

    return answer


def _said(_: Request, error: Exception) -> Response:
    return PlainTextResponse(f"{error}\n", 400)


_HANDLERS: dict[Any, Any] = {OrchilError: _said}


def _wish(asked: Any) -> Wish:
    low, high = _number(asked.get("low")), _number(asked.get("high"))
    quantity = asked.get("quantity", "")
    return Wish(
        text=asked.get("text", "")[:200],
        only=asked.get("only", ""),
        ranges=(Range(quantity, low, high),) if quantity else (),
        sort=asked.get("sort", "rank"),
        descending=asked.get("way") == "down",
        start=PAGE * max(0, int(_number(asked.get("page")) or 0)),
        count=PAGE,
    )


def _number(text: str | None) -> float | None:
    """A finite number, None for anything else."""
    try:
        value = float(text or "")
    except ValueError:
        return None
    return value if math.isfinite(value) and abs(value) < 1e15 else None
