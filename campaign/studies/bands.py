"""Bands whose magnitudes mix photometric systems, or do not say which system they are in.

K of one system and K of another differ by a tenth of a magnitude and more: they are told apart, never
averaged.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Sequence

from campaign.model.bands import BandUse, MixedBand

MOST_WARNINGS = 10
_MOST_NAMES = 4


def photometric_system_key(name: str | None) -> str:
    """The form in which names of photometric systems are compared.

    Parameters
    ----------
    name : str or None
        As typed; None where none was stated.

    Returns
    -------
    str
        Without case and spaces; empty for none.

    Notes
    -----
    Accuracy: exact (no numbers). Source: project convention.
    """
    return "" if name is None else "".join(name.casefold().split())


def mixed_bands(uses: Iterable[BandUse]) -> tuple[MixedBand, ...]:
    """Bands with magnitudes of two or more photometric systems, or with some that state none.

    Parameters
    ----------
    uses : iterable of BandUse
        Counts (dimensionless) of magnitudes; those of equal system, band and photometric system add up.

    Returns
    -------
    tuple of MixedBand
        By system and band.

    Notes
    -----
    Accuracy: exact counts. Names of photometric systems are compared without case and spaces; bands are
    compared as they stand, for h and H are not one band.

    Source: project convention; that systems of one band differ by 0.1 to 0.2 mag is common practice, no
    source.
    """
    points: dict[tuple[str, str], dict[str, int]] = defaultdict(lambda: defaultdict(int))
    spelling: dict[str, str] = {}
    for use in uses:
        key = photometric_system_key(use.photometric_system)
        points[use.system, use.band][key] += use.points
        if use.photometric_system is not None and key:
            spelling[key] = min(spelling.get(key, use.photometric_system), use.photometric_system)
    found = []
    for (system, band), by_key in sorted(points.items()):
        stated = sorted(spelling[key] for key, number in by_key.items() if key and number)
        unknown = by_key.get("", 0)
        if len(stated) > 1 or unknown:
            found.append(MixedBand(system, band, tuple(stated), unknown, sum(by_key.values())))
    return tuple(found)


def band_warnings(mixed: Sequence[MixedBand], most: int = MOST_WARNINGS) -> tuple[str, ...]:
    """What an observer should know of mixed bands, one sentence each.

    Parameters
    ----------
    mixed : sequence of MixedBand
        See :func:`mixed_bands`; ``points`` are counts (dimensionless).
    most : int
        At most so many sentences; one more says how many bands were left out.

    Returns
    -------
    tuple of str
        Ready to be shown.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    told = [_warning(one) for one in mixed[:most]]
    if len(mixed) > most:
        told.append(f"Photometric systems are mixed or unknown in {len(mixed) - most} more bands.")
    return tuple(told)


def _warning(mixed: MixedBand) -> str:
    where = f"{mixed.system}, band {mixed.band}"
    names = ", ".join(mixed.photometric_systems[:_MOST_NAMES])
    if len(mixed.photometric_systems) > _MOST_NAMES:
        names += f" and {len(mixed.photometric_systems) - _MOST_NAMES} more"
    apart = "they are never averaged together"
    unknown = f"{mixed.unknown_points} of {_magnitudes(mixed.points)} do not say their photometric system"
    if not mixed.photometric_systems:
        return f"{where}: no magnitude of {mixed.points} says its photometric system."
    if len(mixed.photometric_systems) == 1:
        return f"{where}: {unknown}, the others are in {names}; {apart}."
    told = f"{where}: {_magnitudes(mixed.points)} in different photometric systems ({names}); {apart}"
    return told + (f", and {unknown}." if mixed.unknown_points else ".")


def _magnitudes(points: int) -> str:
    return f"{points} magnitude{'' if points == 1 else 's'}"
