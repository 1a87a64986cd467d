"""How probable the observations are, had an episode begun at a given date: what a quiet point excludes.

A slow or weak rise hides among quiet points for a while. How fast and how high it rises, where the stars'
level is and how sources differ are common to all points: the chance of all of them is averaged over those,
and is no product of the points' own chances.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from campaign.errors import InputRefused
from campaign.physics.censored import limit_log_likelihood
from campaign.physics.lightcolumns import BoolArray, FloatArray
from campaign.physics.onsetfit import BandPoints
from campaign.physics.riseshapes import RISE_WEIGHTS, rise_shapes

# Numbers worked on at a time.
_BLOCK = 160_000


@dataclass(frozen=True, slots=True, eq=False)
class ExpectedEpisodes:
    """What an episode may be like: joint draws, one entry each.

    ``rise_d`` from onset to top and ``decline_d``, the e-folding time after it; ``amplitude`` of the top in
    units of the stars' flux, one column a band. ``later_d`` is by how much each band's top is later.
    """

    rise_d: FloatArray
    decline_d: FloatArray
    amplitude: FloatArray
    later_d: FloatArray


def quiet_log_likelihood(
    bands: Sequence[BandPoints], onsets: FloatArray, expected: ExpectedEpisodes
) -> FloatArray:
    """ln of the chance of all points for each onset, over their chance without any episode.

    Parameters
    ----------
    bands : sequence of BandPoints
        Points of each band, quiet or not; days, units of the stars' flux (dimensionless).
    onsets : ndarray, shape (m,)
        Dates of onset to be judged, ``bmjd_tdb``, days.
    expected : ExpectedEpisodes
        Draws of what an episode is like; ``amplitude`` and ``later_d`` have a column for each band.

    Returns
    -------
    ndarray, shape (m,)
        Natural logarithm (dimensionless); 0 where no point tells, well below where quiet points exclude.

    Raises
    ------
    InputRefused
        If the columns of the draws do not fit the bands.

    Notes
    -----
    Accuracy: an average over the draws and the eight shapes of ``campaign.physics.riseshapes``; its error is
    that of so many draws. Errors of levels are marginalised for each group of points, exactly.

    Source: definition of a marginal likelihood; normal errors with a common term by Sherman & Morrison (1950,
    Ann. Math. Stat. 21, 124); limits as in ``campaign.physics.censored``.

    Examples
    --------
    >>> t = np.array([0.0, 10.0, 20.0])
    >>> band = BandPoints(t, 0.0 * t, 0.0 * t, np.full(3, 0.05), np.zeros(3, int), np.ones(3),
    ...     np.zeros(3, int), np.array([0.01]), 20.0, 20.0)
    >>> one = ExpectedEpisodes(np.array([50.0]), np.array([200.0]), np.array([[1.0]]), np.array([[0.0]]))
    >>> long_before, just_before, after = quiet_log_likelihood([band], np.array([-60.0, 15.0, 30.0]), one)
    >>> bool(long_before < -100.0), bool(-2.0 < just_before < 0.0), float(after)
    (True, True, 0.0)
    """
    if expected.amplitude.shape != (expected.rise_d.size, len(bands)):
        raise InputRefused(
            f"Draws of {expected.amplitude.shape} amplitudes do not fit {len(bands)} bands.",
            why="Every draw has one amplitude for each band.",
            hint="Give the amplitudes as an array of draws by bands.",
            code="draws-refused",
        )
    total = np.zeros((expected.rise_d.size, RISE_WEIGHTS.size, onsets.size))
    for number, band in enumerate(bands):
        if band.bmjd_tdb.size:
            total += _band_log_likelihood(band, onsets, expected, number)
    total += np.log(RISE_WEIGHTS)[None, :, None] - np.log(expected.rise_d.size)
    top = total.max(axis=(0, 1))
    value: FloatArray = top + np.log(np.exp(total - top).sum(axis=(0, 1)))
    return value


def _band_log_likelihood(
    band: BandPoints, onsets: FloatArray, expected: ExpectedEpisodes, number: int
) -> FloatArray:
    """ln likelihood of one band over (draw, shape, onset), less that without dust."""
    measured = band.limit_side == 0
    t, y = band.bmjd_tdb, band.excess
    weight = np.where(measured, band.sigma**-2.0, 0.0)
    member = (band.group[:, None] == np.arange(band.group_sigma.size)[None, :]) * (band.scale * weight)[
        :, None
    ]
    variance = band.group_sigma**2
    shrink = variance / (1.0 + variance * (band.scale[:, None] * member).sum(axis=0))
    columns = np.concatenate([(weight * y)[:, None], member * np.sqrt(shrink)], axis=1)
    projected = columns[:, 1:].T @ y
    quiet = _limits(band, ~measured, np.zeros(t.size))
    count = expected.rise_d.size
    found = np.empty((RISE_WEIGHTS.size, count, onsets.size))
    since = t[None, None, :] - onsets[None, :, None]
    lengths = (expected.rise_d + expected.later_d[:, number])[:, None, None]
    # Several draws at a time, as long as their arrays stay in the processor's cache.
    step = max(1, _BLOCK // max(1, RISE_WEIGHTS.size * since.size))
    for first in range(0, count, step):
        draws = slice(first, first + step)
        length = lengths[draws]
        fall = np.exp(np.minimum(length - since, 0.0) / expected.decline_d[draws, None, None])
        dust = rise_shapes(since / length)
        dust *= expected.amplitude[draws, number, None, None] * fall
        sums = dust @ columns
        score = sums[..., 0] - sums[..., 1:] @ projected
        square = (dust * dust) @ weight - (sums[..., 1:] ** 2).sum(axis=-1)
        found[:, draws] = score - 0.5 * square + _limits(band, ~measured, dust) - quiet
    return np.swapaxes(found, 0, 1)


def _limits(band: BandPoints, limits: BoolArray, dust: FloatArray) -> FloatArray:
    """ln likelihood of a band's limits."""
    if not limits.any():
        return np.zeros(dust.shape[:-1])
    terms = limit_log_likelihood(
        dust[..., limits], band.excess[limits], band.sigma[limits], band.limit_side[limits]
    )
    value: FloatArray = terms.sum(axis=-1)
    return value
