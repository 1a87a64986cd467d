"""Exported observations that were superseded or withdrawn, back into a catalogue as what they are."""

from __future__ import annotations

from collections.abc import Sequence

from sqlalchemy import select

from campaign.catalogue import observations
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import observations as table
from campaign.errors import InputRefused
from campaign.model.exported import ExchangedObservation, ExchangeRow
from campaign.model.loading import LoadWarning
from campaign.model.observations import Observation
from campaign.studies.load_exchanged import Tally, attempted

_UIDS_AT_ONCE = 500

# A row, what it says, and the observation with the numbers of its system and site.
Past = tuple[ExchangeRow, ExchangedObservation, Observation]


def enter_past(writing: Writing, tally: Tally, rows: Sequence[Past]) -> None:
    """Enter what is out of use, once everything in use is there.

    Parameters
    ----------
    writing : Writing
        The operation under way.
    tally : Tally
        Gets what comes of each row.
    rows : sequence
        Rows marked as superseded or withdrawn; units as in ``campaign.model.exchange_columns``.

    Notes
    -----
    Accuracy: exact. A row whose successor is nowhere, and one that is in use here, are refused. Source:
    project convention.
    """
    entry = _Entry(writing, tally, rows)
    added = tally.added
    waiting = list(rows)
    while waiting:
        # A successor may be out of use itself, and wait for its own.
        later = [past for past in waiting if not entry.enter(past)]
        if len(later) == len(waiting):
            for past in later:
                entry.refuse_orphan(past)
            break
        waiting = later
    number = tally.added - added
    if number:
        one = number == 1
        text = (
            f"{number:,} {'row is' if one else 'rows are'} marked as superseded or withdrawn, and "
            f"{'stays' if one else 'stay'} so here"
        )
        tally.warnings.append(LoadWarning("out-of-use", text, number))


class _Entry:
    """Numbers by identifier, of what is there and of what was entered."""

    def __init__(self, writing: Writing, tally: Tally, rows: Sequence[Past]) -> None:
        self._writing = writing
        self._tally = tally
        self._numbers: dict[str, int] = {}
        self._in_use: set[str] = set()
        self._entered: set[str] = set()
        wanted = {uid for _, each, own in rows for uid in (own.uid, each.superseded_by) if uid}
        ordered = sorted(wanted)
        columns = table.c
        for start in range(0, len(ordered), _UIDS_AT_ONCE):
            some = ordered[start : start + _UIDS_AT_ONCE]
            query = select(columns.uid, columns.id, columns.withdrawn_at, columns.superseded_at)
            for uid, number, withdrawn, superseded in writing.connection.execute(
                query.where(columns.uid.in_(some))
            ):
                self._numbers[uid] = number
                if withdrawn is None and superseded is None:
                    self._in_use.add(uid)

    def enter(self, past: Past) -> bool:
        """Whether the row is settled; not while its successor is still to come."""
        row, exchanged, observation = past
        uid = observation.uid
        if uid in self._entered:
            self._refuse(row, "uid", "uid-repeated", "The identifier uid stands in an earlier row too.", uid)
        elif uid in self._in_use:
            why = "The catalogue holds the observation of this identifier in use: withdraw it there."
            self._refuse(row, "out_of_use", "known-otherwise", why, str(exchanged.out_of_use))
        elif uid in self._numbers:
            self._tally.already_known += 1
        else:
            successor = exchanged.superseded_by if exchanged.out_of_use == "superseded" else None
            if exchanged.out_of_use == "superseded" and successor not in self._numbers:
                return False
            self._add(row, exchanged, observation, None if successor is None else self._numbers[successor])
        return True

    def _add(
        self, row: ExchangeRow, exchanged: ExchangedObservation, observation: Observation, by: int | None
    ) -> None:
        numbers: list[int] = []

        def enter() -> None:
            why = exchanged.withdrawn_why
            number = observations.add_past_observation(
                self._writing, observation, superseded_by_id=by, why=why
            )
            numbers.append(number)

        if attempted(self._writing, self._tally, row, enter):
            self._tally.added += 1
            self._numbers[observation.uid] = numbers[0]
            self._entered.add(observation.uid)

    def refuse_orphan(self, past: Past) -> None:
        """Refuse a row whose successor is neither in the table nor in the catalogue."""
        row, exchanged, _ = past
        why = "What took its place is neither in the table nor in the catalogue."
        self._refuse(row, "superseded_by", "successor-missing", why, exchanged.superseded_by or "")

    def _refuse(self, row: ExchangeRow, column: str, code: str, why: str, text: str) -> None:
        self._tally.refuse_for(
            row, InputRefused("", why=why, code=code, details={"column": column, "text": text})
        )
