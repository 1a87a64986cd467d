"""How far universal time, by which clocks went before 1960, lags behind uniform time."""

from __future__ import annotations

import numpy as np
from numpy.polynomial import polynomial
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# (first year, zero year, years per unit, coefficients in seconds from the constant up).
_PIECES: tuple[tuple[float, float, float, tuple[float, ...]], ...] = (
    (-500.0, 0.0, 100.0, (10583.6, -1014.41, 33.78311, -5.952053, -0.1798452, 0.022174192, 0.0090316521)),
    (500.0, 1000.0, 100.0, (1574.2, -556.01, 71.23472, 0.319781, -0.8503463, -0.005050998, 0.0083572073)),
    (1600.0, 1600.0, 1.0, (120.0, -0.9808, -0.01532, 1.0 / 7129.0)),
    (1700.0, 1700.0, 1.0, (8.83, 0.1603, -0.0059285, 0.00013336, -1.0 / 1_174_000.0)),
    (
        1800.0,
        1800.0,
        1.0,
        (13.72, -0.332447, 0.0068612, 0.0041116, -0.00037436, 0.0000121272, -0.0000001699, 0.000000000875),
    ),
    (1860.0, 1860.0, 1.0, (7.62, 0.5737, -0.251754, 0.01680668, -0.0004473624, 1.0 / 233_174.0)),
    (1900.0, 1900.0, 1.0, (-2.79, 1.494119, -0.0598939, 0.0061966, -0.000197)),
    (1920.0, 1920.0, 1.0, (21.20, 0.84493, -0.076100, 0.0020936)),
    (1941.0, 1950.0, 1.0, (29.07, 0.407, -1.0 / 233.0, 1.0 / 2547.0)),
)
_LAST_YEAR = 1961.0


def delta_t_s(year: ArrayLike) -> FloatArray:
    """TT minus UT, as read from eclipses, occultations and telescopic timings.

    Parameters
    ----------
    year : array_like
        Decimal year, yr, -500 to 1961; values beyond are taken at the nearer end.

    Returns
    -------
    ndarray
        TT - UT, s.

    Notes
    -----
    Accuracy: as far as another reconstruction (Stephenson, Morrison & Hohenkerk 2016) differs: 1.2 s since
    1900, 6 s since 1700, 20 s since 1600, 4 min since the year 1.

    Source: Espenak & Meeus 2006, Five Millennium Canon of Solar Eclipses, polynomial expressions
    (coefficients from memory; the tests compare them with another reconstruction).

    Examples
    --------
    >>> round(float(delta_t_s(1950.0)), 2)
    29.07
    """
    y = np.clip(np.asarray(year, dtype=np.float64), _PIECES[0][0], _LAST_YEAR)
    result = np.full(y.shape, np.nan)
    for first, zero, unit, coefficients in _PIECES:
        within = y >= first
        if bool(within.any()):
            result = np.where(within, polynomial.polyval((y - zero) / unit, coefficients), result)
    return result[()]
