"""Instants of many rows on the catalogue's axis, as each would be put there alone."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from campaign.model.systems import Site, System
from campaign.physics.lighttime import to_barycentre_along, unit_vector
from campaign.reading.columntimes import PLACES, SCALES
from campaign.studies.load_rows import CheckedRows

_AT_ONCE = 100_000


def on_axis(rows: CheckedRows, systems: Sequence[System], sites: Sequence[Site]) -> NDArray[np.float64]:
    """Instants of checked rows as MJD in TDB at the barycentre.

    Parameters
    ----------
    rows : CheckedRows
        Days and fractions as MJD in the scale and at the place of each row, days.
    systems, sites : sequence
        Those that the rows refer to by place; deg and m.

    Returns
    -------
    ndarray
        ``bmjd_tdb``, days, in the order of the rows.

    Notes
    -----
    Accuracy: the same to the last bit as ``campaign.studies.instants.moment_of`` of each row.

    Source: Eastman, Siverd & Gaudi 2010, PASP 122, 935.
    """
    found = np.empty(rows.size)
    n = unit_vector([system.ra_deg for system in systems], [system.dec_deg for system in systems])
    # One group for each scale, place and observatory: those need functions of their own.
    group = (rows.scale.astype(np.int64) * len(PLACES) + rows.place) * (len(sites) + 1) + rows.site + 1
    for number in _different(group):
        some = np.flatnonzero(group == number)
        scale_and_place, site = divmod(number, len(sites) + 1)
        scale, place = SCALES[scale_and_place // len(PLACES)], PLACES[scale_and_place % len(PLACES)]
        geodetic = _geodetic(sites[site - 1]) if site > 0 and place == "observatory" else None
        counted_at = "geocentre" if place == "observatory" and geodetic is None else place
        # In order of time, so that instants of the same days are together.
        some = some[np.argsort(rows.day[some])]
        for start in range(0, len(some), _AT_ONCE):
            part = some[start : start + _AT_ONCE]
            found[part] = to_barycentre_along(
                rows.day[part], rows.fraction[part], scale, counted_at, n[rows.system[part]], geodetic
            )
    return found


def _different(group: NDArray[np.int64]) -> list[int]:
    is_one = group.size > 0 and bool((group == group[0]).all())
    different: list[int] = group[:1].tolist() if is_one else np.unique(group).tolist()
    return different


def _geodetic(site: Site) -> tuple[float, float, float] | None:
    if site.kind != "ground" or site.latitude_deg is None:
        return None
    return (site.longitude_deg_east or 0.0, site.latitude_deg, site.height_m or 0.0)
