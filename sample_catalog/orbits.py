"""Where the two stars truly are: a plain Kepler orbit, kept apart from the program's own."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from .truth import TrueElements

FloatArray = NDArray[np.float64]


def true_anomaly_rad(elements: TrueElements, mjd: FloatArray) -> tuple[FloatArray, FloatArray]:
    """True anomaly and separation over semi-major axis at each time."""
    e = elements.eccentricity
    turns = (mjd - elements.periastron_bmjd_tdb) / elements.period_d
    mean = 2.0 * np.pi * (turns - np.round(turns))
    eccentric = mean + 0.85 * e * np.sign(mean)
    for _ in range(30):
        eccentric = eccentric - (eccentric - e * np.sin(eccentric) - mean) / (1.0 - e * np.cos(eccentric))
    anomaly = 2.0 * np.arctan2(
        np.sqrt(1.0 + e) * np.sin(0.5 * eccentric), np.sqrt(1.0 - e) * np.cos(0.5 * eccentric)
    )
    return anomaly, 1.0 - e * np.cos(eccentric)


def velocities_kms(elements: TrueElements, mjd: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Radial velocities of star A and star B; positive recedes."""
    anomaly, _ = true_anomaly_rad(elements, mjd)
    omega = np.radians(elements.omega_b_deg)
    swing = np.cos(anomaly + omega) + elements.eccentricity * np.cos(omega)
    return elements.gamma_kms - elements.k_a_kms * swing, elements.gamma_kms + elements.k_b_kms * swing


def sky_position(elements: TrueElements, mjd: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Separation of B from A in mas and position angle in deg, from North through East."""
    anomaly, radius = true_anomaly_rad(elements, mjd)
    argument = anomaly + np.radians(elements.omega_b_deg)
    node, tilt = np.radians(elements.node_deg), np.cos(np.radians(elements.inclination_deg))
    along, across = np.cos(argument), np.sin(argument) * tilt
    north = along * np.cos(node) - across * np.sin(node)
    east = along * np.sin(node) + across * np.cos(node)
    separation = 1000.0 * elements.a_arcsec * radius * np.hypot(north, east)
    return separation, np.degrees(np.arctan2(east, north)) % 360.0
