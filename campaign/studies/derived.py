"""Masses, sizes and distances that follow from the elements; computed each time, never stored."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shown import DerivedValue
from campaign.model.systems import Solution
from campaign.physics import masses
from campaign.physics.constants import AU_KM
from campaign.physics.draws import stratified_normals, two_piece_within
from campaign.studies.rows import distance_of
from campaign.studies.sampling import DEFAULT_SEED

FloatArray = NDArray[np.float64]

_DRAWS = 20_000
_POSITIVE = (1e-9, float("inf"))
# The values that an input can have; all others are positive.
_DOMAINS = {"e": (0.0, 1.0 - 1e-9), "i": (0.0, 180.0)}


def derive(record: SystemRecord, solution: Solution) -> tuple[DerivedValue, ...]:
    """Masses, sizes and distance that follow from the elements, with errors by seeded draws.

    From the velocities of one star alone only the size of its own orbit times sin i follows.

    Parameters
    ----------
    record : SystemRecord
        System with distance in pc or parallax in mas, and its stars' masses in Msun.
    solution : Solution
        Elements.

    Returns
    -------
    tuple of DerivedValue
        Median and 16/84 % errors; an input without an error gives a value without one.

    Notes
    -----
    Accuracy: about 1 % of the errors, from 20,000 draws.

    Source: M sin^3 i = (P/2 pi G)(1 - e^2)^1.5 (K_A + K_B)^2 K_other; a sin i = K P sqrt(1 - e^2)/(2 pi);
    Kepler's third law.
    """
    inputs = _Inputs(record, solution)
    found = [*derive_distance(record), *_from_angle_and_size(inputs), *_from_velocities(inputs)]
    axis = _axis_au(inputs)
    if axis is not None:
        size, how, names = axis
        if how != "given":
            found.append(inputs.value("semi-major axis", size, "au", how, names))
        if inputs.has("e"):
            near = size * (1.0 - inputs.draws("e"))
            found.append(
                inputs.value("separation at periastron", near, "au", f"a {how} and e", (*names, "e"))
            )
    return tuple(found)


# Sine of an inclination below which the orbit is seen face on.
_FACE_ON = 1e-6


class _Inputs:
    """The measured inputs by a short name, and draws of them from one set of deviates."""

    def __init__(self, record: SystemRecord, solution: Solution) -> None:
        period = solution.period_d
        self.known: dict[str, Measured | None] = {
            "period": period if isinstance(period, Measured) else None,
            "e": solution.eccentricity,
            "i": solution.inclination_deg,
            "k_a": solution.k_a_kms,
            "k_b": solution.k_b_kms,
            "a_au": solution.a_au,
            "a_arcsec": solution.a_arcsec,
            "distance": distance_of(record),
            "mass_a": record.system.star_a.mass_msun,
            "mass_b": record.system.star_b.mass_msun,
        }
        self._normals = stratified_normals(list(self.known), _DRAWS, DEFAULT_SEED)

    def has(self, *names: str) -> bool:
        return all(self.known[name] is not None for name in names)

    def is_tilted(self) -> bool:
        """Whether an inclination is known, and one at which velocities say something of masses."""
        tilt = self.known["i"]
        return tilt is not None and abs(np.sin(np.radians(tilt.value))) > _FACE_ON

    def draws(self, name: str) -> FloatArray:
        value = self.known[name]
        assert value is not None
        middle, minus, plus = (np.array([[x]]) for x in (value.value, value.minus or 0.0, value.plus or 0.0))
        low, high = _DOMAINS.get(name, _POSITIVE)
        return two_piece_within(middle, minus, plus, self._normals[name][None, :], low, high).ravel()

    def value(self, quantity: str, draws: Any, unit: str, how: str, names: Iterable[str]) -> DerivedValue:
        low, median, high = (float(q) for q in np.quantile(draws, [0.16, 0.5, 0.84]))
        used = [self.known[name] for name in names]
        known = all(value is not None and value.error_known for value in used)
        errors = (median - low, high - median) if known else (None, None)
        return DerivedValue(quantity, Measured(median, *errors), unit, how)


def derive_distance(record: SystemRecord) -> list[DerivedValue]:
    """The distance that follows from a parallax, and how; none where a distance was given.

    Parameters
    ----------
    record : SystemRecord
        System with a parallax in mas.

    Returns
    -------
    list of DerivedValue
        None or one, in pc.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.distance``.
    """
    parallax, distance = record.system.parallax_mas, distance_of(record)
    if record.system.distance_pc is not None or parallax is None or distance is None:
        return []
    if parallax.sigma is None:
        return [DerivedValue("distance", distance, "pc", "parallax, plain inversion, error unknown")]
    from campaign.physics.distance import distance_from_parallax

    method = distance_from_parallax(parallax.value, parallax.sigma).method
    return [DerivedValue("distance", distance, "pc", f"parallax, {method}")]


def _from_angle_and_size(inputs: _Inputs) -> list[DerivedValue]:
    found = []
    if inputs.has("a_au", "distance"):
        angle = 1000.0 * inputs.draws("a_au") / inputs.draws("distance")
        names: tuple[str, ...] = ("a_au", "distance")
        found.append(inputs.value("semi-major axis", angle, "mas", "a in au over distance", names))
    if inputs.has("a_au", "a_arcsec"):
        names = ("a_au", "a_arcsec")
        far = inputs.draws("a_au") / inputs.draws("a_arcsec")
        found.append(inputs.value("distance", far, "pc", "a in au over a in arcsec", names))
    return found


def _from_velocities(inputs: _Inputs) -> list[DerivedValue]:
    if not inputs.has("period", "e"):
        return []
    period, e = inputs.draws("period"), inputs.draws("e")
    if not inputs.has("k_a", "k_b"):
        return [
            inputs.value(
                f"semi-major axis of star {star} times sin i",
                masses.projected_semi_major_axis_km(period, e, inputs.draws(name)) / AU_KM,
                "au",
                "velocities",
                ("period", "e", name),
            )
            for star, name in (("A", "k_a"), ("B", "k_b"))
            if inputs.has(name)
        ]
    names: tuple[str, ...] = ("period", "e", "k_a", "k_b")
    k_a, k_b = inputs.draws("k_a"), inputs.draws("k_b")
    least = dict(zip("AB", masses.minimum_masses(period, e, k_a, k_b), strict=True))
    found = [
        inputs.value(f"mass of star {star} times sin^3 i", mass, "Msun", "velocities", names)
        for star, mass in least.items()
    ]
    found.append(inputs.value("mass ratio B/A", k_a / k_b, "", "velocities", ("k_a", "k_b")))
    if inputs.is_tilted():
        cube = np.sin(np.radians(inputs.draws("i"))) ** 3
        found += [
            inputs.value(
                f"mass of star {star}", mass / cube, "Msun", "velocities and inclination", (*names, "i")
            )
            for star, mass in least.items()
        ]
    return found


def _axis_au(inputs: _Inputs) -> tuple[FloatArray, str, tuple[str, ...]] | None:
    """Draws of the semi-major axis, how it came about, and from what; in the order a forecast uses."""
    if inputs.has("a_au"):
        return inputs.draws("a_au"), "given", ("a_au",)
    if inputs.has("a_arcsec", "distance"):
        size = inputs.draws("a_arcsec") * inputs.draws("distance")
        return size, "from a in arcsec and distance", ("a_arcsec", "distance")
    if inputs.has("period", "e", "k_a", "k_b") and inputs.is_tilted():
        names: tuple[str, ...] = ("period", "e", "k_a", "k_b", "i")
        period, e, k_a, k_b, tilt = (inputs.draws(name) for name in names)
        size = masses.semi_major_axis_from_velocities(period, e, k_a, k_b, np.radians(tilt))
        return size, "from velocities and inclination", names
    if inputs.has("period", "mass_a", "mass_b"):
        names = ("period", "mass_a", "mass_b")
        total = inputs.draws("mass_a") + inputs.draws("mass_b")
        return (
            masses.semi_major_axis_au(inputs.draws("period"), total),
            "from the masses and the period",
            names,
        )
    return None
