"""A fresh database for each test, copied from one that was begun once, and what goes in and comes out."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
import undo_examples
from studies_examples import CLOCK, stamp

from campaign.model.forecasts import UpcomingResult
from campaign.studies.begin import begin_campaign


@pytest.fixture(scope="session")
def begun(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("begun") / "campaign.db"
    begin_campaign(str(path), stamp())
    return path


@pytest.fixture
def db(begun: Path, tmp_path: Path) -> str:
    path = tmp_path / "campaign.db"
    shutil.copy(begun, path)
    return str(path)


@pytest.fixture
def ask_catalogue(db: str) -> Callable[..., UpcomingResult]:
    """The forecast that somebody gets who types these instants."""
    from campaign.reading.instants import read_instant
    from campaign.studies import watch

    def ask(as_of: str, until: str, names: list[str] | None = None, **options: object) -> UpcomingResult:
        now, end = read_instant(as_of), read_instant(until)
        campaign = watch.load_campaign(db, names, None, now)
        asked = {
            "now": CLOCK, "as_of": now, "start": None, "end": end, "within_d": None, "events": (),
            "min_probability": 0.0, "draws": None, "seed": None, "solutions": "adopted", **options,
        }  # fmt: skip
        return watch.upcoming(campaign, watch.ask(campaign, **asked))  # type: ignore[arg-type]

    return ask


@pytest.fixture(scope="session")
def kept_folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Where a catalogue is kept by one test after the other, each time from its beginning."""
    return undo_examples.begun(tmp_path_factory.mktemp("kept"))


@pytest.fixture(scope="module")
def _kept_engines() -> Iterator[None]:
    with undo_examples.keep_engines():
        yield


@pytest.fixture
def keeper(kept_folder: Path, _kept_engines: None) -> undo_examples.Keeper:
    """A catalogue of two systems, by operations 1 and 2."""
    found = undo_examples.Keeper(kept_folder)
    found.system("Dim", aliases=("Gleam",))
    found.system("Faint")
    return found
