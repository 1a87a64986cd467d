"""What quiet observations say of cycles of which no event is known, and of a period after a single event."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.physics.brightspans import JudgedCurve
from campaign.physics.quietchance import ExpectedEpisodes, quiet_log_likelihood
from campaign.physics.recurrence import RecurrencePrediction
from campaign.physics.risepoints import points_between

FloatArray = NDArray[np.float64]

# So improbable a cycle is held against a period at most: an episode may have been too faint to be seen.
FAINT_CHANCE = 1e-3
_CHUNK_D = 250.0
_MOST_STEPS = 2500
_SHARES: FloatArray = (np.arange(61, dtype=np.float64) + 0.5) / 61.0
# How many e-folding times of the decline an episode is looked for after its top.
_DECLINES_SEEN = 2.5


@dataclass(frozen=True, slots=True, eq=False)
class QuietProfile:
    """ln of the chance of the observations had an onset happened then, over that without one.

    ``onset_bmjd_tdb`` in equal steps, days; 0 where nothing was observed.
    """

    onset_bmjd_tdb: FloatArray
    log_chance: FloatArray

    def at(self, onset: FloatArray) -> FloatArray:
        """ln chance at some dates; 0 outside the profile."""
        value: FloatArray = np.interp(onset, self.onset_bmjd_tdb, self.log_chance, left=0.0, right=0.0)
        return value


def quiet_profile(
    curve: JudgedCurve, bands: Sequence[int], expected: ExpectedEpisodes, start: float, stop: float
) -> QuietProfile:
    """What the light curve says of an onset at each date between two.

    Parameters
    ----------
    curve : JudgedCurve
        The light curve with its levels; points of known episodes have no finite excess. Days, mag.
    bands : sequence of int
        Numbers of the bands to be looked at, in the order of the draws' columns (dimensionless).
    expected : ExpectedEpisodes
        What an episode is like, days and units of the stars' flux.
    start, stop : float
        First and last date, ``bmjd_tdb``, days.

    Returns
    -------
    QuietProfile
        Days and natural logarithms.

    Notes
    -----
    Accuracy: steps of a fifth of the median rise or finer, but no more than 2,500; see
    ``campaign.physics.quietchance`` for the rest.

    Source: as ``campaign.physics.quietchance``.

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> z, t = np.zeros(60), np.arange(60) * 9.0
    >>> curve = find_bright_spans(LightColumns(t, z, z + 6.0, z + 0.02, np.zeros(60, np.int8), z,
    ...     np.zeros(60, int), np.zeros(1, int)))
    >>> one = ExpectedEpisodes(np.array([80.0]), np.array([200.0]), np.array([[0.8]]), np.array([[0.0]]))
    >>> found = quiet_profile(curve, [0], one, 0.0, 2000.0).at(np.array([200.0, 1500.0]))
    >>> bool(found[0] < -50.0), float(found[1])
    (True, 0.0)
    """
    rise = float(np.median(expected.rise_d))
    steps = int(np.clip((stop - start) / max(0.2 * rise, 2.0), 2, _MOST_STEPS)) + 1
    onsets = np.linspace(start, stop, steps)
    found = np.zeros(steps)
    reach = float(np.quantile(expected.rise_d, 0.9) + expected.later_d.max())
    reach += _DECLINES_SEEN * float(np.median(expected.decline_d))
    at_once = max(1, int(_CHUNK_D / (onsets[1] - onsets[0])))
    for first in range(0, steps, at_once):
        mine = onsets[first : first + at_once]
        points = [points_between(curve, band, mine[0], mine[-1] + reach) for band in bands]
        if any(one.bmjd_tdb.size for one in points):
            found[first : first + at_once] = quiet_log_likelihood(points, mine, expected)
    return QuietProfile(onsets, found)


def missed_log_chance(profile: QuietProfile, predicted: RecurrencePrediction) -> float:
    """ln of the chance of what was observed, had an episode begun when a line says so.

    Parameters
    ----------
    profile : QuietProfile
        What the light curve says of each date; days.
    predicted : RecurrencePrediction
        When the onset is expected, ``bmjd_tdb``, days.

    Returns
    -------
    float
        Natural logarithm (dimensionless): 0 where nothing was observed, above 0 where an excess was seen,
        never below that of a thousandth: an episode may have been too faint.

    Notes
    -----
    Accuracy: 61 quantiles of the prediction.

    Source: definition of a marginal likelihood.

    Examples
    --------
    >>> dates = np.linspace(0.0, 100.0, 101)
    >>> profile = QuietProfile(dates, np.where(dates < 50.0, -50.0, 0.0))
    >>> line = RecurrencePrediction(np.ones(1), np.array([50.0]), np.array([5.0]), np.zeros(1), 1, True)
    >>> round(float(np.exp(missed_log_chance(profile, line))), 1)
    0.5
    """
    ln = profile.at(predicted.quantiles_d(_SHARES))
    top = float(ln.max())
    chance = top + float(np.log(np.mean(np.exp(ln - top))))
    return max(chance, float(np.log(FAINT_CHANCE)))


@dataclass(frozen=True, slots=True, eq=False)
class SinglePeriod:
    """What one event and the time without another say of the period.

    ``at_least_d`` has 95 % of the probability above it; ``yearly`` is the probability of the next event
    within a year from the instant of the question; ``covered_d`` is how much of the time was observed.
    """

    period_d: FloatArray
    density: FloatArray
    at_least_d: float
    yearly: float
    covered_d: float


def single_event_period(
    onset: float, sigma_d: float, profile: QuietProfile, now: float, shortest_d: float, longest_d: float = 1e7
) -> SinglePeriod | None:
    """The period after a single event, from quiet observations before and after it.

    Parameters
    ----------
    onset : float
        The event, ``bmjd_tdb``, days.
    sigma_d : float
        Its one-sigma error with the scatter of another one, days.
    profile : QuietProfile
        What the light curve says of each date, days.
    now : float
        The instant of the question, ``bmjd_tdb``, days.
    shortest_d, longest_d : float
        Periods looked at, days.

    Returns
    -------
    SinglePeriod or None
        Days, and a probability (dimensionless); None where nothing was observed that would have shown
        another event.

    Notes
    -----
    Accuracy: 4,000 periods in equal ratios; between 1e7 d and infinity lies less than a thousandth. The prior
    is even in ln P; that one event fell into the time watched is the less probable the longer the period.

    Source: scale-free survival (Gott 1993, Nature 363, 315), times the chance of the quiet observations.

    Examples
    --------
    >>> dates = np.arange(0.0, 4000.0, 10.0)
    >>> seen = QuietProfile(dates, np.where(abs(dates - 500.0) < 100.0, 0.0, -20.0))
    >>> found = single_event_period(500.0, 10.0, seen, 4000.0, 100.0)
    >>> bool(3400.0 < found.at_least_d < 3800.0), round(found.yearly, 2)
    (True, 0.09)
    """
    step = profile.onset_bmjd_tdb[1] - profile.onset_bmjd_tdb[0]
    covered = float(step * np.sum(profile.log_chance < np.log(0.5)))
    if covered <= 0.0:
        return None
    periods = np.geomspace(shortest_d, longest_d, 4000)
    first, last = profile.onset_bmjd_tdb[0], profile.onset_bmjd_tdb[-1]
    ln = np.zeros(periods.size)
    offsets = sigma_d * np.array([-1.5, -0.5, 0.5, 1.5])
    for place, period in enumerate(periods):
        back, ahead = int((onset - first) / period) + 1, int((last - onset) / period) + 1
        turns = np.concatenate([np.arange(-back, 0), np.arange(1, ahead + 1)])
        chance = np.exp(profile.at((onset + turns * period)[:, None] + offsets[None, :])).mean(axis=1)
        ln[place] = np.log(np.clip(chance, FAINT_CHANCE, 1.0)).sum()
    watched = max(covered, shortest_d)
    density = np.exp(ln) * np.minimum(1.0, watched / periods)
    weight = density / density.sum()
    # Beyond the longest period as much again as a survival in proportion to 1/P leaves there.
    at_least = float(np.interp(0.05, np.cumsum(weight), periods))
    elapsed = max(now - onset, 0.0)
    following = np.maximum(np.ceil(elapsed / periods), 1.0) * periods
    # Nothing of a period that its own next event has passed unseen is left in `weight`.
    yearly = float(weight[following <= elapsed + 365.25].sum())
    return SinglePeriod(periods, weight, at_least, yearly, covered)
