"""Observed less computed against the cycle, drawn in characters, with the error of the line about it."""

from __future__ import annotations

import math

from rich.cells import cell_len

from campaign.model.refined import RefinedDate, Refinement
from campaign.output.console import Screen, Span
from campaign.output.timeaxis import TimeAxis
from campaign.output.wording import signed_days

_PIPE_WIDTH = 100
_ROWS = 9
_ZERO, _BAR, _ONSET, _MAXIMUM, _NEXT, _BAND = "╌", "│", "●", "◆", "◇", "░"
_STYLES = {_ONSET: "green", _MAXIMUM: "bold yellow", _NEXT: "cyan", _BAR: "", _BAND: "dim", _ZERO: "dim"}


def render_oc(screen: Screen, found: Refinement) -> None:
    """The O-C diagram: dates with their errors, and the interval of the event to come."""
    if not found.dates:
        return
    coming = found.next_event
    low = min(row.o_minus_c_d - _size(row, early=True) for row in found.dates)
    high = max(row.o_minus_c_d + _size(row, early=False) for row in found.dates)
    reach = _nice(max(abs(low), abs(high), 1.0))
    labels = [signed_days(reach), "0", signed_days(-reach)]
    width = max(cell_len(label) for label in labels) + 2
    cells = max((screen.width or _PIPE_WIDTH) - width - 2, 10)
    first, last = found.dates[0].bmjd_tdb, max(row.bmjd_tdb for row in found.dates)
    if coming is not None:
        last = coming.median
    room = 0.03 * (last - first)
    axis = TimeAxis(first - room, last + room, cells)
    grid = [[_ZERO if row == _ROWS // 2 else " "] * cells for row in range(_ROWS)]
    if coming is not None and coming.lo68 is not None and coming.hi68 is not None:
        column = axis.cell(coming.median)
        if column is not None:
            _bar(grid, column, coming.lo68 - coming.median, coming.hi68 - coming.median, reach, _BAND)
            grid[_ROWS // 2][column] = _NEXT
    for row in found.dates:
        column = axis.cell(row.bmjd_tdb)
        if column is None:
            continue
        rest = row.o_minus_c_d
        _bar(grid, column, rest - _size(row, early=True), rest + _size(row, early=False), reach, _BAR)
    for row in found.dates:
        column = axis.cell(row.bmjd_tdb)
        if column is not None:
            grid[_place(row.o_minus_c_d, reach)][column] = _ONSET if row.event == "onset" else _MAXIMUM
    screen.wrapped("O−C, days")
    for place, line in enumerate(grid):
        label = {0: labels[0], _ROWS // 2: labels[1], _ROWS - 1: labels[2]}.get(place, "")
        screen.line(
            label.rjust(width - 1), " ┤" if label else " │", *[Span(c, _STYLES.get(c, "")) for c in line]
        )
    rule, years = axis.ticks()
    screen.line(" " * (width + 1), Span(rule, "dim"))
    screen.line(" " * (width + 1), Span(years, "dim"))
    screen.wrapped(_legend(found), hang=2, style="dim")


def _size(row: RefinedDate, *, early: bool) -> float:
    return row.minus_d if early else row.plus_d


def _nice(size: float) -> float:
    """The next of 1, 2, 5, 10, ..."""
    power = 10.0 ** math.floor(math.log10(size))
    return next(power * step for step in (1.0, 2.0, 5.0, 10.0) if power * step >= size)


def _place(days: float, reach: float) -> int:
    """The line of a value; later is higher."""
    place = round((1.0 - days / reach) * 0.5 * (_ROWS - 1))
    return min(max(place, 0), _ROWS - 1)


def _bar(grid: list[list[str]], column: int, low: float, high: float, reach: float, mark: str) -> None:
    for place in range(_place(high, reach), _place(low, reach) + 1):
        grid[place][column] = mark


def _legend(found: Refinement) -> str:
    kinds = {row.event for row in found.dates}
    parts = [f"{_ONSET} onset"] if "onset" in kinds else []
    if "maximum" in kinds:
        parts.append(f"{_MAXIMUM} maximum")
    parts.append(f"{_BAR} error of the date")
    if found.next_event is not None:
        parts.append(f"{_NEXT} the next with its 68 % interval {_BAND}")
    return "  ".join(parts)
