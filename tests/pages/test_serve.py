"""The live pages: behind a token, on loopback, read-only, and the same rows as the file."""

from __future__ import annotations

import sqlite3
import subprocess
import sys
import urllib.error
import urllib.request

import httpx
import pytest

from ..demo import FORMULA, IMAGE, SCRIPT
from ..live import TOKEN, served


@pytest.fixture(scope="module")
def client(demo_store):
    with served(demo_store) as address, httpx.Client(base_url=address, timeout=120) as opened:
        yield opened


def get(client, path, **options):
    return client.get(f"/{TOKEN}/{path}", **options)


@pytest.mark.parametrize("path", ["", "rows", "points?x=a&y=b", "candidate/1", "assets/page.js"])
@pytest.mark.parametrize("token", ["", "wrong", TOKEN[:-1], TOKEN + "x", TOKEN.upper()])
def test_without_the_token_there_is_nothing(client, path, token):
    answer = client.get(f"/{token}/{path}")
    assert answer.status_code == 404
    assert "Stretched" not in answer.text


def test_another_host_name_is_refused(client):
    """What a page elsewhere could reach by binding its own name to this address (DNS rebinding)."""
    assert get(client, "", headers={"Host": "evil.example"}).status_code == 400


@pytest.mark.parametrize("path", ["", "rows", "candidate/1", "assets/page.css"])
def test_every_answer_is_kept_to_itself(client, path):
    headers = get(client, path).headers
    assert "default-src 'none'" in headers["content-security-policy"]
    assert "frame-ancestors 'none'" in headers["content-security-policy"]
    assert headers["cache-control"] == "no-store"
    assert headers["referrer-policy"] == "no-referrer"
    assert headers["x-content-type-options"] == "nosniff"


@pytest.mark.parametrize("method", ["post", "put", "delete", "patch"])
def test_nothing_can_be_sent(client, method):
    assert getattr(client, method)(f"/{TOKEN}/rows").status_code == 405


def test_the_page_has_no_script_of_its_own(client):
    page = get(client, "").text
    assert "<script>" not in page
    assert SCRIPT not in page
    assert 'src="assets/page.js"' in page


def test_rows_are_sorted_filtered_and_paged(client):
    found = get(client, "rows?sort=absorption_max_nm&way=down").json()
    peaks = [row["quantities"]["absorption_max_nm"][0] for row in found["rows"] if row["quantities"]]
    assert peaks == sorted(peaks, reverse=True)
    assert found["total"] == 12
    names = {row["candidate"] for row in found["rows"]}
    assert {SCRIPT, FORMULA, IMAGE} <= names
    few = get(client, "rows?quantity=absorption_max_nm&low=500&high=540").json()["rows"]
    assert few
    assert all(500 <= row["quantities"]["absorption_max_nm"][0] <= 540 for row in few)
    assert get(client, "rows?page=1").json()["rows"] == []


@pytest.mark.parametrize(
    "query",
    ["sort=nothing", "sort=c.name;DROP TABLE candidate", "quantity=x&low=nan", "page=-5", "page=1e99", "text=%25_'\"!"],
)
def test_odd_requests_are_answered(client, query):
    assert get(client, f"rows?{query}").status_code == 200


def test_a_page_for_every_candidate_that_is_there(client, demo_store):
    known = get(client, "rows").json()["rows"]
    failed = next(row["id"] for row in known if row["candidate"] == IMAGE)
    page = get(client, f"candidate/{failed}")
    assert page.status_code == 200
    assert "bad_input" in page.text
    assert "<img src=x" not in page.text
    done = next(row["id"] for row in known if row["candidate"] == SCRIPT)
    page = get(client, f"candidate/{done}").text
    assert 'data-panel="spectrum"' in page
    assert SCRIPT not in page
    assert get(client, "candidate/999").status_code == 404
    assert get(client, "candidate/x").status_code == 404


def test_points_are_those_of_the_store(client, demo_store):
    found = get(client, "points?x=absorption_max_nm&y=heavy_atoms").json()
    with sqlite3.connect(demo_store) as raw:
        (count,) = raw.execute("SELECT count(*) FROM score").fetchone()
    assert len(found) == count
    assert {point["kind"] for point in found} <= {"picked", "Pareto front 1", "other"}
    assert get(client, "points?x=none&y=none").json() == []


def test_the_command_prints_an_address_that_works(demo_store):
    words = [sys.executable, "-m", "orchil", "serve", str(demo_store)]
    with subprocess.Popen(words, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True) as server:
        try:
            assert server.stdout is not None
            address = server.stdout.readline().strip()
            assert address.startswith("http://127.0.0.1:")
            assert len(address.rstrip("/").rpartition("/")[2]) >= 32
            with urllib.request.urlopen(address, timeout=120) as answer:
                assert b"From the library to the picks" in answer.read()
            with pytest.raises(urllib.error.HTTPError, match="404"):
                urllib.request.urlopen(address[:-2] + "/", timeout=120)
        finally:
            server.terminate()
            server.communicate(timeout=60)
