"""The epoch of periastron from an epoch that marks something else, where the elements allow it."""

from __future__ import annotations

import numpy as np

from campaign.model.systems import Solution
from campaign.physics.orbit import conjunction_phases


def omega_b_deg(solution: Solution) -> float | None:
    """Argument of periastron of star B, whichever star the solution gives it for.

    Parameters
    ----------
    solution : Solution
        ``omega_deg`` of the star ``omega_of``.

    Returns
    -------
    float or None
        Degrees in [0, 360); None when omega or its star is unknown.

    Notes
    -----
    Accuracy: exact.

    Source: omega_A = omega_B + 180 deg.
    """
    if solution.omega_deg is None or solution.omega_of is None:
        return None
    return (solution.omega_deg.value + (180.0 if solution.omega_of == "A" else 0.0)) % 360.0


def periastron_epoch(solution: Solution, period_d: float) -> float | None:
    """Nominal epoch of periastron.

    Parameters
    ----------
    solution : Solution
        With an epoch that marks periastron or, with e and omega, a conjunction.
    period_d : float
        Period, days.

    Returns
    -------
    float or None
        ``bmjd_tdb``; None when periastron cannot be derived.

    Notes
    -----
    Accuracy: of the nominal elements.

    Source: nu + omega_B = 90 deg with A in front, 270 deg with B in front; Kepler's equation.
    """
    if solution.epoch is None:
        return None
    epoch = solution.epoch.bmjd_tdb
    if solution.epoch_marks == "periastron":
        return epoch
    omega = omega_b_deg(solution)
    if solution.epoch_marks in ("A in front", "B in front") and omega is not None and solution.eccentricity:
        a_front, b_front = conjunction_phases(solution.eccentricity.value, np.radians(omega))
        offset = float(a_front if solution.epoch_marks == "A in front" else b_front)
        return epoch - (offset - round(offset)) * period_d
    return None
