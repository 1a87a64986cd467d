"""How many cycles lie between dated events: every count that the dates allow, each with its likelihood.

Dates alone allow P, P/2, P/3 ... equally well. Nothing here prefers one of those; only observations between
the dates can.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.datedlikelihood import DatedEvents
from campaign.physics.datedline import DatedLine, fit_dated_line

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# Counts whose likelihood is below this share of the best one's do not fit the dates. The best is often a very
# short period that fits by chance and that quiet observations exclude: a mild bound would lose the true one.
FITS_SHARE = 1e-6
# A period shorter than so many of its own errors of dates and scatter fits anything.
_MEANINGFUL = 6.0
MOST_CYCLES = 400
# What a scatter may be before any count is known: this share of the smallest gap.
_USUAL_SCATTER_GAPS = 0.01


@dataclass(frozen=True, slots=True, eq=False)
class CycleCount:
    """One way to count: a cycle for each event (the first is 0), and the line that it gives.

    ``divisor`` is the greatest common divisor of the counts: above 1, it is an alias P/2, P/3 ... of
    another count. ``log_evidence`` is that of the dates alone, relative to the best count.
    """

    cycles: IntArray
    divisor: int
    line: DatedLine
    log_evidence: float

    @property
    def period_d(self) -> float:
        """Mean of the period's posterior, days."""
        return float(self.line.weights @ self.line.means[:, 1])


def possible_counts(
    episodes: IntArray, kinds: IntArray, events: DatedEvents, shortest_period_d: float
) -> tuple[CycleCount, ...]:
    """Every count of cycles that fits the dates, the most probable first and of equals the longest period.

    Parameters
    ----------
    episodes : ndarray of int, shape (n,)
        Which episode an event belongs to, 0, 1, ... in order of time (dimensionless).
    kinds : ndarray of int, shape (n,)
        Kind of event, see ``campaign.physics.datedline`` (dimensionless).
    events : DatedEvents
        The dates, days.
    shortest_period_d : float
        No period below it is looked at, days: an episode cannot begin before the one before has ended.

    Returns
    -------
    tuple of CycleCount
        Days; aliases stand beside what they are aliases of.

    Raises
    ------
    InputRefused
        Fewer than two episodes; no count fits.

    Notes
    -----
    Accuracy: all end-to-end counts up to 400 cycles; between the ends each episode takes the nearest cycle.
    The prior of the period is even in its logarithm, that of the scatter log-normal about 1 % of the smallest
    gap for all counts alike, so that aliases are exactly as probable as each other.

    Source: marginal likelihood (MacKay 2003, Information Theory, Inference and Learning Algorithms, ch. 28).

    Examples
    --------
    >>> events = DatedEvents(np.array([1980.12, 2000.33, 2010.42]) * 365.25, np.full(3, 29.2),
    ...     np.full(3, 29.2), np.zeros(3, bool))
    >>> found = possible_counts(np.arange(3), np.zeros(3, int), events, 1100.0)
    >>> [one.cycles.tolist() for one in found[:3]]
    [[0, 2, 3], [0, 4, 6], [0, 6, 9]]
    """
    mean, sigma = events.moments()
    centres, errors = _centres(episodes, kinds, mean, sigma)
    if centres.size < 2:
        raise InputRefused(
            "One episode has no period.",
            why="A count of cycles needs two episodes.",
            hint="Confirm another one: campaign episodes find SYSTEM",
            code="recurrence-undetermined",
        )
    gaps = np.diff(centres)
    smallest = float(gaps.min())
    usual = _USUAL_SCATTER_GAPS * smallest
    typical = float(np.hypot(np.median(errors), usual))
    least = max(shortest_period_d, _MEANINGFUL * typical)
    longest = smallest + 3.0 * float(np.hypot(errors.max() * np.sqrt(2.0), usual))
    span = float(centres[-1] - centres[0])
    most = int(min(span / least + 0.5, MOST_CYCLES))
    found: dict[tuple[int, ...], DatedLine] = {}
    for total in range(max(1, int(span / longest)), max(most, centres.size - 1) + 1):
        counts = np.rint((centres - centres[0]) * total / span).astype(np.int64)
        key = tuple(int(count) for count in counts)
        if key in found or bool(np.any(np.diff(counts) < 1)):
            continue
        line = fit_dated_line(counts[episodes].astype(float), kinds, events, usual_scatter_d=usual)
        found[key] = line.by_scatter()
    if not found:
        raise InputRefused(
            "No period is as short as the shortest gap between the episodes.",
            why=f"Two of them lie {smallest:.0f} d apart, which is too near for dates so uncertain.",
            hint="See whether one burst stands there twice: campaign episodes list SYSTEM",
            code="episodes-too-near",
            details={"gap_d": smallest},
        )
    best = max(line.log_evidence for line in found.values())
    ranked = [
        CycleCount(np.array(key), int(np.gcd.reduce(np.array(key))), line, line.log_evidence - best)
        for key, line in found.items()
    ]
    fitting = [one for one in ranked if one.log_evidence > np.log(FITS_SHARE)]
    # To a thousandth: aliases are equal but for rounding, and then the longest period stands first.
    fitting.sort(key=lambda one: (-round(one.log_evidence, 3), int(one.cycles[-1])))
    return tuple(fitting)


def _centres(
    episodes: IntArray, kinds: IntArray, mean: FloatArray, sigma: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """One date for each episode: of its first kind of event, or of another less the usual offset."""
    shifted = mean.copy()
    for kind in range(1, int(kinds.max(initial=0)) + 1):
        offsets = [
            mean[i] - mean[j]
            for i in np.flatnonzero(kinds == kind)
            for j in np.flatnonzero((kinds == 0) & (episodes == episodes[i]))
        ]
        shifted[kinds == kind] -= float(np.median(offsets)) if offsets else 0.0
    count = int(episodes.max(initial=-1)) + 1
    first = [int(np.flatnonzero(episodes == e)[np.argmin(kinds[episodes == e])]) for e in range(count)]
    return shifted[first], sigma[first]
