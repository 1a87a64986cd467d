"""Reference rows for the tests of dating shells. Each row of the two files names its source and basis."""

from __future__ import annotations

import csv
import json
import re
from typing import Any

from physics_reference import FOLDER


def checks(topic: str) -> list[tuple[dict[str, Any], dict[str, Any]]]:
    """Rows of checks_shells.csv with this topic: inputs and expected."""
    with (FOLDER / "checks_shells.csv").open(newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert rows, f"no reference rows for {topic}"
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in rows]


def published(identifier: str) -> dict[str, str]:
    """One row of published_shells.csv."""
    with (FOLDER / "published_shells.csv").open(newline="") as file:
        (row,) = [row for row in csv.DictReader(file) if row["id"] == identifier]
    return row


def with_error(text: str) -> tuple[float, float]:
    """`1.45+-0.03` of a reference row as value and error."""
    value, error = text.split("+-")
    return float(value), float(error)


def numbers(text: str) -> list[float]:
    """All numbers of a published text, in order."""
    return [float(found) for found in re.findall(r"(?<![A-Za-z])\d+(?:\.\d+)?(?:e\d+)?", text)]
