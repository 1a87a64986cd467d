"""A wind collision on the screen and as a JSON document."""

from __future__ import annotations

from collections.abc import Sequence

from campaign.model.propagated import Propagated
from campaign.model.winds import Cooling, SightZone, WindEvent, WindRow, WindsResult
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.propagated import bare_phase, brief, in_millions, mostly, phase, told
from campaign.output.tables import Column, print_table
from campaign.output.winds_picture import render_orbit, render_surface
from campaign.output.wording import UTC_NOTE, day, percent

# Rarer cases than this share of the draws stand in the JSON document alone.
_WORTH_SAYING = 0.005
_LAWS = {"constant": "constant", "beta": "law"}


def render_winds(screen: Screen, result: WindsResult, *, forms: bool = False, shape: bool = False) -> None:
    """Write the collision, its picture, the orbit, what changes when, and the dated table."""
    origin = f" from {result.solution}" if result.solution else ""
    screen.heading(f"Wind collision of {result.system}{origin}")
    for line in result.warnings:
        screen.wrapped(line, label="- Warning: ", hang=2, style="bold yellow")
    screen.line("")
    print_table(screen, _QUANTITY_COLUMNS, _quantities(result))
    if forms:
        screen.line("")
        screen.heading("Half-opening angle by other published forms")
        rows = [(f.name, told(f.half_opening_deg, "°"), f.source) for f in result.forms]
        print_table(screen, _FORM_COLUMNS, rows)
    screen.line("")
    render_surface(screen, result)
    if shape:
        screen.line("")
        print_table(screen, _SHAPE_COLUMNS, _shape(result))
    if result.cooling:
        screen.line("")
        screen.heading("Cooling parameter chi: below 1 a shocked wind cools, above 1 it stays hot")
        print_table(screen, _COOLING_COLUMNS, [_cooling(each) for each in result.cooling])
    if result.sightline is not None:
        screen.line("")
        screen.heading("Line of sight, in phases from one periastron (below −0.5: in the cycle before)")
        zones = (result.sightline.cavity, result.sightline.cavity_and_rim)
        print_table(screen, _SIGHT_COLUMNS, [_zone(each) for each in zones])
    render_orbit(screen, result)
    if result.events:
        screen.line("")
        screen.heading("What changes when")
        print_table(screen, _EVENT_COLUMNS, [_event(each) for each in result.events])
    _render_rows(screen, result)
    screen.line("")
    for line in (*result.assumptions, *([UTC_NOTE] if result.rows else [])):
        screen.wrapped(line, label="- ", hang=2)


def winds_json(result: WindsResult) -> str:
    """The whole document ``campaign/winds/1``."""
    data = plain(result)
    for name in ("as_of_utc", "warnings"):
        del data[name]
    if result.rows:
        data["assumptions"].append(UTC_NOTE)
    return document("winds", data, as_of=result.as_of_utc, warnings=result.warnings)


# --------------------------------------------------------------------------------------------- quantities

_QUANTITY_COLUMNS = (
    Column("quantity"),
    Column("median, 68 %"),
    Column("95 %", drop=2),
    Column("mostly from", drop=1),
)
_FORM_COLUMNS = (Column("form"), Column("angle, 68 %"), Column("source", shrinks=True, drop=1))
_SHAPE_COLUMNS = (
    Column("angle°", align="right", name="angle at the weaker star from the stronger"),
    Column("R/D", align="right"),
    Column("68 %", align="right"),
    Column("along/D", align="right", drop=2),
    Column("across/D", align="right", drop=1),
)


def _quantities(result: WindsResult) -> list[tuple[str, str, str, str]]:
    weaker, stronger = result.weaker, result.stronger
    rows = [
        (f"momentum ratio {weaker}/{stronger}", result.momentum_ratio, ""),
        (f"stagnation from {weaker}", result.stagnation_from_weaker_over_d, "D"),
        (f"stagnation from {stronger}", result.stagnation_from_stronger_over_d, "D"),
        (f"half-opening about {weaker}", result.half_opening_deg, "°"),
        ("  with shocks' flare", result.shock_opening_deg, "°"),
    ]
    for wind in result.winds:
        temperature = in_millions(wind.postshock_temperature_k)
        assert temperature is not None
        rows.append((f"shocked wind of {wind.star}", temperature, "MK"))
        rows.append((f"  k T, {wind.composition.name} mix", wind.postshock_energy_kev, "keV"))
    return [
        (name, told(value, unit), _wide(value), mostly(value)) for name, value, unit in rows if _known(value)
    ]


