"""Tables of who changed what and when, and of the campaign as a whole."""

from __future__ import annotations

from sqlalchemy import Index, Table, TypedColumns, UniqueConstraint

from campaign.catalogue.columns import (
    check,
    choice,
    document,
    identity,
    instant,
    line,
    maybe_document,
    maybe_reference,
    maybe_whole,
    metadata,
    prose,
    reference,
)

CHANGE_ACTIONS = ("insert", "update", "delete", "insert many", "withdraw many", "restore many")


class OperationColumns(TypedColumns):
    """One command that changed something.

    ``undoes_id`` is the operation that this one took back. One that put it back undoes that one in turn,
    so that each operation is taken back at most once.
    """

    id = identity()
    uid = line(36)
    at = instant()
    who = line(200)
    command = prose()
    summary = prose()
    program_version = line(50)
    undoes_id = maybe_reference("operations.id")


operations = Table(
    "operations", metadata, OperationColumns, UniqueConstraint("uid"), UniqueConstraint("undoes_id")
)


class ChangeColumns(TypedColumns):
    """One row changed by an operation: its columns before and after, as they were stored.

    An update lists only what differs. ``insert many`` stands for all rows of a bulk load: it has no
    row, and ``after`` holds their number. ``withdraw many`` and ``restore many`` stand for the rows that
    the operation ``after["brought_by"]`` brought.
    """

    id = identity()
    operation_id = reference("operations.id")
    table_name = line(63)
    row_id = maybe_whole()
    action = choice(*CHANGE_ACTIONS)
    before = maybe_document()
    after = maybe_document()


changes = Table(
    "changes",
    metadata,
    ChangeColumns,
    Index("ix_changes_operation_id", "operation_id"),
    Index("ix_changes_table_name_row_id", "table_name", "row_id"),
)


class LapseColumns(TypedColumns):
    """A time in which an entry was out of use, though it is in use again now.

    Concerns one row, or all rows that one operation brought. Who asks what was known within it does not
    see them.
    """

    id = identity()
    table_name = line(63)
    row_id = maybe_whole()
    brought_by_id = maybe_reference("operations.id")
    from_at = instant()
    until_at = instant()


lapses = Table("lapses", metadata, LapseColumns, check("rows", "(row_id IS NULL) <> (brought_by_id IS NULL)"))


class ColumnMappingColumns(TypedColumns):
    """How the columns of somebody's tables are to be understood, kept under a name."""

    id = identity()
    name = line(200)
    name_key = line(200)
    kind = line(32)
    document = document()
    entered_at = instant()
    operation_id = reference("operations.id")


column_mappings = Table(
    "column_mappings",
    metadata,
    ColumnMappingColumns,
    UniqueConstraint("name_key"),
    check("name_key", "name_key <> ''"),
)


class CampaignInfoColumns(TypedColumns):
    """What is true of the whole campaign: its identifier, format, and the sample's date."""

    id = identity()
    key = line(50)
    value = line(500)


campaign_info = Table("campaign_info", metadata, CampaignInfoColumns, UniqueConstraint("key"))
