"""The live pages on a free port of loopback, for tests."""

from __future__ import annotations

import socket
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import uvicorn
from orchil.registry import Registry
from orchil.serve import make_app
from orchil.store import Store

TOKEN = "a-token-of-the-test"


@contextmanager
def served(store_path: Path) -> Iterator[str]:
    """The address of a server over the store, without the token; it ends with the block."""
    taken = socket.socket()
    taken.bind(("127.0.0.1", 0))
    taken.listen()
    with Store.open_read_only(store_path) as store:
        app = make_app(store, Registry.load(), TOKEN)
        server = uvicorn.Server(uvicorn.Config(app, log_level="warning", access_log=False, lifespan="off"))
        thread = threading.Thread(target=server.run, kwargs={"sockets": [taken]}, daemon=True)
        thread.start()
        while not server.started:
            time.sleep(0.02)
        try:
            yield f"http://127.0.0.1:{taken.getsockname()[1]}"
        finally:
            server.should_exit = True
            thread.join(30)
            taken.close()
