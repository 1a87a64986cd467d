"""Exported observations, back into a catalogue, some thousands at a time."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields, replace
from itertools import islice

import numpy as np
from sqlalchemy import select
from sqlalchemy.exc import DBAPIError

from campaign.catalogue import bulk, observations, sites
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import observations as table
from campaign.errors import CampaignError, InputRefused
from campaign.model.exported import ExchangedObservation, ExchangeRow
from campaign.model.loading import SHOWN_TEXT, BadCell, LoadWarning
from campaign.model.observations import Observation
from campaign.model.systems import Site, System
from campaign.reading.exchange_models import observation_from_row
from campaign.studies.load_exchanged import Tally, attempted
from campaign.studies.load_exchanged_past import Past, enter_past
from campaign.studies.load_known import check_known
from campaign.studies.load_names import NameIndex, alias_warnings, site_index, system_index
from campaign.studies.load_objects import checked_objects, columns_of_objects

_BATCH_ROWS = 5_000
_UIDS_AT_ONCE = 500
_SITE_FIELDS = [field.name for field in fields(Site) if field.name not in ("id", "name", "notes")]

# A row with the observation it holds, and the place of its system.
_Good = tuple[ExchangeRow, Observation, int]


def enter_observations(
    writing: Writing,
    rows: Iterable[ExchangeRow],
    tally: Tally,
    known_systems: Sequence[System],
    known_sites: Sequence[Site],
) -> None:
    """Enter exported observations; sites that are not there are made.

    Parameters
    ----------
    writing : Writing
        The operation under way.
    rows : iterable of ExchangeRow
        Units as in ``campaign.model.exchange_columns``.
    tally : Tally
        Gets what comes of each row.
    known_systems, known_sites : sequence
        Of the catalogue.

    Notes
    -----
    Accuracy: exact; ``bmjd_tdb`` (days) and ``uid`` are kept as they stand. Source: project convention.
    """
    entry = _Entry(writing, tally, known_systems, known_sites)
    source = iter(rows)
    while batch := list(islice(source, _BATCH_ROWS)):
        entry.enter([good for row in batch if (good := entry.read(row)) is not None])
    enter_past(writing, tally, entry.past)
    tally.warnings += alias_warnings(entry.systems_called, known_systems)


class _Entry:
    """One load of exported observations."""

    def __init__(
        self, writing: Writing, tally: Tally, known_systems: Sequence[System], known_sites: Sequence[Site]
    ) -> None:
        self._writing = writing
        self._tally = tally
        self._systems = known_systems
        self._sites = list(known_sites)
        self.systems_called: NameIndex = system_index(known_systems)
        self._site_index: NameIndex = site_index(known_sites)
        self._moved: set[int] = set()
        self.past: list[Past] = []

    def read(self, row: ExchangeRow) -> _Good | None:
        """The observation of a row, with the numbers of its system and site; None when it is put aside."""
        try:
            exchanged = observation_from_row(row.cells)
            place = self.systems_called.read(exchanged.system)
            site_id = self._site_id(exchanged)
        except InputRefused as refused:
            self._tally.refuse_for(row, refused)
            return None
        observation = replace(exchanged.observation, system_id=self._systems[place].id, site_id=site_id)
        if exchanged.out_of_use is not None:
            # What took its place may stand further down.
            self.past.append((row, exchanged, observation))
            return None
        return row, observation, place

    def _site_id(self, exchanged: ExchangedObservation) -> int | None:
        name = exchanged.observation.site
        if not name:
            return None
        try:
            site = self._sites[self._site_index.read(name)]
        except InputRefused:
            if exchanged.site is None:
                raise
            number = sites.add_site(self._writing, exchanged.site)
            self._sites.append(replace(exchanged.site, id=number))
            self._site_index = site_index(self._sites)
            self._tally.made["sites"] = self._tally.made.get("sites", 0) + 1
            return number
        if exchanged.site is not None and site.id not in self._moved and _differs(site, exchanged.site):
            self._moved.add(site.id)
            text = f"the site {site.name!r} is described otherwise in the table; what is known of it stays"
            self._tally.warnings.append(LoadWarning("site-otherwise", text, 1))
        return site.id

    def enter(self, batch: Sequence[_Good]) -> None:
        """Enter some of them; what is known already is left out."""
        known = self._known_digests([good[1].uid for good in batch])
        fresh: list[_Good] = []
        there: list[_Good] = []
        seen: set[str] = set()
        for good in batch:
            uid = good[1].uid
            if uid in known:
                there.append(good)
            elif uid in seen:
                why = "The identifier uid stands in an earlier row too."
                self._refuse(good[0], "uid", "uid-repeated", why, uid)
            else:
                fresh.append(good)
            seen.add(uid)
        for good in [good for good in fresh if good[1].value is None]:
            self._enter_alone(good)
        for group in _alike(fresh):
            self._enter_group(group)
        self._tally.already_known += sum(good[1].value is None for good in there)
        for group in _alike(there):
            self._compare_group(group, known)

    def _refuse(self, row: ExchangeRow, column: str | None, code: str, why: str, text: str) -> None:
        self._tally.refuse(row, BadCell(row.line, column, code, why, text[:SHOWN_TEXT]))

    def _known_digests(self, uids: Sequence[str]) -> dict[str, str | None]:
        """Digests of those that are in the catalogue; None where they are out of use."""
        known: dict[str, str | None] = {}
        for start in range(0, len(uids), _UIDS_AT_ONCE):
            some = uids[start : start + _UIDS_AT_ONCE]
            rows = self._writing.connection.execute(
                select(table.c.uid, table.c.sameness).where(table.c.uid.in_(some))
            )
            known.update((uid, sameness) for uid, sameness in rows)
        return known

    def _compare_group(self, group: Sequence[_Good], known: Mapping[str, str | None]) -> None:
        """Rows whose identifier is known must be what it stands for."""
        texts = bulk.digests_of(columns_of_objects([good[1] for good in group])).tobytes().hex()
        for place, (row, observation, _) in enumerate(group):
            there = known[observation.uid]
            if there is None or there == texts[32 * place : 32 * place + 32]:
                self._tally.already_known += 1
            else:
                why = (
                    "The catalogue holds another observation under this identifier: one of them was changed."
                )
                self._refuse(row, "uid", "known-otherwise", why, observation.uid)

    def _enter_alone(self, good: _Good) -> None:
        row, observation, _ = good
        found: list[bool] = []

        def enter() -> None:
            found.append(observations.add_observation(self._writing, observation)[1])

        if attempted(self._writing, self._tally, row, enter):
            if found[0]:
                self._tally.already_known += 1
            else:
                self._tally.added += 1

    def _enter_group(self, group: Sequence[_Good]) -> None:
        columns = columns_of_objects([observation for _, observation, _ in group])
        digests = bulk.digests_of(columns)
        rows = checked_objects(
            [row.line for row, _, _ in group], [place for _, _, place in group], dict(columns.same)
        )
        check = check_known(
            self._writing.connection, rows, columns, digests, self._systems, lambda done: None,
            self._writing.operation_id,
        )  # fmt: skip
        self._tally.already_known += int(np.count_nonzero(check.known))
        self._tally.repeated += int(np.count_nonzero(check.repeated & ~check.known))
        self._tally.conflicts += check.conflicts
        fresh = np.flatnonzero(~(check.known | check.repeated))
        self._tally.added += len(fresh)
        changed = self._writing.changed
        savepoint = self._writing.connection.begin_nested()
        try:
            bulk.add_columns(self._writing, columns, digests, fresh, lambda done: None)
        except (CampaignError, DBAPIError):
            savepoint.rollback()
            self._writing.changed = changed
            self._tally.added -= len(fresh)
            # One of them is refused by a column or a constraint: each is tried alone, to say which.
            for place in fresh.tolist():
                self._enter_alone(group[place])
            return
        savepoint.commit()


def _alike(goods: Sequence[_Good]) -> list[list[_Good]]:
    """Those with a value, by kind and unit."""
    groups: dict[tuple[str, str | None], list[_Good]] = {}
    for good in goods:
        if good[1].value is not None:
            groups.setdefault((good[1].kind, good[1].unit), []).append(good)
    return list(groups.values())


def _differs(site: Site, other: Site) -> bool:
    return any(getattr(site, name) != getattr(other, name) for name in _SITE_FIELDS)
