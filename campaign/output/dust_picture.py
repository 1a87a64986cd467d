"""Pictures of dust in text: where it can be, how much of a band is dust, and how its mass changes."""

from __future__ import annotations

import math
from collections.abc import Sequence

from campaign.model.dust import DustPhysics
from campaign.output.console import Screen, Span

_LEAST_CELLS, _MOST_CELLS = 30, 96
_LABEL = 10


def render_zones(screen: Screen, physics: DustPhysics) -> None:
    """A ruler of distances, even in the logarithm: gas, where carbon condenses, and dust beyond."""
    marks = sorted((grain.distance_au, grain.temperature_k.value or 0.0) for grain in physics.grains)
    cells = min(_MOST_CELLS, (screen.width or 80) - _LABEL - 1)
    low, high = min(marks, default=(0.0,))[0], max(marks, default=(0.0,))[0]
    if not high > low or not physics.condensation or cells < _LEAST_CELLS:
        return
    inner = min(row.radius_au.value or low for row in physics.condensation)
    outer = max(row.radius_au.value or high for row in physics.condensation)

    def place(distance_au: float) -> int:
        share = math.log(distance_au / low) / math.log(high / low)
        return round(min(max(share, 0.0), 1.0) * (cells - 1))

    first, last = place(inner), place(outer)
    inside = inner <= high and outer >= low
    zones = ["·" if cell < first else "▓" if cell <= last and inside else "░" for cell in range(cells)]
    screen.line(f"{'au':<{_LABEL}}", _labels([(place(r), f"{r:.4g}") for r, _ in marks], cells))
    screen.line(
        f"{'':<{_LABEL}}",
        Span("".join(zones[:first]), "dim"),
        Span("".join(zones[first : last + 1]), "bold yellow"),
        "".join(zones[last + 1 :]),
    )
    warm = [(place(r), f"{t:.0f}") for r, t in marks]
    screen.line(f"{'grains, K':<{_LABEL}}", _labels(warm, cells))
    span = f"{inner:.3g} to {outer:.3g} au" if outer > inner else f"{inner:.3g} au"
    screen.wrapped(f"· too hot for grains  ▓ carbon condenses ({span})  ░ dust", style="dim")


def _labels(marks: Sequence[tuple[int, str]], cells: int) -> str:
    """Numbers at their places; one that would touch the one before it is left out."""
    line, free = [" "] * cells, 0
    for place, text in marks:
        start = min(max(place - len(text) // 2, 0), cells - len(text))
        if start >= free:
            line[start : start + len(text)] = text
            free = start + len(text) + 1
    return "".join(line).rstrip()


def share_bar(dust: float, stars: float, cells: int = 10) -> str:
    """The light of a band: dust as full blocks, the stars as light ones; anything seen shows one block."""
    whole = max(dust, 0.0) + stars
    if whole <= 0.0:
        return ""
    full = round(cells * max(dust, 0.0) / whole)
    full = min(max(full, 1 if dust > 0.0 else 0), cells)
    return "█" * full + "░" * (cells - full)


def amount_bar(value: float, largest: float, cells: int = 16) -> str:
    """A bar in half cells against the largest of its kind."""
    if not largest > 0.0 or not value > 0.0:
        return ""
    halves = math.ceil(2 * cells * min(value / largest, 1.0))
    return "█" * (halves // 2) + "▌" * (halves % 2)
