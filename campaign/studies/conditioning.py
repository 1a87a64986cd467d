"""Onset, maximum and end of a cycle, given that it was quiet until now: what quiet nights do to dates."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import Conditioning, EventName, Quantiles
from campaign.physics.conditioned import ConditionedDraws, condition_draws, weighted_quantiles
from campaign.physics.intervals import PROBABILITIES
from campaign.studies.following import days_since_onset
from campaign.studies.forecast import DatedEvent, Forecaster
from campaign.studies.preparing import Prepared, Question
from campaign.studies.quietpoints import QuietPoints, quiet_points
from campaign.studies.status import OnsetState
from campaign.studies.summaries import GRID, Window, share_before

FloatArray = NDArray[np.float64]
States = Mapping[tuple[int, int | None], OnsetState]

# Statuses of an onset that quiet observations still say something of.
_OPEN = ("expected", "open", "late", "suspected", "unseen")
# Quiet points after less than this of an onset's probability leave its date as it is.
LEAST_PAST = 0.01
# With fewer draws left than so many there is no distribution to show.
LEAST_DRAWS = 30.0
# Nor where the points are so improbable under all that the forecast allows, larger errors or not.
LEAST_EVIDENCE = 1e-5
# A cycle whose interval has passed longer ago than this is no longer waited for.
_WAITED_D = 365.25
# A draw with so little of the greatest weight is none.
_NOTHING = 1e-8
DISAGREE = "elements and data disagree"
_STAGES: tuple[EventName, ...] = ("onset", "maximum", "end")


def condition_events(
    prepared: Prepared,
    forecaster: Forecaster,
    dated: Sequence[DatedEvent],
    states: States,
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
) -> list[DatedEvent]:
    """The dated events, those of onsets that quiet observations bear on conditioned on them.

    Parameters
    ----------
    prepared : Prepared
        Rows and units, with the light curves that were judged for their status.
    forecaster : Forecaster
        For the draws, ``bmjd_tdb``.
    dated : sequence of DatedEvent
        Before any conditioning.
    states : mapping
        Status of each onset by (unit, cycle), which rests on the interval before.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id.
    question : Question
        ``as_of`` and window, ``bmjd_tdb``.

    Returns
    -------
    list of DatedEvent
        In the same order.

    Notes
    -----
    Accuracy: that of the draws that are left, and of the priors of ``expected_episodes``. Periastron and
    conjunctions stay as the elements give them.

    Source: Bayes' theorem; DEVELOPERS.md (Quiet observations).
    """
    by_key = {(d.unit, d.cycle, d.event): d for d in dated}
    found: dict[tuple[int, int | None, EventName], DatedEvent] = {}
    for onset in dated:
        if onset.event != "onset" or not _may_bear(onset, states, prepared, question):
            continue
        points = points_of(onset, prepared, forecaster, states, photometry, question)
        if points is None:
            continue
        assert onset.cycle is not None
        onsets = forecaster.unit_times(onset.unit, "onset", onset.cycle)
        draws = condition_draws(onsets, points.log_likelihood)
        for event in _STAGES:
            stage = by_key.get((onset.unit, onset.cycle, event))
            if stage is None or stage.missing or stage.observed or stage.quantiles is None:
                continue
            found[onset.unit, onset.cycle, event] = _conditioned(
                stage, onsets, draws, points, forecaster, question.window
            )
    return [found.get((d.unit, d.cycle, d.event), d) for d in dated]


def _may_bear(onset: DatedEvent, states: States, prepared: Prepared, question: Question) -> bool:
    """Whether quiet points may say something: a judged curve, an interval, and points inside it."""
    state = states.get((onset.unit, onset.cycle))
    if state is None or state.status not in _OPEN or onset.missing or onset.grid is None:
        return False
    if onset.cycle is None or onset.quantiles is None or np.isnan(onset.grid[0]):
        return False
    judged = prepared.judged.get(prepared.system_id(onset.unit))
    last = None if judged is None else judged.last_quiet
    if last is None or float(share_before(onset.grid, last)) < LEAST_PAST:
        return False
    return state.status == "late" or question.as_of - float(onset.quantiles[4]) < _WAITED_D


def points_of(
    onset: DatedEvent,
    prepared: Prepared,
    forecaster: Forecaster,
    states: States,
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
) -> QuietPoints | None:
    """The quiet points that bear on one onset.

    Parameters
    ----------
    onset : DatedEvent
        Before any conditioning, with its quantiles; ``bmjd_tdb``.
    prepared, forecaster, states, photometry, question : as for ``condition_events``
        Where an onset is suspected, only what was before it counts.

    Returns
    -------
    QuietPoints or None
        None where there is nothing to say.

    Notes
    -----
    Accuracy and source: see ``campaign.studies.quietpoints``.
    """
    arrays = photometry.get(prepared.system_id(onset.unit))
    if arrays is None or onset.grid is None:
        return None
    since = states[onset.unit, onset.cycle].suspected_bmjd_tdb
    stop = question.as_of if since is None else np.nextafter(since, -np.inf)
    start = float(onset.grid[0] - (onset.grid[-1] - onset.grid[0]))
    record = prepared.rows[prepared.units[onset.unit].rows[0]].record
    return quiet_points(record, arrays, start, float(stop), _rise_d(onset, forecaster))


def _rise_d(onset: DatedEvent, forecaster: Forecaster) -> float | None:
    """Time from onset to maximum by the rule, if it dates both; whatever events were asked for."""
    assert onset.cycle is not None
    for row in forecaster.units[onset.unit].rows:
        one = forecaster.rows[row]
        if "maximum" not in one.events:
            continue
        kind = None if one.rule is None else one.rule.kind
        if kind in ("lag", "phase") and {"onset", "maximum"} <= one.values.keys():
            size = 1.0 if kind == "lag" else one.values["period_d"][0]
            return size * (one.values["maximum"][0] - one.values["onset"][0])
        days = days_since_onset(forecaster.pilot, forecaster.learned.get(row), row, "maximum", onset.cycle)
        if np.isfinite(days).any():
            return float(np.nanmedian(days))
    return None


def _conditioned(
    stage: DatedEvent,
    onsets: FloatArray,
    draws: ConditionedDraws,
    points: QuietPoints,
    forecaster: Forecaster,
    window: Window,
) -> DatedEvent:
    assert stage.cycle is not None
    told = Conditioning(
        before=quantiles_of(stage),
        observations=points.count,
        last_quiet_bmjd_tdb=points.last_bmjd_tdb,
        evidence=draws.evidence,
        inflated_share=draws.inflated_share,
        moved=draws.effective >= LEAST_DRAWS and draws.evidence >= LEAST_EVIDENCE,
    )
    if not told.moved:
        note = (
            f"{DISAGREE}: quiet observations leave nothing of this forecast; its date is that of the elements"
        )
        return replace(stage, conditioning=told, notes=[*stage.notes, note])
    dates = draws.dates_d
    if stage.event != "onset":
        if any(row in forecaster.learned for row in forecaster.units[stage.unit].rows):
            since = forecaster.since_onset(stage.unit, stage.event, stage.cycle)
        else:
            # The same, with the draws of the onset that are here already.
            since = forecaster.unit_times(stage.unit, stage.event, stage.cycle) - onsets
        if np.all(np.isnan(since)):
            return stage
        dates = dates + np.tile(since, 2)
    there = ~np.isnan(dates)
    chance = 1.0 if there.all() else float(draws.weights[there].sum())
    there &= draws.weights > _NOTHING * draws.weights.max()
    values, weights = dates[there], draws.weights[there]
    weights = weights * (chance / weights.sum())
    mean = float(weights @ values) / chance
    inside = float(weights[(values >= window.start) & (values <= window.end)].sum())
    both = weighted_quantiles(values, weights, np.concatenate([PROBABILITIES, GRID]))
    return replace(
        stage,
        quantiles=both[: PROBABILITIES.size],
        grid=None if stage.grid is None else both[PROBABILITIES.size :],
        sigma_d=float(np.sqrt(weights @ (values - mean) ** 2 / chance)),
        probability=None if stage.probability is None else min(chance, 1.0),
        in_window=None if stage.in_window is None else min(inside, 1.0),
        conditioning=told,
        notes=[*stage.notes, *_notes(told)],
    )


def quantiles_of(stage: DatedEvent) -> Quantiles:
    """Median and intervals of a dated event, days (``bmjd_tdb``)."""
    assert stage.quantiles is not None
    median, low68, high68, low95, high95 = (float(q) for q in stage.quantiles)
    return Quantiles(median, stage.sigma_d, low68, high68, low95, high95)


def _notes(told: Conditioning) -> list[str]:
    if told.inflated_share < 0.5:
        return []
    return [
        f"{DISAGREE}: quiet beyond 3 sigma, so the date is a mixture of the forecast "
        f"({1.0 - told.inflated_share:.0%}) and of one with errors three times as large "
        f"({told.inflated_share:.0%})"
    ]
