"""The cooling parameter of each wind around the orbit. An indicator: nothing here decides anything."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.model.systems import StarName
from campaign.model.winds import Cooling, Law
from campaign.physics import cooling, kepler
from campaign.studies.winds_draws import STARS, Propagation, WindDraws
from campaign.studies.winds_inputs import BETA, WindInputs

FloatArray = NDArray[np.float64]


def laws_of(inputs: WindInputs, star: StarName) -> tuple[Law, ...]:
    """The velocity laws that a wind can be followed with.

    Parameters
    ----------
    inputs : WindInputs
        Mass loss in Msun/yr, speed in km/s, radius in Rsun.
    star : str
        'A' or 'B'.

    Returns
    -------
    tuple of str
        'constant' where mass loss and speed are known, 'beta' where the radius is as well.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    low = star.lower()
    if not inputs.has(f"mass_loss_msun_yr_{low}", f"wind_speed_kms_{low}"):
        return ()
    return ("constant", "beta") if inputs.has(f"radius_rsun_{low}") else ("constant",)


def cooling_needs(inputs: WindInputs, star: StarName, law: Law) -> tuple[str, ...]:
    """What the cooling parameter of a wind rests on besides the separation.

    Parameters
    ----------
    inputs : WindInputs
        Values with the units in their names (km/s, Msun/yr, Rsun).
    star, law : str
        Which wind, followed how.

    Returns
    -------
    tuple of str
        Names of inputs.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    low = star.lower()
    names = [*inputs.momentum_needs(), f"mass_loss_msun_yr_{low}", f"wind_speed_kms_{low}"]
    if law == "beta":
        names += [f"radius_rsun_{low}", *([BETA] if BETA in inputs.values else [])]
    return tuple(dict.fromkeys(names))


def speed_and_chi(
    drawn: WindDraws, star: StarName, law: Law, separation_au: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Speed before the shock and cooling parameter of a wind at a separation of the stars.

    Parameters
    ----------
    drawn : WindDraws
        Draws of the winds.
    star, law : str
        Which wind, followed how.
    separation_au : ndarray
        Separation, au, shape (..., draws).

    Returns
    -------
    tuple of ndarray
        Speed in km/s and chi (dimensionless); not a number where the contact surface lies inside the star.

    Notes
    -----
    Accuracy: the contact surface stands where winds at terminal speed balance, whatever the law.

    Source: see ``campaign.physics.cooling``.
    """
    distance = drawn.contact_share(star) * separation_au
    terminal = drawn.given("wind_speed_kms", star)
    if law == "constant":
        speed = np.broadcast_to(terminal, distance.shape)
    else:
        speed = cooling.beta_law_speed(distance, terminal, drawn.radius_au(star), drawn.beta)
    return speed, cooling.cooling_parameter(speed, distance, drawn.given("mass_loss_msun_yr", star))


def half_window(drawn: WindDraws, star: StarName, law: Law) -> FloatArray:
    """Periods from periastron within which the cooling parameter of a wind is below 1.

    Parameters
    ----------
    drawn : WindDraws
        Draws of the winds and of the orbit.
    star, law : str
        Which wind, followed how.

    Returns
    -------
    ndarray
        Periods (dimensionless), in [0, 0.5]: not a number where chi is above 1 all around, 0.5 where it is
        below 1 all around.

    Notes
    -----
    Accuracy: that of the closed form of Kepler's equation.

    Source: chi grows with the separation; ``campaign.physics.kepler.half_window_phase``.
    """
    terminal, rate = drawn.given("wind_speed_kms", star), drawn.given("mass_loss_msun_yr", star)
    if law == "constant":
        distance = cooling.distance_of_unit_cooling(terminal, rate)
    else:
        distance = cooling.distance_of_unit_cooling_beta(terminal, rate, drawn.radius_au(star), drawn.beta)
    separation = distance / drawn.contact_share(star)
    return kepler.half_window_phase(separation / drawn.a_au, drawn.input("eccentricity"))


def coolings(of: Propagation) -> tuple[Cooling, ...]:
    """The cooling parameter of each wind at periastron, at apastron and where it crosses 1.

    Parameters
    ----------
    of : Propagation
        Draws of winds and orbit.

    Returns
    -------
    tuple of Cooling
        Half-windows in periods and days; empty without the size and shape of the orbit.

    Notes
    -----
    Accuracy: an indicator, good to a factor of a few. It gates nothing.

    Source: Stevens, Blondin & Pollock 1992.
    """
    inputs = of.inputs
    if not inputs.size or not inputs.has("eccentricity"):
        return ()
    return tuple(_cooling(of, star, law) for star in STARS for law in laws_of(inputs, star))


def _cooling(of: Propagation, star: StarName, law: Law) -> Cooling:
    inputs = of.inputs
    needs = (*cooling_needs(inputs, star, law), *inputs.size, "eccentricity")
    has_period = inputs.has("period_d")

    def quantities(d: WindDraws) -> dict[str, FloatArray]:
        e, a = d.input("eccentricity"), d.a_au
        half = half_window(d, star, law)
        crossing = np.where(half < 0.5, half, np.nan)
        days = {"days": crossing * d.input("period_d")} if has_period else {}
        return {
            "periastron": speed_and_chi(d, star, law, a * (1.0 - e))[1],
            "apastron": speed_and_chi(d, star, law, a * (1.0 + e))[1],
            "crossing": crossing,
            **days,
        }

    with_period = tuple(dict.fromkeys((*needs, "period_d")))
    found = of.many(
        quantities,
        {"periastron": needs, "apastron": needs, "crossing": needs}
        | ({"days": with_period} if has_period else {}),
    )
    known = not found["crossing"][0].unknown_errors
    half = half_window(of.all, star, law)
    shares = [float(np.mean(x)) for x in (half < 0.5, np.isnan(half), half >= 0.5)] if known else [None] * 3
    return Cooling(
        star,
        law,
        found["periastron"][0],
        found["apastron"][0],
        found["crossing"][0],
        found["days"][0] if has_period else None,
        *shares,
    )
