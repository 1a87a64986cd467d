"""Correct one observation, or take observations out of use; the old rows stay."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

from sqlalchemy import Connection

from campaign.catalogue import journal, observations, sites, store, systems
from campaign.catalogue.store import Writing
from campaign.catalogue.telling import Teller
from campaign.errors import CampaignError, InputRefused
from campaign.model.history import Amended, ListedObservation, Withdrawn
from campaign.model.instants import Moment
from campaign.model.kept import Stamp
from campaign.model.observations import Observation
from campaign.model.systems import Site, System
from campaign.reading.instants import read_instant
from campaign.studies.instants import moment_of
from campaign.studies.observations import observations_by_number

# An instant read again agrees with the kept one to this, or its text is not what it was read from.
_SAME_INSTANT_D = 1e-5


def observation_to_amend(db: str, observation_id: int) -> Observation:
    """The observation as it is, so that what is typed can be read for its kind.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    observation_id : int
        Its number.

    Returns
    -------
    Observation
        In use or not.

    Raises
    ------
    NotFound
        If there is none of that number.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    with store.reading(db) as connection:
        return observations.get_observation(connection, observation_id)


def amend_observation(
    db: str,
    stamp: Stamp,
    observation_id: int,
    changes: Mapping[str, Any],
    at_text: str | None = None,
    site_name: str | None = None,
    *,
    rehearse: bool = False,
) -> Amended:
    """Put a corrected observation in the place of another, which stays in the catalogue.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    observation_id : int
        Number of the observation to correct.
    changes : mapping
        Fields of ``Observation`` to replace, in their units.
    at_text : str, optional
        The right instant as typed; a night is that of the site.
    site_name : str, optional
        The right site; empty text for none. The instant is read again for it.
    rehearse : bool
        Do everything and take it back.

    Returns
    -------
    Amended
        ``changed`` is False when the observation reads so already; nothing is written then.

    Raises
    ------
    NotFound, Conflict
        Unknown observation or site; it is out of use, or the corrected one is in the catalogue already.

    Notes
    -----
    Accuracy: instants as in ``campaign.studies.instants``. Source: project convention.
    """
    opened = store.rehearsing if rehearse else store.writing
    with opened(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        before = observations.get_observation(writing.connection, observation_id)
        observations.refuse_out_of_use(writing.connection, observation_id)
        system = systems.get_system(writing.connection, before.system_id)
        corrected, warnings = _corrected(writing.connection, system, before, changes, at_text, site_name)
        if corrected == before:
            return Amended(system.name, observation_id, observation_id, (), False, False, warnings)
        new_id = observations.supersede_observation(writing, observation_id, replace(corrected, id=0, uid=""))
        fields = _told_fields(writing)
        names = ", ".join(field.name for field in fields)
        writing.summarise(f"amended observation {observation_id} of {system.name}: {names}")
    return Amended(system.name, new_id, observation_id, fields, True, not rehearse, warnings)


def withdraw_observations(
    db: str, stamp: Stamp, numbers: Sequence[int], why: str, *, rehearse: bool = False
) -> Withdrawn:
    """Take observations out of use, all or none; they stay in the catalogue.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    numbers : sequence of int
        Numbers of observations.
    why : str
        The reason, kept with each.
    rehearse : bool
        Do everything and take it back.

    Returns
    -------
    Withdrawn
        As they are now.

    Raises
    ------
    InputRefused
        Without a reason.
    NotFound, Conflict
        One of them is not there, or is out of use already.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    if not why.strip():
        raise InputRefused(
            "The observations are to be withdrawn for no reason.",
            why="Whoever meets them later should learn what was wrong with them.",
            hint='For example --why "wrong star in the aperture".',
            code="reason-missing",
        )
    wanted = list(dict.fromkeys(numbers))
    opened = store.rehearsing if rehearse else store.writing
    with opened(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        for number in wanted:
            observations.withdraw_observation(writing, number, why)
        found = observations_by_number(writing.connection, wanted)
        writing.summarise(f"withdrew {_counted(found)}: {why}")
    return Withdrawn(found, why, not rehearse)


def _counted(found: Sequence[ListedObservation]) -> str:
    names = ", ".join(dict.fromkeys(row.system for row in found))
    if len(found) == 1:
        return f"observation {found[0].observation.id} of {names}"
    return f"{len(found)} observations of {names}"


def _told_fields(writing: Writing) -> tuple[Any, ...]:
    effects = journal.effects_of(writing.connection, writing.operation_id)
    told = Teller(writing.connection).tell(writing.operation_id, effects)
    return next(change.fields for change in told if change.subject.startswith("observation "))


def _corrected(
    connection: Connection,
    system: System,
    before: Observation,
    changes: Mapping[str, Any],
    at_text: str | None,
    site_name: str | None,
) -> tuple[Observation, tuple[str, ...]]:
    old_site = None if before.site_id is None else sites.get_site(connection, before.site_id)
    site = old_site
    if site_name is not None:
        site = sites.find_site(connection, site_name) if site_name else None
    moment = before.moment
    warnings: tuple[str, ...] = ()
    if at_text is not None:
        moment = _read_moment(at_text, system, site)
    elif site != old_site:
        moment, warnings = _moment_elsewhere(before.moment, system, old_site, site)
    corrected = replace(
        before,
        **changes,
        moment=moment,
        site_id=None if site is None else site.id,
        site=None if site is None else site.name,
    )
    return corrected, warnings


def _read_moment(text: str, system: System, site: Site | None) -> Moment:
    return moment_of(read_instant(text, longitude_deg_east=_longitude(site)), system, site)


def _moment_elsewhere(
    moment: Moment, system: System, old_site: Site | None, site: Site | None
) -> tuple[Moment, tuple[str, ...]]:
    """The same reading of the clock at another site: nights and light time differ."""
    if moment.place != "observatory":
        return moment, ()
    read = []
    for place in (old_site, site):
        try:
            typed = read_instant(
                moment.text,
                default_scale=moment.scale,
                default_place=moment.place,
                longitude_deg_east=_longitude(place),
            )
        except CampaignError:
            return moment, _KEPT
        read.append(moment_of(typed, system, place))
    if abs(read[0].bmjd_tdb - moment.bmjd_tdb) > _SAME_INSTANT_D:
        return moment, _KEPT
    if (read[0].minus_d, read[0].plus_d) != (moment.minus_d, moment.plus_d):
        # The error was given apart from the text.
        return replace(read[1], minus_d=moment.minus_d, plus_d=moment.plus_d), ()
    return read[1], ()


_KEPT = ("the instant was kept as it is: its text alone does not give it again, so give --at too",)


def _longitude(site: Site | None) -> float | None:
    return None if site is None else site.longitude_deg_east
