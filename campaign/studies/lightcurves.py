"""Light curves fetched only when somebody looks: a forecast of a large campaign needs few of them."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from datetime import datetime

from campaign.model.arrays import PhotometryArrays


class CataloguedCurves(Mapping[int, PhotometryArrays]):
    """Light curves of a database by system id; which systems have any is known from the start."""

    def __init__(
        self, db: str, systems: Collection[int], as_of_bmjd_tdb: float | None, known_at: datetime | None
    ) -> None:
        self._db = db
        self._systems = frozenset(systems)
        self._as_of = as_of_bmjd_tdb
        self._known_at = known_at
        self._fetched: dict[int, PhotometryArrays] = {}

    def __contains__(self, system_id: object) -> bool:
        return system_id in self._systems

    def __iter__(self) -> Iterator[int]:
        return iter(sorted(self._systems))

    def __len__(self) -> int:
        return len(self._systems)

    def __getitem__(self, system_id: int) -> PhotometryArrays:
        if system_id not in self._systems:
            raise KeyError(system_id)
        self.fetch([system_id])
        return self._fetched[system_id]

    def fetch(self, system_ids: Collection[int]) -> None:
        """Read the named systems' light curves in one query, unless they are here already."""
        missing = [i for i in system_ids if i in self._systems and i not in self._fetched]
        if not missing:
            return
        from campaign.catalogue import observations, store

        with store.reading(self._db) as connection:
            self._fetched |= observations.photometry_arrays(
                connection, missing, as_of_bmjd_tdb=self._as_of, known_at=self._known_at
            )
        # What was withdrawn between the count and now is an empty mapping entry, not an error.
        self._systems = self._systems - {i for i in missing if i not in self._fetched}
