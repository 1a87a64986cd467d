"""The line of sight against the cone of a wind collision: through the cavity, its rim, or neither."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from campaign.model.winds import Sightline, SightZone, Zone
from campaign.physics import sightline
from campaign.physics.eventtimes import conjunction_offset_phase
from campaign.studies.winds_draws import Propagation, WindDraws
from campaign.studies.winds_inputs import FLARE, WindInputs

FloatArray = NDArray[np.float64]

# The weaker star is in front at nu + omega of the weaker star = 270 degrees.
_FRONT_DEG = 270.0


def flare_needs(inputs: WindInputs) -> tuple[str, ...]:
    """What the outer cone, of the shocked gas, rests on.

    Parameters
    ----------
    inputs : WindInputs
        With the flare in deg, if one was given.

    Returns
    -------
    tuple of str
        Names of inputs.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    return (*inputs.momentum_needs(), *([FLARE] if FLARE in inputs.values else []))


def line_of_sight(of: Propagation) -> Sightline | None:
    """Between which phases the observer looks through the cavity of the weaker wind, or through its rim.

    Parameters
    ----------
    of : Propagation
        Draws of winds and orbit.

    Returns
    -------
    Sightline or None
        Angles in degrees, phases in periods; None without inclination, omega or eccentricity.

    Notes
    -----
    Accuracy: of a straight cone; the turn by the orbital motion is left out.

    Source: ``campaign.physics.sightline``.
    """
    if not of.inputs.has("inclination_deg", "omega_b_deg", "eccentricity"):
        return None
    tilt = ("inclination_deg",)
    least = of.one(lambda d: np.abs(90.0 - d.input("inclination_deg")), tilt)
    greatest = of.one(lambda d: 180.0 - np.abs(90.0 - d.input("inclination_deg")), tilt)
    momenta = of.inputs.momentum_needs()
    return Sightline(
        least,
        greatest,
        _zone(of, "cavity", momenta),
        _zone(of, "rim", flare_needs(of.inputs)),
    )


def zone_phases(drawn: WindDraws, zone: Zone, reference_rad: float) -> tuple[FloatArray, FloatArray]:
    """Phases from periastron at which the line of sight enters and leaves a cone.

    Parameters
    ----------
    drawn : WindDraws
        Draws of winds and orbit.
    zone : str
        'cavity', or 'rim' for the cone that holds cavity and rim.
    reference_rad : float
        Nominal true anomaly of the conjunction, rad: draws are followed continuously from it.

    Returns
    -------
    tuple of ndarray
        Phases in periods; not a number in draws that never enter, or never leave.

    Notes
    -----
    Accuracy: of a straight cone.

    Source: ``campaign.physics.sightline.half_passage_rad``.
    """
    half = _half_passage(drawn, zone)
    half = np.where(half < np.pi, half, np.nan)
    front = np.radians(_FRONT_DEG - drawn.omega_weaker_deg)
    front = reference_rad + np.remainder(front - reference_rad + np.pi, 2.0 * np.pi) - np.pi
    e = drawn.input("eccentricity")
    return conjunction_offset_phase(e, front - half), conjunction_offset_phase(e, front + half)


def front_anomaly_rad(of: Propagation) -> float:
    """Nominal true anomaly with the weaker wind in front, within half a turn of periastron.

    Parameters
    ----------
    of : Propagation
        With omega.

    Returns
    -------
    float
        rad.

    Notes
    -----
    Accuracy: exact. Source: nu + omega = 270 degrees.
    """
    front = _FRONT_DEG - float(of.nominal.omega_weaker_deg[0])
    return float(np.radians((front + 180.0) % 360.0 - 180.0))


def _half_passage(drawn: WindDraws, zone: Zone) -> FloatArray:
    cone = drawn.opening_rad if zone == "cavity" else drawn.shock_opening_rad
    return sightline.half_passage_rad(cone, np.radians(drawn.input("inclination_deg")))


def _zone(of: Propagation, zone: Zone, cone_needs: Sequence[str]) -> SightZone:
    needs = tuple(dict.fromkeys((*cone_needs, "inclination_deg", "omega_b_deg", "eccentricity")))
    reference = front_anomaly_rad(of)

    def quantities(d: WindDraws) -> dict[str, FloatArray]:
        start, end = zone_phases(d, zone, reference)
        half = _half_passage(d, zone)
        share = np.where(np.isnan(half), 0.0, np.where(half < np.pi, end - start, 1.0))
        cone = d.opening_rad if zone == "cavity" else d.shock_opening_rad
        return {"from": start, "until": end, "share": share, "opening": np.degrees(cone)}

    found = of.many(quantities, {"from": needs, "until": needs, "share": needs, "opening": cone_needs})
    known = not found["share"][0].unknown_errors
    half = _half_passage(of.all, zone)
    return SightZone(
        zone,
        found["opening"][0],
        found["from"][0],
        found["until"][0],
        found["share"][0],
        float(np.mean(~np.isnan(half))) if known else None,
        float(np.mean(half >= np.pi)) if known else None,
    )
