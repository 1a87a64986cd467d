"""A refined ephemeris on the screen and as JSON: O-C table and drawing, ways to count, what would change."""

from __future__ import annotations

from dataclasses import fields

from campaign.model.measured import Measured
from campaign.model.refined import (
    CycleCounting,
    MissedCycle,
    OrbitComparison,
    RefinedDate,
    RefinedEphemeris,
    Refinement,
    SingleEpisode,
)
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.oc_picture import render_oc
from campaign.output.tables import Cell, Column, print_table
from campaign.output.values import number
from campaign.output.wording import DAYS_PER_YEAR, UTC_NOTE, between, day, percent, signed_days, spread

_DATES = (
    Column("cycle", align="right"),
    Column("event"),
    Column("observed"),
    Column("error d", align="right"),
    Column("band", drop=4),
    Column("computed", drop=2),
    Column("O−C d", align="right", name="observed less computed"),
    Column("O−C σ", align="right", drop=1, name="O−C in sigma"),
    Column("episode", align="right", drop=3),
)
_COUNTS = (
    Column("", align="right", name="number"),
    Column("period d", align="right"),
    Column("cycles", shrinks=True),
    Column("fit by the dates", align="right", drop=2),
    Column("cycles between", shrinks=True, drop=1),
    Column("probability", align="right"),
    Column("against orbit", align="right", drop=3),
    Column("verdict"),
)
_MOST_COUNTS = 6
_MOST_MISSED = 12


def render_refinement(screen: Screen, found: Refinement, *, every_count: bool = False) -> None:
    """The clock of one system: ephemeris, O-C, ways to count, orbit, and what would change."""
    if found.single is not None:
        _render_single(screen, found, found.single)
        return
    assert found.ephemeris is not None
    screen.heading(f"{found.system}: clock of {found.episodes} dated episodes")
    _render_ephemeris(screen, found, found.ephemeris)
    screen.line("")
    print_table(screen, _DATES, [_date_row(row) for row in found.dates])
    screen.line("")
    render_oc(screen, found)
    screen.line("")
    _render_counts(screen, found, every_count=every_count)
    if found.change_of_period is not None:
        change = found.change_of_period
        size = "" if change.change_d_per_cycle is None else f"{number(change.change_d_per_cycle)} d a cycle; "
        screen.wrapped(
            f"change of period: {size}{change.why}: {'kept' if change.kept else 'not kept'}", hang=2
        )
    if found.orbit is not None:
        _render_orbit(screen, found.orbit, found.ephemeris)
    if found.forecast_change is not None:
        change_day = found.forecast_change
        before = "no date" if change_day.before_utc is None else change_day.before_utc.partition("T")[0]
        after = "no date" if change_day.after_utc is None else change_day.after_utc.partition("T")[0]
        screen.wrapped(f"if adopted: {change_day.text} ({before} → {after})", hang=2, style="bold")
    screen.line("")
    for assumption in (*found.assumptions, UTC_NOTE):
        screen.wrapped(assumption, hang=2, style="dim")


def refinement_json(found: Refinement, kept: object | None = None) -> str:
    """Document ``refine``."""
    data = {
        field.name: plain(getattr(found, field.name))
        for field in fields(found)
        if field.name not in {"warnings", "as_of_utc"}
    }
    if kept is not None:
        data["kept"] = plain(kept)
    return document("refine", data, as_of=found.as_of_utc, warnings=found.warnings)


