"""What of a wind collision needs no orbit: angles, shape, and temperatures behind the shocks."""

from __future__ import annotations

import numpy as np

from campaign.model.propagated import Propagated
from campaign.model.systems import StarName
from campaign.model.winds import OpeningForm, SurfacePoint, WindOfStar
from campaign.physics import contactsurface, openingforms, postshock
from campaign.studies.winds_draws import STARS, Propagation

_SURFACE_POINTS = 41
# Where the shape ends: within the square of what is left here of the way to the asymptote.
_SURFACE_END = 0.95
_THIN_SHELL = "Canto, Raga & Wilkin 1996"


def forms(of: Propagation) -> tuple[OpeningForm, ...]:
    """The half-opening angle by every published form, the thin shell first.

    Parameters
    ----------
    of : Propagation
        Draws of the momentum ratio (dimensionless).

    Returns
    -------
    tuple of OpeningForm
        Angles in degrees.

    Notes
    -----
    Accuracy: see ``campaign.physics.openingforms``. Source: named in each.
    """
    table = (
        ("thin shell, mixed", _THIN_SHELL, contactsurface.half_opening_rad),
        ("fit, radiative", "Eichler & Usov 1993 (memory)", openingforms.fitted_half_opening_rad),
        ("radiative, not mixed", "Gayley 2009 (memory)", openingforms.unmixed_half_opening_rad),
        ("adiabatic", "Gayley 2009 (memory)", openingforms.adiabatic_half_opening_rad),
        ("fit, hydrodynamic", "Pittard & Dawson 2018 (memory)", openingforms.hydrodynamic_half_opening_rad),
    )
    needs = of.inputs.momentum_needs()
    found = of.many(
        lambda d: {name: np.degrees(form(d.eta)) for name, _, form in table},
        {name: needs for name, _, _ in table},
    )
    return tuple(OpeningForm(name, source, found[name][0]) for name, source, _ in table)


def surface(eta: Propagated) -> tuple[SurfacePoint, ...]:
    """The contact surface, from the stagnation point to several separations away.

    Parameters
    ----------
    eta : Propagated
        Momentum ratio (dimensionless).

    Returns
    -------
    tuple of SurfacePoint
        Distances in separations.

    Notes
    -----
    The distance grows with the momentum ratio at every angle, so its quantiles are those of the ratio
    carried through; there is no standard deviation, since the distance may be infinite. Accuracy: exact.

    Source: Canto, Raga & Wilkin 1996.
    """
    assert eta.value is not None
    opening = float(contactsurface.half_opening_rad(eta.value))
    # Closer together towards the asymptote, where the surface runs off.
    left = 1.0 - np.linspace(0.0, _SURFACE_END, _SURFACE_POINTS)
    angles = (1.0 - left**2) * (np.pi - opening)
    known = [eta.value, eta.median, eta.lo68, eta.hi68, eta.lo95, eta.hi95]
    ratios = np.array([np.nan if x is None else x for x in known])
    distances = contactsurface.contact_surface(angles[:, None], ratios[None, :])[1]
    points = []
    for angle, row in zip(angles, distances, strict=True):
        numbers = [float(x) if np.isfinite(x) else None for x in row]
        value, median, lo68, hi68, lo95, hi95 = numbers
        told = Propagated(
            value, median, None, lo68, hi68, lo95, hi95,
            dominant=eta.dominant, dominant_share=eta.dominant_share, unknown_errors=eta.unknown_errors,
        )  # fmt: skip
        radius = float(row[0])
        points.append(
            SurfacePoint(
                float(np.degrees(angle)),
                told,
                1.0 - radius * float(np.cos(angle)),
                radius * float(np.sin(angle)),
            )
        )
    return tuple(points)


def winds_of_stars(of: Propagation) -> tuple[WindOfStar, ...]:
    """Both winds with their composition and the temperature behind the shock at terminal speed.

    Parameters
    ----------
    of : Propagation
        Draws of speeds in km/s and of mass fractions.

    Returns
    -------
    tuple of WindOfStar
        Temperatures in K and keV.

    Notes
    -----
    Accuracy: that of the composition stated; see ``campaign.physics.postshock``.

    Source: strong shock, T = 3 mu m_p v^2/(16 k).
    """
    return tuple(_wind_of_star(of, star) for star in STARS)


def _wind_of_star(of: Propagation, star: StarName) -> WindOfStar:
    inputs = of.inputs
    composition, origin = inputs.compositions[star]
    spoken_type = (inputs.record.system.star_a if star == "A" else inputs.record.system.star_b).spectral_type
    fractions = tuple(n for n in inputs.values if n.startswith(f"fraction_{star.lower()}_"))
    weight = of.one(lambda d: d.mean_weight(star), fractions)
    speed = f"wind_speed_kms_{star.lower()}"
    temperature = energy = Propagated(None)
    if inputs.has(speed):
        found = of.many(
            lambda d: {
                "k": (k := postshock.postshock_temperature_k(d.mean_weight(star), d.input(speed))),
                "kev": postshock.thermal_energy_kev(k),
            },
            {"k": (*fractions, speed), "kev": (*fractions, speed)},
        )
        temperature, energy = found["k"][0], found["kev"][0]
    return WindOfStar(
        star,
        "weaker" if star == inputs.weaker else "stronger",
        spoken_type,
        composition,
        origin,
        weight,
        temperature,
        energy,
    )
