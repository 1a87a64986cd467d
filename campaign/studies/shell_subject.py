"""What is known of the system whose shells are asked about: radii, distance, winds, and its ephemeris."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from datetime import datetime, timedelta

import numpy as np

from campaign.model.instants import TypedInstant
from campaign.model.measured import Limit, Measured, Range
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.shellquestion import ShellRadius
from campaign.studies.forecast import Forecaster
from campaign.studies.instants import axis_instant
from campaign.studies.learned import LearnedDates
from campaign.studies.preparing import Question, prepare
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.watch import MJD_ZERO, load_sample_campaign, mjd_of

YEAR_D = 365.25


@dataclass(frozen=True, slots=True)
class ShellSubject:
    """One system: its record, the shells logged of it, and the date that stands in for today, if any."""

    record: SystemRecord
    observations: tuple[Observation, ...]
    own_as_of: float | None = None
    is_sample: bool = False


def load_subject(
    db: str, name: str, known_at: TypedInstant | None, as_of: TypedInstant | None, solution: str | None
) -> ShellSubject:
    """A system of the catalogue with its logged shells.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    name : str
        Name or alias.
    known_at, as_of : TypedInstant or None
        Hide entries, or observations, made after it.
    solution : str or None
        Label of the solution that gives the ephemeris, in place of what is adopted.

    Returns
    -------
    ShellSubject
        Radii in arcsec, instants ``bmjd_tdb``.

    Raises
    ------
    NotFound
        Unknown system or solution.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    from campaign.catalogue import info, observed, records, store, systems

    entered = None if known_at is None else MJD_ZERO + timedelta(days=known_at.mjd)
    until = None if as_of is None else axis_instant(as_of)
    with store.reading(db) as connection:
        number = systems.find_system(connection, name).id
        record = records.load_records(connection, [number], known_at=entered, include_retired=True)[0]
        found = observed.observations_of(
            connection, [number], ["shell"], as_of_bmjd_tdb=until, known_at=entered
        )
        own = info.read_info(connection).get("sample_as_of")
    own_as_of = None if own is None else mjd_of(datetime.fromisoformat(own.replace("Z", "+00:00")))
    return ShellSubject(_with_solution(record, solution), tuple(found), own_as_of, own is not None)


def sample_subject(name: str, as_of: TypedInstant | None, solution: str | None) -> ShellSubject:
    """A system of the invented sample, without any database.

    Parameters
    ----------
    name : str
        Name or alias.
    as_of : TypedInstant or None
        Hide observations made after it.
    solution : str or None
        Label of the solution that gives the ephemeris.

    Returns
    -------
    ShellSubject
        Radii in arcsec, instants ``bmjd_tdb``.

    Raises
    ------
    NotFound
        Unknown system or solution.

    Notes
    -----
    Accuracy: not applicable. Source: the project's own invented data.
    """
    campaign = load_sample_campaign([name], with_shells=True)
    record = campaign.records[0]
    until = np.inf if as_of is None else axis_instant(as_of)
    logged = campaign.shells.get(record.system.id, ())
    found = tuple(each for each in logged if each.moment.bmjd_tdb <= until)
    return ShellSubject(_with_solution(record, solution), found, campaign.own_as_of, True)


def today_of(subject: ShellSubject | None, now: datetime, as_of: TypedInstant | None) -> float:
    """The instant of the question.

    Parameters
    ----------
    subject : ShellSubject or None
        Its own date stands in for the clock, if it has one.
    now : datetime
        The clock, aware.
    as_of : TypedInstant or None
        Stands in for both.

    Returns
    -------
    float
        ``bmjd_tdb``.

    Notes
    -----
    Accuracy: no light time, up to 8.4 min. Source: project convention.
    """
    if as_of is not None:
        return axis_instant(as_of)
    if subject is not None and subject.own_as_of is not None:
        return subject.own_as_of
    return mjd_of(now)


def forecaster_of(
    record: SystemRecord, as_of: float, draws: int | None = None, seed: int | None = None
) -> Forecaster:
    """The forecaster of one system, for the launches of its cycles.

    Parameters
    ----------
    record : SystemRecord
        The system.
    as_of : float
        Instant of the question, ``bmjd_tdb``; later episodes are not looked at.
    draws, seed : int, optional
        Of the random draws (dimensionless).

    Returns
    -------
    Forecaster
        With one unit.

    Notes
    -----
    Accuracy: see ``campaign.studies.forecast``. Source: DEVELOPERS.md (Date).
    """
    question = Question(as_of, as_of, as_of + 1.0, draws=draws or DEFAULT_DRAWS, seed=seed_of(seed))
    prepared = prepare([record], {}, question)
    return Forecaster(prepared.rows, prepared.units, prepared.learned, question.draws, question.seed)


