"""The elements of a forecast and its cycle count in words, for the explanation of one system."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from campaign.model.forecasts import EventForecast
from campaign.model.measured import Limit, Measured, Range
from campaign.model.systems import DustRule, Solution
from campaign.physics.timescales import utc_iso
from campaign.studies.cycles import count_is_safe
from campaign.studies.ephemeris import semi_major_axis
from campaign.studies.preparing import Prepared
from campaign.studies.rows import SCATTERS, SPOKEN, ForecastRow

Element = tuple[str, str, str]


def elements(rows: Sequence[ForecastRow], rule: DustRule | None) -> tuple[Element, ...]:
    """Elements and rule as (name, value with error, note).

    Parameters
    ----------
    rows : sequence of ForecastRow
        Rows of one system.
    rule : DustRule or None
        Its dust rule.

    Returns
    -------
    tuple of (str, str, str)
        Units are in the values.

    Notes
    -----
    Accuracy: as typed. Source: project convention.
    """
    lines: list[Element] = []
    for row in rows:
        solution = row.solution
        if solution is None:
            continue
        prefix = f"{solution.label}: " if len(rows) > 1 else ""
        told = (*_solution_lines(solution), *_size_lines(row))
        lines.extend((prefix + name, text, note) for name, text, note in told)
    if rule is not None:
        lines.extend(rule_lines(rule))
    return tuple(lines)


def _solution_lines(solution: Solution) -> list[Element]:
    lines: list[Element] = []
    if solution.period_d is not None:
        lines.append(("period", _text(solution.period_d, "d"), _years(solution.period_d)))
    if solution.epoch is not None:
        epoch = Measured(solution.epoch.bmjd_tdb, solution.epoch.minus_d, solution.epoch.plus_d)
        when = (utc_iso(np.array([solution.epoch.bmjd_tdb]))[0] or "")[:10]
        lines.append((f"epoch ({solution.epoch_marks})", f"MJD {_text(epoch, 'd')} TDB", when))
    if solution.eccentricity is not None:
        lines.append(("eccentricity", _text(solution.eccentricity, ""), ""))
    if solution.omega_deg is not None:
        lines.append(("omega", _text(solution.omega_deg, "deg"), f"of star {solution.omega_of}"))
    for name, value, unit in (
        ("a", solution.a_au, "au"),
        ("a", solution.a_arcsec, "arcsec"),
        ("inclination", solution.inclination_deg, "deg"),
        ("node", solution.node_deg, "deg"),
        ("K of star A", solution.k_a_kms, "km/s"),
        ("K of star B", solution.k_b_kms, "km/s"),
    ):
        if value is not None:
            lines.append((name, _text(value, unit), ""))
    return lines


def _size_lines(row: ForecastRow) -> list[Element]:
    """What the semi-major axis in au is computed from, where the dust rule needs it and nobody gave it."""
    if row.a_source in (None, "given") or row.solution is None:
        return []
    lines: list[Element] = []
    for name, unit in (("distance_pc", "pc"), ("mass_a_msun", "Msun"), ("mass_b_msun", "Msun")):
        if name in row.values:
            lines.append((SPOKEN[name], _text(Measured(*row.values[name]), unit), ""))
    axis = semi_major_axis(row.record, row.solution, row.values["period_d"][0])
    if axis is not None:
        lines.append(("a", f"{axis[0]:.4g} au", f"from {axis[1]}"))
    return lines


def rule_lines(rule: DustRule) -> list[Element]:
    """A dust rule as (name, value with error and unit, note), its kind first.

    Parameters
    ----------
    rule : DustRule
        Offsets in periods or days, distances in au, speed in km/s.

    Returns
    -------
    list of (str, str, str)
        What is given of the rule.

    Notes
    -----
    Accuracy: as typed. Source: project convention.
    """
    unit = "P" if rule.kind == "phase" else "d"
    lines: list[Element] = [("dust rule", rule.kind, "")]
    for name, value, its_unit in (
        ("onset offset", rule.onset, unit),
        ("maximum offset", rule.maximum, unit),
        ("end offset", rule.end, unit),
        ("critical separation", rule.critical_separation_au, "au"),
        ("condensation distance", rule.condensation_distance_au, "au"),
        ("flow speed", rule.flow_speed_kms, "km/s"),
        ("lag of the maximum", rule.maximum_lag_d, "d"),
    ):
        if value is not None:
            lines.append((name, _text(value, its_unit), ""))
    for event in SCATTERS:
        scatter = getattr(rule, f"scatter_{event}_d")
        if scatter is not None:
            lines.append((f"scatter of the {event}", f"{scatter:g} d", "cycle to cycle"))
    return lines


def _text(value: Measured | Limit | Range, unit: str) -> str:
    tail = f" {unit}" if unit else ""
    if isinstance(value, Limit):
        return f"{'>' if value.side == 'above' else '<'} {value.bound:.8g}{tail}"
    if isinstance(value, Range):
        return f"{value.low:.8g} to {value.high:.8g}{tail}"
    if value.minus is None or value.plus is None:
        return f"{value.value:.9g}{tail} (error unknown)"
    below, above = (f"{size:.3g}" if size < 999.5 else f"{size:.0f}" for size in (value.minus, value.plus))
    if value.minus == value.plus:
        return f"{value.value:.9g} ± {above}{tail}"
    return f"{value.value:.9g} +{above} -{below}{tail}"


def _years(period: Measured | Limit | Range) -> str:
    if isinstance(period, Measured):
        return f"{period.value / 365.25:.4f} yr"
    return ""


def cycle_count(prepared: Prepared, events: Sequence[EventForecast]) -> tuple[str, ...]:
    """How the cycles of the events were counted, and whether the count can be off by one.

    Parameters
    ----------
    prepared : Prepared
        Rows and units of one system.
    events : sequence of EventForecast
        Its events.

    Returns
    -------
    tuple of str
        One sentence each (dimensionless counts).

    Notes
    -----
    Accuracy: see ``campaign.studies.cycles.count_is_safe``. Source: project convention.
    """
    lines: list[str] = []
    for unit in prepared.units:
        for index in unit.rows:
            row = prepared.rows[index]
            if row.solution is None or "epoch" not in row.values or "period_d" not in row.values:
                continue
            period, minus, plus = row.values["period_d"]
            epoch_minus, epoch_plus = row.values["epoch"][1:]
            listed = sorted({e.cycle for e in events if e.cycle is not None})
            lines.append(f"{row.solution.label}: its epoch is cycle {row.epoch_cycle} of this system")
            if row.solution.published_cycle_offset:
                lines.append(
                    f"published counts run {row.solution.published_cycle_offset:+d} ahead of the system's"
                )
            known = None not in (minus, plus, epoch_minus, epoch_plus)
            for cycle in listed:
                step = cycle - row.epoch_cycle
                safe = count_is_safe(
                    step, period, max(epoch_minus or 0.0, epoch_plus or 0.0), max(minus or 0.0, plus or 0.0)
                )
                verdict = "count is safe" if safe else "count may be off by one"
                if step and not known:
                    verdict = "an error is unknown, so the count cannot be checked"
                side = "after" if step >= 0 else "before"
                periods = "1 period" if abs(step) == 1 else f"{abs(step)} periods"
                lines.append(f"cycle {cycle}: {periods} {side} the epoch, {verdict}")
    return tuple(dict.fromkeys(lines))
