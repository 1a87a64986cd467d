"""Mappings of columns, kept under a name."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sqlalchemy import Connection, select

from campaign.catalogue.naming import name_key, nearest_names, tidy_name
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import column_mappings
from campaign.catalogue.types import json_text, unreadable
from campaign.errors import Conflict, NotFound
from campaign.model.loading import LOAD_KINDS, LoadKind, MappingRequest


def keep_mapping(writing: Writing, name: str, kind: LoadKind, request: MappingRequest) -> bool:
    """Keep what was said of columns under a name; False when it was kept so already.

    Raises
    ------
    Conflict
        ``mapping-taken``, when the name stands for another mapping.
    InputRefused
        For a name that the column refuses.
    """
    tidy = tidy_name(name)
    document = {
        "columns": dict(request.columns),
        "constants": dict(request.constants),
        "missing": list(request.missing),
    }
    row = writing.connection.execute(
        select(column_mappings.c.name, column_mappings.c.kind, column_mappings.c.document).where(
            column_mappings.c.name_key == name_key(tidy)
        )
    ).first()
    if row is not None:
        if row.kind == kind and json_text(row.document) == json_text(document):
            return False
        raise Conflict(
            f"There is already another mapping named {row.name!r}.",
            why="A mapping that was kept is not changed, since tables were loaded by it.",
            hint="Keep this one under another name.",
            code="mapping-taken",
            details={"name": row.name},
        )
    values = {
        "name": tidy,
        "name_key": name_key(tidy),
        "kind": kind,
        "document": document,
        "entered_at": writing.at,
        "operation_id": writing.operation_id,
    }
    writing.insert(column_mappings, values)
    return True


def find_mapping(connection: Connection, name: str) -> MappingRequest:
    """The mapping of that name, whatever its case and spaces.

    Raises
    ------
    NotFound
        ``mapping-not-found``; ``details["nearest"]`` lists names like it.
    """
    columns = column_mappings.c
    row = connection.execute(
        select(columns.kind, columns.document).where(columns.name_key == name_key(name))
    ).first()
    if row is None:
        known = {key: shown for key, shown in connection.execute(select(columns.name_key, columns.name))}
        near = nearest_names(name, known)
        raise NotFound(
            f"There is no mapping named {name!r}.",
            why="The catalogue holds: " + ", ".join(repr(each) for each in known.values()) + "."
            if 0 < len(known) <= 10
            else f"The catalogue holds {len(known)} mappings, none of that name.",
            hint="Did you mean " + " or ".join(f'"{each}"' for each in near) + "?"
            if near
            else "Keep one with: campaign load FILE --keep-mapping NAME.",
            code="mapping-not-found",
            details={"name": name, "nearest": near},
        )
    return _request(row.kind, row.document)


def _request(kind: str, document: Any) -> MappingRequest:
    if kind not in LOAD_KINDS or not isinstance(document, Mapping):
        raise unreadable(f"a mapping of columns for {kind!r}")
    parts = [document.get(name) for name in ("columns", "constants", "missing")]
    if not (isinstance(parts[0], Mapping) and isinstance(parts[1], Mapping) and isinstance(parts[2], list)):
        raise unreadable("a mapping of columns without columns")
    return MappingRequest(kind, parts[0], parts[1], tuple(parts[2]))
