"""Observations of every kind: entering and correcting them.

Nothing is erased: a corrected observation supersedes the old row, a wrong one is withdrawn.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from hashlib import blake2b
from typing import Any

from sqlalchemy import Connection, select

from campaign.catalogue.converting import measured_values
from campaign.catalogue.observed import (
    PLAIN_COLUMNS,
    band_uses,
    count_observations,
    get_observation,
    no_observation,
    observations_of,
    photometry_arrays,
)
from campaign.catalogue.sites import find_site
from campaign.catalogue.sources import source_id
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import observations
from campaign.errors import Conflict
from campaign.model.observations import Observation

# What is read is found here too, beside what is written.
__all__ = [
    "add_observation",
    "add_observations",
    "band_uses",
    "count_observations",
    "get_observation",
    "observations_of",
    "photometry_arrays",
    "supersede_observation",
    "withdraw_observation",
]

_KEYS_IN_STATEMENT = 500

# What was measured, as against how well and by whom: two entries alike in these are one observation.
SAMENESS = (
    "system_id",
    "kind",
    "unit",
    "limit_side",
    "band",
    "frequency_ghz",
    "energy_low_kev",
    "energy_high_kev",
    "star",
    "species",
    "feature",
    "measured_at",
    "shell_index",
    "site_id",
    "value",
    "position_angle_deg",
)


def add_observation(writing: Writing, observation: Observation) -> tuple[int, bool]:
    """Enter an observation, unless it is in the catalogue already.

    ``id`` is ignored; an empty ``uid`` is filled in. The site may be given by number or by name.

    Returns
    -------
    (int, bool)
        Its number, and whether it was there already: the same system, instant, kind, band, site and
        value, or the same ``uid``.
    """
    numbers = _Numbers(writing)
    row = _row(writing, observation, numbers)
    known = _already_logged(writing.connection, [row])
    found = known.get(row["uid"]) or known.get(row["sameness"])
    if found is not None:
        return found, True
    row["source_id"] = numbers.source(observation.source)
    return writing.insert(observations, {**row, "operation_id": writing.operation_id}), False


def add_observations(writing: Writing, entries: Sequence[Observation]) -> tuple[int, int]:
    """Enter many observations, and return how many were new and how many were there already."""
    numbers = _Numbers(writing)
    rows = [_row(writing, entry, numbers) for entry in entries]
    seen: set[str] = set(_already_logged(writing.connection, rows))
    fresh = []
    for row, entry in zip(rows, entries, strict=True):
        if row["uid"] in seen or row["sameness"] in seen:
            continue
        seen.update((row["uid"], row["sameness"]))
        # Only now, so that what is known already does not bring a source with it.
        row["source_id"] = numbers.source(entry.source)
        fresh.append(row)
    writing.insert_many(observations, fresh)
    return len(fresh), len(rows) - len(fresh)


def add_past_observation(
    writing: Writing, observation: Observation, *, superseded_by_id: int | None, why: str | None
) -> int:
    """Enter an observation that went out of use in another catalogue; here it never counts.

    The caller made sure that its ``uid`` is new. Without a successor it counts as withdrawn, for ``why``.
    """
    numbers = _Numbers(writing)
    row = _row(writing, observation, numbers) | {"sameness": None, "withdrawn_why": why or None}
    row["source_id"] = numbers.source(observation.source)
    if superseded_by_id is None:
        row["withdrawn_at"] = writing.at
    else:
        row |= {"superseded_by_id": superseded_by_id, "superseded_at": writing.at}
    return writing.insert(observations, {**row, "operation_id": writing.operation_id})


def supersede_observation(writing: Writing, observation_id: int, observation: Observation) -> int:
    """Put a corrected observation in the place of another, which stays in the catalogue.

    Raises
    ------
    NotFound
    Conflict
        When the old one is out of use already, or the corrected one is in the catalogue already.
    """
    refuse_out_of_use(writing.connection, observation_id)
    # The old row gives up its digest first: a correction of the error alone has the same one.
    writing.update(observations, observation_id, {"sameness": None})
    new_id, already_logged = add_observation(writing, observation)
    if already_logged:
        raise Conflict(
            "The corrected observation is in the catalogue already.",
            why=f"It is number {new_id}.",
            hint=f"Withdraw the wrong one instead: campaign withdraw {observation_id} --why ....",
            code="already-logged",
            details={"id": new_id},
        )
    writing.update(observations, observation_id, {"superseded_by_id": new_id, "superseded_at": writing.at})
    return new_id


def withdraw_observation(writing: Writing, observation_id: int, why: str | None = None) -> None:
    """Take an observation out of use, for a reason; it stays in the catalogue.

    Raises
    ------
    NotFound
    Conflict
        When it is out of use already.
    """
    refuse_out_of_use(writing.connection, observation_id)
    writing.update(
        observations,
        observation_id,
        {"sameness": None, "withdrawn_at": writing.at, "withdrawn_why": why or None},
    )


class _Numbers:
    """Numbers of sources and sites by what was typed, each looked up once."""

    def __init__(self, writing: Writing) -> None:
        self._writing = writing
        self._sources: dict[str | None, int | None] = {}
        self._sites: dict[str, int] = {}

    def source(self, text: str | None) -> int | None:
        if text not in self._sources:
            self._sources[text] = source_id(self._writing, text)
        return self._sources[text]

    def site(self, observation: Observation) -> int | None:
        if observation.site_id is not None or not observation.site:
            return observation.site_id
        if observation.site not in self._sites:
            self._sites[observation.site] = find_site(self._writing.connection, observation.site).id
        return self._sites[observation.site]


def _row(writing: Writing, observation: Observation, numbers: _Numbers) -> dict[str, Any]:
    """Everything but the source, which is entered only with an observation that is new."""
    moment = observation.moment
    row: dict[str, Any] = {
        "uid": observation.uid or writing.new_uid(),
        **{name: getattr(observation, name) for name in PLAIN_COLUMNS},
        "bmjd_tdb": moment.bmjd_tdb,
        "time_minus_d": moment.minus_d,
        "time_plus_d": moment.plus_d,
        "time_text": moment.text,
        "time_scale": moment.scale,
        "time_place": moment.place,
        **measured_values("value", observation.value),
        **measured_values("position_angle_deg", observation.position_angle_deg),
        "site_id": numbers.site(observation),
        "entered_at": writing.at,
    }
    row["sameness"] = _sameness(row)
    return row


def _sameness(row: Mapping[str, Any]) -> str:
    """Digest of what was measured; equal for two entries of one observation."""
    parts = [repr(_plain(row[name])) for name in SAMENESS]
    # Conversions round: instants within half of 1e-8 d (0.4 ms) are one.
    parts.append(f"{row['bmjd_tdb']:.8f}")
    if row["value"] is None:
        parts.append(row["text"])
    return blake2b("\x1f".join(parts).encode("utf-8", "backslashreplace"), digest_size=16).hexdigest()


def _plain(value: Any) -> Any:
    """Numbers of numpy and whole numbers as floats, so that equal values have equal digits."""
    if isinstance(value, (int, float)):
        return float(value)
    return value


def _already_logged(connection: Connection, rows: Sequence[Mapping[str, Any]]) -> dict[str, int]:
    """Numbers of observations in the catalogue by ``uid`` and by ``sameness``, as far as in ``rows``."""
    found: dict[str, int] = {}
    for name in ("uid", "sameness"):
        column = observations.c[name]
        keys = [row[name] for row in rows]
        for first in range(0, len(keys), _KEYS_IN_STATEMENT):
            some = keys[first : first + _KEYS_IN_STATEMENT]
            for key, number in connection.execute(select(column, observations.c.id).where(column.in_(some))):
                found[key] = number
    return found


def refuse_out_of_use(connection: Connection, observation_id: int) -> None:
    columns = observations.c
    row = connection.execute(
        select(columns.superseded_by_id, columns.withdrawn_at).where(columns.id == observation_id)
    ).first()
    if row is None:
        raise no_observation(observation_id)
    if row.superseded_by_id is None and row.withdrawn_at is None:
        return
    if row.superseded_by_id is None:
        reason = "It was withdrawn before."
        hint = f"See why: campaign history {observation_id}. What is in use: campaign observations."
    else:
        reason = f"Number {row.superseded_by_id} took its place."
        hint = (
            f"See what became of it: campaign history {observation_id}. Take {row.superseded_by_id} instead."
        )
    raise Conflict(
        f"Observation number {observation_id} is out of use already.",
        why=reason,
        hint=hint,
        code="out-of-use",
        details={"superseded_by": row.superseded_by_id},
    )
