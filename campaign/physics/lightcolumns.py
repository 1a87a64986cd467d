"""A light curve as columns of numbers: what the dating of episodes works on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]

# ln flux per magnitude (Pogson 1856, MNRAS 17, 12).
LN_PER_MAG = float(0.4 * np.log(10.0))


@dataclass(frozen=True, slots=True, eq=False)
class LightColumns:
    """Photometry in order of time; one entry a point, errors NaN where unknown.

    ``group`` numbers what shares a stellar level: one band of one photometric system of one source and
    site. ``group_band`` is the band of each group. ``limit_side`` is 0 measured, +1 fainter than ``mag``,
    -1 brighter than ``mag``.
    """

    bmjd_tdb: FloatArray
    time_sigma_d: FloatArray
    mag: FloatArray
    error_mag: FloatArray
    limit_side: NDArray[np.int8]
    limit_sigma: FloatArray
    group: IntArray
    group_band: IntArray

    @property
    def band(self) -> IntArray:
        """Band number of each point."""
        return self.group_band[self.group] if self.group_band.size else self.group

    @property
    def measured(self) -> BoolArray:
        """Which points are measurements, not limits."""
        return np.asarray(self.limit_side == 0)
