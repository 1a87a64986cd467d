"""Which photometric systems the magnitudes of each band of a system are in."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class BandUse:
    """How many magnitudes of a system are in one band of one photometric system; None: none was stated."""

    system: str
    band: str
    photometric_system: str | None
    points: int


@dataclass(frozen=True, slots=True)
class MixedBand:
    """A band of a system whose magnitudes cannot be compared as they stand.

    ``photometric_systems`` are those stated, in the order of the alphabet; ``unknown_points`` is how many
    of the ``points`` magnitudes state none.
    """

    system: str
    band: str
    photometric_systems: tuple[str, ...]
    unknown_points: int
    points: int
