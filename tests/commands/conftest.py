"""A database of the tests' own with one system in it, kept through the command line."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
POSITION = ("--ra", "18:02:31.5", "--dec", "-45:12:30")
EPOCH = "BJD 2461234.2±0.5"


@pytest.fixture
def kept(run_campaign: RunCampaign) -> RunCampaign:
    """The program on a database with the system Lantern 3 (alias LN3) and an adopted orbit."""
    for words in (
        ("begin",),
        ("system", "add", "Lantern 3", *POSITION, "--alias", "LN3"),
        (
            "solution", "add", "Lantern 3", "--label", "orbit", "--period", "3127.5±0.3 d", "--epoch", EPOCH,
            "--eccentricity", "0.71±0.02", "--omega", "143±2 deg", "--omega-of", "A", "--adopt",
        ),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    return run_campaign


@pytest.fixture
def fingerprint(own_database: Path) -> Callable[[], str]:
    """The bytes of the database in one word."""
    return lambda: hashlib.sha256(own_database.read_bytes()).hexdigest()
