"""A number that follows from uncertain ones, with what their errors make of it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Propagated:
    """A result in the unit that the holder's name states.

    ``value`` follows from the inputs as stated, the rest from draws within their errors: median, standard
    deviation and equal-tailed intervals of the draws in which the quantity exists, whose share is
    ``probability``. Where an error that is needed is unknown, ``unknown_errors`` names it and only ``value``
    is given. ``dominant`` is the input whose error alone spreads the result most, ``dominant_share`` its
    part of the sum of such spreads squared. ``sigma`` can be ruled by a long tail, as where a divisor may be
    near zero; the intervals are not. None is what is not known or does not exist.
    """

    value: float | None
    median: float | None = None
    sigma: float | None = None
    lo68: float | None = None
    hi68: float | None = None
    lo95: float | None = None
    hi95: float | None = None
    probability: float | None = None
    dominant: str | None = None
    dominant_share: float | None = None
    unknown_errors: tuple[str, ...] = ()
