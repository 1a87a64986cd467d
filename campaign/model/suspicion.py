"""An unexplained excess: since when, how strong, and how to decide what it is."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Suspicion:
    """One system's suspected onset.

    ``since_*`` is the first suspicious point, ``latest_*`` the last one; ``points`` how many there are,
    ``bands`` where, ``excess_sigma`` the strongest of them. ``confirm`` and ``reject`` are command lines.
    """

    system: str
    since_bmjd_tdb: float
    since_utc: str
    latest_bmjd_tdb: float
    latest_utc: str
    points: int
    bands: tuple[str, ...]
    excess_sigma: float
    confirm: str
    reject: str
