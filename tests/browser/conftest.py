"""A real browser: the Chromium of the machine. Without one these tests are left out; the head of the run says so."""

from __future__ import annotations

import shutil
from collections.abc import Iterator

import pytest
from orchil import cli

from ..live import TOKEN, served

CHROMIUM = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
collect_ignore_glob = [] if CHROMIUM else ["test_*.py"]

# A closed network makes Chromium's own calls home wait; none of these switches changes what a page can do.
_ARGUMENTS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
PATIENCE_MS = 240_000


def pytest_report_header() -> str:
    return f"browser tests: {CHROMIUM or 'left out, no Chromium on this machine'}"


@pytest.fixture(scope="session")
def browser():
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        opened = playwright.chromium.launch(executable_path=CHROMIUM, args=_ARGUMENTS, timeout=PATIENCE_MS)
        yield opened
        opened.close()


@pytest.fixture(scope="session")
def report(demo_store, tmp_path_factory):
    path = tmp_path_factory.mktemp("report") / "night.html"
    assert cli.run(["report", str(demo_store), "-o", str(path), "--also", "OB-009"]) == cli.DONE
    return path.as_uri()


@pytest.fixture(scope="session")
def live(demo_store) -> Iterator[str]:
    with served(demo_store) as address:
        yield f"{address}/{TOKEN}/"


@pytest.fixture
def opened(browser):
    """Opens pages; every message of the console, every fault and every request to elsewhere fails the test."""
    contexts, said = [], []

    def visit(address, width=1440, height=900):
        context = browser.new_context(viewport={"width": width, "height": height})
        contexts.append(context)
        page = context.new_page()
        page.set_default_timeout(PATIENCE_MS)
        page.on("console", lambda message: said.append(message.text))
        page.on("pageerror", lambda error: said.append(str(error)))
        page.on("request", lambda request: said.extend(_elsewhere(request.url, address)))
        page.goto(address)
        page.wait_for_selector("#rows tbody tr, article")
        return page

    yield visit
    for context in contexts:
        context.close()
    assert said == []


def _elsewhere(url: str, home: str) -> list[str]:
    root = home if home.startswith("file:") else home.split("/", 3)[2]
    return [] if root in url or url.startswith(("data:", "blob:")) else [f"asked for {url}"]
