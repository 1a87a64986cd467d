"""The wind collision against rows of checks_winds.csv and published_winds.csv (source and basis in each),
against integrals and roots of scipy and mpmath, and against the geometry of the sky."""

from __future__ import annotations

import csv
import json
import re

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from physics_reference import FOLDER
from scipy.integrate import quad
from scipy.optimize import brentq

from campaign.errors import InputRefused
from campaign.physics import contactsurface, cooling, kepler, openingforms, orbit, postshock, sightline
from campaign.physics import windmomentum as momentum

RATIOS = st.floats(1e-6, 1.0)


def rows(topic):
    with (FOLDER / "checks_winds.csv").open(newline="") as file:
        chosen = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert chosen, topic
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in chosen]


def published(identifier):
    with (FOLDER / "published_winds.csv").open(newline="") as file:
        (row,) = [row for row in csv.DictReader(file) if row["id"] == identifier]
    return row


def numbers(text):
    return [float(found) for found in re.findall(r"\d+(?:\.\d+)?(?:e-?\d+)?", text)]


# ---------------------------------------------------------------------------------------- reference rows


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.geometry"))
def test_the_geometry_of_the_reference_rows(inputs, expected):
    (eta,) = inputs.values()
    near, far = momentum.stagnation_fractions(eta)
    found = {
        "r_from_weaker_over_D": near,
        "r_from_stronger_over_D": far,
        "half_opening_CRW96_deg": np.degrees(contactsurface.half_opening_rad(eta)),
        "half_opening_EU93_deg": np.degrees(openingforms.fitted_half_opening_rad(eta)),
        "half_opening_adiabatic_2atan(eta^1/4)_deg": np.degrees(openingforms.adiabatic_half_opening_rad(eta)),
        "half_opening_2atan(eta^1/3)_deg": np.degrees(openingforms.hydrodynamic_half_opening_rad(eta)),
        "half_opening_radiative_unmixed_deg": np.degrees(openingforms.unmixed_half_opening_rad(eta)),
    }
    assert found.keys() == expected.keys()
    for name, value in expected.items():
        assert float(found[name]) == pytest.approx(float(value), rel=1e-9), name


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.crw_shape"))
def test_the_contact_surface_of_the_reference_rows(inputs, expected):
    theta = np.radians(inputs["theta_from_weaker_star_deg_measured_from_axis_to_stronger"])
    theta1, distance = contactsurface.contact_surface(theta, inputs["eta"])
    assert float(np.degrees(theta1)) == pytest.approx(float(expected["theta1_at_stronger_deg"]), rel=1e-9)
    assert float(distance) == pytest.approx(float(expected["R_from_weaker_over_D"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.momentum_ratio"))
def test_the_momentum_ratio_of_the_reference_row(inputs, expected):
    first = momentum.wind_momentum(inputs["Mdot_WR"], inputs["v_WR_kms"])
    second = momentum.wind_momentum(inputs["Mdot_O"], inputs["v_O_kms"])
    assert float(momentum.momentum_ratio(second, first)) == pytest.approx(float(expected["eta"]), rel=1e-10)
    swapped = float(momentum.momentum_ratio(first, second))
    assert swapped == pytest.approx(float(expected["inverse_if_swapped"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.inverse_opening"))
def test_the_momentum_ratio_behind_an_angle(inputs, expected):
    angle = np.radians(inputs["half_opening_deg"])
    found = float(contactsurface.momentum_ratio_from_half_opening(angle))
    assert found == pytest.approx(float(expected["eta_CRW96"]), rel=1e-9)
    adiabatic = float(openingforms.adiabatic_momentum_ratio(angle))
    assert adiabatic == pytest.approx(float(expected["eta_adiabatic_tan4"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.chi"))
def test_the_cooling_parameter_of_the_reference_rows(inputs, expected):
    found = cooling.cooling_parameter(inputs["v_kms"], inputs["d_au"], inputs["Mdot_Msun_yr"])
    assert float(found) == pytest.approx(float(expected["chi"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.chi_orbit"))
def test_the_cooling_parameter_around_an_orbit_at_constant_speed(inputs, expected):
    e = inputs["e"]

    def chi(nu_deg):
        anomaly = kepler.eccentric_from_true(np.radians(nu_deg), e)
        return float(cooling.cooling_parameter(2000.0, kepler.separation_ratio(anomaly, e), 1e-5))

    assert chi(180.0) / chi(0.0) == pytest.approx(float(expected["chi_apastron_over_periastron"]), rel=1e-9)
    assert chi(90.0) / chi(0.0) == pytest.approx(float(expected["chi(nu=90)/chi(peri)"]), rel=1e-9)
    doubled = float(kepler.half_window_phase(2.0 * (1.0 - e), e))
    if expected["phase_when_chi=2chi_peri"] is None:
        assert doubled == 0.5  # twice the least is never reached
    else:
        assert doubled == pytest.approx(float(expected["phase_when_chi=2chi_peri"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.chi_orbit_betalaw"))
def test_the_cooling_parameter_around_an_orbit_with_a_velocity_law(inputs, expected):
    _, share = momentum.stagnation_fractions(inputs["eta"])
    chi = {}
    for where, ratio in (("peri", 1.0 - inputs["e"]), ("apo", 1.0 + inputs["e"])):
        distance = share * inputs["a_au"] * ratio
        speed = cooling.beta_law_speed(distance, inputs["v_inf_kms"], inputs["R_core_au"], inputs["beta"])
        chi[where] = float(cooling.cooling_parameter(speed, distance, inputs["Mdot"]))
        assert float(speed) == pytest.approx(float(expected[where]["v_kms"]), rel=1e-8)
        assert chi[where] == pytest.approx(float(expected[where]["chi"]), rel=1e-8)
    assert chi["apo"] / chi["peri"] == pytest.approx(float(expected["ratio"]), rel=1e-8)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.postshock_T"))
def test_the_temperature_behind_the_shock_of_the_reference_rows(inputs, expected):
    found = float(postshock.postshock_temperature_k(inputs["mu"], inputs["v_kms"]))
    # To all digits of the row; its tolerance is for other choices of the particle's mass.
    assert found == pytest.approx(float(expected["T_K"]), rel=2e-7)


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.mean_weight"))
def test_the_mean_weight_of_the_reference_rows(inputs, expected):
    found = float(postshock.mean_molecular_weight(inputs["mass_fractions"]))
    assert found == pytest.approx(float(expected["mu"]), rel=1e-5)


def test_half_opening_of_wr_30a():
    # W1, Gosset et al. 2001 (read second-hand): apex 25 Rsun from the WO star and 10 from the O star.
    row = published("W1")
    from_wo, from_o = (float(n) for n in re.findall(r"(\d+) Rsun", row["inputs"]))
    (angle,), (tolerance,) = numbers(row["published"]), numbers(row["tolerance"])
    eta = momentum.momentum_ratio_from_stagnation(from_o, from_wo)
    assert abs(float(np.degrees(contactsurface.half_opening_rad(eta))) - angle) <= tolerance


def test_momentum_ratios_and_angles_of_eta_carinae():
    # W2, Madura et al. 2013, MNRAS 436, 3820 (mass-loss rates published, the rest memory).
    row = published("W2")
    losses = [1e-4 * n for n in numbers(row["inputs"].partition("e-4")[0].partition("=")[2])]
    v_a, loss_b, v_b = numbers(row["inputs"].partition("v_A")[2])
    ratios, angles = (numbers(part) for part in row["published"].split(";"))
    tolerance, angle_tolerance = numbers(row["tolerance"])
    assert len(losses) == len(ratios) == len(angles) == 3
    for loss, ratio, angle in zip(losses, ratios, angles, strict=True):
        eta = momentum.momentum_ratio(momentum.wind_momentum(loss_b, v_b), momentum.wind_momentum(loss, v_a))
        assert abs(float(eta) - ratio) <= tolerance
        assert abs(float(np.degrees(contactsurface.half_opening_rad(eta))) - angle) <= angle_tolerance


# --------------------------------------------------------------------- integrals, roots, limits, symmetry


def swept_up(eta, theta, theta1):
    """Momentum along and across the axis that both winds bring to the shell, up to a point, by quadrature.

    Spherical winds: the momentum into a ring at angle x goes as sin x dx, along x.
    """
    along = quad(lambda x: np.cos(x) * np.sin(x), 0.0, theta1)[0]
    along -= eta * quad(lambda x: np.cos(x) * np.sin(x), 0.0, theta)[0]
    across = quad(lambda x: np.sin(x) ** 2, 0.0, theta1)[0]
    return along, across + eta * quad(lambda x: np.sin(x) ** 2, 0.0, theta)[0]


@pytest.mark.parametrize("eta", [1e-4, 0.003, 0.05, 0.3, 0.8, 1.0, 2.5])
def test_the_momentum_swept_up_by_the_whole_shell_points_along_the_cone(eta):
    t = float(contactsurface.half_opening_rad(eta))
    along, across = swept_up(eta, np.pi - t, t)
    assert np.arctan2(across, along) == pytest.approx(t, rel=1e-9)


@pytest.mark.parametrize("eta", [0.004, 0.1, 0.7, 1.0, 3.0])
@pytest.mark.parametrize("share", [0.05, 0.3, 0.6, 0.9])
def test_everywhere_the_shell_flows_along_the_surface_with_the_momentum_swept_up(eta, share):
    """Momentum conservation: the surface has the direction of the momentum brought to it since the axis."""
    theta = share * (np.pi - float(contactsurface.half_opening_rad(eta)))
    step = 1e-5
    _, radius = contactsurface.contact_surface(np.array([theta - step, theta + step]), eta)
    angle = np.array([theta - step, theta + step])
    # x from the stronger star through the weaker, y across; theta is counted from the stronger star.
    x, y = -radius * np.cos(angle), radius * np.sin(angle)
    theta1, _ = contactsurface.contact_surface(theta, eta)
    along, across = swept_up(eta, theta, float(theta1))
    assert np.arctan2(y[1] - y[0], x[1] - x[0]) == pytest.approx(np.arctan2(across, along), abs=1e-7)


@pytest.mark.parametrize("eta", [1e-9, 1e-5, 0.02, 0.37, 0.999])
def test_roots_agree_with_forty_digits(eta):
    with mpmath.workdps(40):
        ratio = mpmath.mpf(eta)
        t = mpmath.findroot(
            lambda x: (mpmath.sin(x) - x * mpmath.cos(x)) * (1 - ratio) - mpmath.pi * ratio * mpmath.cos(x),
            min(float((3 * mpmath.pi * ratio) ** (1 / 3)), 1.5),
        )
        assert float(contactsurface.half_opening_rad(eta)) == pytest.approx(float(t), rel=1e-13)
        theta = 0.7 * (mpmath.pi - t)
        load = ratio * (1 - theta * mpmath.cot(theta))
        guess = float(contactsurface.contact_surface(float(theta), eta)[0])
        theta1 = mpmath.findroot(lambda x: 1 - x * mpmath.cot(x) - load, guess)
        distance = float(mpmath.sin(theta1) / mpmath.sin(theta + theta1))
    assert float(contactsurface.contact_surface(float(theta), eta)[1]) == pytest.approx(distance, rel=1e-12)


@given(eta=st.floats(1e-6, 0.999))
@settings(max_examples=60, deadline=None)
def test_swapping_the_stars_turns_the_cone_around(eta):
    for form in (
        contactsurface.half_opening_rad, openingforms.fitted_half_opening_rad,
        openingforms.adiabatic_half_opening_rad, openingforms.hydrodynamic_half_opening_rad,
        openingforms.unmixed_half_opening_rad,
    ):  # fmt: skip
        assert float(form(1.0 / eta)) == pytest.approx(np.pi - float(form(eta)), rel=1e-9, abs=1e-9)
    near, far = momentum.stagnation_fractions(eta)
    assert momentum.stagnation_fractions(1.0 / eta) == (pytest.approx(far), pytest.approx(near))


@given(eta=RATIOS)
@settings(max_examples=60, deadline=None)
def test_an_angle_leads_back_to_its_momentum_ratio(eta):
    angle = contactsurface.half_opening_rad(eta)
    assert float(contactsurface.momentum_ratio_from_half_opening(angle)) == pytest.approx(eta, rel=1e-11)
    hot = openingforms.adiabatic_half_opening_rad(eta)
    assert float(openingforms.adiabatic_momentum_ratio(hot)) == pytest.approx(eta, rel=1e-9)


@given(eta=RATIOS)
@settings(max_examples=40, deadline=None)
def test_the_surface_begins_at_the_stagnation_point_and_ends_at_its_asymptote(eta):
    opening = float(contactsurface.half_opening_rad(eta))
    near = float(momentum.stagnation_fractions(eta)[0])
    theta = np.linspace(0.0, np.pi - opening, 50)[:-1]
    theta1, distance = contactsurface.contact_surface(theta, eta)
    assert distance[0] == pytest.approx(near, rel=1e-12)
    assert (np.diff(distance) > 0.0).all() and (np.diff(theta1) > 0.0).all() and theta1[-1] < opening
    beyond = contactsurface.contact_surface(np.array([np.pi - 0.999 * opening]), eta)
    assert np.isinf(beyond[1]).all() and np.isnan(beyond[0]).all()


def test_one_unknown_draw_spoils_no_others():
    eta = np.array([0.1, np.nan, 0.3])
    for form in (contactsurface.half_opening_rad, openingforms.unmixed_half_opening_rad):
        assert np.isnan(form(eta)).tolist() == [False, True, False]
    assert np.isnan(contactsurface.contact_surface(0.5, eta)[1]).tolist() == [False, True, False]


@pytest.mark.parametrize("beta", [0.3, 0.8, 1.0, 2.0])
@pytest.mark.parametrize("radius_au", [0.02, 0.6])
def test_where_cooling_is_balanced_with_a_velocity_law(beta, radius_au):
    def excess(d):
        speed = cooling.beta_law_speed(d, 2400.0, radius_au, beta)
        return float(cooling.cooling_parameter(speed, d, 2e-5)) - 1.0

    expected = brentq(excess, radius_au * (1 + 1e-12), 50.0, xtol=1e-14, rtol=1e-13)
    found = float(cooling.distance_of_unit_cooling_beta(2400.0, 2e-5, radius_au, beta))
    assert found == pytest.approx(expected, rel=1e-11)
    assert found > float(cooling.distance_of_unit_cooling(2400.0, 2e-5))


def test_a_wind_has_no_speed_inside_its_star():
    speed = cooling.beta_law_speed(np.array([0.4, 0.5, 1.0, 1e9]), 2000.0, 0.5, 1.0)
    assert np.isnan(speed[0])
    assert speed[1:] == pytest.approx([0.0, 1000.0, 2000.0])


def test_carbon_rich_gas_gets_two_and_a_half_times_as_hot():
    # Mass fractions of a WC wind against a mean weight of 0.6 (the reference sheet, section 4).
    carbon = postshock.mean_molecular_weight({"He": 0.5, "C": 0.4, "O": 0.1})
    ratio = postshock.postshock_temperature_k(carbon, 1500.0) / postshock.postshock_temperature_k(0.6, 1500.0)
    assert float(ratio) == pytest.approx(2.5, abs=0.02)


def test_pure_gases_have_the_mean_weights_of_the_textbooks():
    # Fully ionised hydrogen 1/2, helium 4/3 (common practice, no source).
    assert float(postshock.mean_molecular_weight({"H": 1.0})) == 0.5
    assert float(postshock.mean_molecular_weight({"He": 3.0})) == pytest.approx(4.0 / 3.0)


# ------------------------------------------------------------------------------------------ line of sight


@given(
    nu=st.floats(-np.pi, np.pi), omega_b=st.floats(0.0, 2 * np.pi), tilt=st.floats(0.0, np.pi),
    node=st.floats(0.0, 2 * np.pi), weaker=st.sampled_from("AB"),
)  # fmt: skip
@settings(max_examples=100, deadline=None)
def test_the_angle_to_the_axis_is_that_of_the_vectors_on_the_sky(nu, omega_b, tilt, node, weaker):
    """The axis runs from the stronger star to the weaker; the observer is towards minus z."""
    from_a_to_b = np.array([float(part) for part in orbit.sky_position(nu, 1.0, omega_b, tilt, node)])
    axis = from_a_to_b if weaker == "B" else -from_a_to_b
    expected = np.arccos(np.clip(axis @ np.array([0.0, 0.0, -1.0]), -1.0, 1.0))
    omega_weaker = omega_b if weaker == "B" else omega_b + np.pi
    assert float(sightline.angle_to_axis_rad(nu, omega_weaker, tilt)) == pytest.approx(expected, abs=1e-6)


@pytest.mark.parametrize(("omega_deg", "nu_deg"), [(0.0, 270.0), (90.0, 180.0), (200.0, 70.0)])
def test_with_the_weaker_wind_in_front_the_axis_points_nearest_to_us(omega_deg, nu_deg):
    # nu + omega = 270 deg has that star in front (convention of DEVELOPERS.md).
    angle = sightline.angle_to_axis_rad(*np.radians([nu_deg, omega_deg, 65.0]))
    assert float(np.degrees(angle)) == pytest.approx(25.0)
    behind = sightline.angle_to_axis_rad(*np.radians([nu_deg + 180.0, omega_deg, 65.0]))
    assert float(np.degrees(behind)) == pytest.approx(155.0)


@given(opening=st.floats(0.05, 3.0), tilt=st.floats(0.05, 3.0), omega=st.floats(0.0, 6.28))
@settings(max_examples=100, deadline=None)
def test_the_line_of_sight_is_inside_the_cone_exactly_within_the_passage(opening, tilt, omega):
    half = float(sightline.half_passage_rad(opening, tilt))
    x = np.linspace(-np.pi, np.pi, 721)[1:-1]
    angle = sightline.angle_to_axis_rad(x + 1.5 * np.pi - omega, omega, tilt)
    inside = angle < opening
    expected = np.zeros_like(inside) if np.isnan(half) else np.abs(x) < half
    unsure = np.abs(angle - opening) < 1e-6
    assert (inside == expected)[~unsure].all()


# ------------------------------------------------------------------------------------------------ refusals


@pytest.mark.parametrize("wrong", [0.0, -0.2])
@pytest.mark.parametrize(
    "refuses",
    [
        contactsurface.half_opening_rad,
        openingforms.fitted_half_opening_rad,
        openingforms.adiabatic_half_opening_rad,
        openingforms.hydrodynamic_half_opening_rad,
        openingforms.unmixed_half_opening_rad,
        momentum.stagnation_fractions,
        lambda x: momentum.wind_momentum(x, 2000.0),
        lambda x: momentum.wind_momentum(1e-5, x),
        lambda x: momentum.momentum_ratio(x, 1.0),
        lambda x: momentum.momentum_ratio_from_stagnation(1.0, x),
        lambda x: cooling.cooling_parameter(2000.0, 1.0, x),
        lambda x: cooling.beta_law_speed(1.0, 2000.0, x, 1.0),
        lambda x: cooling.distance_of_unit_cooling(x, 1e-5),
        lambda x: cooling.distance_of_unit_cooling_beta(2000.0, 1e-5, 0.1, x),
        lambda x: postshock.postshock_temperature_k(x, 2000.0),
    ],
)
def test_what_must_be_above_zero_is_refused_at_or_below_it(refuses, wrong):
    with pytest.raises(InputRefused) as refused:
        refuses(np.array([1.0, wrong]))
    assert refused.value.why and refused.value.hint


@pytest.mark.parametrize("fractions", [{"Xx": 1.0}, {"He": -0.1, "C": 1.1}, {"He": 0.0}, {}])
def test_what_is_no_gas_is_refused(fractions):
    with pytest.raises(InputRefused, match=r"element|gas"):
        postshock.mean_molecular_weight(fractions)


@pytest.mark.parametrize("angle", [0.0, -0.1, np.pi, 4.0])
def test_what_is_no_half_opening_angle_is_refused(angle):
    with pytest.raises(InputRefused):
        contactsurface.momentum_ratio_from_half_opening(angle)


@pytest.mark.parametrize("theta", [-0.1, np.pi])
def test_what_is_no_direction_from_the_weaker_star_is_refused(theta):
    with pytest.raises(InputRefused):
        contactsurface.contact_surface(theta, 0.1)
