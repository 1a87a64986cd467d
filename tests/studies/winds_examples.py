"""Invented wind collisions that the tests share, and rows of checks_winds.csv."""

from __future__ import annotations

import csv
import json
from dataclasses import replace
from typing import Any

from studies_examples import REFERENCE, exact, record, solution

from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution, Star
from campaign.model.winds import WindOverrides, WindsResult
from campaign.studies.winds import WindsQuestion, winds

NOW = 61_000.0


def pm(value: float, error: float | None) -> Measured:
    return Measured(value, error, error)


def wind_rows(topic: str) -> list[tuple[dict[str, Any], dict[str, Any]]]:
    """Inputs and expected values of the rows of checks_winds.csv with this topic."""
    with (REFERENCE / "checks_winds.csv").open(newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert rows, topic
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in rows]


# The stronger wind is that of A. Everything is invented.
STRONG = Star("A", "WC7", mass_loss_msun_yr=pm(2e-5, 2e-6), wind_speed_kms=pm(2400.0, 100.0),
              radius_rsun=pm(4.0, 0.5))  # fmt: skip
WEAK = Star("B", "O6 V", mass_loss_msun_yr=pm(1e-6, 2e-7), wind_speed_kms=pm(2800.0, 150.0),
            radius_rsun=pm(11.0, 1.0))  # fmt: skip


def orbit(**fields: Any) -> Solution:
    """An orbit with everything that a line of sight and a separation need."""
    return solution(
        **{
            "period_d": pm(3_600.0, 4.0),
            "epoch": 60_500.0,
            "eccentricity": pm(0.7, 0.02),
            "omega_deg": pm(40.0, 3.0),
            "omega_of": "B",
            "inclination_deg": pm(62.0, 3.0),
            "a_au": pm(15.0, 0.6),
            **fields,
        }
    )


def exact_orbit(**fields: Any) -> Solution:
    """The same without any error."""
    plain = orbit(period_error=0.0, epoch_error=0.0)
    names = ("period_d", "eccentricity", "omega_deg", "inclination_deg", "a_au")
    return replace(plain, **{name: exact(getattr(plain, name).value) for name in names} | fields)


def binary(*orbits: Solution, a: Star = STRONG, b: Star = WEAK, **fields: Any) -> SystemRecord:
    return record(*orbits, star_a=a, star_b=b, **fields)


def exact_star(star: Star, **values: float) -> Star:
    """A star whose wind has no errors; with some values replaced."""
    fields: dict[str, Measured] = {}
    for name in ("mass_loss_msun_yr", "wind_speed_kms", "radius_rsun"):
        value = values.get(name, getattr(star, name).value)
        fields[name] = exact(value)
    return replace(star, **fields)


def collide(one: SystemRecord, *, draws: int = 300, **asked: Any) -> WindsResult:
    """The result with fewer draws than usual; overrides by their names, ``elements`` being the solution's."""
    names = set(WindOverrides.__dataclass_fields__) - {"solution"}
    asked.setdefault("step_d", 900.0)
    changes = {name: asked.pop(name) for name in list(asked) if name in names}
    overrides = WindOverrides(**changes, solution=asked.pop("elements", {}))
    return winds(one, WindsQuestion(asked.pop("as_of", NOW), draws=draws, overrides=overrides, **asked))
