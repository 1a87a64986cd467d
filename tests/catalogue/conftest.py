"""A fresh catalogue for each test, copied from one that was begun once."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from contextlib import AbstractContextManager
from datetime import datetime
from pathlib import Path

import pytest
from catalogue_examples import FIRST

from campaign.catalogue import store, upgrade

Write = Callable[..., AbstractContextManager[store.Writing]]


@pytest.fixture(scope="session")
def begun(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("begun") / "campaign.db"
    upgrade.begin_database(path, at=FIRST)
    return path


@pytest.fixture
def database(begun: Path, tmp_path: Path) -> Path:
    path = tmp_path / "campaign.db"
    shutil.copy(begun, path)
    return path


@pytest.fixture
def write(database: Path) -> Write:
    def open_for_writing(at: datetime = FIRST, summary: str = "") -> AbstractContextManager[store.Writing]:
        return store.writing(database, at=at, who="Ida Vik", command="campaign test", summary=summary)

    return open_for_writing
