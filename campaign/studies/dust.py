"""Dust of one system: what grains do in its light, and what its photometry says of dust at a date."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np

from campaign.errors import InputRefused, NotFound
from campaign.model.arrays import PhotometryArrays
from campaign.model.dust import BandExcess, DustOverrides, DustResult, DustThrough, MeasuredDust
from campaign.model.instants import TypedInstant
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution
from campaign.physics.timescales import utc_iso
from campaign.studies.bands import photometric_system_key
from campaign.studies.dust_excess import Sky, excesses
from campaign.studies.dust_inputs import DustInputs, gather
from campaign.studies.dust_measured import Fitted, measure, with_other_opacities
from campaign.studies.dust_physics import grains_in_light
from campaign.studies.dust_points import FLUXES, Levels, LightPoints, light_points, require_stand_ins
from campaign.studies.dust_through import MOST_EPOCHS, epochs_of, production_rates
from campaign.studies.instants import axis_instant
from campaign.studies.judging import confirmed_spans
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.watch import Campaign, mjd_of

DEFAULT_WITHIN_D = 10.0
# Many dates need no finer intervals than the screen shows.
_DRAWS_OF_MANY = 4000


@dataclass(frozen=True, slots=True, eq=False)
class DustQuestion:
    """What is asked: instants as typed, days, draws. Without ``on`` or a span only the physics is told."""

    now: datetime
    as_of: TypedInstant | None = None
    on: TypedInstant | None = None
    start: TypedInstant | None = None
    end: TypedInstant | None = None
    cycle: int | None = None
    within_d: float = DEFAULT_WITHIN_D
    label: str | None = None
    draws: int = DEFAULT_DRAWS
    seed: int = DEFAULT_SEED


def fluxes_of(db: str, system_id: int, as_of: TypedInstant | None) -> tuple[Observation, ...]:
    """Fluxes of a system, of every kind.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    system_id : int
        Number of the system.
    as_of : TypedInstant or None
        Hide what was observed later.

    Returns
    -------
    tuple of Observation
        Kind ``flux``, Jy or erg/s/cm2.

    Notes
    -----
    Accuracy: as logged. Source: the catalogue.
    """
    from campaign.catalogue import observations, store

    until = None if as_of is None else axis_instant(as_of)
    with store.reading(db) as connection:
        found = observations.observations_of(connection, [system_id], ["flux"], as_of_bmjd_tdb=until)
    return tuple(found)


def tell_dust(
    campaign: Campaign,
    overrides: DustOverrides,
    question: DustQuestion,
    fluxes: Iterable[Observation] = (),
) -> DustResult:
    """Answer a question on the dust of one system.

    Parameters
    ----------
    campaign : Campaign
        Of one system, with its light curve.
    overrides : DustOverrides
        Values in place of the catalogue's, in the units of their keys.
    question : DustQuestion
        What is asked.
    fluxes : iterable of Observation
        Logged fluxes, Jy.

    Returns
    -------
    DustResult
        K, au, days, km/s, Msun, Lsun, each with errors and the input that makes most of them.

    Raises
    ------
    Conflict
        No luminosity for the physics.
    NotFound
        No photometry near the date, none with a zero point, no episode of that cycle; an unknown table of
        opacities or solution.
    InputRefused
        A value that cannot be.

    Notes
    -----
    Accuracy: see ``campaign.studies.dust_physics`` and ``campaign.studies.dust_measured``.

    Source: the parts name theirs.
    """
    record = campaign.records[0]
    inputs = gather(record, _solution(record, question.label), overrides)
    today = _today(campaign, question)
    result = DustResult(
        record.system.name,
        utc_iso(np.array([today]))[0] or "",
        (),
        inputs.opacity.name,
        inputs.opacity.source,
    )
    assumptions = [f"opacity per gram of dust, not of gas: {inputs.opacity.name}, {inputs.opacity.source}"]
    if campaign.is_sample:
        assumptions.append("everything in the sample campaign is invented")
    if question.on is None and question.start is None and question.end is None and question.cycle is None:
        physics = grains_in_light(inputs, overrides.distances_au, question.draws, question.seed)
        assumptions = assumptions[1:] + list(_PHYSICS_NOTES)
        result = replace(result, physics=physics)
    else:
        require_stand_ins(overrides)
        arrays = campaign.photometry.get(record.system.id)
        result = _measured(result, inputs, overrides, question, arrays, fluxes)
        assumptions += [*_zero_point_notes(result), *_MEASURED_NOTES, _veil_note(overrides)]
    notes = dict.fromkeys([*inputs.notes, *assumptions])
    return replace(result, inputs=inputs.used_inputs(), assumptions=tuple(notes))


def _zero_point_notes(result: DustResult) -> list[str]:
    """Whose zero points stand in for whose, and which errors of them are assumed."""
    epochs = [result.measured] if result.measured is not None else []
    epochs += result.through.epochs if result.through is not None else ()
    bands = [band for epoch in epochs for band in epoch.bands if band.zero_points]
    notes, stand_ins = [], dict[str, list[str]]()
    for band in bands:
        stated, used = band.photometric_system, band.zero_points
        if stated != FLUXES and photometric_system_key(stated) != photometric_system_key(used):
            whose = f"'{stated}'" if stated else "magnitudes of no stated photometric system"
            if whose not in stand_ins.setdefault(used, []):
                stand_ins[used].append(whose)
    for used, whom in stand_ins.items():
        notes.append(
            f"zero points {'' if used == 'as given' else 'of '}{used} stand in for {', '.join(whom)}"
        )
    assumed = {band.zero_point_error_assumed or 0.0 for band in bands} - {0.0}
    if assumed:
        shares = " or ".join(f"{100.0 * share:.0f} %" for share in sorted(assumed))
        notes.append(f"where a zero point has no known error, {shares} are assumed")
    return notes


_PHYSICS_NOTES = (
    "grains absorb starlight with their whole cross-section and emit with (2 pi a/lambda)^s; optically thin",
    "free grains run away from the gas: an upper bound; with their gas they start at the flow speed",
)
_MEASURED_NOTES = (
    "one temperature, optically thin, with the stars' level of each series taken away",
    "no colour correction of the bands is made",
)


def _veil_note(overrides: DustOverrides) -> str:
    veil = overrides.extinction_k_mag
    if veil is None:
        return "no interstellar extinction is taken out: give --extinction, in K"
    return (
        f"interstellar extinction of {veil.value:g} ± {veil.sigma or 0.0:.2g} mag in K is taken out, as "
        "lambda^-1.8 to 5 um and level beyond (memory); its error is in the results, not in the fluxes"
    )


def _solution(record: SystemRecord, label: str | None) -> Solution | None:
    from campaign.studies.systems import require_solution

    if label is not None:
        return require_solution(record, label)
    adopted = [one for one in record.solutions if one.adopted]
    return max(adopted, key=lambda one: one.weight or 0.0) if adopted else None


def _today(campaign: Campaign, question: DustQuestion) -> float:
    if question.as_of is not None:
        return axis_instant(question.as_of)
    return campaign.own_as_of if campaign.own_as_of is not None else mjd_of(question.now)


def _measured(
    result: DustResult,
    inputs: DustInputs,
    overrides: DustOverrides,
    question: DustQuestion,
    arrays: PhotometryArrays | None,
    fluxes: Iterable[Observation],
) -> DustResult:
    points = light_points(arrays, fluxes)
    if not points.mag.size:
        raise NotFound(
            f"{result.system} has no photometry.",
            why="Without magnitudes or infrared fluxes nothing is known of its dust.",
            hint=f'Log some with: campaign log photometry "{result.system}" K=7.31±0.03 L=5.20±0.05 --at ...',
            code="no-photometry",
        )
    episodes = [(start, end) for start, end, _ in confirmed_spans(inputs.record)]
    if question.on is not None:
        at = axis_instant(question.on)
        span = (at - question.within_d, at + question.within_d)
        _require_near(result.system, points, at, question.within_d)
        sky = _sky(
            inputs, overrides, points, Levels(points, episodes, span, is_long=False, given=overrides.levels)
        )
        found = excesses(sky, *span)
        _require_zero_points(found, result.system)
        measured, _ = measure(inputs, found, at, question.draws, question.seed)
        measured = with_other_opacities(inputs, measured, inputs.opacity)
        return replace(result, measured=replace(measured, within_d=question.within_d))
    first, last = _span(inputs.record, question)
    levels = Levels(points, episodes, (first, last), is_long=True, given=overrides.levels)
    sky = _sky(inputs, overrides, points, levels)
    inside = points.bmjd_tdb[(points.bmjd_tdb >= first) & (points.bmjd_tdb <= last)]
    dates = epochs_of(inside, question.within_d)
    if not dates:
        raise _nothing_between(result.system, points, first, last)
    if len(dates) > MOST_EPOCHS:
        raise InputRefused(
            f"There are {len(dates)} dates in that span.",
            why=f"At most {MOST_EPOCHS} are computed at once.",
            hint="Choose a shorter span, or a longer --within.",
            code="span-refused",
        )
    through = _through(inputs, sky, dates, question, result.system)
    if levels.inside:
        whose = ", ".join(f"{band} ({source or 'no source'})" for band, source in levels.inside)
        inputs.notes.append(
            f"levels from points inside the span asked about: {whose}; dust that was there most of the time "
            "hides itself in them, give --level"
        )
    return replace(result, through=through)


def _sky(inputs: DustInputs, overrides: DustOverrides, points: LightPoints, levels: Levels) -> Sky:
    return Sky(points, levels, overrides, inputs.opacity)


def _nothing_between(system: str, points: LightPoints, first: float, last: float) -> NotFound:
    nearest = int(np.argmin(np.abs(points.bmjd_tdb - 0.5 * (first + last))))
    when = (utc_iso(points.bmjd_tdb[nearest : nearest + 1])[0] or "")[:10]
    start, end = ((text or "")[:10] for text in utc_iso(np.array([first, last])))
    return NotFound(
        f"{system} was not measured from {start} until {end}.",
        why=f"The nearest photometry is of {when}.",
        hint=f"Choose another span, or that date: --on {when}.",
        code="no-photometry-near",
        details={"nearest_utc": when},
    )


def _through(
    inputs: DustInputs,
    sky: Sky,
    dates: Sequence[tuple[float, float]],
    question: DustQuestion,
    system: str,
) -> DustThrough:
    draws = min(question.draws, _DRAWS_OF_MANY)
    epochs: list[tuple[MeasuredDust, Fitted | None]] = []
    seen: list[BandExcess] = []
    for start, end in dates:
        found = excesses(sky, start, end)
        seen += found
        at = float(np.mean([one.bmjd_tdb for one in found]))
        epochs.append(measure(inputs, found, at, draws, question.seed))
    _require_zero_points(seen, system)
    rates = production_rates(inputs, epochs, draws, question.seed)
    return DustThrough(tuple(measured for measured, _ in epochs), rates, question.cycle)


def _span(record: SystemRecord, question: DustQuestion) -> tuple[float, float]:
    """The span asked for: instants, or a confirmed episode with the dust that is left after it."""
    if question.cycle is not None:
        spans = [(start, end) for start, end, cycle in confirmed_spans(record) if cycle == question.cycle]
        if not spans:
            known = sorted(
                {e.cycle for e in record.episodes if e.state == "confirmed" and e.cycle is not None}
            )
            raise NotFound(
                f"{record.system.name} has no dated episode of cycle {question.cycle}.",
                why="Its dated episodes are of the cycles " + (", ".join(map(str, known)) or "(none)") + ".",
                hint="Name one of these, or a span with --from and --until.",
                code="episode-not-found",
                details={"cycles": known},
            )
        return min(s[0] for s in spans), max(s[1] for s in spans)
    if question.start is None or question.end is None:
        raise InputRefused(
            "The span has one end only.",
            why="An episode is followed from one instant until another.",
            hint="Give both, for example --from 2018-01-01 --until 2019-01-01, or --cycle 0.",
            code="span-refused",
        )
    first, last = axis_instant(question.start), axis_instant(question.end)
    if not last > first:
        raise InputRefused(
            "The span ends before it begins.",
            why="--until is not later than --from.",
            hint="Swap them, for example --from 2018-01-01 --until 2019-01-01.",
            code="span-refused",
        )
    return first, last


def _require_near(system: str, points: LightPoints, at: float, within_d: float) -> None:
    away = np.abs(points.bmjd_tdb - at)
    nearest = int(np.argmin(away))
    if away[nearest] <= within_d:
        return
    when = (utc_iso(points.bmjd_tdb[nearest : nearest + 1])[0] or "")[:10]
    raise NotFound(
        f"{system} was not measured within {within_d:g} d of {(utc_iso(np.array([at]))[0] or '')[:10]}.",
        why=f"The nearest photometry is of {when}, {away[nearest]:.0f} d away.",
        hint=f"Ask for that date (--on {when}), or allow more days: --within {np.ceil(away[nearest]):.0f}d.",
        code="no-photometry-near",
        details={"nearest_utc": when, "days_away": float(away[nearest])},
    )


def _require_zero_points(found: Sequence[BandExcess], system: str) -> None:
    """It is an error when no band at all can be turned into janskys."""
    without = [one for one in found if one.wavelength_um is None]
    if not found or len(without) < len(found):
        return
    names = dict.fromkeys(one.photometric_system for one in without)
    stated = [name for name in names if name]
    bands = ", ".join(dict.fromkeys(one.band for one in without))
    why = (
        f"{bands} of {', '.join(stated)} have none here."
        if stated
        else f"The photometric system of {bands} is not stated, and K of one system is not K of another."
    )
    raise NotFound(
        f"No band of {system} has a zero point: magnitudes cannot be turned into fluxes.",
        why=why,
        hint="Say whose zero points stand in: --zero-points Johnson-Glass (or 2MASS, MKO, Johnson, WISE); or "
        'give them: --zero-point "K=640±20 Jy at 2.19 um".',
        code="zero-point-not-found",
        details={"bands": [one.band for one in without], "photometric_systems": stated},
    )