def _render_ephemeris(screen: Screen, found: Refinement, ephemeris: RefinedEphemeris) -> None:
    period = ephemeris.period_d
    years = number(period.scaled(1.0 / DAYS_PER_YEAR), "yr")
    screen.wrapped(f"period    {number(period, 'd')}, {years}", hang=10)
    error = ephemeris.epoch_bmjd_tdb.plus or 0.0
    when = day(ephemeris.epoch_utc, ephemeris.epoch_bmjd_tdb.value)
    screen.wrapped(
        f"{ephemeris.event:<9} {when} ± {_short(error)} d in "
        f"cycle {ephemeris.epoch_cycle}, MJD {number(ephemeris.epoch_bmjd_tdb)} TDB; least uncertain "
        f"at cycle {ephemeris.best_cycle:.2f}",
        hang=10,
    )
    if ephemeris.maximum_after_onset_d is not None:
        screen.wrapped(f"maximum   {number(ephemeris.maximum_after_onset_d, 'd')} after onset", hang=10)
    rest = ", by the stated prior" if ephemeris.prior_used else ""
    screen.wrapped(f"scatter   {number(ephemeris.scatter_d, 'd')} from cycle to cycle{rest}", hang=10)
    if found.line is not None:
        line = found.line
        screen.wrapped(
            f"dates alone, without scatter: P {number(line.period_d, 'd')}, correlation with the epoch of "
            f"cycle {line.epoch_cycle} {_minus(f'{line.correlation:+.2f}')}, chi-square {line.chi2:.1f} for "
            f"{line.degrees_of_freedom}",
            hang=2,
            style="dim",
        )
    if found.next_event is not None and found.next_utc is not None:
        q, utc = found.next_event, found.next_utc
        likely = between(utc.lo68, utc.hi68, q.lo68, q.hi68)
        nearly_sure = between(utc.lo95, utc.hi95, q.lo95, q.hi95)
        screen.wrapped(
            f"next      {ephemeris.event} {found.next_cycle}: {day(utc.median, q.median)}, 68 % {likely}, "
            f"95 % {nearly_sure}",
            hang=10,
        )


def _date_row(row: RefinedDate) -> tuple[str | Cell, ...]:
    error = spread(row.bmjd_tdb, row.bmjd_tdb - row.minus_d, row.bmjd_tdb + row.plus_d)
    if row.bracketed:
        error = f"within {error}"
    elif row.error_assumed:
        error = f"{error} assumed"
    far = "bold yellow" if abs(row.sigma) > 3.0 else ""
    return (
        str(row.cycle),
        row.event,
        day(row.utc, row.bmjd_tdb),
        error,
        row.band or "",
        _day_of(row),
        _signed(row.o_minus_c_d),
        Cell(_minus(f"{row.sigma:+.1f}"), far),
        str(row.episode),
    )


def _day_of(row: RefinedDate) -> str:
    from campaign.output.values import calendar_day

    return calendar_day(row.computed_bmjd_tdb)


def _signed(days: float) -> str:
    return signed_days(days) if abs(days) >= 10.0 else _minus(f"{days:+.1f}")


def _render_counts(screen: Screen, found: Refinement, *, every_count: bool) -> None:
    shown = [one for one in found.counts if every_count or one.number <= _MOST_COUNTS or not one.excluded]
    open_ones = sum(not one.excluded for one in found.counts)
    text = "one way to count the cycles fits dates and observations"
    if open_ones > 1:
        text = f"{open_ones} ways to count the cycles fit dates and observations"
    left = len(found.counts) - open_ones
    if left:
        text += f"; {left} more fit the dates and are excluded by quiet observations"
    screen.wrapped(text, hang=2)
    # Without an orbit there is nothing to say in its column.
    kept = [i for i, column in enumerate(_COUNTS) if column.heading != "against orbit" or _has_orbit(found)]
    rows = [_count_row(one, found.chosen) for one in shown]
    print_table(screen, [_COUNTS[i] for i in kept], [[row[i] for i in kept] for row in rows])
    hidden = len(found.counts) - len(shown)
    if hidden:
        screen.wrapped(f"{hidden} more, all excluded: --all-counts", hang=2, style="dim")
    chosen = next((one for one in found.counts if one.number == found.chosen), None)
    if chosen is not None:
        for cycle in chosen.missed[:_MOST_MISSED]:
            screen.wrapped(_missed(cycle), hang=2)


