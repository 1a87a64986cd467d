"""The event 'resolvable': when a shell has grown past what an image resolves."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import EventForecast, ExplainedEvent, VarianceTerm
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.studies.expansion import Expansion, expansion_of
from campaign.studies.forecast import DatedEvent, Forecaster
from campaign.studies.launches import Launch, cycles_between, launch_of, rough_span
from campaign.studies.preparing import Prepared, Question
from campaign.studies.summaries import summarise

FloatArray = NDArray[np.float64]
Motion = tuple[Measured, str]

YEAR_D = 365.25
RESOLVABLE = "resolvable"
# Of the drawn motions; the slowest few would keep every cycle.
_ALL_BUT = 0.995


def resolvable_events(
    prepared: Prepared,
    forecaster: Forecaster,
    question: Question,
    shells: Mapping[int, Sequence[Observation]],
) -> list[DatedEvent]:
    """When the shell of each cycle becomes resolvable, for every system whose shells' motion is known.

    Parameters
    ----------
    prepared : Prepared
        Rows and units.
    forecaster : Forecaster
        For the launches, ``bmjd_tdb``.
    question : Question
        With ``resolution_arcsec``, arcsec; without it there are no such events.
    shells : mapping of int to sequence of Observation
        Logged shells by system id.

    Returns
    -------
    list of DatedEvent
        Those whose date may fall into the window.

    Notes
    -----
    A shell whose launch has an error that nobody knows is dated without an interval.
    Accuracy: that of the draws.

    Source: resolvable = launch + resolution / motion; launch as in ``campaign.studies.launches``.
    """
    limit = question.resolution_arcsec
    if limit is None or RESOLVABLE not in question.events:
        return []
    found: list[DatedEvent] = []
    for unit in range(len(prepared.units)):
        record = prepared.rows[prepared.units[unit].rows[0]].record
        moving = motion_of(record, shells.get(record.system.id, ()), question)
        if moving is not None:
            found += _events_of(forecaster, unit, moving, limit, question)
    return found


def motion_of(
    record: SystemRecord, observations: Sequence[Observation], question: Question
) -> Expansion | None:
    """The motion of one system's shells.

    Parameters
    ----------
    record : SystemRecord
        For distance, rule and wind.
    observations : sequence of Observation
        Its logged shells, arcsec.
    question : Question
        ``as_of``, draws and seed.

    Returns
    -------
    Expansion or None
        mas/yr; None where nothing tells it.

    Notes
    -----
    Accuracy and source: see ``campaign.studies.expansion``.
    """
    measured: Motion | None = None
    if observations:
        from campaign.studies.shell_subject import ShellSubject
        from campaign.studies.shell_tracks import motion_of_shells

        measured = motion_of_shells(ShellSubject(record, tuple(observations)), question.as_of)
    return expansion_of(record, {}, measured, question.draws, question.seed)


def _events_of(
    forecaster: Forecaster, unit: int, moving: Expansion, limit_arcsec: float, question: Question
) -> list[DatedEvent]:
    way_d = 1000.0 * limit_arcsec / moving.draws_mas_yr * YEAR_D
    typical = 1000.0 * limit_arcsec / moving.value_mas_yr * YEAR_D
    quickest, slowest = float(way_d.min()), float(np.quantile(way_d, _ALL_BUT))
    found = []
    for cycle in cycles_between(forecaster, unit, question.start - typical, question.end - typical):
        span = rough_span(forecaster, unit, cycle, question.seed)
        if span is None or span[0] + quickest > question.end or span[1] + slowest < question.start:
            continue
        launch = launch_of(forecaster, unit, cycle, question.seed)
        if launch is not None and np.isfinite(launch.median_d):
            found.append(_event(unit, launch, way_d, moving, question))
    return found


def _event(unit: int, launch: Launch, way_d: FloatArray, moving: Expansion, question: Question) -> DatedEvent:
    summary = summarise((launch.spread_d + way_d)[None, :], question.window, False)
    missing = tuple(dict.fromkeys((*launch.missing, *moving.missing)))
    probability: float | None = float(summary.probability[0])
    if missing and probability is not None and probability < 1.0:
        probability = None
    return DatedEvent(
        unit=unit,
        event="resolvable",
        cycle=launch.cycle,
        quantiles=summary.quantiles[0],
        sigma_d=float(summary.sigma_d[0]),
        probability=probability,
        in_window=None if missing else float(summary.in_window[0]),
        missing=missing,
        notes=[f"shell past {question.resolution_arcsec:g} arcsec by the {moving.origin}"],
    )


def explain_resolvable(
    forecast: EventForecast,
    prepared: Prepared,
    question: Question,
    shells: Mapping[int, Sequence[Observation]],
) -> ExplainedEvent:
    """How the date came about at which a shell becomes resolvable.

    Parameters
    ----------
    forecast : EventForecast
        The event.
    prepared : Prepared
        Rows and units of one system.
    question : Question
        With ``resolution_arcsec``, arcsec.
    shells : mapping of int to sequence of Observation
        Logged shells by system id.

    Returns
    -------
    ExplainedEvent
        Sizes of the terms in days.

    Notes
    -----
    Accuracy: draws. Source: as ``resolvable_events``.
    """
    place = next(i for i, u in enumerate(prepared.units) if u.label == forecast.solution or u.label is None)
    record = prepared.rows[prepared.units[place].rows[0]].record
    forecaster = Forecaster(prepared.rows, prepared.units, prepared.learned, question.draws, question.seed)
    moving = motion_of(record, shells.get(record.system.id, ()), question)
    assert forecast.cycle is not None and question.resolution_arcsec is not None and moving is not None
    launch = launch_of(forecaster, place, forecast.cycle, question.seed)
    assert launch is not None
    limit = question.resolution_arcsec
    way_d = 1000.0 * limit / moving.draws_mas_yr * YEAR_D
    middle = float(np.nanmedian(launch.middle_d))
    text = (
        f"launch {middle:.3f}, {launch.in_words}; {limit:g} arcsec at {moving.value_mas_yr:.4g} mas/yr "
        f"({moving.origin}) = {1000.0 * limit / moving.value_mas_yr * YEAR_D:.1f} d"
    )
    terms = [
        VarianceTerm("launch", float(np.nanstd(launch.middle_d)), launch.in_words),
        VarianceTerm("window", float(np.nanmedian(launch.half_width_d)), "half of its width"),
        VarianceTerm("motion of the shells", float(np.std(way_d)), ""),
    ]
    return ExplainedEvent(forecast, text, tuple(terms))
