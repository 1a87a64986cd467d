"""Scores of single forecasts, and what many of them say together, by event and lead time."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from campaign.model.forecasts import EventName
from campaign.model.verification import Outcome, ScoredForecast, ScoreGroup
from campaign.physics.calibration import judge_transforms
from campaign.physics.datedscores import DatedScores, QuantileDistribution, score_date, score_span
from campaign.physics.intervals import PROBABILITIES, normal_quantiles
from campaign.physics.timescales import utc_iso
from campaign.physics.verification import skill_score
from campaign.studies.rows import SCATTERS
from campaign.studies.summaries import GRID

# Lead times that are judged together: a season, a year, and what no season reaches.
LEADS_D: tuple[tuple[float, float | None], ...] = (
    (float("-inf"), 0.0), (0.0, 91.3), (91.3, 365.25), (365.25, 1095.75), (1095.75, None),
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Forecasted:
    """A forecast to be scored; dates ``bmjd_tdb``, ``place`` in [0, 1] puts its transform in a span."""

    keeping_id: int
    keeping_label: str | None
    system: str
    event: EventName
    cycle: int | None
    solution: str | None
    rule: str | None
    as_of_bmjd_tdb: float
    quantiles_bmjd_tdb: tuple[float, ...]
    probability: float | None
    reference_bmjd_tdb: float | None
    reference_sigma_d: float | None
    place: float
    lead_asked_d: float | None = None


def score_forecast(forecast: Forecasted, outcome: Outcome) -> ScoredForecast:
    """Hold one forecast against what came.

    Parameters
    ----------
    forecast : Forecasted
        Quantiles at the shares of ``campaign.studies.summaries.GRID``, ``bmjd_tdb``.
    outcome : Outcome
        Date with errors or a span, ``bmjd_tdb``.

    Returns
    -------
    ScoredForecast
        Scores in days; the log score counts the chance of no episode too.

    Notes
    -----
    Accuracy: see ``campaign.physics.datedscores``. An unknown error of the outcome counts as zero.

    Source: see ``campaign.physics.datedscores``.
    """
    grid = np.array(forecast.quantiles_bmjd_tdb)
    scores = _scores(grid, outcome, forecast.place)
    reference = None
    if forecast.reference_bmjd_tdb is not None:
        mean, sigma = np.array([forecast.reference_bmjd_tdb]), np.array([forecast.reference_sigma_d or 0.0])
        reference = _scores(normal_quantiles(mean, sigma, GRID)[0], outcome, forecast.place).crps_d
    log_score = scores.log_score
    if log_score is not None and forecast.probability is not None:
        log_score -= float(np.log(forecast.probability)) if forecast.probability > 0.0 else -np.inf
    median, lo68, hi68, lo95, hi95 = (float(date) for date in np.interp(PROBABILITIES, GRID, grid))
    return ScoredForecast(
        keeping_id=forecast.keeping_id,
        keeping_label=forecast.keeping_label,
        system=forecast.system,
        event=forecast.event,
        cycle=forecast.cycle,
        solution=forecast.solution,
        rule=forecast.rule,
        lead_d=outcome.bmjd_tdb - forecast.as_of_bmjd_tdb,
        median_bmjd_tdb=median,
        lo68_bmjd_tdb=lo68,
        hi68_bmjd_tdb=hi68,
        lo95_bmjd_tdb=lo95,
        hi95_bmjd_tdb=hi95,
        outcome=outcome,
        outcome_utc=utc_iso(np.array([outcome.bmjd_tdb]))[0],
        miss_d=outcome.bmjd_tdb - median,
        crps_d=scores.crps_d,
        log_score=log_score,
        pit=scores.pit,
        reference_crps_d=reference,
        probability=forecast.probability,
        lead_asked_d=forecast.lead_asked_d,
    )


def _scores(grid: np.ndarray, outcome: Outcome, place: float) -> DatedScores:
    distribution = QuantileDistribution(grid, GRID)
    if outcome.first_bmjd_tdb is not None and outcome.last_bmjd_tdb is not None:
        return score_span(distribution, outcome.first_bmjd_tdb, outcome.last_bmjd_tdb, place)
    return score_date(distribution, outcome.bmjd_tdb, outcome.minus_d or 0.0, outcome.plus_d or 0.0)


def place_in_span(seed: int, number: int) -> float:
    """The random number that places the transform of one forecast in a span; always the same one.

    Parameters
    ----------
    seed, number : int
        Of the draws, and of the forecast (dimensionless).

    Returns
    -------
    float
        In [0, 1) (dimensionless).

    Notes
    -----
    Accuracy: exact. Source: numpy's generator PCG64.
    """
    return float(np.random.default_rng([seed, number]).uniform())


def group_scores(
    scored: Sequence[ScoredForecast], leads_d: Sequence[tuple[float, float | None]] = LEADS_D
) -> tuple[ScoreGroup, ...]:
    """What scored forecasts say together: each event by ranges of lead time.

    Parameters
    ----------
    scored : sequence of ScoredForecast
        Days.
    leads_d : sequence of (float, float or None)
        Ranges of lead time in days, each from its first (excluded) to its last (included).

    Returns
    -------
    tuple of ScoreGroup
        Only those with a forecast; calibration rests on one forecast for each outcome, the last before it.

    Notes
    -----
    Accuracy: means are plain. Source: see ``campaign.physics.calibration``.
    """
    groups = []
    for event in SCATTERS:
        for low, high in leads_d:
            found = [
                one
                for one in scored
                if one.event == event and one.lead_d > low and (high is None or one.lead_d <= high)
            ]
            if found:
                groups.append(_group(event, low, high, found))
    return tuple(groups)


def _group(event: EventName, low: float, high: float | None, found: Sequence[ScoredForecast]) -> ScoreGroup:
    last: dict[tuple[str, int | None], ScoredForecast] = {}
    for one in found:
        key = (one.system, one.outcome.cycle)
        if key not in last or one.lead_d < last[key].lead_d:
            last[key] = one
    told = judge_transforms(np.array([one.pit for one in last.values()]))
    both = [(one.crps_d, one.reference_crps_d) for one in found if one.reference_crps_d is not None]
    ours = float(np.mean([crps for crps, _ in both])) if both else None
    theirs = float(np.mean([crps for _, crps in both])) if both else None
    logs = [one.log_score for one in found if one.log_score is not None]
    skill = None
    if ours is not None and theirs is not None and theirs > 0.0:
        skill = skill_score(ours, theirs)
    return ScoreGroup(
        event=event,
        lead_low_d=low,
        lead_high_d=high,
        forecasts=len(found),
        outcomes=len(last),
        mean_crps_d=float(np.mean([one.crps_d for one in found])),
        mean_log_score=float(np.mean(logs)) if logs else None,
        mean_miss_d=float(np.mean([one.miss_d for one in found])),
        compared=len(both),
        compared_crps_d=ours,
        reference_crps_d=theirs,
        skill=skill,
        coverage68=told.coverage68,
        coverage68_lo=told.coverage68_lo,
        coverage68_hi=told.coverage68_hi,
        coverage95=told.coverage95,
        coverage95_lo=told.coverage95_lo,
        coverage95_hi=told.coverage95_hi,
        pit_mean=told.mean,
        pit_variance=told.variance,
        ks_d=told.ks_d,
        ks_p=told.ks_p,
        verdict=told.verdict,
    )
