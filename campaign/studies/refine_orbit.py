"""The clock of the episodes beside the orbit's own: tension, combination, and the solution proposed."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Measured
from campaign.model.records import SystemRecord
from campaign.model.refined import OrbitComparison, RefinedEphemeris
from campaign.model.systems import Solution
from campaign.physics.datedline import DatedLine
from campaign.studies.fitted import fitted_source
from campaign.studies.forecast import Forecaster
from campaign.studies.preparing import Question, prepare
from campaign.studies.summaries import Window

_JD_OF_MJD_0 = 2_400_000.5
# Two periods that differ by more are not averaged: one of them is wrong, or its error.
_TOO_FAR_SIGMA = 3.0
_DRAWS = 4000
_NAMES = ("epoch", "period_d")


@dataclass(frozen=True, slots=True)
class Combined:
    """An orbit's epoch and period with what the episodes say of the period; days, days squared.

    ``epoch_bmjd_tdb`` is None where the orbit has none. ``note`` says what could not be combined.
    """

    period_d: Measured
    epoch_bmjd_tdb: Measured | None
    covariance_d2: float | None
    note: str = ""


def combine(ephemeris: RefinedEphemeris, orbit: Solution | None) -> Combined | None:
    """Let the period of the episodes sharpen an orbit that knows nothing of them.

    Parameters
    ----------
    ephemeris : RefinedEphemeris
        From the episodes alone, days.
    orbit : Solution or None
        Epoch and period with their errors and covariance.

    Returns
    -------
    Combined or None
        Days; None without an orbit. The epoch moves with the period as far as their covariance says.

    Notes
    -----
    Accuracy: exact for normal errors. Periods more than 3 sigma apart are not averaged: that of the episodes
    is taken, and a note says so.

    Source: linear least squares with a prior (Kalman 1960, J. Basic Eng. 82, 35, one step).
    """
    if orbit is None:
        return None
    own = ephemeris.period_d
    own_sigma = own.sigma or 0.0
    epoch = orbit.epoch
    stated = None if epoch is None else Measured(epoch.bmjd_tdb, epoch.minus_d, epoch.plus_d)
    period = orbit.period_d
    if not isinstance(period, Measured) or period.sigma is None:
        return Combined(
            own, stated, None, f"'{orbit.label}' has no period with an error: nothing is averaged"
        )
    apart = own.value - period.value
    tension = apart / float(np.hypot(own_sigma, period.sigma))
    if abs(tension) > _TOO_FAR_SIGMA:
        note = (
            f"elements and data disagree: the period of '{orbit.label}' is {abs(tension):.1f} sigma from the "
            "episodes' own; that of the episodes is proposed, not an average"
        )
        return Combined(own, stated, None, note)
    variance = period.sigma**2
    gain = variance / (variance + own_sigma**2)
    value, sigma = period.value + gain * apart, float(np.sqrt((1.0 - gain) * variance))
    combined = Measured(value, sigma, sigma)
    if stated is None or stated.sigma is None:
        return Combined(combined, stated, None)
    both = 0.0 if orbit.covariance is None else orbit.covariance.between(*_NAMES) or 0.0
    moved = both / (variance + own_sigma**2)
    left = float(np.sqrt(max(stated.sigma**2 - moved * both, 0.0)))
    if both == 0.0:
        return Combined(combined, stated, None)
    return Combined(combined, Measured(stated.value + moved * apart, left, left), (1.0 - gain) * both)


def compare_with_orbit(
    record: SystemRecord, orbit: Solution, ephemeris: RefinedEphemeris, line: DatedLine,
    combined: Combined | None,
) -> OrbitComparison:  # fmt: skip
    """Tensions of period and date between the episodes and an orbit.

    Parameters
    ----------
    record : SystemRecord
        The system and its dust rule.
    orbit : Solution
        The orbit.
    ephemeris, line : RefinedEphemeris, DatedLine
        From the episodes alone, days.
    combined : Combined or None
        See :func:`combine`.

    Returns
    -------
    OrbitComparison
        Days; signed sigma, episodes less orbit.

    Notes
    -----
    Accuracy: normal errors; the event by the dust rule is drawn 4,000 times, without cycle-to-cycle scatter.

    Source: DEVELOPERS.md (disagreement).
    """
    own = ephemeris.period_d
    period = orbit.period_d if isinstance(orbit.period_d, Measured) else None
    tension = None
    if period is not None and period.sigma is not None:
        tension = (own.value - period.value) / float(np.hypot(own.sigma or 0.0, period.sigma))
    averaged = combined is not None and not combined.note
    return OrbitComparison(
        solution=orbit.label,
        period_d=period,
        period_tension_sigma=tension,
        combined_period_d=combined.period_d if combined is not None and averaged else None,
        epoch_marks=orbit.epoch_marks,
        event_after_epoch_d=_after_epoch(orbit, line),
        event_tension_sigma=_rule_tension(record, orbit, ephemeris, line),
        note=combined.note if combined is not None else "",
    )


def _after_epoch(orbit: Solution, line: DatedLine) -> Measured | None:
    if orbit.epoch is None:
        return None
    found = line.mixture(line.column(orbit.epoch_cycle or 0), with_scatter=False)
    epoch = Measured(orbit.epoch.bmjd_tdb, orbit.epoch.minus_d, orbit.epoch.plus_d).sigma
    sigma = None if epoch is None else float(np.hypot(found.sigma_d, epoch))
    return Measured(found.mean_d - orbit.epoch.bmjd_tdb, sigma, sigma)


def _rule_tension(
    record: SystemRecord, orbit: Solution, ephemeris: RefinedEphemeris, line: DatedLine
) -> float | None:
    """The fitted event against the dust rule's, in the cycle nearest to the mean of the dates."""
    rule = record.rule
    if rule is None or rule.kind == "learned":
        return None
    bare = replace(
        record,
        episodes=(),
        solutions=(replace(orbit, adopted=True, weight=None),),
        rule=replace(rule, scatter_onset_d=0.0, scatter_maximum_d=0.0, scatter_end_d=0.0),
    )
    question = Question(as_of=0.0, start=0.0, end=1.0, draws=_DRAWS)
    prepared = prepare([bare], {}, question)
    if ephemeris.event not in prepared.rows[0].events:
        return None
    forecaster = Forecaster(prepared.rows, prepared.units, prepared.learned, _DRAWS, question.seed)
    cycle = ephemeris.epoch_cycle
    dated = forecaster.date_pairs({ephemeris.event: [(0, cycle)]}, Window(-1e6, 1e6, 0.0))
    if not dated or dated[0].quantiles is None or dated[0].sigma_d is None or dated[0].missing:
        return None
    rule_date, rule_sigma = float(dated[0].quantiles[0]), float(dated[0].sigma_d)
    if not np.isfinite(rule_date):
        return None
    own = line.mixture(line.column(cycle), with_scatter=False)
    return (own.mean_d - rule_date) / float(np.hypot(own.sigma_d, rule_sigma))