def _known(value: Propagated | None) -> bool:
    return value is not None and (value.value is not None or value.median is not None)


def _wide(value: Propagated) -> str:
    """The 95 % interval."""
    if value.lo95 is None or value.hi95 is None or value.lo95 == value.hi95:
        return ""
    return f"{value.lo95:.3g} … {value.hi95:.3g}"


def _shape(result: WindsResult) -> list[tuple[str, ...]]:
    return [
        (
            f"{point.angle_deg:.1f}",
            f"{point.from_weaker_over_d.value:.3f}",
            _reach(point.from_weaker_over_d),
            f"{point.along_over_d:.3f}".replace("-", "−"),
            f"{point.across_over_d:.3f}",
        )
        for point in result.surface
    ]


def _reach(distance: Propagated) -> str:
    """An interval of distances, whose far end may be out of reach."""
    if distance.unknown_errors or distance.lo68 is None:
        return "error unknown" if distance.unknown_errors else "out of reach"
    far = "out of reach" if distance.hi68 is None else f"{distance.hi68:.3f}"
    return f"{distance.lo68:.3f} … {far}"


# ------------------------------------------------------------------------------------ cooling, line of sight

_COOLING_COLUMNS = (
    Column("wind"),
    Column("speed", drop=4),
    Column("at periastron", align="right"),
    Column("at apastron", align="right"),
    Column("below 1", shrinks=True, min_width=14),
    Column("mostly from", shrinks=True, min_width=12, drop=3),
)
_SIGHT_COLUMNS = (
    Column("through"),
    Column("within°", align="right", drop=2, name="half-opening angle"),
    Column("from phase", align="right"),
    Column("until", align="right"),
    Column("of the orbit", align="right", drop=3),
    Column("ever", align="right", drop=1, name="chance that it ever happens"),
    Column("mostly from", shrinks=True, min_width=12, drop=4),
)


def _cooling(each: Cooling) -> tuple[str, ...]:
    return (
        f"star {each.star}",
        _LAWS[each.law],
        brief(each.periastron),
        brief(each.apastron),
        _below_one(each),
        mostly(each.periastron),
    )


def _below_one(each: Cooling) -> str:
    """Where a wind cools, with the chance of it when that is in doubt."""
    crosses, above, below = (
        each.probability_crosses,
        each.probability_always_above,
        each.probability_always_below,
    )
    if crosses is None or above is None or below is None:
        start, end = each.periastron.value, each.apastron.value
        if start is None or end is None:
            return "unknown"
        if each.half_window_periods.value is not None:
            return f"within {each.half_window_periods.value:.4f} P of periastron (error unknown)"
        return "at no phase (error unknown)" if start > 1.0 else "at every phase (error unknown)"
    half, unit = (each.half_window_d, "d") if _known(each.half_window_d) else (each.half_window_periods, "P")
    parts = [
        (crosses, f"within {told(half)} {unit} of periastron"),
        (above, "at no phase"),
        (below, "at every phase"),
    ]
    told_parts = sorted((part for part in parts if part[0] >= _WORTH_SAYING), key=lambda part: -part[0])
    return "; ".join(words if share == 1.0 else f"{words}: {percent(share)}" for share, words in told_parts)


def _zone(zone: SightZone) -> tuple[str, ...]:
    name = "cavity" if zone.zone == "cavity" else "cavity or rim"
    always = zone.probability_always is not None and zone.probability_always > 0.5
    return (
        name,
        brief(zone.opening_deg),
        "always" if always else phase(zone.from_phase),
        "" if always else phase(zone.until_phase),
        brief(zone.share_of_orbit),
        percent(zone.probability_ever),
        mostly(zone.share_of_orbit),
    )


# -------------------------------------------------------------------------------------------- dated tables

_EVENT_COLUMNS = (
    Column("UTC"),
    Column("68 %", drop=3),
    Column("what", shrinks=True, min_width=20),
    Column("cycle", align="right", drop=4),
    Column("phase", align="right", drop=2),
    Column("chance", align="right", drop=1),
    Column("mostly from", shrinks=True, min_width=12, drop=5),
)


