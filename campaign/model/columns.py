"""Many observations at once, column by column."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, eq=False)
class Words:
    """A column of few different words: ``codes`` says which of ``words`` each row has, -1 none."""

    words: Sequence[str]
    codes: NDArray[np.int32]


@dataclass(frozen=True, slots=True, eq=False)
class ObservationColumns:
    """Observations of one kind; columns bear the names of those of the catalogue.

    ``same`` holds what is alike in all rows; ``numbers`` are floats (NaN: unknown), ``wholes`` whole numbers
    of zero and more (-1: unknown), ``words`` few different words, ``texts`` one text a row. Sources are
    words in the column "source".
    """

    size: int
    same: Mapping[str, Any]
    numbers: Mapping[str, NDArray[np.float64]]
    wholes: Mapping[str, NDArray[np.int64]] = field(default_factory=dict)
    words: Mapping[str, Words] = field(default_factory=dict)
    texts: Mapping[str, Sequence[str]] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, eq=False)
class KnownRows:
    """Observations of one system and kind that are in use, in order of time."""

    id: NDArray[np.int64]
    bmjd_tdb: NDArray[np.float64]
    value: NDArray[np.float64]
    value_minus: NDArray[np.float64]
    value_plus: NDArray[np.float64]
    position_angle_deg: NDArray[np.float64]
    limit_side: Sequence[str | None]
    band: Sequence[str | None]
    photometric_system: Sequence[str | None]
    site_id: Sequence[int | None]
    operation_id: Sequence[int]
    other: Sequence[tuple[Any, ...]]
    sameness: Sequence[str | None]
