"""Ages and launch dates of shells, from logged radii or without any catalogue."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from campaign.errors import Conflict
from campaign.model.instants import TypedInstant
from campaign.model.measured import Measured
from campaign.model.shellquestion import ShellQuestion, ShellRadius
from campaign.model.shells import DatedShell, ShellAcceleration, ShellDatingResult
from campaign.physics.shellassignment import BLEND_PRIOR, MISSING_PRIOR
from campaign.physics.shellrelations import RelationSolution, what_would_do
from campaign.physics.shelltension import likely_reasons
from campaign.physics.shellvalues import Sided
from campaign.physics.timescales import utc_iso
from campaign.studies.shell_ephemeris import ShellEphemeris
from campaign.studies.shell_fitting import Ages, ages_of, motions_of, sided
from campaign.studies.shell_launches import (
    against_ephemeris,
    anchor,
    foreseen_in,
    launch_tension,
    rows_of,
    unmeasured_in_words,
)
from campaign.studies.shell_projection import true_quantities, true_tensions, with_light_time
from campaign.studies.shell_relations import (
    Stated,
    insufficient,
    none_if_nan,
    shell_quantities,
    shell_tensions,
    solve,
    stated_inputs,
    with_wind_if_needed,
    would_do,
)
from campaign.studies.shell_solving import (
    ONE_RADIUS,
    SolvedGroup,
    SolvedShells,
    expansion_parallax,
    solve_shells,
)
from campaign.studies.shell_speeds import acceleration_of, launch_radius_of, launch_time_of
from campaign.studies.shell_subject import ShellSubject, forecaster_of, radii_of, seed_of, today_of


def date_shells(
    question: ShellQuestion, subject: ShellSubject | None, *, now: datetime, as_of: TypedInstant | None
) -> ShellDatingResult:
    """Date shells.

    Parameters
    ----------
    question : ShellQuestion
        What is stated: radii in arcsec, quantities in the units of their names, instants ``bmjd_tdb``.
    subject : ShellSubject or None
        A system of the catalogue with its logged radii; what the question states goes before it.
    now : datetime
        The clock, aware.
    as_of : TypedInstant or None
        In place of now.

    Returns
    -------
    ShellDatingResult
        Ages in yr, launches ``bmjd_tdb`` and UTC, tensions in sigma.

    Raises
    ------
    InputRefused
        Values that cannot be, or too few of them: then the hint says what else would do.
    Conflict
        A system without logged shells, and no radius or spacing typed.

    Notes
    -----
    Accuracy: see ``campaign.physics.shellspacing``, ``shellmotion`` and ``shellrelations``.

    Source: DEVELOPERS.md (Shells).
    """
    today = today_of(subject, now, as_of)
    ephemeris = None
    if subject is not None:
        forecaster = forecaster_of(subject.record, today, question.draws, question.seed)
        ephemeris = ShellEphemeris(forecaster, seed_of(question.seed))
    period = None
    if ephemeris is not None and ephemeris.period_yr is not None:
        period = (ephemeris.period_yr, ephemeris.period_from)
    stated = stated_inputs(question.stated, question.correlations, subject, period)
    radii = question.radii or (() if subject is None else radii_of(subject.observations))
    told = _Told(subject.record.system.name if subject is not None else None, utc_iso([today])[0] or "")
    if not radii:
        return _without_radii(question, subject, stated, told)
    return _with_radii(question, radii, stated, subject, ephemeris, told)


@dataclass(frozen=True, slots=True)
class _Told:
    """What every result says first."""

    system: str | None
    as_of_utc: str


def _without_radii(
    question: ShellQuestion, subject: ShellSubject | None, stated: Stated, told: _Told
) -> ShellDatingResult:
    """Relations alone: nothing was measured in an image but perhaps a spacing or a motion."""
    if subject is not None and not {"spacing_arcsec", "proper_motion_mas_yr"} & question.stated.keys():
        raise Conflict(
            f"No shells are logged of {subject.record.system.name}.",
            why="Shells are dated from their radii, their spacing or their motion in an image.",
            hint=f'Log them: campaign log shell "{subject.record.system.name}" --radius "1.20±0.05 arcsec" '
            "--at 2031-04-07; or type --radius or --spacing.",
            code="no-shells",
        )
    stated = with_wind_if_needed(stated)
    solution = solve(stated, question.draws, question.seed)
    # Values that only stand against each other are told too: how well they agree.
    if not solution.tensions and not any(each.origin == "derived" for each in solution.quantities):
        raise insufficient(stated, "Nothing follows from what is given.")
    return ShellDatingResult(
        system=told.system,
        as_of_utc=told.as_of_utc,
        quantities=shell_quantities(solution),
        shells=(),
        tensions=tuple(shell_tensions(solution.tensions, likely_reasons(solution.tensions))),
        not_told=_still_open(solution),
        assumptions=(*stated.assumptions, *_assumptions(solution)),
    )


def _with_radii(
    question: ShellQuestion,
    radii: Sequence[ShellRadius],
    stated: Stated,
    subject: ShellSubject | None,
    ephemeris: ShellEphemeris | None,
    told: _Told,
) -> ShellDatingResult:
    seed = seed_of(question.seed)
    record = None if subject is None else subject.record
    solved = solve_shells(radii, stated, ephemeris, question, record)
    distance = solved.best.get("distance_pc")
    distance_pc = None if distance is None else distance.spread.value
    said: list[str] = []
    main, solution, agrees = solved.main, solved.solution, solved.agrees
    motion = solved.best.get("proper_motion_mas_yr")
    shells: list[DatedShell] = []
    warnings: list[str] = []
    not_told: list[str] = []
    for one in solved.groups:
        ages = ages_of(one.fit, solved.best if one is not main else solution, solved.period, agrees, seed)
        rows = rows_of(one.fit.group, one.counted.index.tolist(), ages)
        rows, light = with_light_time(rows, one.seen, distance_pc)
        said += [one.seen.statement, *light]
        cycles = one.counted.cycle.tolist()
        anchored = anchor(rows, cycles, ephemeris)
        shells += against_ephemeris(rows, cycles, anchored, ephemeris)
        warnings += [*one.counted.warnings, *anchored.warnings]
        not_told += [*one.counted.not_told, *anchored.not_told]
        if one is main:
            main_ages, main_rows, main_shift = ages, rows, anchored.shift
    if main_ages.yr is None and main.fit.fit is None:
        raise insufficient(solved.stated, ONE_RADIUS)
    launch = launch_tension(shells, ephemeris)
    foreseen = foreseen_in(shells, None if motion is None else motion.spread.value, ephemeris)
    typed = stated.get("speed_kms")
    stated_speed = None if typed is None else Measured(typed.value, typed.minus, typed.plus)
    told_of = (*solution.tensions, *expansion_parallax(solved.stated))
    acceleration = _acceleration(solved, question, subject, ephemeris, main_shift)
    reasons = likely_reasons(
        told_of,
        _steps(main),
        None if acceleration is None else acceleration.verdict,
        main.seen.feature,
    )
    tensions = true_tensions(shell_tensions(told_of, reasons), main.seen)
    span, span_sigma = _span(main, main_rows, solved.best)
    fit = main.fit.fit
    youngest = main_ages.periods
    return ShellDatingResult(
        system=told.system,
        as_of_utc=told.as_of_utc,
        quantities=true_quantities(shell_quantities(solved.best), main.seen, stated_speed),
        shells=tuple(shells),
        tensions=(*tensions, launch) if launch is not None else tuple(tensions),
        assignments=main.counted.assignments,
        motions=tuple(motions_of(main.fit, main_shift)),
        acceleration=acceleration,
        chi2=None if fit is None else none_if_nan(fit.chi2),
        degrees_of_freedom=None if fit is None else fit.degrees_of_freedom,
        error_scale=None if fit is None else fit.error_scale,
        phase_of_youngest=None if youngest is None else float(youngest.value[0]),
        phase_of_youngest_sigma=None if youngest is None else none_if_nan(float(youngest.sigma[0])),
        span_yr=span,
        span_sigma_yr=span_sigma,
        foreseen=foreseen,
        not_told=(
            *unmeasured_in_words(foreseen),
            *dict.fromkeys(not_told),
            *_still_open(solution),
        ),
        assumptions=(
            *solved.stated.assumptions,
            *dict.fromkeys(said),
            *_price(main, question),
            *_heaviest(ephemeris),
            *_ways(main_ages, agrees),
            *_assumptions(solution),
        ),
        warnings=tuple(dict.fromkeys(warnings)),
    )


def _acceleration(
    solved: SolvedShells,
    question: ShellQuestion,
    subject: ShellSubject | None,
    ephemeris: ShellEphemeris | None,
    shift: int | None,
) -> ShellAcceleration | None:
    given = solved.stated.get("distance_pc")
    distance = None if given is None else Measured(given.value, given.minus, given.plus)
    launched = launch_time_of(ephemeris, shift) if solved.agrees else None
    return acceleration_of(
        solved.main.fit,
        solved.period if solved.agrees else None,
        None if distance is None else distance.value,
        _launch_radius(question, subject, distance),
        launched,
    )


def _launch_radius(
    question: ShellQuestion, subject: ShellSubject | None, distance: Measured | None
) -> Sided | None:
    stated = question.launch_radius_arcsec
    if stated is not None:
        return sided(stated) if stated.error_known else None
    return None if subject is None else launch_radius_of(subject.record, distance)


def _steps(main: SolvedGroup) -> int | None:
    """Steps from shell to shell that the spacing rests on."""
    steps = int(main.counted.cycle.max() - main.counted.cycle.min())
    return steps if steps > 0 else None


def _span(
    main: SolvedGroup, rows: Sequence[DatedShell], solution: RelationSolution
) -> tuple[float | None, float | None]:
    """Years between the launches of youngest and oldest shell, with the error of the periods between."""
    if len(rows) < 2 or any(row.age_yr is None for row in rows):
        return None, None
    launches = [(row.launched_bmjd_tdb or 0.0) / 365.25 for row in rows]
    if rows[0].launched_bmjd_tdb is None:
        launches = [-(row.age_yr or 0.0) for row in rows]
    period = solution.uncertain("period_yr")
    turns = float(main.counted.cycle.max() - main.counted.cycle.min())
    if turns == 0.0:
        return None, None
    sigma = None if period is None else none_if_nan(turns * period.sigma)
    return max(launches) - min(launches), sigma


def _price(main: SolvedGroup, question: ShellQuestion) -> list[str]:
    """What a missing shell costs, where it mattered."""
    if not main.counted.assignments:
        return []
    prior = MISSING_PRIOR if question.missing_prior is None else question.missing_prior
    return [f"each shell that went unseen costs a factor of {prior:g}, each blend of two {BLEND_PRIOR:g}"]


def _heaviest(ephemeris: ShellEphemeris | None) -> list[str]:
    """Which of several solutions gives the period."""
    if ephemeris is None or len(ephemeris.forecaster.units[0].rows) < 2:
        return []
    return ["several solutions are adopted: the period is that of the largest weight, launches are of all"]


def _ways(ages: Ages, agrees: bool) -> list[str]:
    if ages.yr is None:
        ways = would_do(what_would_do(["spacing_arcsec"], ["period_yr"]))
        return [f"ages are in periods; years would take {ways}"]
    said = [f"ages by {ages.basis}"]
    if not agrees:
        said.append(
            "what is stated does not agree within 3 sigma, so that the ages do not mix it; see the tensions"
        )
    return said


def _still_open(solution: RelationSolution) -> tuple[str, ...]:
    if not solution.unknown:
        return ()
    words = ", ".join(
        name.rsplit("_", 1)[0].replace("_mas", "").replace("_", " ") for name in solution.unknown
    )
    others = would_do(solution.would_do)
    return (f"not known: {words}" + (f"; it would take {others}" if others else ""),)


def _assumptions(solution: RelationSolution) -> tuple[str, ...]:
    unknown = [each.quantity for each in solution.quantities if np.isnan(each.spread.sigma)]
    said = ["the shells keep their speed, and ages count to zero radius"]
    if unknown:
        said.append("an error that is not known is never taken as zero: what rests on it has none")
    return tuple(said)
