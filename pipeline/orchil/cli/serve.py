"""`orchil serve`: the same pages, live."""

from __future__ import annotations

from orchil.errors import RequestError
from orchil.store import Store

from .common import loaded_registry, remark


def run_serve(target: str, port: int) -> None:
    """Serve a store on loopback until Ctrl-C."""
    try:
        from orchil.serve import run_server
    except ImportError as error:
        raise RequestError(f"this needs more than is installed: pip install 'orchil[serve]' ({error})") from None
    with Store.open_read_only(target) as store:
        remark(["open the address below in a browser on this machine; Ctrl-C ends it"])
        run_server(store, loaded_registry(), port)
