"""Refine a system's clock: a line through its dated episodes, how their cycles are counted, what follows."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.forecasts import Quantiles, UtcQuantiles
from campaign.model.instants import TypedInstant
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.refined import (
    CycleCounting,
    PlainLine,
    RefinedDate,
    RefinedEphemeris,
    Refinement,
    SingleEpisode,
)
from campaign.model.systems import Solution
from campaign.physics.cyclecounts import possible_counts
from campaign.physics.datedline import DatedLine, fit_dated_line
from campaign.physics.intervals import PROBABILITIES
from campaign.physics.linearephemeris import fit_ephemeris
from campaign.physics.missedcycles import single_event_period
from campaign.physics.recurrence import PRIOR_SCATTER_PERIODS, RecurrencePrediction
from campaign.physics.timescales import utc_iso
from campaign.studies.fitted import independent_of
from campaign.studies.preparing import hide_later_episodes
from campaign.studies.refine_change import forecast_change
from campaign.studies.refine_counts import WeighedCounts, weigh_counts
from campaign.studies.refine_curved import change_of_period
from campaign.studies.refine_dates import ChosenDates, choose_dates
from campaign.studies.refine_orbit import Combined, combine, compare_with_orbit, proposed_solution
from campaign.studies.refine_quiet import quiet_evidence
from campaign.studies.watch import Campaign, ask

FloatArray = NDArray[np.float64]
_ASSUMPTIONS = (
    "errors are as stated, never rescaled by chi-square; what they leave is cycle-to-cycle scatter",
    "between counts of equal likelihood only quiet observations decide; the longest period stands first",
)
_PRIOR = (
    "cycle-to-cycle scatter from the stated prior, 1 % of the period within a factor of e: the dates alone "
    "do not tell it"
)


@dataclass(frozen=True, slots=True)
class RefineQuestion:
    """What is asked of ``refine``: ``event`` onset, maximum, both or None; ``count`` the way to count to be
    taken, from 1; ``orbit`` the label of a solution to compare with, None for the adopted one; ``alone`` for
    none at all; ``curved`` whether a change of period is looked for; ``label`` that of the proposal."""

    as_of: float
    event: str | None = None
    count: int | None = None
    orbit: str | None = None
    alone: bool = False
    curved: bool = False
    label: str = "refined"


@dataclass(frozen=True, slots=True)
class Refined:
    """The result, and the solution that it proposes; None where there is none to propose."""

    result: Refinement
    proposal: Solution | None
    learns: bool = False


def asked_at(campaign: Campaign, now: datetime, as_of: TypedInstant | None) -> float:
    """The instant of the question: as asked, else the campaign's own date, else the clock.

    Parameters
    ----------
    campaign : Campaign
        The sample has a date of its own.
    now : datetime
        The clock.
    as_of : TypedInstant or None
        As asked.

    Returns
    -------
    float
        ``bmjd_tdb``, days.

    Notes
    -----
    Accuracy: as ``campaign.studies.watch.ask``. Source: project convention.
    """
    question = ask(
        campaign, now=now, as_of=as_of, start=None, end=None, within_d=None, events=(), min_probability=0.0,
        draws=None, seed=None, solutions="adopted",
    )  # fmt: skip
    return question.as_of


def refine(campaign: Campaign, question: RefineQuestion) -> Refined:
    """Refine period and epoch of one system from its confirmed episodes.

    Parameters
    ----------
    campaign : Campaign
        Of one system, with its light curve.
    question : RefineQuestion
        ``as_of`` in ``bmjd_tdb``; later episodes and observations are not looked at.

    Returns
    -------
    Refined
        Days, ``bmjd_tdb``, probabilities; with one episode a lower limit of the period.

    Raises
    ------
    InputRefused, Conflict, NotFound
        No dated episode; a count that is not listed; confirmed episodes that lie over each other; unknown
        solution.

    Notes
    -----
    Accuracy: intervals of the next event are true to within what thousands of simulated systems can tell
    (tests/studies/test_studies_refine_calibration.py).

    Source: DEVELOPERS.md (refined solutions).
    """
    record = hide_later_episodes(campaign.records[0], question.as_of)
    orbit = None if question.alone else _orbit(record, question.orbit)
    dates = choose_dates(record, question.event)
    if dates is None:
        raise _no_episode(record, question.event)
    arrays = campaign.photometry.get(record.system.id)
    if len(dates.episodes) == 1:
        return Refined(_single(record, dates, campaign, question), None)
    first, last = float(dates.events.date_d.min()), float(dates.events.date_d.max())
    counts = possible_counts(dates.owner, dates.kinds, dates.events, dates.shortest_period_d)
    needed = len(counts) > 1 or bool(np.any(np.diff(counts[0].cycles) > 1))
    quiet = quiet_evidence(record, arrays, question.as_of, first, last) if needed else None
    weighed = weigh_counts(dates, counts, quiet, orbit)
    chosen = _chosen(weighed, question.count, record)
    count = weighed.counts[chosen]
    offset = weighed.listed[chosen].cycles[0] - int(count.cycles[0])
    cycles = count.cycles[dates.owner].astype(float) + offset
    line = fit_dated_line(cycles, dates.kinds, dates.events)
    curved = change_of_period(cycles, dates, line) if question.curved else None
    used = curved.line if curved is not None and curved.told.kept and curved.line is not None else line
    ephemeris = _ephemeris(dates, cycles, used)
    combined = combine(ephemeris, orbit)
    comparison = None if orbit is None else compare_with_orbit(record, orbit, ephemeris, line, combined)
    reached = float((dates.events.date_d + dates.events.plus_d).max())
    proposal = proposed_solution(record.system.id, ephemeris, combined, orbit, question.label, reached)
    change = forecast_change(record, proposal, question.as_of, ephemeris.event)
    next_cycle, following = _next(used, question.as_of, cycles)
    result = Refinement(
        system=record.system.name,
        as_of_utc=utc_iso(np.array([question.as_of]))[0] or "",
        events=dates.kinds_of,
        episodes=len(dates.episodes),
        dates=_rows(dates, cycles, used),
        counts=_with_own_period(weighed, chosen, ephemeris),
        chosen=chosen + 1,
        ephemeris=ephemeris,
        line=_plain(dates, cycles),
        next_event=_quantiles(following),
        next_utc=_utc(following),
        next_cycle=next_cycle,
        change_of_period=None if curved is None else curved.told,
        orbit=comparison,
        forecast_change=change.told,
        assumptions=_assumptions(dates, used, weighed, orbit),
        warnings=_warnings(weighed, chosen, combined, question, len(dates.episodes)),
    )
    return Refined(result, proposal, change.learns)


def _orbit(record: SystemRecord, label: str | None) -> Solution | None:
    """The orbit to compare with, without what was fitted from the same episodes."""
    from campaign.studies.systems import require_solution

    if label is not None:
        return independent_of(require_solution(record, label), record.solutions)
    adopted = [s for s in record.solutions if s.adopted]
    best = max(adopted, key=lambda s: s.weight or 0.0) if adopted else None
    return independent_of(best, record.solutions)


def _no_episode(record: SystemRecord, event: str | None) -> InputRefused:
    confirmed = sum(e.state == "confirmed" for e in record.episodes)
    proposed = [e.id for e in record.episodes if e.state == "proposed"]
    name = record.system.name
    if confirmed:
        why = f"Of its {confirmed} confirmed episodes none has a date of its {event or 'onset'}."
        hint = "Ask for the other event: --event onset, or --event maximum."
    elif proposed:
        why = "Episodes are proposed, but none is confirmed."
        hint = f"Confirm what you trust, for example: campaign episodes confirm {proposed[0]}"
    else:
        why = "A period is refined from dated bursts, and it has none."
        hint = f'Look for some: campaign episodes find "{name}"; or add one: campaign episodes add "{name}"'
    return InputRefused(
        f"{name} has no confirmed episode to refine from.", why=why, hint=hint, code="no-episode",
        details={"confirmed": confirmed, "proposed": proposed},
    )  # fmt: skip


def _chosen(weighed: WeighedCounts, asked: int | None, record: SystemRecord) -> int:
    if asked is None:
        return weighed.best
    if 1 <= asked <= len(weighed.listed):
        return asked - 1
    raise InputRefused(
        f"There is no way {asked} to count the cycles of {record.system.name}.",
        why=f"{len(weighed.listed)} fit the dates; they are numbered from 1.",
        hint=f'See them with: campaign refine "{record.system.name}"',
        code="count-unknown",
        details={"counts": len(weighed.listed)},
    )


def _with_own_period(
    weighed: WeighedCounts, chosen: int, ephemeris: RefinedEphemeris
) -> tuple[CycleCounting, ...]:
    """The counts share one prior of the scatter; the one that is taken has the period of its own line."""
    listed = list(weighed.listed)
    listed[chosen] = replace(listed[chosen], period_d=ephemeris.period_d)
    return tuple(listed)


def _rows(dates: ChosenDates, cycles: FloatArray, line: DatedLine) -> tuple[RefinedDate, ...]:
    mean, sigma = dates.events.moments()
    mixtures = [
        line.mixture(line.column(c, int(k)), with_scatter=False)
        for c, k in zip(cycles, dates.kinds, strict=True)
    ]
    scatter = line.scatter_quantiles_d[1]
    utc = utc_iso(np.array([event.moment.bmjd_tdb for event in dates.dated]))
    rows = []
    for i, (event, model) in enumerate(zip(dates.dated, mixtures, strict=True)):
        rest = float(mean[i]) - model.mean_d
        rows.append(
            RefinedDate(
                episode=dates.episodes[dates.owner[i]].id,
                cycle=int(cycles[i]),
                event=dates.kinds_of[dates.kinds[i]],
                band=event.band,
                bmjd_tdb=event.moment.bmjd_tdb,
                utc=utc[i],
                minus_d=float(dates.events.minus_d[i]),
                plus_d=float(dates.events.plus_d[i]),
                bracketed=bool(dates.events.bracketed[i]),
                error_assumed=bool(dates.assumed[i]),
                computed_bmjd_tdb=model.mean_d,
                o_minus_c_d=rest,
                sigma=rest / float(np.hypot(sigma[i], scatter)),
            )
        )
    return tuple(rows)


def _ephemeris(dates: ChosenDates, cycles: FloatArray, line: DatedLine) -> RefinedEphemeris:
    mean, covariance = line.coefficients()
    best = line.pivot - float(covariance[0, 1] / covariance[1, 1])
    epoch_cycle = round(best)
    column = line.column(epoch_cycle)
    period_column = np.zeros(mean.size)
    period_column[1] = 1.0
    if line.curved:
        # The period of the epoch's own cycle.
        period_column[-1] = epoch_cycle - line.pivot
    low, middle, high = line.scatter_quantiles_d
    epoch = _measured(line, column)
    offset = np.zeros(mean.size)
    if len(dates.kinds_of) > 1:
        offset[2] = 1.0
    return RefinedEphemeris(
        event=dates.kinds_of[0],
        epoch_cycle=epoch_cycle,
        epoch_bmjd_tdb=epoch,
        epoch_utc=utc_iso(np.array([epoch.value]))[0],
        period_d=_measured(line, period_column),
        covariance_d2=float(column @ covariance @ period_column),
        best_cycle=best,
        scatter_d=Measured(middle, middle - low, high - middle),
        prior_used=line.prior_used,
        maximum_after_onset_d=_measured(line, offset) if len(dates.kinds_of) > 1 else None,
    )


def _measured(line: DatedLine, column: FloatArray) -> Measured:
    """Mean and standard deviation: what a solution with a covariance can hold."""
    mean, covariance = line.coefficients()
    sigma = float(np.sqrt(column @ covariance @ column))
    return Measured(float(column @ mean), sigma, sigma)


def _plain(dates: ChosenDates, cycles: FloatArray) -> PlainLine | None:
    """Weighted least squares through the first kind of event alone."""
    mean, sigma = dates.events.moments()
    first = dates.kinds == 0
    try:
        line = fit_ephemeris(cycles[first], mean[first], sigma[first])
    except InputRefused:
        return None
    epoch_cycle = round(line.best_cycle)
    epoch, epoch_sigma = line.at(epoch_cycle)
    covariance = line.covariance_d2 + epoch_cycle * line.period_variance_d2
    return PlainLine(
        epoch_cycle=epoch_cycle,
        epoch_bmjd_tdb=Measured(epoch, epoch_sigma, epoch_sigma),
        period_d=Measured(line.period_d, line.period_sigma_d, line.period_sigma_d),
        covariance_d2=covariance,
        correlation=covariance / (epoch_sigma * line.period_sigma_d),
        best_cycle=line.best_cycle,
        chi2=line.chi2,
        degrees_of_freedom=line.degrees_of_freedom,
    )


def _next(line: DatedLine, as_of: float, cycles: FloatArray) -> tuple[int, RecurrencePrediction]:
    """The first cycle after the last dated one whose event is not yet past, and its date."""
    cycle = int(cycles.max()) + 1
    found = line.mixture(line.column(cycle), with_scatter=True)
    for _ in range(1000):
        if found.quantiles_d(np.array([0.975]))[0] >= as_of:
            break
        cycle += 1
        found = line.mixture(line.column(cycle), with_scatter=True)
    return cycle, found


def _quantiles(found: RecurrencePrediction) -> Quantiles:
    median, low68, high68, low95, high95 = (float(q) for q in found.quantiles_d(PROBABILITIES))
    return Quantiles(median, found.sigma_d, low68, high68, low95, high95)


def _utc(found: RecurrencePrediction) -> UtcQuantiles:
    iso = utc_iso(found.quantiles_d(PROBABILITIES))
    return UtcQuantiles(iso[0], iso[1], iso[2], iso[3], iso[4])


def _single(
    record: SystemRecord, dates: ChosenDates, campaign: Campaign, question: RefineQuestion
) -> Refinement:
    """One episode: no period, but a limit from the time without another."""
    event = dates.dated[0]
    onset = event.moment.bmjd_tdb
    arrays = campaign.photometry.get(record.system.id)
    first = onset if arrays is None or not arrays.bmjd_tdb.size else float(arrays.bmjd_tdb.min())
    quiet = quiet_evidence(record, arrays, question.as_of, min(first, onset - 1.0), question.as_of)
    found = None
    if quiet.profile is not None:
        sigma = float(dates.events.moments()[1][0])
        shortest = dates.shortest_period_d
        usual = PRIOR_SCATTER_PERIODS * max(question.as_of - onset, shortest)
        found = single_event_period(
            onset, float(np.hypot(sigma, usual)), quiet.profile, question.as_of, shortest
        )
    return Refinement(
        system=record.system.name,
        as_of_utc=utc_iso(np.array([question.as_of]))[0] or "",
        events=dates.kinds_of,
        episodes=1,
        dates=(),
        counts=(),
        chosen=None,
        ephemeris=None,
        line=None,
        next_event=None,
        next_utc=None,
        next_cycle=None,
        single=SingleEpisode(
            event=dates.kinds_of[0],
            bmjd_tdb=onset,
            utc=utc_iso(np.array([onset]))[0],
            elapsed_d=question.as_of - onset,
            at_least_d=None if found is None else found.at_least_d,
            at_least_share=0.95,
            probability_per_yr=None if found is None else found.yearly,
            covered_d=0.0 if found is None else found.covered_d,
        ),
        assumptions=(
            "prior of the period even in its logarithm; the longer it is, the less probable that one episode "
            "fell into the time watched (Gott 1993)",
            quiet.note,
        ),
    )


def _assumptions(
    dates: ChosenDates, line: DatedLine, weighed: WeighedCounts, orbit: Solution | None
) -> tuple[str, ...]:
    told = [*_ASSUMPTIONS]
    if line.prior_used:
        told.append(_PRIOR)
    if len(dates.kinds_of) > 1:
        told.append(
            "a maximum shares nine tenths of its deviation with its onset; where less, intervals are too wide"
        )
    if orbit is not None:
        told.append(
            f"'{orbit.label}' is taken to know nothing of these episodes; if it rests on them: --alone"
        )
    if weighed.note:
        told.append(weighed.note)
    return (*told, *dates.notes)


def _warnings(
    weighed: WeighedCounts, chosen: int, combined: Combined | None, question: RefineQuestion, episodes: int
) -> tuple[str, ...]:
    told = []
    open_counts = [one for one in weighed.listed if not one.excluded]
    if len(open_counts) > 1 and question.count is None:
        others = ", ".join(f"{one.period_d.value:.0f} d" for one in open_counts if one.number != chosen + 1)
        told.append(
            f"other ways to count remain, with periods of {others}: observations between the dates decide"
        )
    if question.count is not None and weighed.listed[chosen].excluded:
        told.append("the way to count that was asked for is excluded by quiet observations")
    if episodes == 2:
        told.append(
            "two episodes: the period has an error only through the stated scatter and the dates' own"
        )
    if combined is not None and combined.note:
        told.append(combined.note)
    return tuple(told)
