"""Columns of the tables as fields that people speak of: grouped, named, with their unit."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from datetime import datetime
from typing import Any, Final

from sqlalchemy import Table

from campaign.catalogue.tables import dust_rules, observations, solutions
from campaign.model.history import FieldChange
from campaign.model.instants import Moment
from campaign.model.measured import Limit, Measured, Range

# What the program keeps for itself.
_OWN: Final = frozenset(
    {
        "id", "uid", "entered_at", "operation_id", "sameness", "former_sameness", "withdrawn_at",
        "superseded_at", "superseded_by_id", "ended_at", "adopted_at", "set_at", "decided_at", "system_id",
        "solution_id", "name_key", "label_key", "source_key", "name_rank", "star_of",
        "kept_at", "known_at", "as_of_bmjd_tdb", "draws", "seed", "program_version",
        "from_bmjd_tdb", "until_bmjd_tdb",
    }
)  # fmt: skip
# How a unit is written at the end of a column's name; the longest first.
_UNITS: Final = (
    ("_mas_yr", "mas/yr"), ("_msun_yr", "Msun/yr"), ("_bmjd_tdb", "BMJD_TDB"), ("_arcsec", "arcsec"),
    ("_deg_east", "deg"), ("_deg", "deg"), ("_kms", "km/s"), ("_msun", "Msun"), ("_lsun", "Lsun"),
    ("_rsun", "Rsun"), ("_mas", "mas"), ("_ghz", "GHz"), ("_kev", "keV"), ("_jyr", "Julian year"),
    ("_au", "au"), ("_pc", "pc"), ("_d", "d"), ("_k", "K"), ("_m", "m"),
)  # fmt: skip
_NAMES: Final[Mapping[str, str]] = {
    "ra_deg": "right ascension",
    "dec_deg": "declination",
    "pm_ra_cosdec_mas_yr": "proper motion in right ascension",
    "pm_dec_mas_yr": "proper motion in declination",
    "cycle_anchor_bmjd_tdb": "epoch of cycle 0",
    "cycle_anchor_period_d": "period that counts cycles",
    "k_a_kms": "K of star A",
    "k_b_kms": "K of star B",
    "longitude_deg_east": "longitude east",
    "omega_of": "star of omega",
    "epoch_marks": "the epoch marks",
    "epoch_cycle": "cycle of the epoch",
    "withdrawn_why": "reason",
    "measured_at": "measured at",
    "text": "note",
    "site_id": "site",
    "source_id": "source",
    "replaces_id": "replaces episode",
}
_OFFSETS: Final = frozenset({"onset_offset", "maximum_offset", "end_offset"})
_OFFSET_UNITS: Final = {"phase": "periods", "lag": "d"}

Stored = Mapping[str, Any]


def field_changes(
    table: Table[Any], before: Stored, after: Stored, changed: frozenset[str], names_of: Mapping[str, Any]
) -> tuple[FieldChange, ...]:
    """The fields that hold one of the ``changed`` columns, before and after.

    Parameters
    ----------
    table
        Whose columns they are.
    before, after
        The whole row, empty where there was none.
    changed
        Names of the columns that differ.
    names_of
        By column that refers elsewhere, what stands for its numbers.
    """
    found = []
    for name, columns in _groups(table):
        if changed.intersection(columns):
            old, new = (_value(table, name, row, names_of) for row in (before, after))
            if old != new:
                unit = _unit(table, name, after or before)
                found.append(FieldChange(_NAMES.get(name) or _spoken(name), unit, old, new))
    return tuple(found)


def _groups(table: Table[Any]) -> Iterator[tuple[str, tuple[str, ...]]]:
    """First column and all columns of each field, in the order of the table."""
    names = [column.name for column in table.c]
    taken: set[str] = set(_OWN)
    for name in names:
        if name in taken:
            continue
        columns = _columns_of_field(table, name, names)
        taken.update(columns)
        yield name, columns


def _columns_of_field(table: Table[Any], name: str, names: list[str]) -> tuple[str, ...]:
    if table is observations and name == "bmjd_tdb":
        return (name, *(column for column in names if column.startswith("time_")))
    if table is observations and name == "value":
        return ("value", "value_minus", "value_plus", "unit", "limit_side", "limit_sigma")
    if table is solutions and name.startswith("period_"):
        return tuple(column for column in names if column.startswith("period_"))
    if name.endswith("_bmjd_tdb") and f"{name.removesuffix('_bmjd_tdb')}_scale" in names:
        prefix = name.removesuffix("bmjd_tdb")
        return tuple(prefix + part for part in ("bmjd_tdb", "minus_d", "plus_d", "text", "scale", "place"))
    return tuple(column for column in (name, f"{name}_minus", f"{name}_plus") if column in names)


def _value(table: Table[Any], name: str, row: Stored, names_of: Mapping[str, Any]) -> Any:
    """The field of a row as one value; None where it says nothing."""
    if not row:
        return None
    if table is observations and name == "bmjd_tdb":
        parts = ("time_minus_d", "time_plus_d", "time_text", "time_scale", "time_place")
        return Moment(row["bmjd_tdb"], *(row[part] for part in parts))
    if table is observations and name == "value" and row["limit_side"] is not None:
        return Limit(row["value"], row["limit_side"], row["limit_sigma"])
    if table is solutions and name.startswith("period_"):
        return _period(row)
    value = row.get(name)
    if value is None or value == "":
        return None
    if name in names_of:
        return names_of[name].get(value, value)
    if f"{name.removesuffix('bmjd_tdb')}scale" in row and name.endswith("_bmjd_tdb"):
        prefix = name.removesuffix("bmjd_tdb")
        return Moment(
            value, *(row[prefix + part] for part in ("minus_d", "plus_d", "text", "scale", "place"))
        )
    if f"{name}_minus" in row:
        return Measured(value, row[f"{name}_minus"], row[f"{name}_plus"])
    return value.isoformat() if isinstance(value, datetime) else value


def _period(row: Stored) -> Measured | Limit | Range | None:
    if row["period_kind"] is None:
        return None
    if row["period_kind"] == "range":
        return Range(row["period_d"], row["period_high_d"])
    if row["period_kind"] in ("above", "below"):
        return Limit(row["period_d"], row["period_kind"], row["period_limit_sigma"])
    return Measured(row["period_d"], row["period_d_minus"], row["period_d_plus"])


def _unit(table: Table[Any], name: str, row: Stored) -> str:
    if table is observations and name == "value":
        return row.get("unit") or ""
    if table is observations and name == "bmjd_tdb":
        return "BMJD_TDB"
    if table is dust_rules and name in _OFFSETS:
        return _OFFSET_UNITS.get(row.get("kind", ""), "")
    if table is solutions and name.startswith("period_"):
        return "d"
    return _split(name)[1]


def _spoken(name: str) -> str:
    return {"bmjd_tdb": "instant", "period_kind": "period"}.get(name) or _split(name)[0].replace("_", " ")


def _split(name: str) -> tuple[str, str]:
    """A column's name without its unit, and the unit."""
    for ending, unit in _UNITS:
        if name.endswith(ending) and name != ending[1:]:
            return name.removesuffix(ending), unit
    return name, ""
