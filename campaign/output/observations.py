"""Observations as a list, one corrected, some withdrawn: on the screen and as JSON."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from campaign.model.history import Amended, ListedObservation, ObservationList, Withdrawn
from campaign.model.measured import Limit
from campaign.model.observations import Observation
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.history import UNIT_NAMES, both, field_data, iso
from campaign.output.tables import Cell, Column, fits, print_table
from campaign.output.values import number

_COLUMNS = {
    "N": Column("N", align="right"),
    "UTC": Column("UTC at the barycentre"),
    "system": Column("system", shrinks=True, min_width=10),
    "kind": Column("kind", drop=3),
    "of": Column("of", shrinks=True, min_width=6),
    "value": Column("value", shrinks=True, min_width=14),
    "quality": Column("quality", drop=4),
    "site": Column("site", shrinks=True, drop=5, min_width=10),
    "source": Column("source", shrinks=True, drop=7, min_width=12),
    "by": Column("entered by", shrinks=True, drop=8, min_width=10),
    "note": Column("note", shrinks=True, drop=6, min_width=12),
    "fate": Column("out of use", shrinks=True, drop=1, min_width=12),
}

# Widths at which a column need not be folded.
_ROOM = {"system": 22, "of": 26, "value": 26, "site": 18, "source": 28, "by": 18, "note": 30, "fate": 30}


def render_observations(screen: Screen, found: ObservationList) -> None:
    """One line an observation; columns that say nothing, or the same of all, are left away."""
    if not found.rows:
        screen.wrapped("No observation passes the filters.")
        return
    rows = [_cells(row) for row in found.rows]
    heading: list[str] = []
    unneeded = {name for name in _COLUMNS if not any(row[name].text for row in rows)}
    for name in ("system", "kind"):
        different = {row[name].text for row in rows}
        if len(different) == 1:
            heading += different
            unneeded.add(name)
    if all(row["quality"].text in ("good", "") for row in rows):
        unneeded.add("quality")
    if heading:
        screen.heading(", ".join(heading))
    names = [name for name in _COLUMNS if name not in unneeded]
    cells = [[row[name] for name in names] for row in rows]
    # One line an observation where the window allows it: rather fewer columns than folded ones.
    roomy = [replace(_COLUMNS[name], min_width=_ROOM.get(name, _COLUMNS[name].min_width)) for name in names]
    needed = [i for i, column in enumerate(roomy) if not column.drop]
    if fits(screen, [roomy[i] for i in needed], [[row[i] for i in needed] for row in cells]):
        print_table(screen, roomy, cells)
    else:
        print_table(screen, [_COLUMNS[name] for name in names], cells)


def _cells(row: ListedObservation) -> dict[str, Cell]:
    observation = row.observation
    style = "" if row.in_use else "dim"
    when = row.utc or f"MJD {observation.moment.bmjd_tdb:.4f} TDB"
    texts = {
        "N": str(observation.id),
        "UTC": when[:16].replace("T", " ") if row.utc else when,
        "system": row.system,
        "kind": observation.kind,
        "of": what_of(observation),
        "value": value_of(observation),
        "quality": observation.quality if observation.value is not None else "",
        "site": observation.site or "",
        "source": observation.source or "",
        "by": row.entered_by,
        "note": observation.text,
        "fate": fate(row),
    }
    return {name: Cell(text, style) for name, text in texts.items()}


def what_of(observation: Observation) -> str:
    """What the value belongs to: a band, a star, a line, a feature."""
    parts = [
        observation.band or "",
        observation.photometric_system or "",
        f"star {observation.star}" if observation.star else "",
        observation.species or "",
        f"{observation.frequency_ghz:g} GHz" if observation.frequency_ghz is not None else "",
        f"{observation.energy_low_kev:g} to {observation.energy_high_kev:g} keV"
        if observation.energy_low_kev is not None
        else "",
        f"shell {observation.shell_index}" if observation.shell_index is not None else "",
        observation.feature or "",
        observation.measured_at or "",
    ]
    return " ".join(part for part in parts if part)


def value_of(observation: Observation) -> str:
    """The value with its error and unit, or the limit; a position angle beside it."""
    unit = UNIT_NAMES.get(observation.unit or "", observation.unit or "")
    value = observation.value
    if value is None:
        return ""
    if observation.limit_side is not None:
        told = number(Limit(value.value, observation.limit_side, observation.limit_sigma or 3.0), unit)
    else:
        told = number(value, unit)
    if observation.position_angle_deg is not None:
        told += f" at {number(observation.position_angle_deg, 'deg')}"
    return told


def fate(row: ListedObservation) -> str:
    """Why an observation is out of use; empty when it counts."""
    if row.superseded_by_id is not None:
        return f"replaced by {row.superseded_by_id}"
    if row.withdrawn_at is not None:
        return row.withdrawn_why or "taken back by an undo"
    return ""


def observations_json(found: ObservationList, as_of: str) -> str:
    """Document ``observation-list``."""
    data = {"found": found.found, "observations": [observation_data(row) for row in found.rows]}
    return document("observation-list", data, as_of=as_of, warnings=found.warnings)


def observation_data(row: ListedObservation) -> dict[str, Any]:
    """One observation for a program; ``value`` is in ``unit``, and the bound for a limit."""
    observation: dict[str, Any] = plain(row.observation)
    for name in ("system_id", "site_id"):
        observation.pop(name)
    moment = observation.pop("moment")
    return {
        "id": observation.pop("id"),
        "system": row.system,
        "bmjd_tdb": moment["bmjd_tdb"],
        "bmjd_tdb_minus_d": moment["minus_d"],
        "bmjd_tdb_plus_d": moment["plus_d"],
        "utc": row.utc,
        "as_typed": {name: moment[name] for name in ("text", "scale", "place")},
        **observation,
        "entered_at": iso(row.entered_at),
        "entered_by": row.entered_by,
        "operation": row.operation_id,
        "in_use": row.in_use,
        "superseded_by": row.superseded_by_id,
        "superseded_at": iso(row.superseded_at),
        "withdrawn_at": iso(row.withdrawn_at),
        "withdrawn_why": row.withdrawn_why,
    }


def render_amended(screen: Screen, amended: Amended) -> None:
    """What a correction changed."""
    if not amended.changed:
        screen.wrapped(f"observation {amended.id} of {amended.system} reads so already; nothing was changed")
        return
    did = "amended" if amended.written else "would amend"
    by = f", now {amended.id}" if amended.written else ""
    screen.wrapped(f"{did} observation {amended.replaced_id} of {amended.system}{by}")
    for field in amended.fields:
        before, after = both(field)
        screen.wrapped(f"{field.name}: {before} → {after}", label="  ", hang=4)
    if amended.written:
        screen.wrapped(f"number {amended.replaced_id} is kept: campaign history {amended.id}")


def amended_json(amended: Amended, as_of: str) -> str:
    """Document ``amend``."""
    data = {
        "system": amended.system,
        "id": amended.id if amended.written else None,
        "replaces": amended.replaced_id,
        "changed": amended.changed,
        "written": amended.written,
        "fields": [field_data(field) for field in amended.fields],
    }
    return document("amend", data, as_of=as_of, warnings=amended.warnings)


def render_withdrawn(screen: Screen, withdrawn: Withdrawn) -> None:
    """Which observations went out of use."""
    did = "withdrew" if withdrawn.written else "would withdraw"
    for row in withdrawn.observations:
        observation = row.observation
        when = (row.utc or f"MJD {observation.moment.bmjd_tdb:.4f}").partition("T")[0]
        about = " ".join(p for p in (observation.kind, what_of(observation), value_of(observation)) if p)
        screen.wrapped(f"{did} {observation.id}: {row.system}, {about}, {when}", hang=2)
    if withdrawn.written:
        screen.wrapped(f"reason kept: {withdrawn.why}; take it back with: campaign undo", hang=2)


def withdrawn_json(withdrawn: Withdrawn, as_of: str) -> str:
    """Document ``withdraw``."""
    data = {
        "why": withdrawn.why,
        "written": withdrawn.written,
        "observations": [observation_data(row) for row in withdrawn.observations],
    }
    return document("withdraw", data, as_of=as_of)
