"""Instants: as somebody typed them, and as the catalogue keeps them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Scale = Literal["utc", "tt", "tdb", "tai", "ut"]
Place = Literal["observatory", "geocentre", "heliocentre", "barycentre"]


@dataclass(frozen=True, slots=True)
class TypedInstant:
    """An instant as read from text, in its own scale and at its own place.

    ``mjd_day + mjd_fraction`` is the modified Julian date in ``scale`` (for ``utc`` the quasi-MJD of
    erfa). ``minus_d`` and ``plus_d`` are one-sigma errors in days, None when unknown. ``width_d`` is
    the width of the interval that a calendar day, night, month or year stands for, otherwise 0.
    ``precision`` says what was given: second, day, night, month, year, decimal year, Julian epoch,
    Besselian epoch, Julian date.
    """

    mjd_day: float
    mjd_fraction: float
    scale: Scale
    place: Place
    minus_d: float | None
    plus_d: float | None
    precision: str
    text: str
    width_d: float = 0.0

    @property
    def mjd(self) -> float:
        return self.mjd_day + self.mjd_fraction


@dataclass(frozen=True, slots=True)
class Moment:
    """An instant on the catalogue's one axis: MJD in TDB at the solar-system barycentre.

    ``text``, ``scale`` and ``place`` keep what was typed, so that the conversion can be repeated.
    """

    bmjd_tdb: float
    minus_d: float | None = None
    plus_d: float | None = None
    text: str = ""
    scale: Scale = "tdb"
    place: Place = "barycentre"
