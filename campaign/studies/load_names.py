"""Names in a table, looked up in the catalogue."""

from __future__ import annotations

from collections.abc import Sequence

from campaign.catalogue.naming import name_key, nearest_names
from campaign.errors import InputRefused
from campaign.model.systems import Site, System


class NameIndex:
    """Places of entries by every name that they have, and who was called by another than its own."""

    def __init__(self, names: Sequence[tuple[str, ...]], what: str, advice: str) -> None:
        self._what = what
        self._advice = advice
        self._shown: dict[str, str] = {}
        self._places: dict[str, int] = {}
        self._own = [name_key(each[0]) for each in names]
        for place, each in enumerate(names):
            for name in each:
                self._places[name_key(name)] = place
                self._shown[name_key(name)] = name
        self.called: dict[int, dict[str, str]] = {}

    def read(self, text: str) -> int:
        """The place of the entry that has the name.

        Raises
        ------
        InputRefused
            ``system-not-found`` or ``site-not-found``, with the nearest names.
        """
        key = name_key(text)
        place = self._places.get(key)
        if place is None:
            near = nearest_names(text, self._shown)
            likely = " Did you mean " + " or ".join(repr(name) for name in near) + "?" if near else ""
            raise InputRefused(
                f"There is no {self._what} named {text!r}.",
                why=f"There is no {self._what} of this name in the catalogue.{likely}",
                hint=self._advice,
                code=f"{self._what}-not-found",
                details={"name": text, "nearest": near},
            )
        self.called.setdefault(place, {}).setdefault(key, " ".join(text.split()))
        return place

    def aliases(self) -> list[tuple[int, tuple[str, ...]]]:
        """Entries that were called by another name than their own, with those names."""
        return [
            (place, other)
            for place, names in sorted(self.called.items())
            if (other := tuple(name for key, name in names.items() if key != self._own[place]))
        ]


def system_index(systems: Sequence[System]) -> NameIndex:
    """Systems by name and alias.

    Parameters
    ----------
    systems : sequence of System
        Of the catalogue; places count in this order (dimensionless).

    Returns
    -------
    NameIndex
        Names compared without case and spaces.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return NameIndex(
        [(system.name, *system.aliases) for system in systems],
        "system",
        "See the systems with: campaign system list. Load new ones first: campaign load systems.csv.",
    )


def site_index(sites: Sequence[Site]) -> NameIndex:
    """Sites by name.

    Parameters
    ----------
    sites : sequence of Site
        Of the catalogue; places count in this order (dimensionless).

    Returns
    -------
    NameIndex
        Names compared without case and spaces.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return NameIndex(
        [(site.name,) for site in sites],
        "site",
        "See the sites with: campaign site list. Add one with: campaign site add.",
    )
