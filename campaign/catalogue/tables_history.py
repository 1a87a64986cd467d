"""Tables of who changed what and when, and of the campaign as a whole."""

from __future__ import annotations

from sqlalchemy import Index, Table, TypedColumns, UniqueConstraint

from campaign.catalogue.columns import (
    choice,
    identity,
    instant,
    line,
    maybe_document,
    maybe_whole,
    metadata,
    prose,
    reference,
)

CHANGE_ACTIONS = ("insert", "update", "delete", "insert many")


class OperationColumns(TypedColumns):
    """One command that changed something."""

    id = identity()
    uid = line(36)
    at = instant()
    who = line(200)
    command = prose()
    summary = prose()
    program_version = line(50)


operations = Table("operations", metadata, OperationColumns, UniqueConstraint("uid"))


class ChangeColumns(TypedColumns):
    """One row changed by an operation: its columns before and after, as they were stored.

    An update lists only what differs. ``insert many`` stands for all rows of a bulk load: it has no
    row, and ``after`` holds their number.
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


class CampaignInfoColumns(TypedColumns):
    """What is true of the whole campaign: its identifier, format, and the sample's date."""

    id = identity()
    key = line(50)
    value = line(500)


campaign_info = Table("campaign_info", metadata, CampaignInfoColumns, UniqueConstraint("key"))