def _has_orbit(found: Refinement) -> bool:
    return any(one.against_orbit_sigma is not None for one in found.counts)


def _short(size: float) -> str:
    return f"{size:.2g}" if size < 99.5 else f"{size:.0f}"


def _minus(text: str) -> str:
    return text.replace("-", "−")


def _count_row(one: CycleCounting, chosen: int | None) -> tuple[str | Cell, ...]:
    verdicts = [cycle.verdict for cycle in one.missed]
    told = [
        f"{verdicts.count(v)} {v}" for v in ("quiet", "in part", "excess", "not observed") if v in verdicts
    ]
    verdict = "taken" if one.number == chosen else "open"
    if one.excluded:
        verdict = "excluded, taken" if one.number == chosen else "excluded"
    orbit = one.against_orbit_sigma
    return (
        str(one.number),
        number(one.period_d),
        " ".join(map(str, one.cycles)),
        f"{one.dates_share:.2g}",
        ", ".join(told),
        percent(one.probability),
        "" if orbit is None else _minus(f"{orbit:+.1f} σ"),
        Cell(verdict, "bold" if one.number == chosen else ("dim" if one.excluded else "yellow")),
    )


def _missed(cycle: MissedCycle) -> str:
    told = {
        "quiet": "quiet: an episode would have shown",
        "in part": "observed in part",
        "not observed": "not observed",
        "excess": "an excess was seen that is no confirmed episode",
    }[cycle.verdict]
    q = cycle.bmjd_tdb
    when = between(cycle.utc.lo68, cycle.utc.hi68, q.lo68, q.hi68)
    return f"cycle {cycle.cycle}, no episode known, expected {when}: {told}"


def _render_orbit(screen: Screen, orbit: OrbitComparison, ephemeris: RefinedEphemeris) -> None:
    parts = []
    if orbit.period_d is not None:
        parts.append(f"P {number(orbit.period_d, 'd')}")
    if orbit.period_tension_sigma is not None:
        parts.append(_minus(f"episodes less orbit {orbit.period_tension_sigma:+.1f} σ"))
    if orbit.combined_period_d is not None:
        parts.append(f"together {number(orbit.combined_period_d, 'd')}")
    if orbit.event_after_epoch_d is not None:
        parts.append(f"{ephemeris.event} {_lag(orbit.event_after_epoch_d)} {orbit.epoch_marks}")
    if orbit.event_tension_sigma is not None:
        parts.append(_minus(f"against the dust rule {orbit.event_tension_sigma:+.1f} σ"))
    screen.wrapped(f"orbit '{orbit.solution}': {', '.join(parts)}", hang=2)


def _lag(lag: Measured) -> str:
    size = number(Measured(abs(lag.value), lag.minus, lag.plus), "d")
    return f"{size} {'after' if lag.value >= 0 else 'before'}"


def _render_single(screen: Screen, found: Refinement, single: SingleEpisode) -> None:
    screen.heading(f"{found.system}: one dated episode")
    elapsed = single.elapsed_d / DAYS_PER_YEAR
    screen.wrapped(
        f"{single.event} {day(single.utc, single.bmjd_tdb)}, {elapsed:.1f} yr ago; one episode has no period"
    )
    if single.at_least_d is None or single.probability_per_yr is None:
        screen.wrapped("no observations that would have shown another one: no limit of the period")
    else:
        screen.wrapped(
            f"period    longer than {single.at_least_d:.0f} d, {single.at_least_d / DAYS_PER_YEAR:.1f} yr, "
            f"with {percent(single.at_least_share)} probability",
            hang=10,
        )
        screen.wrapped(f"next      {percent(single.probability_per_yr)} within a year", hang=10)
        screen.wrapped(
            f"observed  {single.covered_d / DAYS_PER_YEAR:.1f} yr in which another one would have shown",
            hang=10,
        )
    screen.line("")
    for assumption in found.assumptions:
        screen.wrapped(assumption, hang=2, style="dim")
