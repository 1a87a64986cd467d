"""Solutions of the model as rows of their table, and back."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from campaign.catalogue.converting import (
    measured_names,
    measured_or_none,
    measured_values,
    moment_names,
    moment_values,
)
from campaign.catalogue.tables_knowledge import ELEMENT_QUANTITIES
from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.systems import Solution

# What is read of a solution, in this order; number and weight of its adoption follow.
SOLUTION_COLUMNS = (
    "id",
    "system_id",
    "label",
    "epoch_marks",
    "omega_of",
    "data_until_bmjd_tdb",
    "epoch_cycle",
    "published_cycle_offset",
    "note",
    "source_id",
    "covariance",
    "period_kind",
    "period_high_d",
    "period_limit_sigma",
    *measured_names("period_d"),
    *moment_names("epoch"),
    *measured_names(*ELEMENT_QUANTITIES),
)


def solution_from_row(row: Any, titles: Mapping[int, str]) -> Solution:
    """A solution from its columns and those of its adoption."""
    epoch = row[17:23]
    return Solution(
        id=row[0],
        system_id=row[1],
        label=row[2],
        epoch_marks=row[3],
        omega_of=row[4],
        data_until_bmjd_tdb=row[5],
        epoch_cycle=row[6],
        published_cycle_offset=row[7],
        note=row[8],
        source="" if row[9] is None else titles[row[9]],
        covariance=None if row[10] is None else _covariance(row[10]),
        period_d=_period(row[11:17]),
        epoch=None if epoch[0] is None else Moment(*epoch),
        eccentricity=measured_or_none(row[23], row[24], row[25]),
        omega_deg=measured_or_none(row[26], row[27], row[28]),
        inclination_deg=measured_or_none(row[29], row[30], row[31]),
        node_deg=measured_or_none(row[32], row[33], row[34]),
        k_a_kms=measured_or_none(row[35], row[36], row[37]),
        k_b_kms=measured_or_none(row[38], row[39], row[40]),
        gamma_kms=measured_or_none(row[41], row[42], row[43]),
        a_au=measured_or_none(row[44], row[45], row[46]),
        a_arcsec=measured_or_none(row[47], row[48], row[49]),
        adopted=row[50] is not None,
        weight=row[51],
    )


def _period(columns: Any) -> Measured | Limit | Range | None:
    kind, high_d, limit_sigma, value, minus, plus = columns
    if kind is None:
        return None
    if kind == "measured":
        return Measured(value, minus, plus)
    if kind == "range":
        return Range(value, high_d)
    return Limit(value, "above" if kind == "above" else "below", limit_sigma)


def _period_values(period: Measured | Limit | Range | None) -> dict[str, Any]:
    values: dict[str, Any] = {"period_kind": None, "period_high_d": None, "period_limit_sigma": None}
    if isinstance(period, Range):
        values |= measured_values("period_d", Measured(period.low))
        return values | {"period_kind": "range", "period_high_d": period.high}
    if isinstance(period, Limit):
        values |= measured_values("period_d", Measured(period.bound))
        return values | {"period_kind": period.side, "period_limit_sigma": period.limit_sigma}
    values |= measured_values("period_d", period)
    return values | {"period_kind": None if period is None else "measured"}


def _covariance(document: Mapping[str, Any]) -> Covariance:
    return Covariance(
        tuple(document["names"]), tuple(tuple(float(x) for x in line) for line in document["matrix"])
    )


def element_values(solution: Solution) -> dict[str, Any]:
    """Columns of the elements; system, label, source and time of entry are the caller's."""
    covariance = solution.covariance
    values: dict[str, Any] = {
        "epoch_marks": solution.epoch_marks,
        "omega_of": solution.omega_of,
        "data_until_bmjd_tdb": solution.data_until_bmjd_tdb,
        "epoch_cycle": solution.epoch_cycle,
        "published_cycle_offset": solution.published_cycle_offset,
        "note": solution.note,
        "covariance": None
        if covariance is None
        else {
            "names": list(covariance.names),
            "matrix": [[float(x) for x in line] for line in covariance.matrix],
        },
    }
    values |= _period_values(solution.period_d) | moment_values("epoch", solution.epoch)
    for name in ELEMENT_QUANTITIES:
        values |= measured_values(name, getattr(solution, name))
    return values
