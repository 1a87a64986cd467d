"""Forecasts as they were kept: entering them, listing them, and when what they used was entered."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, Table, func, select

from campaign.catalogue.journal import in_portions
from campaign.catalogue.naming import name_key, nearest_names, tidy_name
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import dust_rules, episodes, keepings, kept_forecasts, solutions, system_names
from campaign.catalogue.types import unreadable, utc_text
from campaign.errors import Conflict, NotFound
from campaign.model.forecasts import EventForecast, Quantiles
from campaign.model.verification import (
    ForecastInputs,
    Keeping,
    KeptForecast,
    UsedEpisode,
    UsedPhotometry,
    UsedRule,
    UsedSolution,
)

_OF_EVENT = (
    "event",
    "cycle",
    "basis",
    "rule",
    "status",
    "probability",
    "probability_in_window",
    "probability_per_yr",
    "disagreement_sigma",
)
_QUANTILES = ("median", "sigma_d", "lo68", "hi68", "lo95", "hi95")


def add_keeping(writing: Writing, keeping: Keeping, forecasts: Sequence[KeptForecast]) -> int:
    """Enter forecasts under one keeping; the numbers in them are ignored.

    Raises
    ------
    Conflict
        ``label-taken``, when other kept forecasts have that label.
    InputRefused
        For a label that the column refuses.
    """
    label = None if keeping.label is None else tidy_name(keeping.label)
    if label is not None:
        _refuse_taken(writing.connection, label)
    keeping_id = writing.insert(
        keepings,
        {
            "label": label,
            "label_key": None if label is None else name_key(label),
            "as_of_bmjd_tdb": keeping.as_of_bmjd_tdb,
            "from_bmjd_tdb": keeping.from_bmjd_tdb,
            "until_bmjd_tdb": keeping.until_bmjd_tdb,
            "known_at": keeping.known_at,
            "draws": keeping.draws,
            "seed": keeping.seed,
            "program_version": keeping.program_version,
            "kept_at": keeping.kept_at,
        },
    )
    for forecast in forecasts:
        writing.insert(kept_forecasts, _forecast_values(keeping_id, forecast))
    return keeping_id


def _refuse_taken(connection: Connection, label: str) -> None:
    row = connection.execute(
        select(keepings.c.id, keepings.c.label).where(
            keepings.c.label_key == name_key(label), keepings.c.withdrawn_at.is_(None)
        )
    ).first()
    if row is not None:
        raise Conflict(
            f"There are kept forecasts labelled {row.label!r} already.",
            why=f"They are keeping {row.id}; labels are compared without regard to case and spaces.",
            hint=f'Give these another label, for example --label "{label} 2", or none.',
            code="label-taken",
            details={"label": row.label, "keeping": row.id},
        )


def list_keepings(connection: Connection) -> list[Keeping]:
    """Keepings in use, in the order in which they were kept."""
    columns = keepings.c
    rows = connection.execute(
        select(
            columns.id, columns.label, columns.as_of_bmjd_tdb, columns.from_bmjd_tdb, columns.until_bmjd_tdb,
            columns.known_at, columns.kept_at, columns.draws, columns.seed, columns.program_version,
        )
        .where(columns.withdrawn_at.is_(None))
        .order_by(columns.id)
    )  # fmt: skip
    return [Keeping(*tuple(row)) for row in rows.all()]


def find_keeping(connection: Connection, name: str) -> Keeping:
    """The keeping of that number or label.

    Raises
    ------
    NotFound
        ``keeping-not-found``; ``details["nearest"]`` lists labels like it.
    """
    known = list_keepings(connection)
    labelled = {name_key(each.label): each for each in known if each.label is not None}
    found = labelled.get(name_key(name))
    if found is None and name.isascii() and name.isdigit():
        found = next((each for each in known if each.id == int(name)), None)
    if found is None:
        nearest = nearest_names(name, {key: str(each.label) for key, each in labelled.items()})
        raise NotFound(
            f"No forecasts are kept as {name!r}.",
            why=f"{len(known)} keepings are in use; they have numbers, and labels if they were given any."
            if known
            else "No forecasts are kept yet.",
            hint="Did you mean " + " or ".join(f'"{near}"' for near in nearest) + "?"
            if nearest
            else "See them with: campaign forecast list"
            if known
            else "Keep some with: campaign forecast keep",
            code="keeping-not-found",
            details={"given": name, "nearest": nearest},
        )
    return found


def count_kept(connection: Connection) -> dict[int, tuple[int, int, int]]:
    """Of each keeping: forecasts, systems, and forecasts with a distribution."""
    columns = kept_forecasts.c
    rows = connection.execute(
        select(
            columns.keeping_id,
            func.count(),
            func.count(columns.system_id.distinct()),
            func.count(columns.quantiles),
        )
        .where(columns.withdrawn_at.is_(None))
        .group_by(columns.keeping_id)
    )
    return {row[0]: (row[1], row[2], row[3]) for row in rows.all()}


def systems_kept(connection: Connection, keeping_ids: Collection[int] | None = None) -> set[int]:
    """Numbers of the systems with a kept forecast in use."""
    columns = kept_forecasts.c
    statement = select(columns.system_id).where(columns.withdrawn_at.is_(None)).distinct()
    if keeping_ids is not None:
        statement = statement.where(columns.keeping_id.in_(sorted(keeping_ids)))
    return set(connection.execute(statement).scalars())


def load_kept(connection: Connection, keeping_ids: Collection[int] | None = None) -> list[KeptForecast]:
    """Kept forecasts in use, in the order in which they were kept."""
    columns = kept_forecasts.c
    names = {
        number: name
        for number, name in connection.execute(
            select(system_names.c.system_id, system_names.c.name).where(
                system_names.c.name_rank == 0, system_names.c.withdrawn_at.is_(None)
            )
        )
    }
    rows: list[Any] = []
    wanted = [None] if keeping_ids is None else list(in_portions(sorted(keeping_ids)))
    for some in wanted:
        statement = select(kept_forecasts).where(columns.withdrawn_at.is_(None)).order_by(columns.id)
        if some is not None:
            statement = statement.where(columns.keeping_id.in_(some))
        rows += connection.execute(statement).mappings().all()
    return [_forecast(row, names) for row in rows]


def entry_times(
    connection: Connection,
    solution_ids: Collection[int],
    rule_ids: Collection[int],
    episode_ids: Collection[int],
) -> tuple[dict[int, datetime], dict[int, datetime], dict[int, datetime | None]]:
    """When solutions were entered, rules set, and episodes confirmed or rejected."""
    return (
        _times(connection, solutions, "entered_at", solution_ids),
        _times(connection, dust_rules, "set_at", rule_ids),
        _times(connection, episodes, "decided_at", episode_ids),
    )


def _times(connection: Connection, table: Table[Any], name: str, numbers: Collection[int]) -> dict[int, Any]:
    return {
        number: at
        for some in in_portions(sorted(numbers))
        for number, at in connection.execute(
            select(table.c.id, table.c[name]).where(table.c.id.in_(some))
        ).all()
    }


# ---------------------------------------------------------------------------------- rows and back


def _forecast_values(keeping_id: int, forecast: KeptForecast) -> dict[str, Any]:
    event = forecast.event
    dates = event.bmjd_tdb
    return {
        "keeping_id": keeping_id,
        "system_id": forecast.system_id,
        **{name: getattr(event, name) for name in _OF_EVENT},
        "solution": event.solution or "",
        "is_observed": int(event.observed),
        "is_phase_lost": int(event.phase_lost),
        **{_column(name): None if dates is None else getattr(dates, name) for name in _QUANTILES},
        "quantiles": list(forecast.quantiles_bmjd_tdb) or None,
        "reference_bmjd_tdb": forecast.reference_bmjd_tdb,
        "reference_sigma_d": forecast.reference_sigma_d,
        "inputs": _inputs_document(forecast.inputs),
        "notes": list(event.notes),
    }


def _column(name: str) -> str:
    return name if name == "sigma_d" else f"{name}_bmjd_tdb"


def _forecast(row: Mapping[str, Any], names: Mapping[int, str]) -> KeptForecast:
    dates = None
    if row["median_bmjd_tdb"] is not None:
        dates = Quantiles(*(row[_column(name)] for name in _QUANTILES))
    event = EventForecast(
        system=names.get(row["system_id"], f"system {row['system_id']}"),
        **{name: row[name] for name in _OF_EVENT},
        solution=row["solution"] or None,
        bmjd_tdb=dates,
        utc=None,
        observed=bool(row["is_observed"]),
        phase_lost=bool(row["is_phase_lost"]),
        notes=tuple(row["notes"]),
    )
    return KeptForecast(
        id=row["id"],
        keeping_id=row["keeping_id"],
        system_id=row["system_id"],
        event=event,
        quantiles_bmjd_tdb=tuple(float(date) for date in row["quantiles"] or ()),
        reference_bmjd_tdb=row["reference_bmjd_tdb"],
        reference_sigma_d=row["reference_sigma_d"],
        inputs=_inputs(row["inputs"]),
    )


def _inputs_document(inputs: ForecastInputs) -> dict[str, Any]:
    return {
        "solutions": [_document(each, "entered_at") for each in inputs.solutions],
        "rule": None if inputs.rule is None else _document(inputs.rule, "set_at"),
        "episodes": [_document(each, "decided_at") for each in inputs.episodes],
        "photometry": _document(inputs.photometry, "newest_entered_at"),
    }


def _document(entry: Any, instant: str) -> dict[str, Any]:
    found = {name: getattr(entry, name) for name in entry.__dataclass_fields__}
    at = found[instant]
    return found | {instant: None if at is None else utc_text(at)}


def _inputs(document: Any) -> ForecastInputs:
    try:
        rule = document["rule"]
        return ForecastInputs(
            tuple(UsedSolution(**_read(each, "entered_at")) for each in document["solutions"]),
            None if rule is None else UsedRule(**_read(rule, "set_at")),
            tuple(UsedEpisode(**_read(each, "decided_at")) for each in document["episodes"]),
            UsedPhotometry(**_read(document["photometry"], "newest_entered_at")),
        )
    except (TypeError, KeyError, ValueError):
        raise unreadable("what a kept forecast was made from") from None


def _read(entry: Mapping[str, Any], instant: str) -> dict[str, Any]:
    at = entry[instant]
    return {**entry, instant: None if at is None else datetime.fromisoformat(at)}
