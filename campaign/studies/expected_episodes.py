"""What an episode of a system may look like before anybody has seen it: its rise, decline and heights."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from campaign.physics.brightspans import JudgedCurve
from campaign.physics.quietchance import ExpectedEpisodes

FloatArray = NDArray[np.float64]

# All of these: common practice, no source. Medians and the spread of the natural logarithm.
RISE_D, RISE_SPREAD = 110.0, 0.6
# A rule that dates the maximum tells the length of the rise, but not exactly that of the light.
RULED_SPREAD = 0.4
DECLINE_D, DECLINE_SPREAD = 180.0, 0.6
HEIGHT_K, HEIGHT_SPREAD = 0.9, 0.6
SEEN_SPREAD = 0.4
BAND_SPREAD = 0.25
# Height over that in K, and by which share of the rise the top is later; by the first letters of the band.
_BANDS = {
    "J": (0.12, 0.0), "H": (0.4, 0.0), "K": (1.0, 0.0), "L": (2.8, 0.1), "M": (4.0, 0.15), "N": (6.0, 0.2),
    "W1": (2.8, 0.1), "W2": (4.0, 0.15),
}  # fmt: skip
# Bands in which nobody knows dust to show: they say nothing.
_BLIND = (1e-3, 0.0)
DRAWS = 16
_TOP_SHARE = 0.9
_FEWEST_SEEN = 3


def expected_episodes(
    curve: JudgedCurve,
    bands: Sequence[tuple[int, str]],
    seen: Sequence[tuple[float, float]],
    rise_d: float | None,
) -> ExpectedEpisodes:
    """Draws of what the next episode may be like.

    Parameters
    ----------
    curve : JudgedCurve
        The light curve with its levels.
    bands : sequence of (int, str)
        Number and name of each band.
    seen : sequence of (float, float)
        From and until when earlier episodes were seen, ``bmjd_tdb``: their heights are expected again.
    rise_d : float or None
        Time from onset to maximum by the system's rule, days.

    Returns
    -------
    ExpectedEpisodes
        16 draws, the same for the same input; days and units of the stars' flux.

    Notes
    -----
    Accuracy: priors that are wide: a factor of 1.5 to 1.8 each. They decide how long a rise may hide.

    Source: common practice, no source; the height in each band from earlier episodes of the system.
    """
    normals = _even_normals(DRAWS, 3 + len(bands))
    ruled = rise_d is not None and rise_d > 1.0
    rise = (rise_d if ruled and rise_d is not None else RISE_D) * np.exp(
        (RULED_SPREAD if ruled else RISE_SPREAD) * normals[:, 0]
    )
    decline = DECLINE_D * np.exp(DECLINE_SPREAD * normals[:, 1])
    factors = np.array([_factor(name) for _, name in bands]).reshape(-1, 2)
    expected = HEIGHT_K * factors[:, 0]
    known = np.array([_seen_height(curve, number, seen) for number, _ in bands])
    there = np.isfinite(known)
    spread = HEIGHT_SPREAD
    if there.any():
        # What was seen in one band tells of the others too.
        expected = expected * np.exp(np.mean(np.log(known[there] / expected[there])))
        expected = np.where(there, known, expected)
        spread = SEEN_SPREAD
    height = expected * np.exp(spread * normals[:, 2:3] + BAND_SPREAD * normals[:, 3:])
    return ExpectedEpisodes(rise, decline, height, rise[:, None] * factors[:, 1])


def _factor(name: str) -> tuple[float, float]:
    return _BANDS.get(name[:2].upper()) or _BANDS.get(name[:1].upper(), _BLIND)


def _seen_height(curve: JudgedCurve, band: int, seen: Sequence[tuple[float, float]]) -> float:
    """Typical height of earlier episodes in a band; NaN where none was seen well."""
    columns, heights = curve.columns, []
    for start, end in seen:
        inside = (columns.bmjd_tdb >= start) & (columns.bmjd_tdb <= end) & columns.measured
        mine = inside & (columns.band == band) & (curve.ln_excess > 3.0 * curve.sigma_ln)
        if mine.sum() >= _FEWEST_SEEN:
            heights.append(float(np.quantile(np.expm1(curve.ln_excess[mine]), _TOP_SHARE)))
    return float(np.exp(np.mean(np.log(heights)))) if heights else float("nan")


@lru_cache(maxsize=16)
def _even_normals(count: int, columns: int) -> FloatArray:
    """Normal deviates that fill their space evenly: each column stratified, in an order of its own."""
    from scipy.special import ndtri

    even = ndtri((np.arange(count) + 0.5) / count)
    random = np.random.default_rng(1)
    found: FloatArray = np.stack([even[random.permutation(count)] for _ in range(columns)], axis=1)
    return found
