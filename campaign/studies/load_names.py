"""Names in a table, looked up in the catalogue."""

from __future__ import annotations

import math
from collections.abc import Sequence

from campaign.catalogue.naming import name_key, nearest_names
from campaign.errors import InputRefused
from campaign.model.loading import LoadWarning
from campaign.model.systems import Site, System

_MOST_NAMES = 5
# Two positions of one system differ by less, whoever measured them (common practice, no source).
_SAME_PLACE_ARCSEC = 5.0


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


def comment_warning(lines: Sequence[int]) -> list[LoadWarning]:
    """Words on lines of comments among the rows of a table.

    Parameters
    ----------
    lines : sequence of int
        Where they stood, counted from 1 (dimensionless).

    Returns
    -------
    list of LoadWarning
        One, or none.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    if not lines:
        return []
    text = (
        "1 line among the rows begins with # and was"
        if len(lines) == 1
        else f"{len(lines):,} lines among the rows begin with # and were"
    )
    first = tuple(lines[:_MOST_NAMES])
    return [LoadWarning("commented", f"{text} passed over", len(lines), first, len(lines) > _MOST_NAMES)]


def alias_warnings(names: NameIndex, systems: Sequence[System]) -> list[LoadWarning]:
    """Which systems a table called by another name than their own.

    Parameters
    ----------
    names : NameIndex
        After the table was read.
    systems : sequence of System
        Those that the index counts (dimensionless).

    Returns
    -------
    list of LoadWarning
        The first few by name, and how many more.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    found: list[str] = []
    for place, others in names.aliases():
        called = " and ".join(f"'{name}'" for name in others[:_MOST_NAMES])
        found.append(f"{called} is known here as '{systems[place].name}'")
    if len(found) > _MOST_NAMES:
        found = [*found[:_MOST_NAMES], f"and {len(found) - _MOST_NAMES} more systems are called by an alias"]
    return [LoadWarning("alias", text) for text in found]


class PlaceIndex:
    """Systems by where they stand, to find one that is another under a second name.

    Proper motion is left out, which is below 1 arcsec in 50 years for such distant stars.
    """

    def __init__(self) -> None:
        self._zones: dict[int, list[System]] = {}

    def add(self, system: System) -> None:
        """Count one more among the known."""
        self._zones.setdefault(_zone(system), []).append(system)

    def warning(self, new: System) -> LoadWarning | None:
        """Words on the nearest known system within 5 arcsec of a new one."""
        zone = _zone(new)
        around = [each for near in (zone - 1, zone, zone + 1) for each in self._zones.get(near, ())]
        nearest = min(((_apart_arcsec(new, each), each.name) for each in around), default=None)
        if nearest is None or nearest[0] > _SAME_PLACE_ARCSEC:
            return None
        apart, name = nearest
        text = (
            f"'{new.name}' lies {apart:.1f} arcsec from '{name}', which is known here: is it the same? Then "
            f'take it back and say: campaign system change "{name}" --alias "{new.name}"'
        )
        return LoadWarning("same-place", text, 1)


def _zone(system: System) -> int:
    """Number of the strip of declination, which is broader than what counts as one place."""
    return math.floor(system.dec_deg * 3600.0 / (2.0 * _SAME_PLACE_ARCSEC))


def _apart_arcsec(one: System, other: System) -> float:
    dec, other_dec = math.radians(one.dec_deg), math.radians(other.dec_deg)
    half_ra = math.radians(one.ra_deg - other.ra_deg) / 2.0
    half_dec = (dec - other_dec) / 2.0
    haversine = math.sin(half_dec) ** 2 + math.cos(dec) * math.cos(other_dec) * math.sin(half_ra) ** 2
    return math.degrees(2.0 * math.asin(min(1.0, math.sqrt(haversine)))) * 3600.0
