"""Dated changes of a wind collision: cooling parameters that cross 1, cones entered and left."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.model.systems import StarName
from campaign.model.winds import Law, WindEvent, Zone
from campaign.physics.timescales import utc_iso
from campaign.studies.winds_cooling import cooling_needs, half_window, laws_of
from campaign.studies.winds_draws import STARS, Propagation, WindDraws
from campaign.studies.winds_sightline import flare_needs, front_anomaly_rad, zone_phases

FloatArray = NDArray[np.float64]

MOST_EVENTS = 200


@dataclass(frozen=True, slots=True)
class _Change:
    """What recurs at a phase, and what that phase rests on besides the dates of periastron."""

    name: str
    phases: Callable[[WindDraws], FloatArray]
    needs: tuple[str, ...]


def events(of: Propagation, start: float, end: float) -> tuple[WindEvent, ...]:
    """Dated changes between two instants: cooling parameters that cross 1, cones entered and left.

    Parameters
    ----------
    of : Propagation
        Draws of winds and orbit; periastron must be dated.
    start, end : float
        ``bmjd_tdb``.

    Returns
    -------
    tuple of WindEvent
        By date, at most ``MOST_EVENTS``. Changes that most draws do not have are left out.

    Notes
    -----
    Accuracy: as the windows themselves. Source: ``half_window`` and ``zone_phases``.
    """
    found = [event for change in _changes(of) for event in _dated(of, change, start, end)]
    found.sort(key=lambda each: _middle(each) or 0.0)
    return tuple(found[:MOST_EVENTS])


def _middle(event: WindEvent) -> float | None:
    return event.bmjd_tdb.median if event.bmjd_tdb.median is not None else event.bmjd_tdb.value


def _changes(of: Propagation) -> Iterator[_Change]:
    inputs = of.inputs
    if inputs.size and inputs.has("eccentricity"):
        for star in STARS:
            for law in laws_of(inputs, star):
                yield from _crossings(of, star, law)
    if inputs.has("inclination_deg", "omega_b_deg", "eccentricity"):
        yield from _borders(of, "rim", flare_needs(inputs))
        yield from _borders(of, "cavity", inputs.momentum_needs())


def _crossings(of: Propagation, star: StarName, law: Law) -> Iterator[_Change]:
    needs = (*of.inputs.size, "eccentricity", *cooling_needs(of.inputs, star, law))
    with_law = "" if law == "constant" else " (velocity law)"

    def crossing(drawn: WindDraws) -> FloatArray:
        half = half_window(drawn, star, law)
        return np.where(half < 0.5, half, np.nan)

    yield _Change(f"chi of star {star} falls below 1{with_law}", lambda d: -crossing(d), needs)
    yield _Change(f"chi of star {star} rises above 1{with_law}", crossing, needs)


def _borders(of: Propagation, zone: Zone, cone: tuple[str, ...]) -> Iterator[_Change]:
    needs = ("eccentricity", "inclination_deg", "omega_b_deg", *cone)
    reference = front_anomaly_rad(of)
    outer = "the rim" if zone == "rim" else "the cavity"
    yield _Change(f"line of sight enters {outer}", lambda d: zone_phases(d, zone, reference)[0], needs)
    yield _Change(f"line of sight leaves {outer}", lambda d: zone_phases(d, zone, reference)[1], needs)


def _dated(of: Propagation, change: _Change, start: float, end: float) -> Iterator[WindEvent]:
    """The change in every cycle in which its date falls between two instants."""
    inputs = of.inputs
    assert inputs.row is not None
    needs = tuple(dict.fromkeys((*inputs.row.events["periastron"], *change.needs)))
    stated, drawn = float(change.phases(of.nominal)[0]), change.phases(of.all)
    known = all(inputs.measured(name).error_known for name in needs)
    share = float(np.mean(np.isfinite(drawn))) if known else None
    if share is None:
        if not np.isfinite(stated):
            return
    elif share < 0.5:
        return
    middle = stated if np.isfinite(stated) else float(np.nanmedian(drawn))
    period, periastron = float(of.nominal.input("period_d")[0]), float(of.nominal.periastron[0])
    first = int(np.ceil((start - periastron) / period - middle))
    last = min(int(np.floor((end - periastron) / period - middle)), first + MOST_EVENTS - 1)
    # A change before periastron k belongs to cycle k, up to half a period.
    shift = int(np.floor(middle + 0.5))
    for turn in range(first, last + 1):
        date = of.one(lambda d, k=turn: d.periastron + (k + change.phases(d)) * d.input("period_d"), needs)  # type: ignore[misc]
        centre = date.median if date.median is not None else date.value
        iso = None if centre is None else utc_iso(np.array([centre]))[0]
        cycle = turn + shift + inputs.row.epoch_cycle
        yield WindEvent(change.name, cycle, middle - shift, date, iso, share)
