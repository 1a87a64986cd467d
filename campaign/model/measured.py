"""Values with errors, limits and ranges, as people publish them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal


@dataclass(frozen=True, slots=True)
class Measured:
    """A value with its one-sigma errors, in the unit that the holder's name states.

    ``minus`` and ``plus`` are positive sizes. ``None`` means that the error is unknown, which is
    never the same as zero; zero means that the value was declared exact.
    """

    value: float
    minus: float | None = None
    plus: float | None = None

    @property
    def error_known(self) -> bool:
        return self.minus is not None and self.plus is not None

    @property
    def is_symmetric(self) -> bool:
        return self.minus == self.plus

    @property
    def sigma(self) -> float | None:
        """Standard deviation of the two-piece normal that has ``value`` as its median."""
        if self.minus is None or self.plus is None:
            return None
        mean_square = 0.5 * (self.minus**2 + self.plus**2)
        return math.sqrt(mean_square - (self.plus - self.minus) ** 2 / (2.0 * math.pi))

    def scaled(self, factor: float) -> Measured:
        """The same value in another unit; ``factor`` is positive."""
        return Measured(
            self.value * factor,
            None if self.minus is None else self.minus * factor,
            None if self.plus is None else self.plus * factor,
        )


@dataclass(frozen=True, slots=True)
class Limit:
    """A bound: the true value lies above or below ``bound`` at ``limit_sigma``."""

    bound: float
    side: Literal["above", "below"]
    limit_sigma: float = 3.0

    def scaled(self, factor: float) -> Limit:
        return Limit(self.bound * factor, self.side, self.limit_sigma)


@dataclass(frozen=True, slots=True)
class Range:
    """The true value lies between ``low`` and ``high``, anywhere with equal right."""

    low: float
    high: float

    def scaled(self, factor: float) -> Range:
        return Range(self.low * factor, self.high * factor)


@dataclass(frozen=True, slots=True)
class Covariance:
    """Covariance of solution elements; ``names`` are field names of ``Solution`` (``epoch`` for T0).

    ``matrix`` is row by row, in the units of those fields (days for ``epoch``).
    """

    names: tuple[str, ...]
    matrix: tuple[tuple[float, ...], ...]

    def between(self, first: str, second: str) -> float | None:
        """Covariance of two elements, or None where the matrix does not hold them."""
        if first in self.names and second in self.names:
            return self.matrix[self.names.index(first)][self.names.index(second)]
        return None
