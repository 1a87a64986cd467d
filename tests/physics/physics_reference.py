"""Reference rows for the tests of physics. Each row of the two files names its source and basis."""

from __future__ import annotations

import csv
import json
from pathlib import Path
from typing import Any

import pytest

FOLDER = Path(__file__).parent.parent / "reference"


def checks(topic: str) -> list[Any]:
    """Rows of checks_orbit_time.csv with this topic as pytest parameters (inputs, expected, tolerance)."""
    with (FOLDER / "checks_orbit_time.csv").open(newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert rows, f"no reference rows for {topic}"
    return [
        pytest.param(
            json.loads(row["inputs"]), json.loads(row["expected"]), row["tolerance"], id=f"{topic}-{number}"
        )
        for number, row in enumerate(rows)
    ]


def published(identifier: str) -> dict[str, str]:
    """One row of published_orbits.csv."""
    with (FOLDER / "published_orbits.csv").open(newline="") as file:
        (row,) = [row for row in csv.DictReader(file) if row["id"] == identifier]
    return row
