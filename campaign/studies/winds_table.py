"""The wind collision through the orbit: one line an instant, and a nominal profile for pictures."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.model.propagated import Propagated
from campaign.model.winds import ProfilePoint, WindRow, Zone
from campaign.physics import kepler, postshock, sightline
from campaign.physics.timescales import utc_iso
from campaign.studies.winds_cooling import cooling_needs, laws_of, speed_and_chi
from campaign.studies.winds_draws import STARS, Propagation, WindDraws
from campaign.studies.winds_inputs import WindInputs
from campaign.studies.winds_sightline import flare_needs

FloatArray = NDArray[np.float64]

PROFILE_POINTS = 121
# Numbers held at once: rows of one block times draws.
_BLOCK = 400_000


def table(of: Propagation, times: FloatArray) -> tuple[WindRow, ...]:
    """Lines of the dated table.

    Parameters
    ----------
    of : Propagation
        Draws of winds and orbit; periastron must be dated.
    times : ndarray
        ``bmjd_tdb``.

    Returns
    -------
    tuple of WindRow
        Units in the names; None where the inputs do not give a quantity.

    Notes
    -----
    Accuracy: errors of date, orbit and winds are carried into each line.

    Source: Kepler's equation, and the modules of ``campaign.physics`` on winds.
    """
    rows: list[WindRow] = []
    size = max(1, _BLOCK // of.draws)
    for first in range(0, times.size, size):
        rows.extend(_block(of, times[first : first + size]))
    return tuple(rows)


def _turns(drawn: WindDraws, times: FloatArray) -> FloatArray:
    return (times[:, None] - drawn.periastron) / drawn.input("period_d")


def _block(of: Propagation, times: FloatArray) -> list[WindRow]:
    inputs = of.inputs
    assert inputs.row is not None
    stated = _turns(of.nominal, times)[:, 0]
    # Cycles are counted from half a period before periastron, as an onset before it belongs to it.
    whole = np.floor(stated + 0.5)
    needs = _needs(inputs)

    def quantities(d: WindDraws) -> dict[str, FloatArray]:
        found = _quantities(d, times, whole)
        return {key: found[key] for key in needs}

    found = of.many(quantities, needs)
    zones = _zone_shares(of, times, whole) if "sightline_deg" in needs else None
    iso = utc_iso(times)
    lines = []
    for i in range(times.size):
        values: dict[str, Propagated | None] = {
            name: found[name][i] if name in found else None for name in _COLUMNS
        }
        cycle = int(whole[i]) + inputs.row.epoch_cycle
        seen, cavity, rim = (None, None, None) if zones is None else zones[i]
        lines.append(
            WindRow(
                float(times[i]),
                iso[i],
                cycle,
                **values,  # type: ignore[arg-type]
                seen_through=seen,
                probability_cavity=cavity,
                probability_rim=rim,
            )
        )
    return lines


_COLUMNS = (
    "phase", "separation_au", "contact_from_a_au", "contact_from_b_au", "chi_a", "chi_b", "speed_a_kms",
    "speed_b_kms", "chi_a_beta", "chi_b_beta", "postshock_a_k", "postshock_b_k", "sightline_deg",
)  # fmt: skip


def _needs(inputs: WindInputs) -> dict[str, tuple[str, ...]]:
    """What each quantity of a line rests on; only those that the inputs give."""
    assert inputs.row is not None
    dates = inputs.row.events["periastron"]
    needs: dict[str, tuple[str, ...]] = {"phase": dates}
    if not inputs.has("eccentricity"):
        return needs
    place = (*dates, "eccentricity")
    if inputs.has("inclination_deg", "omega_b_deg"):
        needs["sightline_deg"] = (*place, "inclination_deg", "omega_b_deg")
    if inputs.size:
        distance = (*place, *inputs.size)
        needs["separation_au"] = distance
        for star in STARS:
            low = star.lower()
            needs[f"contact_from_{low}_au"] = (*distance, *inputs.momentum_needs())
            for law in laws_of(inputs, star):
                rests = (*distance, *cooling_needs(inputs, star, law))
                needs[f"chi_{low}" if law == "constant" else f"chi_{low}_beta"] = rests
                if law == "beta":
                    fractions = tuple(n for n in inputs.values if n.startswith(f"fraction_{low}_"))
                    needs[f"speed_{low}_kms"] = rests
                    needs[f"postshock_{low}_k"] = (*rests, *fractions)
    return {key: tuple(dict.fromkeys(names)) for key, names in needs.items()}


def _quantities(d: WindDraws, times: FloatArray, whole: FloatArray) -> dict[str, FloatArray]:
    inputs = d.inputs
    phase = _turns(d, times) - whole[:, None]
    found = {"phase": phase}
    if not inputs.has("eccentricity"):
        return found
    e = d.input("eccentricity")
    anomaly = kepler.eccentric_anomaly(2.0 * np.pi * phase, e)
    if inputs.has("inclination_deg", "omega_b_deg"):
        found["sightline_deg"] = np.degrees(_angle(d, anomaly))
    if inputs.size:
        separation = d.a_au * kepler.separation_ratio(anomaly, e)
        found["separation_au"] = separation
        for star in STARS:
            low = star.lower()
            found[f"contact_from_{low}_au"] = d.contact_share(star) * separation
            for law in laws_of(inputs, star):
                speed, chi = speed_and_chi(d, star, law, separation)
                found[f"chi_{low}" if law == "constant" else f"chi_{low}_beta"] = chi
                if law == "beta":
                    found[f"speed_{low}_kms"] = speed
                    found[f"postshock_{low}_k"] = postshock.postshock_temperature_k(
                        d.mean_weight(star), speed
                    )
    return found


def _angle(d: WindDraws, anomaly: FloatArray) -> FloatArray:
    nu = kepler.true_from_eccentric(anomaly, d.input("eccentricity"))
    return sightline.angle_to_axis_rad(
        nu, np.radians(d.omega_weaker_deg), np.radians(d.input("inclination_deg"))
    )


def zone_of(angle_rad: float, cavity_rad: float, shocks_rad: float) -> Zone:
    """What a line of sight at an angle to the axis passes through.

    Parameters
    ----------
    angle_rad, cavity_rad, shocks_rad : float
        Angle of the line of sight and half-opening angles of contact surface and outer shock, rad.

    Returns
    -------
    str
        'cavity', 'rim' or 'stronger wind'.

    Notes
    -----
    Accuracy: exact. Source: definition.
    """
    if angle_rad < cavity_rad:
        return "cavity"
    return "rim" if angle_rad < shocks_rad else "stronger wind"


def _zone_shares(
    of: Propagation, times: FloatArray, whole: FloatArray
) -> list[tuple[Zone, float | None, float | None]]:
    """Nominal zone, and the shares of draws in cavity and rim, line by line."""
    assert of.inputs.row is not None
    needs = ("eccentricity", "inclination_deg", "omega_b_deg", *flare_needs(of.inputs))
    needs = (*of.inputs.row.events["periastron"], *needs)
    known = all(of.inputs.measured(name).error_known for name in needs)
    lines = []
    stated = np.radians(_quantities(of.nominal, times, whole)["sightline_deg"])[:, 0]
    inner, outer = float(of.nominal.opening_rad[0]), float(of.nominal.shock_opening_rad[0])
    shares = np.full((times.size, 2), np.nan)
    if known:
        angle = np.radians(_quantities(of.all, times, whole)["sightline_deg"])
        cavity = angle < of.all.opening_rad
        rim = (angle < of.all.shock_opening_rad) & ~cavity
        shares = np.stack([cavity.mean(axis=1), rim.mean(axis=1)], axis=1)
    for angle_now, (in_cavity, in_rim) in zip(stated, shares, strict=True):
        lines.append(
            (
                zone_of(float(angle_now), inner, outer),
                float(in_cavity) if known else None,
                float(in_rim) if known else None,
            )
        )
    return lines


def profile(of: Propagation) -> tuple[ProfilePoint, ...]:
    """Nominal values around the orbit, evenly in phase from half a period before periastron to half after.

    Parameters
    ----------
    of : Propagation
        With the shape of the orbit.

    Returns
    -------
    tuple of ProfilePoint
        Units in the names; empty without an eccentricity.

    Notes
    -----
    Accuracy: nominal. Source: as ``table``.
    """
    inputs, d = of.inputs, of.nominal
    if not inputs.has("eccentricity"):
        return ()
    phases = np.linspace(-0.5, 0.5, PROFILE_POINTS)
    e = d.input("eccentricity")
    anomaly = kepler.eccentric_anomaly(2.0 * np.pi * phases[:, None], e)
    empty: list[float | None] = [None] * phases.size
    columns = {"separation_au": empty, "chi_A": empty, "chi_B": empty, "sightline_deg": empty}
    zones: list[Zone | None] = [None] * phases.size
    if inputs.size:
        separation = d.a_au * kepler.separation_ratio(anomaly, e)
        columns["separation_au"] = _listed(separation)
        for star in STARS:
            if laws_of(inputs, star):
                columns[f"chi_{star}"] = _listed(speed_and_chi(d, star, "constant", separation)[1])
    if inputs.has("inclination_deg", "omega_b_deg"):
        angle = _angle(d, anomaly)
        inner, outer = float(d.opening_rad[0]), float(d.shock_opening_rad[0])
        columns["sightline_deg"] = _listed(np.degrees(angle))
        zones = [zone_of(float(x), inner, outer) for x in angle[:, 0]]
    return tuple(
        ProfilePoint(
            float(phases[i]),
            columns["separation_au"][i],
            columns["chi_A"][i],
            columns["chi_B"][i],
            columns["sightline_deg"][i],
            zones[i],
        )
        for i in range(phases.size)
    )


def _listed(rows: FloatArray) -> list[float | None]:
    return [float(x) if np.isfinite(x) else None for x in rows[:, 0]]
