"""The five quantities of nested shells: names, bounds, and how two of them make a third."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.constants import KMS_PER_AU_YR, SPEED_OF_LIGHT_KMS

FloatArray = NDArray[np.float64]

QUANTITIES = ("spacing_arcsec", "proper_motion_mas_yr", "speed_kms", "period_yr", "distance_pc")
WORDS = {
    "spacing_arcsec": "spacing",
    "proper_motion_mas_yr": "proper motion",
    "speed_kms": "speed",
    "period_yr": "period",
    "distance_pc": "distance",
}
_EXAMPLES = {
    "spacing_arcsec": "1.20±0.05 arcsec",
    "proper_motion_mas_yr": "80±5 mas/yr",
    "speed_kms": "1800±100 km/s",
    "period_yr": "20±0.5 yr",
    "distance_pc": "2.1±0.2 kpc",
}


def check_shell_value(quantity: str, value: float) -> None:
    """Refuse a value that one of the five quantities cannot have.

    Parameters
    ----------
    quantity : str
        One of QUANTITIES.
    value : float
        In the unit of the quantity's name (arcsec, mas/yr, km/s, yr, pc).

    Returns
    -------
    None
        No unit.

    Raises
    ------
    InputRefused
        If the value is not finite and positive, if a speed reaches that of light, or the name is unknown.

    Notes
    -----
    Accuracy: exact.

    Source: c = 299 792.458 km/s (SI).

    Examples
    --------
    >>> check_shell_value("speed_kms", 1800.0)
    """
    if quantity not in QUANTITIES:
        raise InputRefused(
            f"There is no quantity of shells called {quantity!r}.",
            why="Shells tie five quantities together.",
            hint=f"Use one of {', '.join(QUANTITIES)}.",
            code="shell-quantity-refused",
        )
    word = WORDS[quantity]
    if not (np.isfinite(value) and value > 0.0):
        raise InputRefused(
            f"A {word} of {value:g} cannot be.",
            why=f"The {word} of expanding shells is a positive, finite number.",
            hint=f"Give a {word} such as {_EXAMPLES[quantity]}.",
            code="shell-value-refused",
            details={"quantity": quantity, "value": value},
        )
    if quantity == "speed_kms" and value >= SPEED_OF_LIGHT_KMS:
        raise InputRefused(
            f"A speed of {value:g} km/s is not below that of light.",
            why=f"Light moves at {SPEED_OF_LIGHT_KMS} km/s, dust far slower.",
            hint=f"Give a speed such as {_EXAMPLES[quantity]}; check the unit.",
            code="speed-above-light",
            details={"speed_kms": value},
        )


def motion_mas_yr(speed_kms: ArrayLike, distance_pc: ArrayLike) -> FloatArray:
    """Proper motion of a shell that moves at a speed, seen from a distance.

    Parameters
    ----------
    speed_kms : array_like
        Speed in the plane of the sky, km/s.
    distance_pc : array_like
        Distance, pc; broadcast with the speed.

    Returns
    -------
    ndarray
        mas/yr (Julian year).

    Notes
    -----
    Accuracy: exact.

    Source: 1 au/yr = 4.740470464 km/s (IAU 2012 Resolution B2, Julian year).

    Examples
    --------
    >>> round(float(motion_mas_yr(1230.0, 3390.0)), 6)
    76.539209
    """
    speed = np.asarray(speed_kms, dtype=np.float64)
    motion: FloatArray = 1000.0 * speed / (KMS_PER_AU_YR * np.asarray(distance_pc, dtype=np.float64))
    return motion
