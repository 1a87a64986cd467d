"""Rows of exchanged tables as dataclasses of the model; the way out is in ``studies.exchange_rows``."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from typing import Any, cast

from campaign.errors import InputRefused
from campaign.model.exchange_columns import (
    ELEMENT_UNITS,
    RULE_SIZES,
    RULE_STAGES,
    STAR_UNITS,
    UNITS_READ,
    Cell,
)
from campaign.model.exported import (
    ExchangedEpisode,
    ExchangedObservation,
    ExchangedSolution,
    ExchangedSystem,
)
from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.observations import Observation
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, Star, System

Row = Mapping[str, Cell]

_OBSERVATION_PLAIN = (
    "uid", "kind", "limit_side", "limit_sigma", "band", "photometric_system", "frequency_ghz",
    "energy_low_kev", "energy_high_kev", "star", "species", "correlation", "feature", "measured_at",
    "plate_scale_error", "shell_index", "site", "observer", "instrument", "comparison_star", "source",
)  # fmt: skip
_SITE_NUMBERS = (
    "latitude_deg", "longitude_deg_east", "height_m", "horizon_deg", "elongation_min_deg",
    "elongation_max_deg",
)  # fmt: skip


def observation_from_row(row: Row) -> ExchangedObservation:
    """One row of ``observations``.

    Raises
    ------
    InputRefused
        ``details["column"]`` names the column.
    """
    unit = _text(row, "unit")
    fields: dict[str, Any] = {name: row.get(name) for name in _OBSERVATION_PLAIN}
    fields["uid"] = _text(row, "uid")
    _required(row, "kind", "bmjd_tdb", "time_scale", "time_place")
    observation = Observation(
        id=0,
        system_id=0,
        moment=_moment(row, "bmjd_tdb", "time"),
        value=_measured(row, "value"),
        unit=UNITS_READ.get(unit, unit) or None,
        position_angle_deg=_measured(row, "position_angle_deg"),
        quality=cast(Any, row.get("quality") or "good"),
        text=_text(row, "text"),
        **fields,
    )
    return ExchangedObservation(
        system=_name(row, "system"),
        observation=observation,
        site=_site(row),
        out_of_use=cast(Any, row.get("out_of_use")),
        superseded_by=_text(row, "superseded_by") or None,
        withdrawn_why=_text(row, "withdrawn_why") or None,
    )


def _site(row: Row) -> Site | None:
    """The site as the row describes it; None where it only names one, or none."""
    name, kind = _text(row, "site"), row.get("site_kind")
    if not name or kind is None:
        return None
    numbers: dict[str, Any] = {field: row.get(f"site_{field}") for field in _SITE_NUMBERS}
    return Site(0, name, cast(Any, kind), **numbers, time_zone=_text(row, "site_time_zone") or None)


def system_from_row(row: Row) -> ExchangedSystem:
    """One row of ``systems``.

    Raises
    ------
    InputRefused
        ``details["column"]`` names the column.
    """
    _required(row, "ra_deg", "dec_deg", "position_epoch_jyr", "state")
    plain: dict[str, Any] = {
        name: row.get(name)
        for name in (
            "ra_deg", "dec_deg", "position_epoch_jyr", "pm_ra_cosdec_mas_yr", "pm_dec_mas_yr", "state",
            "cycle_anchor_bmjd_tdb", "cycle_anchor_period_d",
        )
    }  # fmt: skip
    priority = row.get("priority")
    system = System(
        id=0,
        name=_name(row, "name"),
        aliases=_aliases(row),
        distance_pc=_measured(row, "distance_pc"),
        parallax_mas=_measured(row, "parallax_mas"),
        priority=3 if priority is None else int(priority),
        notes=_text(row, "notes"),
        star_a=_star(row, "A"),
        star_b=_star(row, "B"),
        **plain,
    )
    return ExchangedSystem(system, _rule(row))


def _star(row: Row, name: Any) -> Star:
    prefix = f"star_{name.lower()}"
    quantities: dict[str, Any] = {each: _measured(row, f"{prefix}_{each}") for each in STAR_UNITS}
    return Star(name, spectral_type=_text(row, f"{prefix}_spectral_type") or None, **quantities)


def _rule(row: Row) -> DustRule | None:
    kind = row.get("rule_kind")
    if kind is None:
        return None
    unit = "phase" if kind == "phase" else "d"
    values: dict[str, Any] = {stage: _measured(row, f"rule_{stage}_{unit}") for stage in RULE_STAGES}
    values |= {size: _measured(row, f"rule_{size}") for size in RULE_SIZES}
    values |= {f"scatter_{stage}_d": row.get(f"rule_scatter_{stage}_d") for stage in RULE_STAGES}
    return DustRule(0, 0, cast(Any, kind), **values, note=_text(row, "rule_note"))


def solution_from_row(row: Row) -> ExchangedSolution:
    """One row of ``solutions``.

    Raises
    ------
    InputRefused
        ``details["column"]`` names the column.
    """
    plain: dict[str, Any] = {
        name: row.get(name)
        for name in ("omega_of", "data_until_bmjd_tdb", "weight", "epoch_cycle", "published_cycle_offset")
    }
    elements: dict[str, Any] = {element: _measured(row, element) for element in ELEMENT_UNITS}
    solution = Solution(
        id=0,
        system_id=0,
        label=_name(row, "label"),
        period_d=_period(row),
        epoch=_maybe_moment(row, "epoch"),
        epoch_marks=cast(Any, row.get("epoch_marks") or "periastron"),
        covariance=_covariance(row),
        source=_text(row, "source"),
        adopted=bool(row.get("adopted")),
        note=_text(row, "note"),
        **elements,
        **plain,
    )
    if solution.weight is not None and not solution.adopted:
        raise _refused("weight", str(solution.weight), "Only an adopted solution has a weight.")
    return ExchangedSolution(_name(row, "system"), solution)


def episode_from_row(row: Row) -> ExchangedEpisode:
    """One row of ``episodes``.

    Raises
    ------
    InputRefused
        ``details["column"]`` names the column.
    """
    stages: dict[str, Any] = {stage: _event(row, stage) for stage in RULE_STAGES}
    episode = Episode(
        id=0,
        system_id=0,
        cycle=cast(Any, row.get("cycle")),
        state=cast(Any, row.get("state") or "confirmed"),
        source=_text(row, "source"),
        note=_text(row, "note"),
        **stages,
    )
    return ExchangedEpisode(_name(row, "system"), episode, row.get("out_of_use") is not None)


def _event(row: Row, stage: str) -> DatedEvent | None:
    moment = _maybe_moment(row, stage)
    if moment is None:
        return None
    return DatedEvent(moment, _text(row, f"{stage}_band") or None, _text(row, f"{stage}_method") or None)


def _text(row: Row, name: str) -> str:
    cell = row.get(name)
    return cell if isinstance(cell, str) else ""


def _name(row: Row, name: str) -> str:
    _required(row, name)
    return _text(row, name)


def _required(row: Row, *names: str) -> None:
    for name in names:
        if row.get(name) in (None, ""):
            raise _refused(name, "", "This cell must not be empty.")


def _measured(row: Row, name: str) -> Measured | None:
    value, minus, plus = (cast(Any, row.get(f"{name}{part}")) for part in ("", "_minus", "_plus"))
    for part, error in (("_minus", minus), ("_plus", plus)):
        if error is not None and value is None:
            raise _refused(name + part, repr(error), "There is an error of a value that is not there.")
        if error is not None and error < 0:
            raise _refused(name + part, repr(error), "An error is a size and has no sign.")
    return None if value is None else Measured(value, minus, plus)


def _maybe_moment(row: Row, prefix: str) -> Moment | None:
    if row.get(f"{prefix}_bmjd_tdb") is None:
        return None
    return _moment(row, f"{prefix}_bmjd_tdb", prefix)


def _moment(row: Row, axis: str, prefix: str) -> Moment:
    minus, plus = (cast(Any, row.get(f"{prefix}_{side}_d")) for side in ("minus", "plus"))
    for side, error in (("minus", minus), ("plus", plus)):
        if error is not None and error < 0:
            raise _refused(f"{prefix}_{side}_d", repr(error), "An error is a size and has no sign.")
    return Moment(
        cast(float, row[axis]),
        minus,
        plus,
        _text(row, f"{prefix}_text"),
        cast(Any, row.get(f"{prefix}_scale") or "tdb"),
        cast(Any, row.get(f"{prefix}_place") or "barycentre"),
    )


def _period(row: Row) -> Measured | Limit | Range | None:
    kind, value = row.get("period_kind"), _measured(row, "period_d")
    if kind is None or value is None:
        if kind is not None or value is not None:
            raise _refused(
                "period_kind", str(kind or ""), "period_kind and period_d are given together, or neither."
            )
        return None
    if kind == "measured":
        return value
    if kind == "range":
        _required(row, "period_high_d")
        return Range(value.value, cast(float, row["period_high_d"]))
    sigma = cast(Any, row.get("period_limit_sigma"))
    return Limit(value.value, cast(Any, kind), 3.0 if sigma is None else sigma)


def _aliases(row: Row) -> tuple[str, ...]:
    text = _text(row, "aliases")
    if not text:
        return ()
    names = _json(text, "aliases")
    if not isinstance(names, list) or not all(isinstance(name, str) for name in names):
        raise _refused("aliases", text, 'A JSON list of names is expected, such as ["HD 1", "Star B"].')
    return tuple(names)


def _covariance(row: Row) -> Covariance | None:
    text = _text(row, "covariance")
    if not text:
        return None
    document = _json(text, "covariance")
    names = document.get("names") if isinstance(document, dict) else None
    matrix = document.get("matrix") if isinstance(document, dict) else None
    if (
        not isinstance(names, list)
        or not isinstance(matrix, list)
        or not all(isinstance(name, str) for name in names)
        or len(matrix) != len(names)
        or not all(_is_line(line, len(names)) for line in matrix)
    ):
        raise _refused("covariance", text, "A list of names and a square matrix of numbers are expected.")
    return Covariance(tuple(names), tuple(tuple(float(x) for x in line) for line in matrix))


def _is_line(line: Any, length: int) -> bool:
    return isinstance(line, list) and len(line) == length and all(_is_finite(x) for x in line)


def _is_finite(number: Any) -> bool:
    try:
        return isinstance(number, int | float) and not isinstance(number, bool) and math.isfinite(number)
    except OverflowError:  # a whole number beyond any float
        return False


def _json(text: str, column: str) -> Any:
    try:
        return json.loads(text)
    except (ValueError, RecursionError) as error:
        raise _refused(column, text, "It is no JSON text.") from error


def _refused(column: str, text: str, why: str) -> InputRefused:
    return InputRefused(
        f"The cell of column {column} cannot be used.",
        why=why,
        hint="Mend the cell, or export the table again.",
        code="cell-refused",
        details={"column": column, "text": text[:200]},
    )
