"""For every test: no network, and the program in this process or as a real one, on its own database."""

from __future__ import annotations

import json
import os
import socket
import subprocess
import sys
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
from hypothesis import settings

ROOT = Path(__file__).resolve().parents[1]
OBSERVER = "Ida Vik"

# The same examples every time, so that a change is judged by what it changed; CAMPAIGN_FUZZ=1 looks for
# new ones.
settings.register_profile("steady", derandomize=True)
if "CAMPAIGN_FUZZ" not in os.environ:
    settings.load_profile("steady")


@pytest.hookimpl(optionalhook=True)
def pytest_xdist_auto_num_workers(config: pytest.Config) -> int | None:
    """The whole fast suite runs on all processors; what is named, and the slow tests, one after another.

    Benchmarks, kills and figures on the screen want the machine for themselves.
    """
    is_whole = config.args_source is pytest.Config.ArgsSource.TESTPATHS
    return None if is_whole and config.option.markexpr == "not slow" else 0


# ------------------------------------------------------------------------------------------ no network


class NetworkUsed(AssertionError):  # noqa: N818 - a finding of the tests, not an error of the program
    """A test asked for the network; the program promises that it never does."""


_asked: list[str] = []


def _refuse(asked: str) -> None:
    _asked.append(asked)
    raise NetworkUsed(f"The network was asked for: {asked}")


@pytest.fixture(scope="session", autouse=True)
def _closed_network() -> Iterator[None]:
    """Connections refuse for the whole run; sockets between processes (AF_UNIX) are no network."""
    with pytest.MonkeyPatch.context() as patch:
        for method in ("connect", "connect_ex", "sendto"):
            patch.setattr(socket.socket, method, _guarded(method, getattr(socket.socket, method)))
        for function in ("getaddrinfo", "gethostbyname", "create_connection"):
            patch.setattr(socket, function, lambda *words, _name=function, **_: _refuse(f"{_name}{words}"))
        yield


def _guarded(name: str, original: Callable[..., Any]) -> Callable[..., Any]:
    def method(self: socket.socket, *words: Any) -> Any:
        if self.family == getattr(socket, "AF_UNIX", None):
            return original(self, *words)
        return _refuse(f"{name}{words}")

    return method


@pytest.fixture(autouse=True)
def _no_network_asked_for(request: pytest.FixtureRequest) -> Iterator[None]:
    """Fail the test even where the code under test swallowed the refusal."""
    _asked.clear()
    yield
    if _asked and "expects_refused_network" not in request.fixturenames:
        pytest.fail(f"The network was asked for: {_asked}")


@pytest.fixture
def expects_refused_network() -> type[NetworkUsed]:
    """For the test of the guard itself: the error that it raises."""
    return NetworkUsed


# ----------------------------------------------------------------------------------------- the program


@dataclass(frozen=True)
class Ran:
    """What one command line came to."""

    status: int
    out: str
    err: str

    @property
    def document(self) -> Any:
        """Standard output as the one JSON document that it must be."""
        return json.loads(self.out)

    @property
    def error(self) -> Any:
        """Standard error as the JSON error that it must be."""
        return json.loads(self.err)["error"]


RunCampaign = Callable[..., Ran]


@pytest.fixture
def own_database(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Where the database of this test is, should the test begin one; nobody else's is in reach."""
    path = tmp_path / "campaign.db"
    monkeypatch.setenv("CAMPAIGN_DB", str(path))
    monkeypatch.setenv("CAMPAIGN_OBSERVER", OBSERVER)
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "data"))
    return path


@pytest.fixture
def run_campaign(
    own_database: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> RunCampaign:
    """Run ``campaign WORDS`` in this process, as a pipe would see it."""
    from campaign.__main__ import run

    def run_line(*words: str) -> Ran:
        monkeypatch.setattr(sys, "argv", ["campaign", *words])
        capsys.readouterr()
        status = run(words)
        return Ran(status, *capsys.readouterr())

    return run_line


@pytest.fixture
def run_campaign_process(own_database: Path, tmp_path: Path) -> RunCampaign:
    """Run ``campaign WORDS`` as a process with nothing of this one's surroundings."""

    def run_line(*words: str, environment: Mapping[str, str] | None = None, stdin: str = "") -> Ran:
        done = subprocess.run(
            [sys.executable, "-m", "campaign", *words],
            cwd=tmp_path,
            env=_process_environment(own_database) | dict(environment or {}),
            input=stdin,
            capture_output=True,
            encoding="utf-8",
            check=False,
            timeout=120,
        )
        return Ran(done.returncode, done.stdout, done.stderr)

    return run_line


def _process_environment(database: Path) -> dict[str, str]:
    """The whole environment of a real run: nothing is inherited but the search path."""
    return {
        "PATH": os.environ["PATH"],
        "HOME": str(database.parent),
        "LC_ALL": "C.UTF-8",
        "PYTHONPATH": str(ROOT),
        "CAMPAIGN_DB": str(database),
        "CAMPAIGN_OBSERVER": OBSERVER,
    }
