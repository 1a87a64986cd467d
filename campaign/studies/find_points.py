"""A system's photometry as the dating of episodes wants it: numbers for bands and for what shares a level."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.arrays import PhotometryArrays
from campaign.physics.lightcolumns import LightColumns
from campaign.studies.bands import photometric_system_key

# A level, a rise and a top need at least so many measurements.
FEWEST_MEASURED = 6
_SAME_INSTANT_D = 1e-6


@dataclass(frozen=True, slots=True, eq=False)
class NumberedCurve:
    """A light curve in numbers, and what they stand for.

    ``bands`` by number; ``groups`` by number: (band, photometric system, source, site number), the systems by
    their key, which ``spelt`` turns into what was typed. ``left_out`` counts points that are not good,
    ``twice`` those that stand there twice.
    """

    columns: LightColumns
    bands: tuple[str, ...]
    groups: tuple[tuple[str, str, str, int], ...]
    spelt: dict[str, str]
    left_out: int
    twice: int


def numbered_curve(
    system: str, arrays: PhotometryArrays, bands: tuple[str, ...] | None, as_of: float | None
) -> NumberedCurve:
    """Good photometry in the wanted bands, in order of time.

    Parameters
    ----------
    system : str
        Its name, for what is refused.
    arrays : PhotometryArrays
        Light curve, mag and ``bmjd_tdb``.
    bands : tuple of str or None
        Only these; None for all.
    as_of : float or None
        Nothing later, ``bmjd_tdb``.

    Returns
    -------
    NumberedCurve
        Magnitudes and days as they were.

    Raises
    ------
    InputRefused
        A band without points; too few measurements; nothing but limits.

    Notes
    -----
    Accuracy: exact. What shares a level is one band of one photometric system of one source and site.

    Source: project convention.
    """
    # How a band is written matters: h and H are not one band.
    wanted = np.isin(arrays.band, bands) if bands else np.ones(arrays.band.size, dtype=bool)
    if as_of is not None:
        wanted = wanted & (arrays.bmjd_tdb <= as_of)
    for band in bands or ():
        if not (arrays.band == band).any():
            raise _no_band(system, band, arrays)
    good = wanted & (arrays.quality == "good")
    chosen = np.flatnonzero(good)
    chosen = chosen[np.argsort(arrays.bmjd_tdb[chosen], kind="stable")]
    typed = arrays.photometric_system[chosen].tolist()
    key_of = {name: photometric_system_key(name) for name in set(typed)}
    systems = [key_of[name] for name in typed]
    keys = list(
        zip(
            arrays.band[chosen].tolist(), systems, arrays.source[chosen].tolist(),
            arrays.site_id[chosen].tolist(), strict=True,
        )
    )  # fmt: skip
    groups = sorted(set(keys))
    number = {key: place for place, key in enumerate(groups)}
    names = tuple(sorted({key[0] for key in groups}))
    group = np.array([number[key] for key in keys], dtype=np.int64)
    columns = LightColumns(
        arrays.bmjd_tdb[chosen],
        _time_sigma(arrays, chosen),
        arrays.mag[chosen],
        np.maximum(arrays.mag_minus[chosen], arrays.mag_plus[chosen]),
        arrays.limit_side[chosen],
        arrays.limit_sigma[chosen],
        group,
        np.array([names.index(key[0]) for key in groups], dtype=np.int64),
    )
    once = _first_of_equals(columns)
    twice = int((~once).sum())
    if twice:
        columns = _only(columns, once)
    _check_enough(system, columns)
    spelt = {key: name for name, key in key_of.items()}
    return NumberedCurve(columns, names, tuple(groups), spelt, int((wanted & ~good).sum()), twice)


def _time_sigma(arrays: PhotometryArrays, chosen: NDArray[np.int64]) -> NDArray[np.float64]:
    both = np.maximum(arrays.minus_d[chosen], arrays.plus_d[chosen])
    return np.where(np.isnan(both), 0.0, both)


def _first_of_equals(columns: LightColumns) -> NDArray[np.bool_]:
    """The first of points that agree in instant, magnitude and all else: one point entered twice."""
    instant = np.round(columns.bmjd_tdb / _SAME_INSTANT_D)
    keys = (columns.limit_side.astype(np.float64), columns.mag, instant, columns.group.astype(np.float64))
    # The sort is stable: of equals the first stays first.
    order = np.lexsort(keys)
    same = np.ones(max(order.size - 1, 0), dtype=bool)
    for key in keys:
        same &= np.diff(key[order]) == 0.0
    once = np.ones(order.size, dtype=bool)
    once[order[1:][same]] = False
    return once


def _only(columns: LightColumns, kept: NDArray[np.bool_]) -> LightColumns:
    return LightColumns(
        columns.bmjd_tdb[kept], columns.time_sigma_d[kept], columns.mag[kept], columns.error_mag[kept],
        columns.limit_side[kept], columns.limit_sigma[kept], columns.group[kept], columns.group_band,
    )  # fmt: skip


def _no_band(system: str, band: str, arrays: PhotometryArrays) -> InputRefused:
    there = sorted({str(name) for name in arrays.band})
    return InputRefused(
        f"{system} has no magnitude in band {band}.",
        why=f"Its bands are {', '.join(there)}." if there else "It has no magnitudes at all.",
        hint=f"For example --band {there[0]}, or leave --band out for all of them."
        if there
        else f'Log one with: campaign log photometry "{system}" --band {band} --mag 7.31±0.03',
        code="band-unknown",
        details={"band": band, "bands": there},
    )


def _check_enough(system: str, columns: LightColumns) -> None:
    measured, limits = int(columns.measured.sum()), int((~columns.measured).sum())
    details = {"measured": measured, "limits": limits, "needed": FEWEST_MEASURED}
    if limits and not measured:
        raise InputRefused(
            f"All {limits} magnitudes of {system} are limits.",
            why="Without a single measurement neither stars nor dust are seen, and nothing can be dated.",
            hint="Ask for another band with --band, or load measurements with: campaign load FILE",
            code="only-limits",
            details=details,
        )
    if measured < FEWEST_MEASURED:
        raise InputRefused(
            f"{system} has {measured} good magnitude{'' if measured == 1 else 's'} to look at: too few.",
            why=f"A stellar level and a rise need at least {FEWEST_MEASURED} measurements.",
            hint="Log or load more, or look at all bands by leaving --band out.",
            code="too-few-points",
            details=details,
        )
