"""Values against time, each with what is thought of it: what a drawing shows."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

PointState = Literal[
    "quiet", "excess", "level unknown", "measured", "above", "below", "doubtful", "bad", "out of use"
]


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """One observation in a drawing; errors are sizes, None when unknown.

    Photometry is ``quiet``, in ``excess`` or of ``level unknown``; other values are ``measured``. A limit
    is ``above`` or ``below`` its bound, in its own unit: a magnitude ``above`` is too faint.
    """

    bmjd_tdb: float
    value: float
    minus: float | None
    plus: float | None
    state: PointState


@dataclass(frozen=True, slots=True)
class Curve:
    """Values of one kind in one unit; ``downward`` where larger values are drawn lower, as magnitudes.

    ``levels`` are values to be drawn as lines, as that of the stars.
    """

    system: str
    kind: str
    of: str
    unit: str
    downward: bool
    points: tuple[CurvePoint, ...]
    levels: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True)
class CurveMark:
    """An interval of time drawn under a curve, all ``bmjd_tdb``; marks of one ``name`` share a line."""

    name: str
    low95: float
    low68: float
    median: float
    high68: float
    high95: float
