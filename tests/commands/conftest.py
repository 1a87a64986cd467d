"""A database of the tests' own with one system in it, kept through the command line."""

from __future__ import annotations

import contextlib
import hashlib
import io
import shutil
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
POSITION = ("--ra", "18:02:31.5", "--dec", "-45:12:30")
EPOCH = "BJD 2461234.2±0.5"


ORBIT = (
    "--label", "orbit", "--period", "3127.5±0.3 d", "--epoch", EPOCH, "--eccentricity", "0.71±0.02",
    "--omega", "143±2 deg", "--omega-of", "A", "--adopt",
)  # fmt: skip


def _made(path: Path, lines: Iterable[tuple[str, ...]]) -> Path:
    """A database that the command line made, to be copied for each test."""
    from campaign.__main__ import run

    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("CAMPAIGN_DB", str(path))
        patch.setenv("CAMPAIGN_OBSERVER", "Ida Vik")
        for words in lines:
            patch.setattr("sys.argv", ["campaign", *words])
            said = io.StringIO()
            with contextlib.redirect_stdout(said), contextlib.redirect_stderr(said):
                status = run(words)
            assert status == 0, said.getvalue()
    return path


@pytest.fixture(scope="session")
def _kept_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    lines = [
        ("begin",),
        ("system", "add", "Lantern 3", *POSITION, "--alias", "LN3"),
        ("solution", "add", "Lantern 3", *ORBIT),
    ]
    return _made(tmp_path_factory.mktemp("kept") / "campaign.db", lines)


@pytest.fixture
def kept(run_campaign: RunCampaign, own_database: Path, _kept_file: Path) -> RunCampaign:
    """The program on a database with the system Lantern 3 (alias LN3) and an adopted orbit."""
    shutil.copy(_kept_file, own_database)
    return run_campaign


@pytest.fixture
def fingerprint(own_database: Path) -> Callable[[], str]:
    """The bytes of the database in one word."""
    return lambda: hashlib.sha256(own_database.read_bytes()).hexdigest()


# Two systems, two sites and an observation of every kind; observation n came with operation n + 4.
LOGGED = (
    ("photometry", "Lantern 3", "K=7.31±0.03", "--at", "2021-04-07T03:12:10Z", "--site", "Cold Mesa",
     "--source", "Night book 3"),
    ("photometry", "Lantern 3", "K=7.33±0.03", "--at", "2021-05-01T03:00:00Z", "--site", "Cold Mesa",
     "--quality", "doubtful", "--note", "thin cirrus"),
    ("photometry", "Lantern 3", "J=8.91±0.03", "--at", "2021-05-01T03:05:00Z", "--site", "Harrow Pass"),
    ("photometry", "Lantern 3", "K=>12.1", "--at", "2022-04-07", "--source", "Survey (part 2) 100%"),
    ("flux", "Lantern 3", "--value", "2.3±0.2 mJy", "--frequency", "8.4 GHz", "--at", "2021-06-01"),
    ("velocity", "Lantern 3", "--star", "A", "--velocity", "-45.2±3.1 km/s", "--species", "He II 4686",
     "--at", "2021-06-02"),
    ("line", "Lantern 3", "--species", "C III 5696", "--width", "-12.4±0.5 A", "--at", "2021-06-03"),
    ("position", "Lantern 3", "--separation", "12.1±0.3 mas", "--angle", "143±2 deg", "--at", "2021-06-04"),
    ("shell", "Lantern 3", "--radius", "1.20±0.05 arcsec", "--index", "1", "--at", "2021-06-05"),
    ("attempt", "Lantern 3", "--why", "cloud", "--at", "2021-04-09/10", "--site", "Cold Mesa"),
    ("remark", "Lantern 3", "the finder shows a companion", "--at", "2021-06-06"),
    ("photometry", "Quarry", "K=6.50±0.02", "--at", "2021-04-07T04:00:00Z", "--quality", "bad"),
)  # fmt: skip


@pytest.fixture(scope="session")
def _watched_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    lines = [
        ("begin",),
        ("system", "add", "Lantern 3", *POSITION, "--alias", "LN3"),
        ("system", "add", "Quarry", "--ra", "10:02:31.5", "--dec", "-35:12:30"),
        ("site", "add", "Cold Mesa", "--latitude", "-31.20", "--longitude", "70.00 W", "--height", "2300 m"),
        ("site", "add", "Harrow Pass", "--latitude", "41.9", "--longitude", "74.9", "--height", "2900 m"),
        *(("log", *words) for words in LOGGED),
    ]
    return _made(tmp_path_factory.mktemp("watched") / "campaign.db", lines)


@pytest.fixture
def watched(run_campaign: RunCampaign, own_database: Path, _watched_file: Path) -> RunCampaign:
    """The program on a database of its own with the observations of ``LOGGED``."""
    shutil.copy(_watched_file, own_database)
    return run_campaign
