"""Systems, solutions and episodes as rows of exchanged tables; the way back is in ``reading``."""

from __future__ import annotations

import json
from collections.abc import Iterator

from campaign.model.exchange_columns import (
    ELEMENT_UNITS,
    RULE_SIZES,
    RULE_STAGES,
    STAR_UNITS,
    Cell,
    ExchangeColumn,
)
from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.systems import DustRule, Episode, Solution, System

Cells = dict[str, Cell]


def system_cells(system: System, rule: DustRule | None) -> Cells:
    """A system with the dust rule in force, by column.

    Parameters
    ----------
    system : System
        Units as in the model.
    rule : DustRule or None
        In force; None for none.

    Returns
    -------
    dict
        Cells by column of ``systems`` (unit of each in ``campaign.model.exchange_columns``); what is not
        named is unknown.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    cells: Cells = {
        "name": system.name,
        "aliases": json_cell(list(system.aliases)) if system.aliases else None,
        "ra_deg": system.ra_deg,
        "dec_deg": system.dec_deg,
        "position_epoch_jyr": system.position_epoch_jyr,
        "pm_ra_cosdec_mas_yr": system.pm_ra_cosdec_mas_yr,
        "pm_dec_mas_yr": system.pm_dec_mas_yr,
        "state": system.state,
        "priority": system.priority,
        "notes": system.notes,
        "cycle_anchor_bmjd_tdb": system.cycle_anchor_bmjd_tdb,
        "cycle_anchor_period_d": system.cycle_anchor_period_d,
        **_measured("distance_pc", system.distance_pc),
        **_measured("parallax_mas", system.parallax_mas),
    }
    for letter, star in (("a", system.star_a), ("b", system.star_b)):
        cells[f"star_{letter}_spectral_type"] = star.spectral_type
        for quantity in STAR_UNITS:
            cells |= _measured(f"star_{letter}_{quantity}", getattr(star, quantity))
    return cells | ({} if rule is None else _rule_cells(rule))


def _rule_cells(rule: DustRule) -> Cells:
    cells: Cells = {"rule_kind": rule.kind, "rule_note": rule.note}
    unit = "phase" if rule.kind == "phase" else "d"
    for stage in RULE_STAGES:
        cells |= _measured(f"rule_{stage}_{unit}", getattr(rule, stage))
        cells[f"rule_scatter_{stage}_d"] = getattr(rule, f"scatter_{stage}_d")
    for size in RULE_SIZES:
        cells |= _measured(f"rule_{size}", getattr(rule, size))
    return cells


def solution_cells(system: str, solution: Solution) -> Cells:
    """A solution, by column.

    Parameters
    ----------
    system : str
        Primary name of its system.
    solution : Solution
        Units as in the model.

    Returns
    -------
    dict
        Cells by column of ``solutions`` (unit of each in ``campaign.model.exchange_columns``).

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    cells: Cells = {
        "system": system,
        "label": solution.label,
        **_period(solution.period_d),
        **_moment("epoch", solution.epoch),
        "epoch_marks": solution.epoch_marks,
        "omega_of": solution.omega_of,
        "covariance": None if solution.covariance is None else covariance_cell(solution.covariance),
        "source": solution.source,
        "data_until_bmjd_tdb": solution.data_until_bmjd_tdb,
        "adopted": solution.adopted,
        "weight": solution.weight,
        "epoch_cycle": solution.epoch_cycle,
        "published_cycle_offset": solution.published_cycle_offset,
        "note": solution.note,
    }
    for element in ELEMENT_UNITS:
        cells |= _measured(element, getattr(solution, element))
    return cells


def episode_cells(system: str, episode: Episode) -> Cells:
    """An episode, by column.

    Parameters
    ----------
    system : str
        Primary name of its system.
    episode : Episode
        Instants ``bmjd_tdb`` (days).

    Returns
    -------
    dict
        Cells by column of ``episodes`` (unit of each in ``campaign.model.exchange_columns``).

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    cells: Cells = {
        "system": system,
        "cycle": episode.cycle,
        "state": episode.state,
        "source": episode.source,
        "note": episode.note,
    }
    for stage in RULE_STAGES:
        event = getattr(episode, stage)
        if event is not None:
            cells |= _moment(stage, event.moment)
            cells |= {f"{stage}_band": event.band, f"{stage}_method": event.method}
    return cells


def in_order(columns: tuple[ExchangeColumn, ...], rows: Iterator[Cells]) -> Iterator[tuple[Cell, ...]]:
    """Rows by column as rows in the order of the columns.

    Parameters
    ----------
    columns : tuple of ExchangeColumn
        Of the table; their units are kept.
    rows : iterator of dict
        Cells by name.

    Returns
    -------
    iterator of tuple
        None where a cell is unknown or an empty text.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    names = [column.name for column in columns]
    for cells in rows:
        # A text that is empty and one that was never given are alike in every form of table.
        yield tuple(None if (cell := cells.get(name)) == "" else cell for name in names)


def json_cell(value: object) -> str:
    """A list or document as one line of text; the same value is always the same text.

    Parameters
    ----------
    value : object
        Lists, dictionaries, texts and finite numbers (no unit).

    Returns
    -------
    str
        Compact JSON (no unit).

    Notes
    -----
    Accuracy: floats keep every digit. Source: RFC 8259.
    """
    return json.dumps(value, sort_keys=True, allow_nan=False, ensure_ascii=False, separators=(",", ":"))


def covariance_cell(covariance: Covariance) -> str:
    """A covariance matrix as one line of text.

    Parameters
    ----------
    covariance : Covariance
        In the units of its elements.

    Returns
    -------
    str
        JSON with ``names`` and ``matrix`` (row by row, units of the elements).

    Notes
    -----
    Accuracy: floats keep every digit. Source: project convention.
    """
    return json_cell(
        {"names": list(covariance.names), "matrix": [[float(x) for x in row] for row in covariance.matrix]}
    )


def _measured(name: str, value: Measured | None) -> Cells:
    if value is None:
        return {}
    return {name: value.value, f"{name}_minus": value.minus, f"{name}_plus": value.plus}


def _period(period: Measured | Limit | Range | None) -> Cells:
    if isinstance(period, Range):
        return {"period_kind": "range", "period_d": period.low, "period_high_d": period.high}
    if isinstance(period, Limit):
        return {
            "period_kind": period.side,
            "period_d": period.bound,
            "period_limit_sigma": period.limit_sigma,
        }
    return {} if period is None else {"period_kind": "measured", **_measured("period_d", period)}


def _moment(prefix: str, moment: Moment | None) -> Cells:
    if moment is None:
        return {}
    return {
        f"{prefix}_bmjd_tdb": moment.bmjd_tdb,
        f"{prefix}_minus_d": moment.minus_d,
        f"{prefix}_plus_d": moment.plus_d,
        f"{prefix}_text": moment.text,
        f"{prefix}_scale": moment.scale,
        f"{prefix}_place": moment.place,
    }
