"""How hot a wind gets when a strong shock stops it, for gas of a given composition."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.constants import BOLTZMANN_J_K, ELECTRON_VOLT_J, PROTON_MASS_KG
from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]

# Charge and mass number of the elements of hot winds.
ELEMENTS: Mapping[str, tuple[int, int]] = {
    "H": (1, 1), "He": (2, 4), "C": (6, 12), "N": (7, 14), "O": (8, 16), "Ne": (10, 20), "Mg": (12, 24),
    "Si": (14, 28), "S": (16, 32), "Fe": (26, 56),
}  # fmt: skip


def mean_molecular_weight(mass_fractions: Mapping[str, ArrayLike]) -> FloatArray:
    """Mean weight of a particle, electrons included, of fully ionised gas.

    Parameters
    ----------
    mass_fractions : mapping of str to array_like
        Fraction of the mass in each element (dimensionless), >= 0, by symbol; brought to a sum of 1.

    Returns
    -------
    ndarray
        mu in units of the proton mass (dimensionless).

    Raises
    ------
    InputRefused
        If an element is not known, a fraction is negative, or all are zero.

    Notes
    -----
    Accuracy: 0.7 %, since mass numbers stand for masses. Full ionisation is right for gas of 1e7 K.

    Source: 1/mu = sum X_i (Z_i + 1)/A_i.

    Examples
    --------
    >>> round(float(mean_molecular_weight({"He": 0.5, "C": 0.4, "O": 0.1})), 7)
    1.5047022
    """
    unknown = [symbol for symbol in mass_fractions if symbol not in ELEMENTS]
    if unknown:
        raise InputRefused(
            f"'{unknown[0]}' is not an element of a wind that is known here.",
            why=f"Known are {', '.join(ELEMENTS)}.",
            hint='Give mass fractions such as "He=0.5 C=0.4 O=0.1".',
            code="composition-refused",
        )
    fractions = {symbol: np.asarray(value, dtype=np.float64) for symbol, value in mass_fractions.items()}
    whole = sum(fractions.values(), np.zeros(()))
    if any(bool((value < 0.0).any()) for value in fractions.values()) or bool(np.any(whole <= 0.0)):
        raise InputRefused(
            "The mass fractions do not make a gas.",
            why="Each is zero or more, and together they are above zero.",
            hint='Give mass fractions such as "He=0.5 C=0.4 O=0.1".',
            code="composition-refused",
        )
    particles = sum(
        (value * (ELEMENTS[symbol][0] + 1) / ELEMENTS[symbol][1] for symbol, value in fractions.items()),
        np.zeros(()),
    )
    return np.asarray(whole / particles)


def postshock_temperature_k(mean_weight: ArrayLike, speed_kms: ArrayLike) -> FloatArray:
    """Temperature of gas right behind a strong shock that stands still.

    Parameters
    ----------
    mean_weight : array_like
        mu in units of the proton mass (dimensionless), > 0.
    speed_kms : array_like
        Speed at which the gas meets the shock head on, km/s; broadcast with the weight.

    Returns
    -------
    ndarray
        Temperature, K (unit of the result).

    Raises
    ------
    InputRefused
        If a weight is zero or negative.

    Notes
    -----
    Accuracy: rounding only, of the ideal case: gamma = 5/3, electrons as hot as ions, the whole speed
    across the shock as it is on the line between the stars. Off that line it falls as the squared cosine.

    Source: T = 3 mu m_p v^2/(16 k), Rankine-Hugoniot relations for a strong shock.

    Examples
    --------
    >>> round(float(postshock_temperature_k(0.6, 1000.0)) / 1e7, 4)
    1.3629
    """
    weight = positive(mean_weight, "mean weight", "0.6")
    speed_m_s = 1e3 * np.asarray(speed_kms, dtype=np.float64)
    return 3.0 * weight * PROTON_MASS_KG * speed_m_s**2 / (16.0 * BOLTZMANN_J_K)


def thermal_energy_kev(temperature_k: ArrayLike) -> FloatArray:
    """Temperature as an energy, as X-ray spectra give it.

    Parameters
    ----------
    temperature_k : array_like
        Temperature, K (any value, dimensionless otherwise).

    Returns
    -------
    ndarray
        k T in keV (unit of the result).

    Notes
    -----
    Accuracy: rounding only.

    Source: SI 2019, exact k and e.

    Examples
    --------
    >>> round(float(thermal_energy_kev(1.363e7)), 4)
    1.1745
    """
    return np.asarray(temperature_k, dtype=np.float64) * BOLTZMANN_J_K / (1e3 * ELECTRON_VOLT_J)
