"""Light curves as columns, for studies that look at many points at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, eq=False)
class PhotometryArrays:
    """One system's photometry, in order of time; every column has one entry a point.

    ``minus_d``/``plus_d`` and ``mag_minus``/``mag_plus`` are NaN where the error is unknown.
    ``limit_side`` is 0 for a measurement, +1 for 'fainter than ``mag``', -1 for 'brighter than ``mag``'
    (saturated). ``site_id`` is -1 where no site was given; ``band``, ``source``, ``quality`` and
    ``photometric_system`` (empty where none was stated) are arrays of text.
    """

    id: NDArray[np.int64]
    bmjd_tdb: NDArray[np.float64]
    minus_d: NDArray[np.float64]
    plus_d: NDArray[np.float64]
    mag: NDArray[np.float64]
    mag_minus: NDArray[np.float64]
    mag_plus: NDArray[np.float64]
    limit_side: NDArray[np.int8]
    limit_sigma: NDArray[np.float64]
    band: NDArray[np.str_]
    source: NDArray[np.str_]
    site_id: NDArray[np.int64]
    quality: NDArray[np.str_]
    photometric_system: NDArray[np.str_]
