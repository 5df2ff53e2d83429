"""Runs the application on loopback until it is stopped."""

from __future__ import annotations

import secrets
import socket
import threading

import uvicorn

from orchil.errors import RequestError
from orchil.registry import Registry
from orchil.report.charts import library
from orchil.store import Store

from .app import make_app

HOST = "127.0.0.1"


def run_server(store: Store, registry: Registry, port: int) -> None:
    """Serve until Ctrl-C; prints the address with its token first. :class:`RequestError` when the port is taken."""
    token = secrets.token_urlsafe(24)
    # Packing the chart library takes seconds: by the time a plot is asked for it is there.
    threading.Thread(target=library, daemon=True).start()
    with _listen(port) as taken:
        print(f"http://{HOST}:{taken.getsockname()[1]}/{token}/", flush=True)
        settings = uvicorn.Config(make_app(store, registry, token), log_level="warning", access_log=False)
        uvicorn.Server(settings).run(sockets=[taken])


def _listen(port: int) -> socket.socket:
    taken = socket.socket(socket.AF_INET, socket.SOCK_STREAM)
    taken.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
    try:
        taken.bind((HOST, port))
    except OSError as error:
        taken.close()
        raise RequestError(f"port {port} cannot be used: {error.strerror}; --port 0 takes any free one") from error
    taken.listen()
    return taken