def proposed_solution(
    system_id: int, ephemeris: RefinedEphemeris, combined: Combined | None, orbit: Solution | None,
    label: str, reached: float,
) -> Solution:  # fmt: skip
    """The solution that follows from the episodes, with the orbit's other elements where there is one.

    Parameters
    ----------
    system_id : int
        Number of the system (dimensionless).
    ephemeris : RefinedEphemeris
        From the episodes alone, days.
    combined : Combined or None
        With the orbit, days.
    orbit : Solution or None
        Its other elements are kept; correlations with them are not.
    label : str
        Of the proposal.
    reached : float
        Until when the dates reach, ``bmjd_tdb``.

    Returns
    -------
    Solution
        Not adopted, number 0; its source says that it is fitted from episodes.

    Notes
    -----
    Accuracy: that of its parts. Source: DEVELOPERS.md (refined solutions).
    """
    if orbit is None or combined is None or combined.epoch_bmjd_tdb is None:
        base = Solution(0, system_id, label) if orbit is None else replace(orbit, published_cycle_offset=None)
        epoch, period = ephemeris.epoch_bmjd_tdb, ephemeris.period_d
        return replace(
            base,
            id=0,
            label=label,
            period_d=period,
            epoch=_moment(epoch),
            epoch_marks=ephemeris.event,
            covariance=_covariance(epoch, period, ephemeris.covariance_d2),
            source=fitted_source(orbit),
            data_until_bmjd_tdb=reached,
            adopted=False,
            weight=None,
            epoch_cycle=ephemeris.epoch_cycle,
            note="",
        )
    epoch, moved = combined.epoch_bmjd_tdb, combined.covariance_d2
    return replace(
        orbit,
        id=0,
        label=label,
        period_d=combined.period_d,
        epoch=orbit.epoch if moved is None else _moment(epoch),
        covariance=None if moved is None else _covariance(epoch, combined.period_d, moved),
        source=fitted_source(orbit),
        data_until_bmjd_tdb=max(reached, orbit.data_until_bmjd_tdb or reached),
        adopted=False,
        weight=None,
        note="",
    )


def _moment(epoch: Measured) -> Moment:
    text = f"BJD {epoch.value + _JD_OF_MJD_0:.4f} ± {epoch.plus:.4f}"
    return Moment(epoch.value, epoch.minus, epoch.plus, text, "tdb", "barycentre")


def _covariance(epoch: Measured, period: Measured, both: float) -> Covariance:
    variances = ((epoch.sigma or 0.0) ** 2, (period.sigma or 0.0) ** 2)
    return Covariance(_NAMES, ((variances[0], both), (both, variances[1])))
