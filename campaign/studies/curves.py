"""Values against time, by system and band, star or feature, each with what is thought of it."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np
from sqlalchemy import Connection

from campaign.catalogue import listing, observations, records, store
from campaign.model.curves import Curve, CurvePoint, PointState
from campaign.model.history import ListedObservation
from campaign.model.observations import Observation
from campaign.studies.observations import Wanted, filters_of
from campaign.studies.quietness import CONSECUTIVE_SIGMA

_KINDS = ("photometry", "flux", "velocity", "line", "position", "shell")


def curves_of(db: str, wanted: Wanted) -> tuple[Curve, ...]:
    """The observations that pass the filters as curves, by system, kind and band.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    wanted : Wanted
        The filters.

    Returns
    -------
    tuple of Curve
        Points in order of time; attempts and remarks have no value and are left out.

    Raises
    ------
    NotFound
        Unknown system or site.

    Notes
    -----
    Accuracy: photometry is judged as in ``campaign.studies.quietness``, from all good points of the system
    whatever the filters. Source: DEVELOPERS.md (quiet observation).
    """
    with store.reading(db) as connection:
        rows, _ = listing.find_observations(connection, filters_of(connection, wanted))
        valued = [row for row in rows if row.observation.value is not None]
        states = _judged(connection, valued)
    groups: dict[tuple[str, str, str, str], list[CurvePoint]] = defaultdict(list)
    for row in valued:
        observation = row.observation
        key = (row.system, observation.kind, _of(observation), observation.unit or "")
        groups[key].append(_point(row, states))
    ordered = sorted(groups, key=lambda key: (key[0].casefold(), _KINDS.index(key[1]), key[2], key[3]))
    return tuple(Curve(*key, downward=key[1] == "photometry", points=tuple(groups[key])) for key in ordered)


def _of(observation: Observation) -> str:
    parts = [
        observation.band or "",
        observation.photometric_system or "",
        f"star {observation.star}" if observation.star else "",
        observation.species or "",
        f"{observation.frequency_ghz:g} GHz" if observation.frequency_ghz is not None else "",
        f"{observation.energy_low_kev:g}-{observation.energy_high_kev:g} keV"
        if observation.energy_low_kev is not None
        else "",
        observation.feature or "",
    ]
    return " ".join(part for part in parts if part)


def _point(row: ListedObservation, states: dict[int, PointState]) -> CurvePoint:
    observation = row.observation
    assert observation.value is not None
    state: PointState
    if not row.in_use:
        state = "out of use"
    elif observation.quality != "good":
        state = observation.quality
    elif observation.limit_side is not None:
        state = observation.limit_side
    else:
        state = states.get(
            observation.id, "level unknown" if observation.kind == "photometry" else "measured"
        )
    value = observation.value
    return CurvePoint(observation.moment.bmjd_tdb, value.value, value.minus, value.plus, state)


def _judged(connection: Connection, rows: Sequence[ListedObservation]) -> dict[int, PointState]:
    """Verdicts on measured magnitudes, by number of the observation."""
    from campaign.studies.judging import judge

    wanted = {row.observation.system_id for row in rows if row.observation.kind == "photometry"}
    states: dict[int, PointState] = {}
    if not wanted:
        return states
    arrays = observations.photometry_arrays(connection, wanted)
    for record in records.load_records(connection, wanted, include_retired=True):
        own = arrays.get(record.system.id)
        if own is None:
            continue
        judged = judge(record, own, float(own.bmjd_tdb.max()))
        # The verdicts are those of the good points, in the same order of time.
        for number, sigma, quiet in zip(
            own.id[own.quality == "good"], judged.excess_sigma, judged.is_quiet, strict=True
        ):
            if quiet:
                states[int(number)] = "quiet"
            elif not np.isnan(sigma) and sigma >= CONSECUTIVE_SIGMA:
                states[int(number)] = "excess"
    return states
