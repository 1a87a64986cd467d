"""The orbit on the sky and along the line of sight, masses and sizes. Checks from outside: the orbit rows of
tests/reference/checks_orbit_time.csv and published_orbits.csv (source and basis in each row), and rebound,
an N-body package, as an independent maker of positions and velocities."""

from __future__ import annotations

import re

import numpy as np
import pytest
import rebound
from hypothesis import given, settings
from hypothesis import strategies as st
from physics_reference import checks, published

from campaign.errors import InputRefused
from campaign.physics import kepler, masses, orbit
from campaign.physics.constants import (
    AU_KM,
    DAY_S,
    GM_SUN_KM3_S2,
    JULIAN_YEAR_D,
    KMS_PER_AU_YR,
    LIGHT_TIME_AU_S,
    SOLAR_RADIUS_KM,
    SPEED_OF_LIGHT_KMS,
)

patient = settings(max_examples=200, deadline=None)
angles_deg = st.floats(0.0, 360.0)


def numbers(expected):
    return {key: float(value) for key, value in expected.items()}


def place_on_the_sky(phase, e, a, omega_b_deg, inclination_deg, node_deg):
    E = kepler.eccentric_anomaly(2 * np.pi * phase, e)
    nu = kepler.true_from_eccentric(E, e)
    distance = a * kepler.separation_ratio(E, e)
    return (
        nu,
        distance,
        orbit.sky_position(nu, distance, *np.radians([omega_b_deg, inclination_deg, node_deg])),
    )


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.relative"))
def test_the_companion_stands_and_moves_where_40_digits_put_it(inputs, expected, tolerance):
    assert tolerance == "rel 1e-11"
    want, e, a = numbers(expected), inputs["e"], inputs["a_au"]
    omega = inputs["omega_of_companion_relative_orbit_deg"]
    nu, distance, (north, east, away) = place_on_the_sky(
        inputs["phase"], e, a, omega, inputs["i_deg"], inputs["Omega_deg"]
    )
    angle, projected = orbit.position_angle_and_separation(north, east)
    k = orbit.semi_amplitude(inputs["P_julian_yr"] * JULIAN_YEAR_D, e, a, np.radians(inputs["i_deg"]))
    velocity = orbit.radial_velocity(nu, e, k, np.radians(omega))
    found = {
        "dN_au": north,
        "dE_au": east,
        "z_away_au": away,
        "rho_au": projected,
        "PA_deg": np.degrees(angle),
        "D_au": distance,
        "vrel_los_kms": velocity,
        "light_delay_z_over_c_s": away * LIGHT_TIME_AU_S,
    }
    nu_deg = want.pop("nu_deg")
    # -180 and +180 deg are one place.
    assert (np.degrees(nu) - nu_deg + 180.0) % 360.0 - 180.0 == pytest.approx(0.0, abs=1e-11 * 180)
    assert {key: float(value) for key, value in found.items()} == pytest.approx(want, rel=1e-11, abs=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.meeus_etaCrB_precise"))
def test_the_worked_visual_orbit_to_ten_decimals(inputs, expected, tolerance):
    assert tolerance == "abs 1e-10"
    want, e, a = numbers(expected), inputs["e"], inputs["a_arcsec"]
    mean = kepler.mean_from_eccentric(2 * np.pi * (inputs["t"] - inputs["T"]) / inputs["P_yr"], 0.0)
    E = kepler.eccentric_anomaly(mean, e)
    nu = kepler.true_from_eccentric(E, e)
    distance = a * kepler.separation_ratio(E, e)
    elements = np.radians([inputs["omega_deg"], inputs["i_deg"], inputs["Omega_deg"]])
    north, east, away = orbit.sky_position(nu, distance, *elements)
    angle, projected = orbit.position_angle_and_separation(north, east)
    found = {
        "M_deg": np.degrees(mean),
        "E_deg": np.degrees(E),
        "nu_deg": np.degrees(nu),
        "r_arcsec": distance,
        "theta_deg": np.degrees(angle),
        "rho_arcsec": projected,
        "dN_arcsec": north,
        "dE_arcsec": east,
        "z_away_arcsec": away,
        **orbit.thiele_innes(a, *elements)._asdict(),
    }
    assert {key: float(value) for key, value in found.items()} == pytest.approx(want, abs=1e-10, rel=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.meeus_etaCrB"))
def test_the_worked_visual_orbit_as_the_handbook_prints_it(inputs, expected, tolerance):
    assert tolerance == "abs 0.05 deg / 0.0005 arcsec"
    _, _, (north, east, _) = place_on_the_sky(
        (inputs["t"] - inputs["T"]) / inputs["P_yr"],
        *(inputs[key] for key in ("e", "a_arcsec", "omega_deg", "i_deg", "Omega_deg")),
    )
    angle, projected = orbit.position_angle_and_separation(north, east)
    assert np.degrees(angle) == pytest.approx(expected["theta_deg"], abs=0.05)
    assert float(projected) == pytest.approx(expected["rho_arcsec"], abs=0.0005)


def test_eta_coronae_borealis_published_apparent_orbit():
    row = published("O4")  # Meeus, Astronomical Algorithms, ch. 57
    period, start, e, a, tilt, node, omega, date = map(float, re.findall(r"\d+\.\d+", row["inputs"]))
    theta, rho = map(float, re.findall(r"\d+\.\d+", row["published"]))
    _, _, (north, east, _) = place_on_the_sky((date - start) / period, e, a, omega, tilt, node)
    angle, projected = orbit.position_angle_and_separation(north, east)
    assert np.degrees(angle) == pytest.approx(theta, abs=0.05)
    assert float(projected) == pytest.approx(rho, abs=0.0005)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.symmetry"))
def test_half_a_turn_of_node_and_periastron_leaves_the_sky_path_and_turns_the_line_of_sight(
    inputs, expected, tolerance
):
    assert tolerance == "exact to 1e-12"
    base = inputs["base"]
    turn_node = 180.0 if inputs["change"] == "Omega+180,omega+180" else 0.0
    before = place_on_the_sky(
        base["phase"], base["e"], base["a_au"], base["omega_deg"], base["i_deg"], base["Omega_deg"]
    )[2]
    after = place_on_the_sky(
        base["phase"],
        base["e"],
        base["a_au"],
        base["omega_deg"] + 180.0,
        base["i_deg"],
        base["Omega_deg"] + turn_node,
    )[2]
    ratios = [float(b / a) for a, b in zip(before, after, strict=True)]
    assert ratios == pytest.approx(
        [float(expected[k]) for k in ("dN_ratio", "dE_ratio", "z_ratio")], abs=1e-12
    )


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.conjunctions"))
def test_conjunctions_and_nodes_fall_at_their_phases(inputs, expected, tolerance):
    assert tolerance == "abs 1e-12 phase"
    want = numbers(expected)
    e, omega_b = inputs["e"], np.radians(inputs["omega_companion_deg"])
    a_front, b_front = orbit.conjunction_phases(e, omega_b)
    ascending, _ = orbit.node_phases(e, omega_b)
    assert float(a_front) == pytest.approx(want["phase_companion_behind(nu+omega=90)"], abs=1e-12)
    assert float(b_front) == pytest.approx(want["phase_companion_in_front(nu+omega=270)"], abs=1e-12)
    assert float(ascending) == pytest.approx(want["phase_asc_node(nu+omega=0)"], abs=1e-12)
    # The mistake of the trade: omega of A where omega of B belongs swaps the two.
    swapped, _ = orbit.conjunction_phases(e, omega_b + np.pi)
    assert float(swapped) == pytest.approx(want["phase_conj_if_omega_wrong_by_180_behind"], abs=1e-12)


@patient
@given(st.floats(0.0, 0.99), angles_deg, st.floats(5.0, 85.0))
def test_at_conjunction_one_star_is_straight_behind_and_at_the_nodes_both_are_equally_far(e, omega, tilt):
    # Geometry: z = r sin(nu + omega_B) sin i points away from the observer.
    phases = np.array(
        [*orbit.conjunction_phases(e, np.radians(omega)), *orbit.node_phases(e, np.radians(omega))]
    )
    assert ((phases >= 0.0) & (phases < 1.0)).all()
    _, distance, (north, east, away) = place_on_the_sky(phases, e, 1.0, omega, tilt, 77.0)
    along_node = north * np.cos(np.radians(77.0)) + east * np.sin(np.radians(77.0))
    rounding = 1e-13 / (1.0 - e)
    assert along_node[:2] / distance[:2] == pytest.approx([0.0, 0.0], abs=rounding)
    assert away[0] > 0.0 > away[1]  # A in front means B behind; then B in front
    assert away[2:] / distance[2:] == pytest.approx([0.0, 0.0], abs=rounding)
    velocity = orbit.radial_velocity(
        kepler.true_anomaly(2 * np.pi * phases[2:], e), 0.0, 1.0, np.radians(omega)
    )
    assert velocity[0] > 0.0 > velocity[1]  # B recedes at the ascending node


@patient
@given(
    st.floats(0.0, 0.98),
    st.floats(1.0, 40.0),
    angles_deg,
    st.floats(0.0, 180.0),
    angles_deg,
    st.floats(-0.5, 0.5),
)
def test_positions_and_velocities_are_those_of_an_n_body_package(e, a, omega, tilt, node, phase):
    total_mass = 24.4
    gm_au_yr = GM_SUN_KM3_S2 / AU_KM**3 * (JULIAN_YEAR_D * DAY_S) ** 2
    simulation = rebound.Simulation()
    simulation.G = gm_au_yr
    simulation.add(m=total_mass)
    simulation.add(
        m=0.0,
        a=a,
        e=e,
        inc=np.radians(tilt),
        Omega=np.radians(node),
        omega=np.radians(omega),
        M=2 * np.pi * phase,
    )
    particle = simulation.particles[1]
    nu, _, place = place_on_the_sky(phase, e, a, omega, tilt, node)
    assert [float(x) for x in place] == pytest.approx([particle.x, particle.y, particle.z], abs=1e-9 * a)
    k = orbit.semi_amplitude(masses.orbital_period_d(a, total_mass), e, a, np.radians(tilt))
    velocity = orbit.radial_velocity(nu, e, k, np.radians(omega))
    speed = np.sqrt(particle.vx**2 + particle.vy**2 + particle.vz**2) * KMS_PER_AU_YR
    assert float(velocity) == pytest.approx(particle.vz * KMS_PER_AU_YR, abs=1e-8 * speed)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.rv_extremes"))
def test_velocity_extremes_of_both_stars(inputs, expected, tolerance):
    assert tolerance == "abs 1e-9"
    want, e, k, gamma = numbers(expected), inputs["e"], inputs["K_kms"], inputs["gamma_kms"]
    omega = np.radians(inputs["omega_of_this_star_deg"])
    nu = np.array([-omega, np.pi - omega, 0.0, np.pi])
    found = orbit.radial_velocity(nu, e, k, omega, gamma)
    assert found == pytest.approx(
        [want["V_max"], want["V_min"], want["V_periastron"], want["V_apastron"]], abs=1e-9
    )
    other = orbit.radial_velocity(0.0, e, 15.0, omega + np.pi, gamma)
    assert float(other) == pytest.approx(want["other_star_V_periastron_if_K2=15"], abs=1e-9)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.light_time_delay"))
def test_a_star_beyond_the_barycentre_is_seen_late(inputs, expected, tolerance):
    assert tolerance == "rel 1e-9"
    delay = orbit.light_time_delay_s(
        np.radians(inputs["nu_deg"]),
        inputs["e"],
        inputs["a_star_au"],
        np.radians(inputs["i_deg"]),
        np.radians(inputs["omega_star_deg"]),
    )
    assert float(delay) == pytest.approx(float(expected["delay_s"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.light_time"))
def test_the_projected_axis_of_one_star_and_its_light_time(inputs, expected, tolerance):
    assert tolerance == "rel 1e-8"
    want = numbers(expected)
    axis_km = masses.projected_semi_major_axis_km(inputs["P_d"], inputs["e"], inputs["K_kms"])
    assert float(axis_km) == pytest.approx(want["a1_sin_i_km"], rel=1e-8)
    assert float(axis_km) / SPEED_OF_LIGHT_KMS == pytest.approx(want["a1_sin_i_over_c_s"], rel=1e-8)
    assert float(axis_km) / SPEED_OF_LIGHT_KMS / DAY_S == pytest.approx(want["a1_sin_i_over_c_d"], rel=1e-8)
    # K = 2 pi a sin i/(P sqrt(1 - e^2)) is its inverse.
    k = orbit.semi_amplitude(inputs["P_d"], inputs["e"], axis_km / AU_KM, np.pi / 2)
    assert float(k) == pytest.approx(inputs["K_kms"], rel=1e-12)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.kepler3"))
def test_keplers_third_law_in_julian_years_all_three_ways(inputs, expected, tolerance):
    assert tolerance == "rel 1e-9"
    want, a, mass = numbers(expected), inputs["a_au"], inputs["Mtot_Msun"]
    period = masses.orbital_period_d(a, mass)
    assert float(period) / JULIAN_YEAR_D == pytest.approx(want["P_julian_yr"], rel=1e-9)
    wanted_period = want["P_julian_yr"] * JULIAN_YEAR_D
    assert float(masses.semi_major_axis_au(wanted_period, mass)) == pytest.approx(a, rel=1e-9)
    assert float(masses.total_mass_msun(wanted_period, a)) == pytest.approx(mass, rel=1e-9)
    # The short form a^3 = M P^2 counts in Gaussian years and would be 2e-5 too short.
    assert np.sqrt(a**3 / mass) == pytest.approx(want["P_if_a^3/M_in_au_yr"], rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.sb2_masses_exact"))
def test_masses_and_size_from_two_velocity_curves_to_six_digits(inputs, expected, tolerance):
    assert tolerance == "rel 1e-6"
    assert inputs["GMsun_km3s2"] == GM_SUN_KM3_S2
    want = numbers(expected)
    elements = (inputs["P_d"], inputs["e"], inputs["K_WR_kms"], inputs["K_O_kms"])
    tilt = np.radians(inputs["i_deg"])
    star_a, star_b = masses.masses_from_velocities(*elements, tilt)
    assert float(star_a) == pytest.approx(want["M_WR_Msun"], rel=1e-6)
    assert float(star_b) == pytest.approx(want["M_O_Msun"], rel=1e-6)
    a = masses.semi_major_axis_from_velocities(*elements, tilt)
    assert float(a) == pytest.approx(want["a_au"], rel=1e-6)
    constant, _ = masses.minimum_masses(1.0, 0.0, 1e-12, 1.0)
    assert float(constant) == pytest.approx(want["const_Msun_per_(km/s)^3_d"], rel=1e-6)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("orbit.sb2_masses_published"))
def test_masses_and_size_agree_with_the_published_spectroscopic_orbit(inputs, expected, tolerance):
    assert tolerance == "as published: +-1.5, +-2 Msun; a rounded"
    elements = (
        inputs["P_d"],
        inputs["e"],
        inputs["K_WR_kms"],
        inputs["K_O_kms"],
        np.radians(inputs["i_deg"]),
    )
    star_a, star_b = masses.masses_from_velocities(*elements)
    assert float(star_a) == pytest.approx(expected["M_WR_Msun"], abs=1.5)
    assert float(star_b) == pytest.approx(expected["M_O_Msun"], abs=2.0)
    assert round(float(masses.semi_major_axis_from_velocities(*elements))) == expected["a_au"]


def test_wr_21a_published_masses():
    row = published("O1")  # Tramper et al. 2016, MNRAS 455, 1275
    assert row["tolerance"] == "1 %"
    period, e, k_a, k_b, tilt = map(float, re.findall(r"\d+\.\d+", row["inputs"]))
    low_a, _, low_b, _, mass_a, _, mass_b, _ = map(float, re.findall(r"\d+\.\d+", row["published"]))
    minimum = masses.minimum_masses(period, e, k_a, k_b)
    assert [float(m) for m in minimum] == pytest.approx([low_a, low_b], rel=0.01)
    both = masses.masses_from_velocities(period, e, k_a, k_b, np.radians(tilt))
    assert [float(m) for m in both] == pytest.approx([mass_a, mass_b], rel=0.01)


def test_wr_137_published_masses_and_separation():
    row = published("O2")  # Lefevre et al. 2005, MNRAS 360, 141
    assert row["tolerance"] == "5 %"
    period, e, k_a, k_b, tilt = map(float, re.findall(r"= ([\d.]+)", row["inputs"]))
    a_au, mass_a, mass_b = map(float, re.findall(r"(?:= |and )([\d.]+)", row["published"]))
    elements = (period, e, k_a, k_b, np.radians(tilt))
    assert float(masses.semi_major_axis_from_velocities(*elements)) == pytest.approx(a_au, rel=0.05)
    assert [float(m) for m in masses.masses_from_velocities(*elements)] == pytest.approx(
        [mass_a, mass_b], rel=0.05
    )


def test_wr_25_published_projected_axis():
    row = published("O3")  # Gamen et al. 2006, A&A 460, 777
    assert row["tolerance"] == "1 %"
    period, e, k = map(float, re.findall(r"= ([\d.]+)", row["inputs"]))
    (axis_rsun,) = map(float, re.findall(r"= ([\d.]+)", row["published"]))
    axis_km = masses.projected_semi_major_axis_km(period, e, k)
    assert float(axis_km) / SOLAR_RADIUS_KM == pytest.approx(axis_rsun, rel=0.01)


def test_the_lighter_star_moves_faster_and_a_face_on_pair_tells_nothing():
    # Momentum about the barycentre: M_A K_A = M_B K_B.
    star_a, star_b = masses.minimum_masses(3000.0, 0.5, 30.0, 10.0)
    assert float(star_b / star_a) == pytest.approx(3.0)
    assert masses.masses_from_velocities(3000.0, 0.5, 30.0, 10.0, 0.0) == (np.inf, np.inf)
    assert masses.semi_major_axis_from_velocities(3000.0, 0.5, 30.0, 10.0, 0.0) == np.inf


def test_position_angles_run_from_north_through_east_within_one_turn():
    angle, separation = orbit.position_angle_and_separation(
        [1.0, 0.0, -1.0, 0.0, 1.0], [0.0, 2.0, 0.0, -2.0, -1e-20]
    )
    assert np.degrees(angle) == pytest.approx([0.0, 90.0, 180.0, 270.0, 0.0])
    assert separation == pytest.approx([1.0, 2.0, 1.0, 2.0, 1.0])


@pytest.mark.parametrize(
    ("call", "code"),
    [
        (lambda: masses.minimum_masses(0.0, 0.5, 1.0, 1.0), "period-refused"),
        (lambda: masses.minimum_masses(10.0, 1.0, 1.0, 1.0), "eccentricity-refused"),
        (lambda: masses.minimum_masses(10.0, 0.5, -1.0, 1.0), "semi-amplitude-refused"),
        (lambda: masses.semi_major_axis_au([10.0, -1.0], 3.0), "period-refused"),
        (lambda: masses.orbital_period_d(10.0, 0.0), "mass-refused"),
        (lambda: orbit.radial_velocity(0.0, 1.2, 1.0, 0.0), "eccentricity-refused"),
        (lambda: orbit.conjunction_phases(-0.1, 0.0), "eccentricity-refused"),
        (lambda: orbit.semi_amplitude(-3.0, 0.1, 1.0, 1.0), "period-refused"),
    ],
)
def test_what_no_orbit_can_have_is_refused_with_a_reason_and_a_hint(call, code):
    with pytest.raises(InputRefused) as refusal:
        call()
    assert refusal.value.code == code
    assert refusal.value.why
    assert refusal.value.hint
