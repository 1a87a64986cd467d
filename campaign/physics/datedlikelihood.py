"""How probable a dated event is, had it truly happened at some instant: symmetric, lopsided or bracketed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

_LEAST_D = 1e-9
_LEAST_DENSITY = 1e-300


@dataclass(frozen=True, slots=True, eq=False)
class DatedEvents:
    """Dates in days, one entry an event.

    ``minus_d`` and ``plus_d`` are one-sigma errors to either side. Where ``bracketed``, the event lies
    between ``date_d - minus_d`` and ``date_d + plus_d``, anywhere with equal right.
    """

    date_d: FloatArray
    minus_d: FloatArray
    plus_d: FloatArray
    bracketed: BoolArray

    @property
    def are_normal(self) -> bool:
        """Whether every date is a plain normal one."""
        return not bool(self.bracketed.any()) and bool(np.all(self.minus_d == self.plus_d))

    def moments(self) -> tuple[FloatArray, FloatArray]:
        """Mean and standard deviation of each true date, days.

        A two-piece normal with the stated value as median has its mean off by (plus - minus)/sqrt(2 pi).
        """
        apart = self.plus_d - self.minus_d
        mean = np.where(self.bracketed, self.date_d + 0.5 * apart, self.date_d + apart / np.sqrt(2.0 * np.pi))
        two_piece = 0.5 * (self.minus_d**2 + self.plus_d**2) - apart**2 / (2.0 * np.pi)
        bracket = (self.minus_d + self.plus_d) ** 2 / 12.0
        return mean, np.sqrt(np.where(self.bracketed, bracket, two_piece))


def date_log_likelihood(events: DatedEvents, expected_d: FloatArray, scatter_d: FloatArray) -> FloatArray:
    """ln of the likelihood of each date, its event scattering about an expected instant.

    Parameters
    ----------
    events : DatedEvents
        n dates, days.
    expected_d : ndarray, shape (..., n)
        Where the line puts them, days.
    scatter_d : ndarray, broadcasts with ``expected_d``
        One-sigma deviation of events from the line, days, >= 0.

    Returns
    -------
    ndarray, shape (..., n)
        Natural logarithm (of 1/days). A bracket counts as its share inside, over its width.

    Notes
    -----
    Accuracy: exact to 1e-9; below 1e-300 a floor of that size stands.

    Source: convolution of a normal with a two-piece normal (half of the probability on each side of the
    stated value) or with a uniform bracket; elementary.

    Examples
    --------
    >>> one = DatedEvents(np.array([100.0]), np.array([3.0]), np.array([3.0]), np.array([False]))
    >>> round(float(np.exp(date_log_likelihood(one, np.array([100.0]), np.array(4.0)))[0]), 6)
    0.079788
    """
    from scipy.special import ndtr

    minus, plus = np.maximum(events.minus_d, _LEAST_D), np.maximum(events.plus_d, _LEAST_D)
    scatter = np.maximum(scatter_d, _LEAST_D)
    # From the stated date to where the line has it.
    offset = expected_d - events.date_d
    bracket = (ndtr((plus - offset) / scatter) - ndtr((-minus - offset) / scatter)) / (minus + plus)
    below = _half(-offset, minus, scatter)
    above = _half(offset, plus, scatter)
    density = np.where(events.bracketed, bracket, below + above)
    value: FloatArray = np.log(np.maximum(density, _LEAST_DENSITY))
    return value


def _half(toward: FloatArray, size: FloatArray, scatter: FloatArray) -> FloatArray:
    """Half a normal of ``size``, convolved with the scatter, at ``toward`` (positive on its own side)."""
    from scipy.special import ndtr

    total = np.hypot(size, scatter)
    normal = np.exp(-0.5 * (toward / total) ** 2) / (np.sqrt(2.0 * np.pi) * total)
    value: FloatArray = normal * ndtr(toward * size / (total * scatter))
    return value
