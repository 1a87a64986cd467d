"""Whether the period changes: looked for on request, kept only when an information criterion asks for it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.measured import Measured
from campaign.model.refined import PeriodChange
from campaign.physics.datedline import DatedLine, fit_dated_line
from campaign.studies.refine_dates import ChosenDates

FloatArray = NDArray[np.float64]
# The criterion must fall by more than this: Burnham & Anderson 2002, Model Selection and Inference, sec. 2.6.
CLEAR_GAIN = 2.0


@dataclass(frozen=True, slots=True, eq=False)
class CurvedFit:
    """What is told of a changing period, and the line with it where it could be fitted."""

    told: PeriodChange
    line: DatedLine | None


def change_of_period(cycles: FloatArray, dates: ChosenDates, straight: DatedLine) -> CurvedFit:
    """Fit a period that changes by so much a cycle, and judge it by AICc.

    Parameters
    ----------
    cycles : ndarray, shape (n,)
        Cycle of each date (dimensionless).
    dates : ChosenDates
        The dates, days.
    straight : DatedLine
        The line without a change.

    Returns
    -------
    CurvedFit
        Days a cycle. Not kept where too few dates leave the criterion undefined.

    Notes
    -----
    Accuracy: the likelihood is that of normal errors with the best scatter.

    Source: AICc = -2 ln L + 2 k + 2 k (k + 1)/(n - k - 1) (Hurvich & Tsai 1989, Biometrika 76, 297); kept
    where it falls by more than 2 (Burnham & Anderson 2002).
    """
    count = cycles.size
    width = 2 + len(dates.kinds_of) - 1
    needed = width + 4
    if count < needed or np.unique(cycles).size < 3:
        why = f"{count} dates: a change of period needs {needed}"
        return CurvedFit(PeriodChange(None, None, False, why), None)
    try:
        curved = fit_dated_line(cycles, dates.kinds, dates.events, curved=True)
    except InputRefused:
        return CurvedFit(PeriodChange(None, None, False, "the dates do not determine a change"), None)
    gain = _aicc(straight, width + 1, count) - _aicc(curved, width + 2, count)
    mean, covariance = curved.coefficients()
    size = float(np.sqrt(covariance[-1, -1]))
    kept = bool(gain > CLEAR_GAIN)
    moved = "falls" if gain > 0.0 else "rises"
    why = f"AICc {moved} by {abs(gain):.1f}; it must fall by more than {CLEAR_GAIN:g}"
    return CurvedFit(PeriodChange(Measured(float(mean[-1]), size, size), float(gain), kept, why), curved)


def _aicc(line: DatedLine, parameters: int, count: int) -> float:
    correction = 2.0 * parameters * (parameters + 1) / (count - parameters - 1)
    return -2.0 * line.best_log_likelihood + 2.0 * parameters + correction
