"""Log one instant's observations of a system, and say what the catalogue now knows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import UTC, datetime

import numpy as np
from sqlalchemy import Connection

from campaign.catalogue import observations, records, sites, store, systems
from campaign.model.instants import Moment, TypedInstant
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.shown import Logged, LoggedEntry
from campaign.model.suspicion import Suspicion
from campaign.model.systems import Site
from campaign.reading.instants import describe_instant, read_instant
from campaign.studies.instants import moment_of, spoken_moment
from campaign.studies.quietness import (
    CONSECUTIVE_D,
    CONSECUTIVE_SIGMA,
    MINIMUM_LEVEL_POINTS,
    JudgedPhotometry,
    suspicious_points,
)
from campaign.studies.suspicion import recent_start, suspicion_of

_MJD_OF_UNIX_EPOCH = 40_587.0
_SAME_INSTANT_D = 1e-7


def log_observations(
    db: str,
    stamp: Stamp,
    system_name: str,
    drafts: Sequence[Observation],
    at_text: str,
    site_name: str | None,
) -> Logged:
    """Log observations of one system at one instant, all or none.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    system_name : str
        Name or alias.
    drafts : sequence of Observation
        Values in their units; system, moment and site are filled in here.
    at_text : str
        The instant as typed; a night is that of the site.
    site_name : str or None
        Where it was observed.

    Returns
    -------
    Logged
        The same observation again is not added twice.

    Raises
    ------
    NotFound
        Unknown system or site; the nearest names are in the details.

    Notes
    -----
    Accuracy: the instant as in ``campaign.studies.instants``; verdicts as in
    ``campaign.studies.quietness``.

    Source: DEVELOPERS.md (quiet observation).
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system = systems.find_system(writing.connection, system_name)
        site = sites.find_site(writing.connection, site_name) if site_name is not None else None
        longitude = site.longitude_deg_east if site is not None else None
        instant = read_instant(at_text, longitude_deg_east=longitude)
        moment = moment_of(instant, system, site)
        measured = any(draft.kind not in ("remark", "attempt") for draft in drafts)
        entries, warnings = [], _warnings(instant, stamp.at, site, measured)
        for draft in drafts:
            observation = replace(
                draft,
                system_id=system.id,
                moment=moment,
                site_id=site.id if site is not None else None,
                site=site.name if site is not None else None,
                observer=draft.observer or stamp.who,
            )
            number, known = observations.add_observation(writing, observation)
            if known:
                stored = observations.get_observation(writing.connection, number)
                warnings += _not_kept(stored, observation)
                observation = stored
            entries.append(LoggedEntry(number, known, observation))
        kinds = ", ".join(sorted({e.observation.kind for e in entries}))
        writing.summarise(f"logged {kinds} of {system.name}")
        knowledge, suspicion = _knowledge(writing.connection, system.id, moment, entries)
    return Logged(
        system=system.name,
        understood=describe_instant(instant),
        moment=moment,
        moment_text=spoken_moment(moment),
        site=site.name if site is not None else None,
        entries=tuple(entries),
        knowledge=knowledge,
        suspected=suspicion is not None,
        suspicion=suspicion,
        warnings=tuple(warnings),
    )


def _not_kept(stored: Observation, typed: Observation) -> list[str]:
    """The same value again with another error is not a second observation, and not a correction either."""
    old, new = stored.value, typed.value
    if old is None or new is None or (old.minus, old.plus) == (new.minus, new.plus) or not new.error_known:
        return []
    return [
        f"observation {stored.id} keeps the error that it has, {_error(old)}; the one typed now, "
        f"{_error(new)}, was not kept"
    ]


def _error(value: Measured) -> str:
    if value.minus is None or value.plus is None:
        return "unknown"
    return f"±{value.plus:g}" if value.minus == value.plus else f"+{value.plus:g} -{value.minus:g}"


def _warnings(instant: TypedInstant, now: datetime, site: Site | None, measured: bool) -> list[str]:
    warnings = []
    today = _MJD_OF_UNIX_EPOCH + now.astimezone(UTC).timestamp() / 86_400.0
    if instant.mjd > today + 1.0:
        warnings.append("the observation is dated in the future")
    # Only who gives a clock time is told of the 0.021 s that the place on Earth can make.
    precise = instant.plus_d is not None and instant.plus_d * 86_400.0 < 0.1
    if measured and site is None and instant.place == "observatory" and precise:
        warnings.append("no site given: the light time is that of the geocentre, within 0.021 s")
    return warnings


