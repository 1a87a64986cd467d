"""Radius against age drawn in characters: the shells that were measured, and where shells are expected.

A shell that keeps its speed lies on the dotted line. A measured shell is a filled mark, an expected one an
open mark; where both fall into one cell the mark is a diamond, so that an open mark alone is a shell that
nobody measured, and a disc off the line one that is not where it should be.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import groupby

from rich.cells import cell_len

from campaign.model.shells import DatedShell, ForeseenShell, ShellDatingResult
from campaign.output.console import Screen, Span

_MEASURED, _EXPECTED, _BOTH, _WAY, _ERROR = "●", "◇", "◆", "·", "│"
_STYLES = {_MEASURED: "bold yellow", _BOTH: "bold yellow", _EXPECTED: "cyan", _WAY: "dim", _ERROR: "dim"}
_PIPE_WIDTH = 100
_ROWS = 16
_LABEL_CELLS = 8
_STEPS = (1.0, 2.0, 5.0)

Grid = list[list[str]]


@dataclass(frozen=True, slots=True)
class _Point:
    """One radius: measured with its error, or expected."""

    age: float
    radius: float
    sigma: float | None
    is_measured: bool


class _Scale:
    """Cells along one direction from zero to the largest value, with round numbers."""

    def __init__(self, largest: float, cells: int) -> None:
        # A little room beyond the outermost, so that it does not lie on the frame.
        self.high = 1.04 * largest
        self.cells = cells

    def cell(self, value: float) -> int | None:
        place = math.floor(value / self.high * self.cells)
        return place if 0 <= place < self.cells else None

    def middle(self, cell: int) -> float:
        return (cell + 0.5) * self.high / self.cells

    def ticks(self, room: float) -> Iterator[tuple[int, str]]:
        """Cells of round numbers at least ``room`` cells apart, with their labels."""
        wanted = self.high * room / self.cells
        power = 10.0 ** math.floor(math.log10(wanted))
        step = next((power * each for each in _STEPS if power * each >= wanted), 10.0 * power)
        places = max(0, -math.floor(math.log10(step) + 1e-9))
        number = 0
        while (value := number * step) <= self.high:
            place = self.cell(value)
            if place is not None:
                yield place, f"{value:.{places}f}"
            number += 1


def render_diagram(screen: Screen, result: ShellDatingResult) -> None:
    """Draw radius against age; nothing where no shell has an age."""
    points, in_periods = _points(result)
    if not points:
        return
    whole = screen.width or _PIPE_WIDTH
    ages = _Scale(max(point.age for point in points), whole - _LABEL_CELLS - 1)
    radii = _Scale(max(point.radius for point in points), _ROWS)
    if ages.cells < 20:
        return
    grid: Grid = [[" "] * ages.cells for _ in range(_ROWS)]
    slope = _slope(result, in_periods)
    if slope is not None:
        for column in range(ages.cells):
            _put(grid, radii.cell(slope * ages.middle(column)), column, _WAY)
    bars = _draw_errors(grid, points, ages, radii)
    for point in sorted(points, key=lambda p: p.is_measured):
        _mark(grid, point, ages, radii)
    unit = "periods" if in_periods else "yr"
    screen.line("radius, arcsec")
    _print_grid(screen, grid, radii)
    rule, labels = _axis(ages)
    screen.line(" " * _LABEL_CELLS, Span("└" + rule, "dim"))
    screen.line(" " * (_LABEL_CELLS + 1), Span(labels, "dim"))
    screen.wrapped(_legend(grid, slope, unit, bars), hang=2, style="dim")


def _points(result: ShellDatingResult) -> tuple[list[_Point], bool]:
    """Measured shells at the age that they should have, and expected ones that nobody measured."""
    in_periods = all(shell.age_yr is None for shell in result.shells)
    points = []
    for shell in result.shells:
        age = _age(shell, result.foreseen, in_periods)
        if age is not None and age > 0.0:
            points.append(_Point(age, shell.radius_arcsec, shell.sigma_arcsec, True))
    if points and not in_periods:
        points += [_Point(f.age_yr, f.radius_arcsec, None, False) for f in result.foreseen if f.age_yr > 0.0]
    return points, in_periods


def _age(shell: DatedShell, foreseen: Sequence[ForeseenShell], in_periods: bool) -> float | None:
    if in_periods:
        return shell.age_periods
    if shell.cycle is not None:
        for one in foreseen:
            if one.cycle == shell.cycle and one.image_bmjd_tdb == shell.image_bmjd_tdb:
                return one.age_yr
    return shell.age_yr


def _slope(result: ShellDatingResult, in_periods: bool) -> float | None:
    """Arcsec a year, or a period."""
    name = "spacing_arcsec" if in_periods else "proper_motion_mas_yr"
    found = next((each.value for each in result.quantities if each.name == name), None)
    return None if found is None else found * (1.0 if in_periods else 1e-3)


def _put(grid: Grid, row: int | None, column: int | None, mark: str) -> None:
    if row is not None and column is not None:
        grid[len(grid) - 1 - row][column] = mark


def _draw_errors(grid: Grid, points: Sequence[_Point], ages: _Scale, radii: _Scale) -> bool:
    """Errors larger than a cell as bars; whether there was any."""
    drawn = False
    for point in points:
        column = ages.cell(point.age)
        if point.sigma is None or column is None:
            continue
        low, high = (radii.cell(max(point.radius + side * point.sigma, 0.0)) for side in (-1.0, 1.0))
        first, last = low if low is not None else 0, high if high is not None else radii.cells - 1
        if last > first:
            drawn = True
            for row in range(first, last + 1):
                _put(grid, row, column, _ERROR)
    return drawn


def _mark(grid: Grid, point: _Point, ages: _Scale, radii: _Scale) -> None:
    row, column = radii.cell(point.radius), ages.cell(point.age)
    if row is None or column is None:
        return
    there = grid[len(grid) - 1 - row][column]
    if not point.is_measured:
        _put(grid, row, column, _EXPECTED)
    else:
        _put(grid, row, column, _BOTH if there in (_EXPECTED, _BOTH) else _MEASURED)


def _print_grid(screen: Screen, grid: Grid, radii: _Scale) -> None:
    labels = {len(grid) - 1 - place: text for place, text in radii.ticks(2.5)}
    for number, cells in enumerate(grid):
        label = labels.get(number, "")
        spans = [
            Span("".join(run), _STYLES.get(mark, ""))
            for mark, run in ((m, list(r)) for m, r in groupby(cells))
        ]
        edge = "┤" if label else "│"
        screen.line(label.rjust(_LABEL_CELLS - 1) + " ", Span(edge, "dim"), *spans)


def _axis(ages: _Scale) -> tuple[str, str]:
    rule, labels = ["─"] * ages.cells, [" "] * ages.cells
    free_from = 0
    for place, text in ages.ticks(9.0):
        rule[place] = "┬"
        if place >= free_from and place + cell_len(text) <= ages.cells:
            labels[place : place + len(text)] = text
            free_from = place + len(text) + 1
    return "".join(rule), "".join(labels)


def _legend(grid: Grid, slope: float | None, unit: str, bars: bool) -> str:
    seen = {mark for row in grid for mark in row}
    parts = [
        f"{mark} {name}"
        for mark, name in (
            (_MEASURED, "measured"),
            (_BOTH, "measured where expected"),
            (_EXPECTED, "expected, not measured"),
        )
        if mark in seen
    ]
    if slope is not None and _WAY in seen:
        speed = f"{1000.0 * slope:.4g} mas/yr" if unit == "yr" else f"{slope:.4g} arcsec a period"
        parts.append(f"{_WAY} {speed}")
    if bars:
        parts.append(f"{_ERROR} error")
    return f"{'  '.join(parts)}; age in {unit}"
