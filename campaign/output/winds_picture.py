"""The contact surface drawn to scale, and strips through the orbit."""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Callable, Sequence

from campaign.model.winds import ProfilePoint, WindsResult
from campaign.output.console import Screen, Span

# A cell is about twice as high as it is wide.
_CELLS_PER_D, _LINES_PER_D = 18, 9
_LEFT_CELLS, _WIDEST, _HALF_LINES = 3, 64, 8
_CONTACT, _WITHIN, _STRONGER, _WEAKER = "█", "░", "●", "○"

_CHI_SHADES = ((0.3, "█"), (1.0, "▓"), (3.0, "▒"), (10.0, "░"), (math.inf, "·"))
_SIGHT_SHADES = {"cavity": "█", "rim": "▒", "stronger wind": "·"}
_PIPE_WIDTH = 100
_LABEL = 14


def render_surface(screen: Screen, result: WindsResult) -> None:
    """Draw the contact surface with the stars, to scale, with its 68 % band."""
    width = min(screen.width or _WIDEST, _WIDEST)
    if width < 2 * _CELLS_PER_D:
        return
    edges = _Edges(result)
    for line in range(-_HALF_LINES, _HALF_LINES + 1):
        marks = [_mark(edges, cell, line) for cell in range(width)]
        if line == 0:
            marks[_LEFT_CELLS], marks[_LEFT_CELLS + _CELLS_PER_D] = _STRONGER, _WEAKER
        screen.line("".join(marks))
    band = f", {_WITHIN} its 68 % band" if edges.has_band else ""
    screen.wrapped(
        f"{_STRONGER} star {result.stronger}, {_WEAKER} star {result.weaker}, {_CONTACT} contact surface"
        f"{band}; to scale, {_CELLS_PER_D} cells are the separation D. The shocks reach farther out.",
        hang=2,
        style="dim",
    )


class _Edges:
    """Distance of the surface from the weaker star by angle: nominal, and the ends of the 68 % band."""

    def __init__(self, result: WindsResult) -> None:
        self.angles = [math.radians(point.angle_deg) for point in result.surface]
        distances = [point.from_weaker_over_d for point in result.surface]
        self.middle = [_far(d.value) for d in distances]
        self.low = [_far(d.lo68) for d in distances]
        self.high = [_far(d.hi68) for d in distances]
        self.has_band = distances[0].lo68 is not None and distances[0].lo68 != distances[0].hi68

    def at(self, table: Sequence[float], angle: float) -> float:
        """Between the points of the table; beyond its end the surface is out of reach."""
        place = bisect_left(self.angles, angle)
        if place >= len(self.angles):
            return math.inf
        if place == 0 or math.isinf(table[place]):
            return table[place]
        before, after = self.angles[place - 1], self.angles[place]
        # The surface runs off towards its asymptote: its inverse is the smoother curve.
        share = (angle - before) / (after - before)
        return 1.0 / ((1.0 - share) / table[place - 1] + share / table[place])


def _far(distance: float | None) -> float:
    return math.inf if distance is None else distance


def _mark(edges: _Edges, cell: int, line: int) -> str:
    """What stands in a cell: the surface where it passes between this cell and a neighbour."""
    away = abs(line)
    here = _inside(edges, edges.middle, cell, away)
    if any(_inside(edges, edges.middle, cell + x, away + y) != here for x, y in ((1, 0), (0, 1))):
        return _CONTACT
    if edges.has_band:
        low, high = (_inside(edges, table, cell, line) for table in (edges.low, edges.high))
        if low != high:
            return _WITHIN
    return " "


def _inside(edges: _Edges, table: Sequence[float], cell: int, line: int) -> bool:
    """Whether the middle of a cell lies in the weaker wind."""
    x = (cell - _LEFT_CELLS) / _CELLS_PER_D - 1.0
    y = abs(line) / _LINES_PER_D
    radius = math.hypot(x, y)
    return radius < edges.at(table, math.atan2(y, -x))


def render_orbit(screen: Screen, result: WindsResult) -> None:
    """Write one strip a quantity over the orbit, with periastron in the middle."""
    strips: list[tuple[str, Callable[[ProfilePoint], str]]] = []
    for star in ("A", "B"):
        name = f"chi_{star.lower()}"
        if any(getattr(point, name) is not None for point in result.profile):
            strips.append((f"chi of star {star}", lambda point, n=name: _chi_shade(getattr(point, n))))  # type: ignore[misc]
    if any(point.seen_through is not None for point in result.profile):
        strips.append(("line of sight", lambda point: _SIGHT_SHADES.get(point.seen_through or "", " ")))
    cells = (screen.width or _PIPE_WIDTH) - _LABEL - 1
    if not strips or cells < 20:
        return
    screen.line("")
    points = [_point(result.profile, (i + 0.5) / cells) for i in range(cells)]
    for label, shade in strips:
        screen.line(f"{label:<{_LABEL}} ", "".join(shade(point) for point in points))
    rule, labels = _phase_axis(cells)
    screen.line(" " * (_LABEL + 1), Span(rule, "dim"))
    screen.line(f"{'phase':<{_LABEL}} ", Span(labels, "dim"))
    legend = []
    if len(strips) > 1 or strips[0][0].startswith("chi"):
        legend.append("chi: █ <0.3  ▓ <1 (cools)  ▒ <3  ░ <10  · more (stays hot)")
    if strips[-1][0] == "line of sight":
        legend.append("line of sight: █ cavity  ▒ rim  · stronger wind")
    screen.wrapped("; ".join(legend) + "; at constant speed, nominal.", hang=2, style="dim")


def _chi_shade(chi: float | None) -> str:
    if chi is None:
        return " "
    return next(mark for bound, mark in _CHI_SHADES if chi < bound or math.isinf(bound))


def _point(profile: Sequence[ProfilePoint], share: float) -> ProfilePoint:
    return profile[min(len(profile) - 1, round(share * (len(profile) - 1)))]


def _phase_axis(cells: int) -> tuple[str, str]:
    rule, labels = ["─"] * cells, [" "] * cells
    ticks = ((0.0, "−0.5"), (0.25, "−0.25"), (0.5, "0"), (0.75, "+0.25"), (1.0, "+0.5"))
    for share, text in ticks:
        place = min(cells - 1, int(share * cells))
        rule[place] = "┬"
        start = min(max(0, place - len(text) // 2), cells - len(text))
        if cells >= 40 or share in (0.0, 0.5, 1.0):
            labels[start : start + len(text)] = text
    return "".join(rule), "".join(labels)