def _knowledge(
    connection: Connection, system_id: int, moment: Moment, entries: Sequence[LoggedEntry]
) -> tuple[tuple[str, ...], Suspicion | None]:
    """What the catalogue now knows, in a sentence a band or a kind; and an onset that is now suspected."""
    lines: list[str] = []
    suspicion = None
    bands = [e.observation for e in entries if e.observation.kind == "photometry"]
    if bands:
        record, judged = _judge_now(connection, system_id, moment.bmjd_tdb)
        for observation in bands:
            line, found = _verdict(record, judged, observation)
            lines.append(line)
            suspicion = found or suspicion
        if suspicion is not None:
            lines.append(f"confirm it with: {suspicion.confirm}")
            lines.append(f"or reject it with: {suspicion.reject}")
    for kind in dict.fromkeys(e.observation.kind for e in entries):
        if kind == "photometry":
            continue
        count = len(observations.observations_of(connection, [system_id], [kind]))
        lines.append(f"{count} {kind if count == 1 else _plural(kind)} of this system logged so far")
    return tuple(lines), suspicion


def _plural(kind: str) -> str:
    return {
        "velocity": "velocities",
        "flux": "fluxes",
    }.get(kind, kind + "s")


def _judge_now(connection: Connection, system_id: int, as_of: float) -> tuple[SystemRecord, JudgedPhotometry]:
    from campaign.studies.judging import judge

    record = records.load_records(connection, [system_id], include_retired=True)[0]
    arrays = observations.photometry_arrays(connection, [system_id])[system_id]
    return record, judge(record, arrays, max(as_of, float(arrays.bmjd_tdb.max())))


def _verdict(
    record: SystemRecord, judged: JudgedPhotometry, observation: Observation
) -> tuple[str, Suspicion | None]:
    band, at = observation.band or "?", observation.moment.bmjd_tdb
    if observation.quality != "good":
        return f"{band}: {observation.quality}, so nothing is concluded from it", None
    here = np.flatnonzero(np.abs(judged.bmjd_tdb - at) < 1e-7)
    position = next((int(i) for i in here if judged.band[int(i)] == observation.band), None)
    if position is None or (np.isnan(judged.excess_sigma[position]) and not judged.is_quiet[position]):
        if position is not None and observation.limit_side is not None:
            return f"{band}: the limit says nothing about an excess here", None
        return (
            f"{band}: no stellar level yet; it takes {MINIMUM_LEVEL_POINTS} points of this band and source "
            "outside episodes"
        ), None
    if judged.is_quiet[position]:
        latest = at >= float(judged.bmjd_tdb.max()) - 1e-7
        return f"{band}: quiet, no onset {'yet' if latest else 'then'}", None
    sigma = float(judged.excess_sigma[position])
    if sigma < CONSECUTIVE_SIGMA:
        return f"{band}: too uncertain to tell an excess", None
    text = f"{band}: {sigma:.1f} sigma above the stellar level"
    known = _known_episode(record, at)
    if known is not None:
        return f"{text}, {known}", None
    # The same criteria as for the status: one strong excess, or a second one within a month.
    month = suspicious_points(judged, at - CONSECUTIVE_D, at)
    if month.size and judged.bmjd_tdb[month[-1]] >= at - _SAME_INSTANT_D:
        # Since when: of all that is suspicious and not yet explained.
        suspicion = suspicion_of(record, judged, recent_start(record, at), at)
        if suspicion is not None:
            return f"{text}: onset suspected since {suspicion.since_utc[:10]}", suspicion
    return f"{text}: observe again within {CONSECUTIVE_D:.0f} d", None


def _known_episode(record: SystemRecord, at: float) -> str | None:
    """The confirmed episode that explains an excess."""
    from campaign.studies.judging import confirmed_spans

    for start, end, cycle in confirmed_spans(record):
        if start <= at <= end:
            return "as in the confirmed episode" + ("" if cycle is None else f" of cycle {cycle}")
    return None
