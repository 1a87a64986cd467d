"""Nothing needs a network: no test opens a connection, and no command opens as much as a socket.

The commands run as real processes under an audit hook that ends them when a socket is made, a name is
looked up or a connection is tried, whichever library does it (common practice, no source).
"""

from __future__ import annotations

import socket
import subprocess
import sys
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
CAUGHT = 97
HOOK = f"""
import os, sys

def watch(event, words):
    if event.startswith("socket.") and event != "socket.__init__":
        os.write(2, f"the network was asked for: {{event}} {{words}}\\n".encode())
        os._exit({CAUGHT})

sys.addaudithook(watch)
"""
YESTERDAY = (datetime.now(UTC) - timedelta(days=1)).strftime("%Y-%m-%d")
# Beyond every table of Earth orientation, and where a table of this month has predictions only.
DATES = ("2035-04-07", YESTERDAY)


@pytest.fixture
def watched(run_campaign_process, tmp_path) -> Callable:
    folder = tmp_path / "watch"
    folder.mkdir()
    (folder / "sitecustomize.py").write_text(HOOK, encoding="utf-8")
    surroundings = {"PYTHONPATH": f"{folder}:{ROOT}"}

    def run_line(*words: str):
        done = run_campaign_process(*words, environment=surroundings)
        assert done.status == 0, done.err
        return done

    return run_line


@pytest.fixture
def with_system(run_campaign) -> None:
    for words in (
        ("begin",),
        ("site", "add", "Cold Mesa", "--latitude", "-31.2", "--longitude", "-70", "--height", "2400"),
        ("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30"),
        ("solution", "add", "Lantern 3", "--period", "3127.5±0.3 d", "--epoch", "BJD 2461234.2±0.5",
         "--eccentricity", "0.71±0.02", "--adopt"),
    ):  # fmt: skip
        assert run_campaign(*words).status == 0


@pytest.mark.parametrize(
    "code",
    [
        "import socket; socket.socket()",
        "import socket; socket.getaddrinfo('localhost', 80)",
        "import _socket; _socket.socket()",
        "import urllib.request; urllib.request.urlopen('http://127.0.0.1:9/')",
    ],
)
def test_the_watch_catches_who_asks(tmp_path, code):
    (tmp_path / "sitecustomize.py").write_text(HOOK, encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-c", code], env={"PYTHONPATH": str(tmp_path)}, capture_output=True, check=False
    )
    assert done.returncode == CAUGHT
    assert b"the network was asked for" in done.stderr


@pytest.mark.parametrize("date", DATES)
def test_the_forecast_of_the_sample_opens_no_socket(watched, date):
    assert "Events from" in watched("upcoming", "--sample", "--as-of", date, "--draws", "500").out


def test_making_the_sample_campaign_opens_no_socket(watched):
    assert "made the sample campaign" in watched("begin", "--sample").out
    assert "Events from" in watched("upcoming", "--draws", "500").out


@pytest.mark.parametrize("date", DATES)
def test_logging_opens_no_socket(watched, with_system, date):
    told = watched(
        "log", "photometry", "Lantern 3", "K=7.31±0.03", "--at", f"{date}T03:12:10Z", "--site", "Cold Mesa"
    ).out
    assert f"instant: {date}T03:12:10 UTC at the observatory at Cold Mesa" in told


@pytest.mark.parametrize("date", DATES)
def test_an_ephemeris_opens_no_socket(watched, with_system, date):
    assert f"{date} 12:00" in watched("ephemeris", "Lantern 3", "--from", date, "--step", "100d").out


@pytest.mark.parametrize("date", DATES)
def test_a_forecast_from_the_database_opens_no_socket(watched, with_system, date):
    assert "Lantern 3" in watched("upcoming", "--as-of", date, "--within", "20yr", "--draws", "500").out


# ------------------------------------------------------------------------------------ the tests themselves


@pytest.mark.parametrize(
    "ask",
    [
        lambda: socket.create_connection(("127.0.0.1", 9), timeout=1),
        lambda: socket.getaddrinfo("localhost", 80),
        lambda: socket.gethostbyname("localhost"),
        lambda: _send_to("connect"),
        lambda: _send_to("connect_ex"),
    ],
)
def test_a_test_that_asks_for_the_network_fails(expects_refused_network, ask):
    with pytest.raises(expects_refused_network):
        ask()


def _send_to(method: str) -> None:
    with socket.socket() as each:
        getattr(each, method)(("127.0.0.1", 9))


def test_a_test_that_swallows_the_refusal_fails_too(pytester_like):
    assert pytester_like(
        "import socket, contextlib\n"
        "def test_quietly():\n"
        "    with contextlib.suppress(BaseException):\n"
        "        socket.create_connection(('127.0.0.1', 9))\n"
    )


@pytest.fixture
def pytester_like(tmp_path):
    """Whether a test file of this text fails under the conftest of this suite."""

    def fails(text: str) -> bool:
        conftest = (ROOT / "tests" / "conftest.py").read_text(encoding="utf-8")
        (tmp_path / "conftest.py").write_text(conftest, encoding="utf-8")
        (tmp_path / "test_quietly.py").write_text(text, encoding="utf-8")
        done = subprocess.run(
            [sys.executable, "-m", "pytest", "-q", "-p", "no:cacheprovider", str(tmp_path)],
            cwd=tmp_path, capture_output=True, text=True, check=False,
        )  # fmt: skip
        return done.returncode == 1 and "The network was asked for" in done.stdout

    return fails
