"""Which of the shells of an image an instrument can show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused

BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class ShellsInView:
    """Which shells stand between the inner and the outer limit, and how many do not."""

    in_view: BoolArray
    beyond_outer: int
    within_inner: int


def shells_in_view(
    radius_arcsec: ArrayLike,
    field_arcsec: float | None = None,
    resolution_arcsec: float | None = None,
    outer_radius_arcsec: float | None = None,
) -> ShellsInView:
    """How many shells an instrument can show: inside the field, outside what it cannot resolve.

    Parameters
    ----------
    radius_arcsec : array_like, shape (n,)
        Radii, arcsec; 0 for a shell that is not launched, which is never in view.
    field_arcsec : float, optional
        Full width of the field, arcsec, centred on the stars.
    resolution_arcsec : float, optional
        Resolution or inner working angle: radius, arcsec, inside which nothing is told from the stars.
    outer_radius_arcsec : float, optional
        Largest radius, arcsec, at which shells are still bright enough.

    Returns
    -------
    ShellsInView
        For each shell whether it is in view, and counts (dimensionless).

    Raises
    ------
    InputRefused
        If a limit is not positive, or nothing lies between them.

    Notes
    -----
    Accuracy: exact.

    Source: common practice, no source.

    Examples
    --------
    >>> view = shells_in_view([0.05, 0.8, 1.6, 20.0], field_arcsec=28.0, resolution_arcsec=0.1)
    >>> int(view.in_view.sum()), view.beyond_outer, view.within_inner
    (2, 1, 1)
    """
    given = (field_arcsec, resolution_arcsec, outer_radius_arcsec)
    if any(limit is not None and not limit > 0.0 for limit in given):
        raise InputRefused(
            "A field, resolution, inner working angle or outer radius is not above zero.",
            why="They bound the radii at which a shell can be seen.",
            hint="Give a field such as 28 arcsec and a resolution such as 0.1 arcsec.",
            code="view-refused",
        )
    inner = 0.0 if resolution_arcsec is None else resolution_arcsec
    halves = None if field_arcsec is None else 0.5 * field_arcsec
    outer = min((x for x in (halves, outer_radius_arcsec) if x is not None), default=float("inf"))
    if inner >= outer:
        raise InputRefused(
            f"Nothing lies between the inner limit of {inner:g} and the outer of {outer:g} arcsec.",
            why="The field is no larger than what cannot be resolved.",
            hint="The field is a full width; check both units.",
            code="view-refused",
        )
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    within, beyond = radius < inner, radius > outer
    return ShellsInView(~(within | beyond) & (radius > 0.0), int(beyond.sum()), int(within.sum()))