def _event(event: WindEvent) -> tuple[str, ...]:
    date = event.bmjd_tdb
    middle = date.median if date.median is not None else date.value
    spread = "error unknown"
    if date.lo68 is not None and date.hi68 is not None and date.median is not None:
        below, above = date.median - date.lo68, date.hi68 - date.median
        spread = (
            f"±{_days(above)} d" if _days(below) == _days(above) else f"−{_days(below)}/+{_days(above)} d"
        )
    chance = "" if event.probability in (None, 1.0) else percent(event.probability)
    return (
        day(event.utc, middle or 0.0),
        spread,
        event.event,
        str(event.cycle),
        bare_phase(event.phase),
        chance,
        mostly(date),
    )


def _days(size: float) -> str:
    return f"{size:.0f}" if size >= 9.95 else f"{size:.2g}"


_ROW_COLUMNS = (
    Column("UTC"),
    Column("cycle", align="right", drop=9),
    Column("phase", align="right"),
    Column("D au", align="right", name="separation in au"),
    Column("to A au", align="right", drop=7, name="contact surface from A"),
    Column("to B au", align="right", drop=7, name="contact surface from B"),
    Column("chi A", align="right"),
    Column("chi B", align="right", drop=2),
    Column("chi A law", align="right", drop=5, name="chi of A with a velocity law"),
    Column("chi B law", align="right", drop=5, name="chi of B with a velocity law"),
    Column("T A law, MK", align="right", drop=8, name="temperature of A with a velocity law"),
    Column("T B law, MK", align="right", drop=8, name="temperature of B with a velocity law"),
    Column("sight°", align="right", drop=4, name="line of sight to the axis"),
    Column("through", drop=1, name="what one looks through"),
    Column("cavity", align="right", drop=6, name="chance of the cavity"),
)


def _render_rows(screen: Screen, result: WindsResult) -> None:
    if not result.rows:
        return
    screen.line("")
    screen.heading("Through the orbit")
    cells = [_cells(row) for row in result.rows]
    kept = [i for i in range(len(_ROW_COLUMNS)) if any(row[i] for row in cells)]
    print_table(screen, [_ROW_COLUMNS[i] for i in kept], [[row[i] for i in kept] for row in cells])
    unknown = _unknown(result)
    if unknown:
        screen.wrapped(f"? stands for an error that is not known: {unknown}.", hang=2, style="dim")
    causes = _causes(result)
    if causes:
        screen.wrapped(f"Errors mostly from: {causes}.", hang=2, style="dim")
    lost = [c.name or c.heading for i, c in enumerate(_ROW_COLUMNS) if i not in kept]
    if lost:
        screen.wrapped(f"Not given by the inputs: {', '.join(lost)}.", style="dim")


_CAUSES = (
    ("D", "separation_au"), ("to A", "contact_from_a_au"), ("to B", "contact_from_b_au"), ("chi A", "chi_a"),
    ("chi B", "chi_b"), ("chi A law", "chi_a_beta"), ("chi B law", "chi_b_beta"),
    ("T A law", "postshock_a_k"), ("T B law", "postshock_b_k"), ("sight", "sightline_deg"),
)  # fmt: skip


def _causes(result: WindsResult) -> str:
    """Which input makes most of the error of each column, in most of its lines."""
    columns: dict[str, list[str]] = {}
    for heading, name in _CAUSES:
        values = [getattr(row, name) for row in result.rows]
        causes = [value.dominant for value in values if value is not None and value.dominant is not None]
        if causes:
            columns.setdefault(max(set(causes), key=causes.count), []).append(heading)
    return "; ".join(f"{cause} ({', '.join(headings)})" for cause, headings in columns.items())


def _unknown(result: WindsResult) -> str:
    """The inputs whose errors the lines of the table lack."""
    values = [getattr(row, name) for row in result.rows for _, name in _CAUSES]
    names = [name for value in values if value is not None for name in value.unknown_errors]
    return ", ".join(dict.fromkeys(names))


def _cells(row: WindRow) -> Sequence[str]:
    return (
        day(row.utc, row.bmjd_tdb),
        str(row.cycle),
        phase(row.phase, error=False),
        brief(row.separation_au),
        brief(row.contact_from_a_au),
        brief(row.contact_from_b_au),
        brief(row.chi_a),
        brief(row.chi_b),
        brief(row.chi_a_beta),
        brief(row.chi_b_beta),
        brief(in_millions(row.postshock_a_k)),
        brief(in_millions(row.postshock_b_k)),
        brief(row.sightline_deg),
        row.seen_through or "",
        "" if row.probability_cavity is None else percent(row.probability_cavity),
    )
