"""After the top: when production ended, when the excess was down to half, how fast it decays.

Free dust fades exponentially, which has no end; production has one, and shows as a break from a slow decline
to that decay. Where the break cannot be seen the posterior is as wide as what was allowed, and says so.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from campaign.physics.lightcolumns import FloatArray
from campaign.physics.onsetfit import SUMMARY, posterior_summary

# What is left of the top's excess when production ends, and e-folding times of the decay that follows.
_LEFT = np.array([1.0, 0.9, 0.8, 0.7, 0.6, 0.5, 0.4])
_DECAYS_D = np.geomspace(20.0, 1500.0, 14)
_ENDS = 24
_WILD_SIGMA = 3.5
_TOLD_SHARE = 0.6
# How much of the top's own error passes on: all of it in free decay, little of it while production goes on.
_END_SHARE, _HALF_SHARE = 0.25, 0.25


@dataclass(frozen=True, slots=True, eq=False)
class DeclinePosterior:
    """Median, 16, 84, 2.5 and 97.5 % and standard deviation of three things that differ, days.

    ``end_bmjd_tdb`` of production; ``half_bmjd_tdb`` when the excess was half of the top's; ``decay_d`` the
    e-folding time after production. ``end_is_told`` says that the data, not the allowed range, bound the end;
    ``half_is_seen`` that points reach down to half.
    """

    end_bmjd_tdb: FloatArray
    half_bmjd_tdb: FloatArray
    decay_d: FloatArray
    end_is_told: bool
    half_is_seen: bool


def fit_decline(
    bmjd_tdb: FloatArray, excess: FloatArray, sigma: FloatArray, top_bmjd_tdb: float, top_sigma_d: float
) -> DeclinePosterior | None:
    """End of production, half-decay and decay time from one band's points after the top.

    Parameters
    ----------
    bmjd_tdb : ndarray
        Times of the points, days, ascending; those before the top are left out.
    excess, sigma : ndarray
        Excess and its one-sigma noise in units of the stars' flux (dimensionless).
    top_bmjd_tdb, top_sigma_d : float
        The time of the top and its error, days.

    Returns
    -------
    DeclinePosterior or None
        Days; None with fewer than three points after the top, or no excess left among them.

    Notes
    -----
    Accuracy: priors flat in the end between the top and the point where a tenth is left, in what is left at
    the end (0.4 to 1), and in the logarithm of the decay time (20 to 1500 d). A quarter of the
    top's error is added to both dates.

    Source: segmented regression by profile (Hudson 1966, JASA 61, 1097), a line and then an exponential.

    Examples
    --------
    >>> t = np.arange(0.0, 400.0, 10.0)
    >>> dust = np.where(t < 100.0, 1.0, np.exp(-(t - 100.0) / 80.0))
    >>> fit = fit_decline(t, dust, np.full(t.size, 0.01), 0.0, 1.0)
    >>> bool(abs(fit.end_bmjd_tdb[0] - 100.0) < 5.0), bool(abs(fit.half_bmjd_tdb[0] - 155.5) < 5.0)
    (True, True)
    """
    after = bmjd_tdb >= top_bmjd_tdb - 1e-6
    t, y, s = bmjd_tdb[after] - top_bmjd_tdb, excess[after], sigma[after]
    if t.size < 3 or not (y > 2.0 * s).any():
        return None
    height = float(np.max(_running_median(y)))
    low = np.flatnonzero(_running_median(y) < 0.1 * height)
    last = float(t[low[0]]) if low.size else float(t[-1])
    if last <= 0.0:
        return None
    ends, decays = np.linspace(0.0, last, _ENDS), _DECAYS_D
    inflation = 1.0
    for turn in range(3):
        ln, amplitude = _likelihood(t, y, s, ends, decays)
        place = np.unravel_index(int(np.argmax(ln)), ln.shape)
        model = amplitude[place] * _decline(
            t, float(ends[place[0]]), float(_LEFT[place[1]]), float(decays[place[2]])
        )
        z = np.abs(y - model) / s
        if turn == 0:
            s = np.where(z > _WILD_SIGMA, s * z / _WILD_SIGMA, s)
            continue
        dof = max(t.size - 4, 1)
        chi2 = float((z**2).sum())
        inflation = max(1.0, chi2 / dof) if chi2 > dof + 2.0 * np.sqrt(2.0 * dof) else 1.0
        if turn == 1:
            by_end = np.exp((ln - ln.max()) / inflation).max(axis=(1, 2))
            alive = np.flatnonzero(by_end > 1e-5)
            ends = np.linspace(ends[max(alive[0] - 1, 0)], ends[min(alive[-1] + 1, ends.size - 1)], _ENDS)
            by_decay = np.exp((ln - ln.max()) / inflation).max(axis=(0, 1))
            alive = np.flatnonzero(by_decay > 1e-5)
            first, final = decays[max(alive[0] - 1, 0)], decays[min(alive[-1] + 1, decays.size - 1)]
            decays = np.geomspace(first, final, decays.size)
    weight = np.exp((ln - ln.max()) / inflation)
    end = posterior_summary(ends, weight.sum(axis=(1, 2)))
    halves = _half_time(ends[:, None, None], _LEFT[None, :, None], decays[None, None, :])
    half = _quantiles(halves, weight)
    decay = np.exp(posterior_summary(np.log(decays), weight.sum(axis=(0, 1))))
    # The standard deviation of the logarithm is a share of the time itself.
    decay[5] = decay[0] * np.log(decay[5])
    told = bool(end[4] - end[3] < _TOLD_SHARE * last)
    seen = bool((y[t > 0] < 0.6 * height).any())
    return DeclinePosterior(
        _dated(top_bmjd_tdb, _widened(end, _END_SHARE * top_sigma_d)),
        _dated(top_bmjd_tdb, _widened(half, _HALF_SHARE * top_sigma_d)),
        decay,
        told,
        seen,
    )


def _decline(t: FloatArray, end: float, left: float, decay: float) -> FloatArray:
    """Excess over the top's after a time: linear to what is left at the end, then exponential."""
    linear = 1.0 - (1.0 - left) * np.clip(t / end, 0.0, 1.0) if end > 0.0 else np.ones(t.size)
    value: FloatArray = linear * np.exp(-np.clip(t - end, 0.0, None) / decay)
    return value


