"""Values against time drawn in characters: one strip a band, over a common axis of dates.

Magnitudes grow downward. What is thought of a point is its character, so that it shows without colour;
its error is a bar where there is room for it.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Sequence
from dataclasses import replace
from itertools import groupby

from rich.cells import cell_len, set_cell_size

from campaign.model.curves import Curve, CurveMark, CurvePoint, PointState
from campaign.output.console import Screen, Span
from campaign.output.history import UNIT_NAMES
from campaign.output.timeaxis import TimeAxis

# Character, style and name of each state; the first of them wins a cell that several points share.
MARKS: dict[PointState, tuple[str, str, str]] = {
    "excess": ("◆", "bold yellow", "excess"),
    "quiet": ("●", "green", "quiet"),
    "level unknown": ("○", "", "level unknown"),
    "measured": ("●", "", "measured"),
    "above": ("△", "cyan", "above a limit"),
    "below": ("▽", "cyan", "below a limit"),
    "doubtful": ("?", "dim", "doubtful"),
    "bad": ("×", "dim", "bad"),
    "out of use": ("·", "dim", "out of use"),
}
# A magnitude above its limit is fainter, and lies lower in the drawing.
_MAGNITUDE_LIMITS: dict[PointState, tuple[str, str, str]] = {
    "above": ("▽", "cyan", "too faint to see"),
    "below": ("△", "cyan", "saturated"),
}
_BAR, _CORNER, _LEVEL = "│", "┤", "╌"
_INTERVAL_95, _INTERVAL_68, _MEDIAN = "─", "▒", "█"
_PIPE_WIDTH = 100
_LABEL_CELLS = 9
_STEPS = (1.0, 2.0, 5.0)

Grid = list[list[tuple[str, str]]]


def render_curves(screen: Screen, curves: Sequence[Curve]) -> None:
    """Draw the curves of each system over one axis of dates."""
    if not curves:
        screen.wrapped("No observation with a value passes the filters.")
        return
    for system, group in groupby(curves, key=lambda curve: curve.system):
        _render_system(screen, system, list(group))


def render_marked_curves(
    screen: Screen, curves: Sequence[Curve], marks: Sequence[CurveMark], span: tuple[float, float]
) -> None:
    """Draw curves of one system between two instants (bmjd_tdb), with intervals of time under them."""
    first, last = span
    shown = [
        replace(curve, points=tuple(point for point in curve.points if first <= point.bmjd_tdb <= last))
        for curve in curves
    ]
    shown = [curve for curve in shown if curve.points]
    if not shown:
        return
    axis = TimeAxis(first, last, (screen.width or _PIPE_WIDTH) - _LABEL_CELLS - 1)
    for curve in shown:
        _render_strip(screen, curve, axis, 14 if len(shown) == 1 else 8)
    names = list(dict.fromkeys(mark.name for mark in marks))
    for name in names:
        _render_marks(screen, name, [mark for mark in marks if mark.name == name], axis)
    _render_axis(screen, axis)
    legend = _legend(shown, axis)
    if any(curve.levels for curve in shown):
        legend = f"{_LEVEL} level of the stars  {legend}"
    if names:
        legend += f"; {_INTERVAL_95} 95 %  {_INTERVAL_68} 68 %  {_MEDIAN} median"
    screen.wrapped(legend, hang=2, style="dim")


def _render_marks(screen: Screen, name: str, marks: Sequence[CurveMark], axis: TimeAxis) -> None:
    """One line of intervals; in one cell of several the nearest to a median stays."""
    cells = [" "] * axis.cells
    drawn = [(_INTERVAL_95, mark.low95, mark.high95) for mark in marks]
    drawn += [(_INTERVAL_68, mark.low68, mark.high68) for mark in marks]
    drawn += [(_MEDIAN, mark.median, mark.median) for mark in marks]
    for character, start, end in drawn:
        for place in range(max(axis.place(start), 0), min(axis.place(end), axis.cells - 1) + 1):
            cells[place] = character
    if any(cell != " " for cell in cells):
        label = set_cell_size(screen.spell(name), max(cell_len(name), _LABEL_CELLS - 1))
        screen.line(
            label.rstrip().rjust(_LABEL_CELLS - 1) + " ", Span(_BAR, "dim"), Span("".join(cells), "bold")
        )


def _render_axis(screen: Screen, axis: TimeAxis) -> None:
    rule, dates = axis.fine_ticks()
    screen.line(" " * _LABEL_CELLS, Span("└" + rule, "dim"))
    screen.line(" " * (_LABEL_CELLS + 1), Span(dates, "dim"))


def _render_system(screen: Screen, system: str, curves: list[Curve]) -> None:
    whole = screen.width or _PIPE_WIDTH
    times = [point.bmjd_tdb for curve in curves for point in curve.points]
    first, last = min(times), max(times)
    margin = max(0.01 * (last - first), 0.02)
    axis = TimeAxis(first - margin, last + margin, whole - _LABEL_CELLS - 1)
    rows = 15 if len(curves) == 1 else 10 if len(curves) == 2 else 7
    screen.heading(system)
    for curve in curves:
        _render_strip(screen, curve, axis, rows)
    _render_axis(screen, axis)
    screen.wrapped(_legend(curves, axis), hang=2, style="dim")


def _render_strip(screen: Screen, curve: Curve, axis: TimeAxis, rows: int) -> None:
    unit = UNIT_NAMES.get(curve.unit, curve.unit)
    named = " ".join(part for part in (curve.kind, curve.of) if part)
    count = f"{len(curve.points)} point{'' if len(curve.points) == 1 else 's'}"
    screen.wrapped(f"{named}, {unit}, {count}" + ("" if _bars_fit(curve, axis) else "; errors not drawn"))
    scale = _Scale(curve, rows)
    grid: Grid = [[(" ", "")] * axis.cells for _ in range(rows)]
    for level in curve.levels:
        grid[scale.row(level)] = [(_LEVEL, "dim")] * axis.cells
    if _bars_fit(curve, axis):
        for point in curve.points:
            _draw_bar(grid, point, axis, scale)
    for point in sorted(curve.points, key=lambda point: -list(MARKS).index(point.state)):
        column = axis.cell(point.bmjd_tdb)
        if column is not None:
            character, style, _ = _mark(curve, point.state)
            grid[scale.row(point.value)][column] = (character, style)
    labels = scale.labels()
    for number, cells in enumerate(grid):
        label = labels.get(number, "")
        edge = _CORNER if label else _BAR
        spans = [
            Span("".join(character for character, _ in run), style)
            for style, run in groupby(cells, key=lambda cell: cell[1])
        ]
        shown = set_cell_size(screen.spell(label), max(cell_len(label), _LABEL_CELLS - 1))
        screen.line(shown.rstrip().rjust(_LABEL_CELLS - 1) + " ", Span(edge, "dim"), *spans)


def _mark(curve: Curve, state: PointState) -> tuple[str, str, str]:
    if curve.downward and state in _MAGNITUDE_LIMITS:
        return _MAGNITUDE_LIMITS[state]
    return MARKS[state]


def _bars_fit(curve: Curve, axis: TimeAxis) -> bool:
    """Whether most points have a column to themselves."""
    columns = Counter(axis.cell(point.bmjd_tdb) for point in curve.points)
    return len(curve.points) <= 1.5 * len(columns)


def _draw_bar(grid: Grid, point: CurvePoint, axis: TimeAxis, scale: _Scale) -> None:
    column = axis.cell(point.bmjd_tdb)
    if column is None or point.minus is None or point.plus is None:
        return
    ends = sorted(scale.row(value) for value in (point.value - point.minus, point.value + point.plus))
    for row in range(ends[0], ends[1] + 1):
        grid[row][column] = (_BAR, "dim")


class _Scale:
    """Rows of a strip for values, with round numbers beside it."""

    def __init__(self, curve: Curve, rows: int) -> None:
        values = [*(point.value for point in curve.points), *curve.levels]
        low, high = min(values), max(values)
        # Errors may widen the strip, but one large error does not flatten all the rest.
        spread = (high - low) or max(abs(high) * 1e-3, _largest_error(curve), 1e-9)
        reach = [
            end
            for point in curve.points
            if point.minus is not None and point.plus is not None
            for end in (point.value - point.minus, point.value + point.plus)
        ]
        self._low = max(min([low, *reach]), low - 0.5 * spread)
        self._high = min(max([high, *reach]), high + 0.5 * spread)
        if self._high <= self._low:
            self._low, self._high = low - 0.5 * spread, high + 0.5 * spread
        self._rows = rows
        self._downward = curve.downward

    def row(self, value: float) -> int:
        """The row of a value; what lies outside is drawn at the edge."""
        share = (value - self._low) / (self._high - self._low)
        if not self._downward:
            share = 1.0 - share
        return min(max(math.floor(share * self._rows), 0), self._rows - 1)

    def labels(self) -> dict[int, str]:
        """Round numbers by the row that holds them."""
        wanted = (self._high - self._low) * 2.5 / self._rows
        power = 10.0 ** math.floor(math.log10(wanted))
        step = next((power * each for each in _STEPS if power * each >= wanted), 10.0 * power)
        places = max(0, -math.floor(math.log10(step) + 1e-9))
        number = math.ceil(self._low / step - 1e-9)
        found: dict[int, str] = {}
        while (value := number * step) <= self._high * (1.0 + 1e-12) + 1e-300:
            found.setdefault(self.row(value), _label(value, places))
            number += 1
        return found


def _label(value: float, places: int) -> str:
    text = f"{value + 0.0:.{places}f}"
    for digits in (2, 1, 0):
        if len(text) > _LABEL_CELLS - 1:
            text = f"{value:.{digits}e}"
    return "0" if float(text) == 0.0 else text


def _largest_error(curve: Curve) -> float:
    return max((max(point.minus or 0.0, point.plus or 0.0) for point in curve.points), default=0.0)


def _legend(curves: Sequence[Curve], axis: TimeAxis) -> str:
    seen: dict[str, str] = {}
    for curve in curves:
        for point in curve.points:
            character, _, name = _mark(curve, point.state)
            seen.setdefault(name, character)
    parts = [f"{character} {name}" for name, character in seen.items()]
    if any(_bars_fit(curve, axis) for curve in curves):
        parts.append(f"{_BAR} error")
    down = "magnitudes grow downward; " if any(curve.downward for curve in curves) else ""
    return f"{'  '.join(parts)}; {down}a step is {axis.step_d:.3g} d, dates are of the barycentre"
