"""The dated table of one system: phase, true anomaly, separation, position, velocities."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.errors import Conflict, InputRefused
from campaign.model.forecasts import EphemerisResult, EphemerisRow
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution
from campaign.physics import kepler, masses, orbit
from campaign.physics.timescales import utc_iso
from campaign.studies.cycles import nominal_period_d
from campaign.studies.periastron import omega_b_deg, periastron_epoch
from campaign.studies.rows import distance_of

FloatArray = NDArray[np.float64]
MOST_ROWS = 100_000


def ephemeris(
    record: SystemRecord,
    solution: Solution,
    start: float,
    end: float,
    step_d: float,
    as_of_utc: str,
) -> EphemerisResult:
    """Tabulate an orbit at even steps.

    Parameters
    ----------
    record : SystemRecord
        The system, for its distance.
    solution : Solution
        Elements to use.
    start, end : float
        First and last instant, ``bmjd_tdb``.
    step_d : float
        Step, days, > 0.
    as_of_utc : str
        Instant of the question, for the record.

    Returns
    -------
    EphemerisResult
        Rows with None where the elements do not give a quantity.

    Raises
    ------
    InputRefused
        If the step or the span cannot be used.
    Conflict
        If the solution has no period or no epoch.

    Notes
    -----
    Accuracy: of the nominal elements, no errors are propagated; light time within the orbit is left out
    (at most minutes).

    Source: Kepler's equation; conventions of DEVELOPERS.md.
    """
    _check_span(start, end, step_d)
    period = nominal_period_d(solution)
    if period is None or solution.epoch is None:
        raise Conflict(
            f"Solution '{solution.label}' of {record.system.name} gives no ephemeris.",
            why="It needs a period that is more than a limit, and an epoch.",
            hint="Choose another with --solution, or add one with: campaign solution add.",
            code="no-ephemeris",
        )
    times = start + step_d * np.arange(int(np.floor((end - start) / step_d + 1e-9)) + 1)
    epoch, assumptions = _phase_zero(solution, period)
    if not isinstance(solution.period_d, Measured):
        assumptions.append(f"the period is a range: its middle, {period:.8g} d, is used")
    turns = (times - epoch) / period
    # Cycles are counted from half a period before periastron, as an onset before it belongs to it.
    whole = np.floor(turns + 0.5)
    phase = turns - whole
    cycle = whole.astype(int) + (solution.epoch_cycle or 0)
    e = solution.eccentricity.value if solution.eccentricity is not None else None
    columns = _columns(record, solution, period, phase, e, assumptions)
    iso = utc_iso(times)
    rows = tuple(
        EphemerisRow(float(times[i]), iso[i], int(cycle[i]), float(phase[i]), *(c[i] for c in columns))
        for i in range(times.size)
    )
    assumptions.append("nominal elements: their errors are not carried into the table")
    return EphemerisResult(record.system.name, solution.label, as_of_utc, rows, tuple(assumptions))


def _check_span(start: float, end: float, step_d: float) -> None:
    if not step_d > 0.0:
        raise InputRefused(
            "The step of the table is not positive.",
            why=f"A table cannot advance by {step_d:g} d.",
            hint="Give a step such as --step 30d.",
            code="step-refused",
        )
    if end < start:
        raise InputRefused(
            "The table ends before it begins.",
            why="--until is earlier than --from.",
            hint="Swap them, for example --from 2030-01-01 --until 2032-01-01.",
            code="span-refused",
        )
    if (end - start) / step_d > MOST_ROWS:
        raise InputRefused(
            f"The table would have more than {MOST_ROWS} rows.",
            why="The step is too fine for the span.",
            hint="Choose a longer --step or a shorter span.",
            code="span-refused",
        )


def _phase_zero(solution: Solution, period_d: float) -> tuple[float, list[str]]:
    assert solution.epoch is not None
    epoch = periastron_epoch(solution, period_d)
    mark = solution.epoch_marks
    if epoch is None:
        return solution.epoch.bmjd_tdb, [f"phase counts from '{mark}': periastron is not known"]
    return epoch, [] if mark == "periastron" else [f"periastron derived from the epoch of '{mark}'"]


Column = list[float | None]


def _columns(
    record: SystemRecord,
    solution: Solution,
    period_d: float,
    phase: FloatArray,
    e: float | None,
    assumptions: list[str],
) -> tuple[Column, ...]:
    empty: Column = [None] * phase.size
    anchored = not any("periastron is not known" in text for text in assumptions)
    if e is None or not anchored:
        assumptions.append("no eccentricity or no periastron: phase only")
        return (empty,) * 7
    anomaly = kepler.eccentric_anomaly(2.0 * np.pi * phase, e)
    nu = kepler.true_from_eccentric(anomaly, e)
    ratio = kepler.separation_ratio(anomaly, e)
    axis = semi_major_axis(record, solution, period_d)
    a_au = None if axis is None else axis[0]
    if axis is not None and solution.a_au is None:
        assumptions.append(f"semi-major axis {axis[0]:.4g} au from {axis[1]}")
    distance = distance_of(record)
    a_mas = _a_mas(solution, a_au, distance)
    omega_b = omega_b_deg(solution)
    projected, angle = empty, empty
    if a_mas is not None and solution.inclination_deg is not None and omega_b is not None:
        node = solution.node_deg.value if solution.node_deg is not None else 0.0
        north, east, _ = orbit.sky_position(
            nu,
            ratio * a_mas,
            np.radians(omega_b),
            np.radians(solution.inclination_deg.value),
            np.radians(node),
        )
        projected = _floats(np.hypot(north, east))
        if solution.node_deg is not None:
            angle = _floats(np.degrees(np.arctan2(east, north)) % 360.0)
        else:
            assumptions.append("no node: no position angle")
    velocities = [_velocity(nu, e, solution, star, omega_b) for star in ("A", "B")]
    if solution.gamma_kms is None and any(v is not None for v in velocities):
        assumptions.append("no systemic velocity: velocities are relative to the pair's own centre of mass")
    return (
        _floats(np.degrees(nu)),
        _floats(ratio * a_au) if a_au is not None else empty,
        _floats(ratio * a_mas) if a_mas is not None else empty,
        projected,
        angle,
        velocities[0] if velocities[0] is not None else empty,
        velocities[1] if velocities[1] is not None else empty,
    )


def semi_major_axis_au(record: SystemRecord, solution: Solution, period_d: float) -> float | None:
    """Nominal semi-major axis in au; see ``semi_major_axis``, whose number this is.

    Parameters
    ----------
    record : SystemRecord
        For distance and masses.
    solution : Solution
        Elements.
    period_d : float
        Period, days.

    Returns
    -------
    float or None
        au; None when nothing gives it.

    Notes
    -----
    Accuracy and source: see ``semi_major_axis``.
    """
    found = semi_major_axis(record, solution, period_d)
    return None if found is None else found[0]


def semi_major_axis(record: SystemRecord, solution: Solution, period_d: float) -> tuple[float, str] | None:
    """Nominal semi-major axis from whatever the catalogue holds, and what that is.

    Parameters
    ----------
    record : SystemRecord
        For distance and masses.
    solution : Solution
        Elements.
    period_d : float
        Period, days.

    Returns
    -------
    (float, str) or None
        au, and where it comes from; None when nothing gives it.

    Notes
    -----
    Accuracy: nominal values only.

    Source: given; angle times distance; velocities with inclination; Kepler's third law with masses.
    """
    if solution.a_au is not None:
        return solution.a_au.value, "as given"
    distance = distance_of(record)
    if solution.a_arcsec is not None and distance is not None:
        return solution.a_arcsec.value * distance.value, "a in arcsec times the distance"
    k_a, k_b, tilt, e = solution.k_a_kms, solution.k_b_kms, solution.inclination_deg, solution.eccentricity
    if k_a is not None and k_b is not None and tilt is not None and e is not None:
        size = masses.semi_major_axis_from_velocities(
            period_d, e.value, k_a.value, k_b.value, np.radians(tilt.value)
        )
        return float(size), "the velocities and the inclination"
    mass_a, mass_b = record.system.star_a.mass_msun, record.system.star_b.mass_msun
    if mass_a is not None and mass_b is not None:
        size = masses.semi_major_axis_au(period_d, mass_a.value + mass_b.value)
        return float(size), "the masses of the stars and the period"
    return None


def _a_mas(solution: Solution, a_au: float | None, distance: Measured | None) -> float | None:
    if solution.a_arcsec is not None:
        return 1000.0 * solution.a_arcsec.value
    if a_au is not None and distance is not None:
        return 1000.0 * a_au / distance.value
    return None


def _velocity(
    nu: FloatArray,
    e: float,
    solution: Solution,
    star: str,
    omega_b_deg: float | None,
) -> Column | None:
    k = solution.k_a_kms if star == "A" else solution.k_b_kms
    if k is None or omega_b_deg is None:
        return None
    omega = omega_b_deg + (180.0 if star == "A" else 0.0)
    gamma = solution.gamma_kms.value if solution.gamma_kms is not None else 0.0
    return _floats(orbit.radial_velocity(nu, e, k.value, np.radians(omega), gamma))


def _floats(values: FloatArray) -> Column:
    return [float(v) for v in np.atleast_1d(values)]
