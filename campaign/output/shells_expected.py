"""Expected shells on the screen: where each is at one date or two, what is seen, and what comes."""

from __future__ import annotations

from collections.abc import Sequence

from campaign.model.measured import Measured
from campaign.model.shells import ExpectedShell, ExpectedView, ShellExpectation
from campaign.output.console import Screen
from campaign.output.shells import render_quantities
from campaign.output.tables import Cell, Column, Row, print_table
from campaign.output.values import calendar_day, number
from campaign.output.wording import minus_signs, percent

_SEEN_STYLE = "bold yellow"


def render_expectation(screen: Screen, result: ShellExpectation) -> None:
    """Write everything that is expected."""
    dates = " and ".join(calendar_day(view.bmjd_tdb) for view in result.views)
    screen.heading(f"Shells of {result.system} on {dates}")
    for view in result.views:
        line = _counted(view, result)
        if line:
            screen.wrapped(line)
    screen.line("")
    _print_views(screen, result.views)
    if result.resolvable or result.coming:
        screen.line("")
        _print_coming(screen, result)
    screen.line("")
    render_quantities(screen, result.quantities)
    screen.line("")
    screen.heading("Notes")
    for warning in result.warnings:
        screen.wrapped(warning, label="- Warning: ", hang=2, style="bold yellow")
    for line in result.assumptions:
        screen.wrapped(minus_signs(line), label="- ", hang=2)


def _counted(view: ExpectedView, result: ShellExpectation) -> str:
    """How many shells a picture of that date shows."""
    limits = (result.field_arcsec, result.resolution_arcsec, result.outer_radius_arcsec)
    if all(limit is None for limit in limits):
        return ""
    parts = [f"{view.in_view} in view"]
    if result.resolution_arcsec is not None:
        parts.append(f"{view.within_limit} inside {result.resolution_arcsec:g} arcsec")
    ends = []
    if result.field_arcsec is not None:
        ends.append(f"a field of {result.field_arcsec:g} arcsec")
    if result.outer_radius_arcsec is not None:
        ends.append(f"a radius of {result.outer_radius_arcsec:g} arcsec")
    told = f"{', '.join(parts)} on {calendar_day(view.bmjd_tdb)}"
    # Older ones are beyond without being counted: nobody knows how long dust lasts.
    if ends and view.beyond_field:
        return f"{told}; all older ones lie outside {' or '.join(ends)}."
    return f"{told}; older ones were not looked at." if ends and view.shells else f"{told}."


def _print_views(screen: Screen, views: Sequence[ExpectedView]) -> None:
    numbers = list(dict.fromkeys(_key(shell) for view in views for shell in view.shells))
    by_date = [{_key(shell): shell for shell in view.shells} for view in views]
    if not numbers:
        screen.wrapped("No shell is launched by then.")
        return
    numbers.sort(reverse=True)
    full = [_row([found.get(key) for found in by_date]) for key in numbers]
    columns = _columns(views)
    kept = [i for i in range(len(columns)) if any(_text(row[i]) for row in full)]
    chosen = [columns[i] for i in kept]
    rows = [[row[i] for i in kept] for row in full]
    print_table(screen, chosen, rows)


def _key(shell: ExpectedShell) -> float:
    """Cycles in order, or launches where nothing counts cycles."""
    return shell.launched_bmjd_tdb


def _columns(views: Sequence[ExpectedView]) -> list[Column]:
    several = len(views) > 1
    columns = [Column("cycle", align="right"), Column("launched", drop=4)]
    for place, view in enumerate(views):
        day = calendar_day(view.bmjd_tdb)
        # Of the second date only the radius and whether it is seen are kept as long.
        later = 4 * place
        columns += [
            Column(f"age {day}" if several else "age, yr", align="right", drop=6 + later, name=f"age {day}"),
            Column(f"radius {day}" if several else "radius, arcsec", align="right"),
            Column("seen", drop=1 + place, name=f"seen {day}"),
            Column("T, K", align="right", drop=5 + later, name=f"grain temperature {day}"),
            Column("peak, um", align="right", drop=7 + later, name=f"peak wavelength {day}"),
        ]
    return [*columns, Column("motion, mas/yr", align="right", drop=3)]


def _row(shells: Sequence[ExpectedShell | None]) -> Row:
    first = next(shell for shell in shells if shell is not None)
    cells: list[str | Cell] = ["" if first.cycle is None else minus_signs(str(first.cycle)), _launched(first)]
    for shell in shells:
        cells += ["", "", "", "", ""] if shell is None else _cells(shell)
    cells.append(_plain(first.proper_motion_mas_yr, first.proper_motion_sigma_mas_yr))
    return cells


def _cells(shell: ExpectedShell) -> list[str | Cell]:
    seen = ""
    if shell.in_view is not None:
        seen = "yes" if shell.in_view else "no"
        chance = shell.view_probability
        if chance is not None and 0.005 < chance < 0.995:
            seen += f" {percent(chance)}"
    return [
        f"{shell.age_yr:.1f}" if shell.age_yr > 0.0 else "",
        _radius(shell),
        Cell(seen, _SEEN_STYLE if shell.in_view else ""),
        "" if shell.grain_temperature_k is None else f"{shell.grain_temperature_k:.0f}",
        "" if shell.peak_wavelength_um is None else f"{shell.peak_wavelength_um:.3g}",
    ]


def _radius(shell: ExpectedShell) -> str:
    text = _plain(shell.radius_arcsec, shell.radius_sigma_arcsec)
    if shell.probability is not None and shell.probability < 0.995:
        return f"{text} ({percent(shell.probability)})"
    return text


def _launched(shell: ExpectedShell) -> str:
    day = calendar_day(shell.launched_bmjd_tdb)
    return f"{day} ± {_days(shell.launched_sigma_d)}"


def _days(sigma_d: float | None) -> str:
    if sigma_d is None:
        return "?"
    if sigma_d >= 1000.0:
        return f"{sigma_d / 365.25:.1f} yr"
    return f"{sigma_d:.0f} d" if sigma_d >= 9.5 else f"{sigma_d:.2g} d"


def _plain(value: float, sigma: float | None) -> str:
    return f"{value:.4g} ± ?" if sigma is None else number(Measured(value, sigma, sigma))


def _print_coming(screen: Screen, result: ShellExpectation) -> None:
    """Launches to come, and when each shell becomes resolvable."""
    launches = [("launched", c.cycle, c.launched_bmjd_tdb, c.launched_sigma_d) for c in result.coming]
    limit = "" if result.resolution_arcsec is None else f", past {result.resolution_arcsec:g} arcsec"
    grown = [(f"resolvable{limit}", r.cycle, r.bmjd_tdb, r.sigma_d) for r in result.resolvable]
    rows = [
        (f"{calendar_day(at)} ± {_days(sigma)}", "" if cycle is None else minus_signs(str(cycle)), word)
        for word, cycle, at, sigma in sorted([*launches, *grown], key=lambda each: each[2])
    ]
    columns = (Column("date"), Column("cycle", align="right"), Column("its shell is"))
    counted = [0, 1, 2] if any(cycle for _, cycle, _ in rows) else [0, 2]
    print_table(screen, [columns[i] for i in counted], [[row[i] for i in counted] for row in rows])


def _text(cell: str | Cell) -> str:
    return cell.text if isinstance(cell, Cell) else cell