def _likelihood(
    t: FloatArray, y: FloatArray, s: FloatArray, ends: FloatArray, decays: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """ln likelihood over (end, left, decay) with the amplitude at its best, and that amplitude."""
    share = np.where(ends[:, None] > 0.0, t / np.maximum(ends[:, None], 1e-9), 1.0)
    fallen = (1.0 - _LEFT)[None, :, None] * np.clip(share, 0.0, 1.0)[:, None, :]
    linear = np.where(ends[:, None, None] > 0.0, 1.0 - fallen, 1.0)
    since = np.clip(t[None, :] - ends[:, None], 0.0, None)
    faded = np.exp(-since[:, None, :] / decays[None, :, None])
    weight = s**-2.0
    square = np.einsum("eln,edn->eld", linear**2 * weight, faded**2)
    score = np.einsum("eln,edn->eld", linear * (weight * y), faded)
    amplitude = np.maximum(score / np.maximum(square, 1e-12), 0.0)
    return 0.5 * amplitude * score, amplitude


def _half_time(end: FloatArray, left: FloatArray, decay: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore", invalid="ignore"):
        linear = end * 0.5 / (1.0 - left)
    value: FloatArray = np.where(left <= 0.5, linear, end + decay * np.log(2.0 * left))
    # No end of its own: decay from the top on.
    return np.where(end > 0.0, value, decay * np.log(2.0) + 0.0 * left)


def _running_median(values: FloatArray) -> FloatArray:
    if values.size < 3:
        return values
    inner = np.median(np.stack([values[:-2], values[1:-1], values[2:]]), axis=0)
    return np.concatenate([[np.median(values[:2])], inner, [np.median(values[-2:])]])


def _quantiles(values: FloatArray, weight: FloatArray) -> FloatArray:
    order = np.argsort(values, axis=None)
    below = np.cumsum(weight.ravel()[order])
    middle = (below - 0.5 * weight.ravel()[order]) / below[-1]
    flat = values.ravel()
    mean = float(weight.ravel() @ flat) / below[-1]
    spread = float(weight.ravel() @ (flat - mean) ** 2) / below[-1]
    return np.append(np.interp(SUMMARY, middle, flat[order]), np.sqrt(spread))


def _dated(zero: float, summary: FloatArray) -> FloatArray:
    """A summary moved to another zero; its last entry is a width."""
    return np.append(zero + summary[:5], summary[5])


def _widened(summary: FloatArray, sigma: float) -> FloatArray:
    """A summary with an independent error added to each side."""
    middle, deviates = summary[0], np.array([0.0, -1.0, 1.0, -1.96, 1.96])
    wide = middle + np.sign(deviates) * np.hypot(summary[:5] - middle, deviates * sigma)
    return np.append(wide, np.hypot(summary[5], sigma))