def seed_of(seed: int | None) -> int:
    """The seed asked for, else the usual one.

    Parameters
    ----------
    seed : int or None
        As asked (dimensionless).

    Returns
    -------
    int
        Seed (dimensionless).

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return DEFAULT_SEED if seed is None else seed


def radii_of(observations: Iterable[Observation]) -> tuple[ShellRadius, ...]:
    """Logged shells as radii; what is marked bad, and limits, are left out.

    Parameters
    ----------
    observations : iterable of Observation
        Shells: radius in arcsec, instants ``bmjd_tdb``.

    Returns
    -------
    tuple of ShellRadius
        By image and then by radius. Radii of one instant, instrument and source are of one image.

    Notes
    -----
    Accuracy: nothing is computed. Source: the catalogue.
    """
    found = []
    for each in observations:
        if each.kind != "shell" or each.value is None or each.limit_side is not None or each.quality == "bad":
            continue
        moment = each.moment
        found.append(
            ShellRadius(
                radius_arcsec=each.value,
                index=each.shell_index,
                bmjd_tdb=moment.bmjd_tdb,
                bmjd_sigma_d=max(moment.minus_d or 0.0, moment.plus_d or 0.0),
                image=" ".join((each.instrument or "", each.source or "", each.band or "")).strip(),
                measured_at=each.measured_at,
                plate_scale_error=each.plate_scale_error,
                feature=each.feature,
                position_angle_deg=each.position_angle_deg,
                observation_id=each.id or None,
            )
        )
    return tuple(sorted(found, key=lambda r: (r.bmjd_tdb or 0.0, r.image, r.radius_arcsec.value)))


def period_of(forecaster: Forecaster) -> tuple[Measured, str] | None:
    """The period of a system in years, and what it is from.

    Parameters
    ----------
    forecaster : Forecaster
        Of one system.

    Returns
    -------
    (Measured, str) or None
        Julian years with errors and a label; the solution of largest weight speaks, else the line through
        dated episodes. None where nothing gives a period.

    Notes
    -----
    Accuracy: as stated; a range counts as evenly distributed.

    Source: DEVELOPERS.md (Solution; learned).
    """
    unit = forecaster.units[0]
    heaviest = max(range(len(unit.rows)), key=lambda i: unit.weights[i])
    row = forecaster.rows[unit.rows[heaviest]]
    period = None if row.solution is None else row.solution.period_d
    if isinstance(period, Measured):
        return period.scaled(1.0 / YEAR_D), "orbit"
    if isinstance(period, Range):
        sigma = (period.high - period.low) / np.sqrt(12.0) / YEAR_D
        return Measured(0.5 * (period.low + period.high) / YEAR_D, float(sigma), float(sigma)), "orbit"
    learned = forecaster.learned.get(unit.rows[heaviest])
    if learned is not None and not isinstance(period, Limit):
        return _learned_period(learned), "episodes"
    return None


def _learned_period(learned: LearnedDates) -> Measured:
    """Slope of the line through the dated episodes, its scatter marginalised."""
    from campaign.physics.recurrence import fit_recurrence

    event = max(learned.events(), key=lambda e: (np.unique(learned.cycles[e]).size, e == "onset"))
    fit = fit_recurrence(
        learned.cycles[event], learned.dates_d[event], learned.sigmas_d[event], learned.period_d,
        learned.period_sigma_d,
    )  # fmt: skip
    mean = float(fit.weights @ fit.slopes_d)
    variance = float(fit.weights @ (fit.covariances[2] + (fit.slopes_d - mean) ** 2))
    sigma = float(np.sqrt(variance)) / YEAR_D
    return Measured((fit.base_period_d + mean) / YEAR_D, sigma, sigma)


def _with_solution(record: SystemRecord, label: str | None) -> SystemRecord:
    if label is None:
        return record
    from campaign.studies.systems import require_solution

    chosen = require_solution(record, label)
    others = [replace(s, adopted=False, weight=None) for s in record.solutions if s is not chosen]
    return replace(record, solutions=(replace(chosen, adopted=True, weight=None), *others))
