"""Kepler's equation. Checks from outside: the kepler rows of tests/reference/checks_orbit_time.csv (source
and basis in each row) and mpmath at 60 digits and more as an independent solver."""

from __future__ import annotations

import math
import re

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from physics_reference import checks

from campaign.errors import InputRefused
from campaign.physics import kepler

EPS = np.finfo(float).eps
# What the docstrings call "a few units in the last place".
FEW_ULP = 4 * EPS

eccentricities = st.one_of(
    st.floats(0.0, 1.0, exclude_max=True),
    st.floats(-16.0, 0.0).map(lambda power: max(0.0, min(1.0 - 10.0**power, 1.0 - 2.0**-53))),
    st.sampled_from([0.0, 0.9999, 1.0 - 1e-12, 1.0 - 2.0**-53]),
)
mean_anomalies = st.one_of(
    st.floats(-math.pi, math.pi).map(lambda angle: angle if abs(angle) > 1e-290 else 0.0),
    st.floats(-290.0, 0.49).map(lambda power: 10.0**power),
    st.sampled_from([0.0, 1e-8, math.pi, -math.pi]),
)
patient = settings(max_examples=300, deadline=None)


def exact_eccentric_anomaly(mean: float, e: float) -> mpmath.mpf:
    """Newton in 70 digits, down from above the root: E - e sin E - M is convex on [0, pi]."""
    with mpmath.workdps(70):
        m, e = abs(mpmath.mpf(mean)), mpmath.mpf(e)
        E = min(m + e, m / (1 - e), mpmath.pi)
        while E:
            lower = E - (E - e * mpmath.sin(E) - m) / (1 - e * mpmath.cos(E))
            if E - lower <= E * mpmath.mpf(10) ** -50:
                break
            E = lower
        return E if mean > 0 else -E


def exact_true_anomaly(E: mpmath.mpf, e: float) -> mpmath.mpf:
    with mpmath.workdps(60):
        return 2 * mpmath.atan(mpmath.sqrt((1 + mpmath.mpf(e)) / (1 - mpmath.mpf(e))) * mpmath.tan(E / 2))


def relative_error(value: float, exact: mpmath.mpf) -> float:
    with mpmath.workdps(60):
        if exact == 0:
            return 0.0 if value == 0 else math.inf
        return float(abs(mpmath.mpf(float(value)) - exact) / abs(exact))


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("kepler.elliptic"))
def test_the_60_digit_table_is_met_to_four_ulp_times_the_condition_number(inputs, expected, tolerance):
    allowed = float(re.match(r"rel (\S+) on E", tolerance)[1])
    E = kepler.eccentric_anomaly(inputs["M_rad"], inputs["e"])
    assert float(E) == pytest.approx(float(expected["E_rad"]), rel=allowed, abs=0)
    nu = kepler.true_anomaly(inputs["M_rad"], inputs["e"])
    assert float(nu) == pytest.approx(float(expected["nu_rad"]), rel=allowed, abs=0)
    ratio = kepler.separation_ratio(E, inputs["e"])
    assert float(ratio) == pytest.approx(float(expected["r_over_a"]), rel=allowed, abs=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("kepler.wrap"))
def test_whole_turns_and_signs_of_the_mean_anomaly_are_removed_first(inputs, expected, tolerance):
    assert tolerance == "abs 1e-12 (|M|<1e4), 2e-10 for 1e5"
    allowed = 1e-12 if abs(inputs["M_rad"]) < 1e4 else 2e-10
    E = kepler.eccentric_anomaly(inputs["M_rad"], inputs["e"])
    assert float(E) == pytest.approx(float(expected["E_reduced_rad"]), abs=allowed, rel=0)
    nu = kepler.true_anomaly(inputs["M_rad"], inputs["e"])
    assert float(nu) == pytest.approx(float(expected["nu_rad_in(-pi,pi]"]), abs=allowed, rel=0)
    M = kepler.mean_from_eccentric(E, inputs["e"])
    assert float(M) == pytest.approx(float(expected["M_reduced_rad"]), abs=allowed, rel=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("kepler.meeus"))
def test_the_handbook_table_of_solutions_is_met_to_its_last_digit(inputs, expected, tolerance):
    assert tolerance == "abs 1e-6 deg"
    solve = kepler.true_anomaly if inputs.get("quantity") == "true anomaly" else kepler.eccentric_anomaly
    assert np.degrees(solve(np.radians(inputs["M_deg"]), inputs["e"])) == pytest.approx(
        expected, abs=1e-6, rel=0
    )


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("kepler.forward"))
def test_keplers_equation_read_forwards(inputs, expected, tolerance):
    assert tolerance == "abs 1e-15"
    M = kepler.mean_from_eccentric(inputs["E_rad"], inputs["e"])
    assert float(M) == pytest.approx(float(expected["M_rad"]), abs=1e-15, rel=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("kepler.nu_to_phase"))
def test_the_phase_at_a_true_anomaly_is_negative_before_periastron(inputs, expected, tolerance):
    assert tolerance == "abs 1e-13 (phase)"
    nu = np.radians(inputs["nu_deg"])
    phase = kepler.phase_from_true(nu, inputs["e"])
    assert float(phase) == pytest.approx(float(expected["phase"]), abs=1e-13, rel=0)
    E = kepler.eccentric_from_true(nu, inputs["e"])
    assert np.degrees(E) == pytest.approx(float(expected["E_deg"]), abs=1e-11, rel=0)
    M = kepler.mean_from_true(nu, inputs["e"])
    assert np.degrees(M) == pytest.approx(float(expected["M_deg"]), abs=1e-11, rel=0)


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("kepler.markley1995"))
def test_the_starter_is_as_good_as_markley_1995_makes_it(inputs, expected, tolerance):
    assert tolerance == "order of magnitude"
    # The row's grid: 16 eccentricities from 0 to 1 - 1e-8, 60 mean anomalies in (0, pi] from 1e-8 on.
    e, M = np.meshgrid(
        np.concatenate([np.linspace(0.0, 0.99, 12), 1.0 - np.array([1e-3, 1e-4, 1e-6, 1e-8])]),
        np.concatenate([np.geomspace(1e-8, 0.05, 30), np.linspace(0.1, np.pi, 30)]),
    )
    exact = np.vectorize(lambda m, x: float(exact_eccentric_anomaly(m, x)))(M, e)
    start_error = np.abs(kepler._starter(M, e, 1.0 - e) / exact - 1.0).max()
    assert (
        float(expected["max_rel_err_starter"]) / 10
        < start_error
        < 10 * float(expected["max_rel_err_starter"])
    )
    # The step itself is exact to 7e-19 in 60 digits; in doubles only rounding is left of it.
    assert np.abs(kepler.eccentric_anomaly(M, e) / exact - 1.0).max() < FEW_ULP


@patient
@given(mean_anomalies, eccentricities)
def test_any_ellipse_at_any_anomaly_agrees_with_60_digits_to_a_few_ulp(mean, e):
    E = exact_eccentric_anomaly(mean, e)
    assert relative_error(kepler.eccentric_anomaly(mean, e), E) <= FEW_ULP
    assert relative_error(kepler.true_anomaly(mean, e), exact_true_anomaly(E, e)) <= FEW_ULP


@patient
@given(mean_anomalies, eccentricities)
def test_separation_and_mean_anomaly_agree_with_60_digits_to_a_few_ulp(E, e):
    with mpmath.workdps(70):  # 1 - e >= 1e-16, so at most 16 of the digits cancel
        x, ecc = mpmath.mpf(E), mpmath.mpf(e)
        ratio, mean = 1 - ecc * mpmath.cos(x), x - ecc * mpmath.sin(x)
    assert relative_error(kepler.separation_ratio(E, e), ratio) <= FEW_ULP
    assert relative_error(kepler.mean_from_eccentric(E, e), mean) <= FEW_ULP


@pytest.mark.parametrize("e", [0.9999, 1.0 - 1e-12])
def test_near_periastron_of_nearly_parabolic_orbits(e):
    for mean in np.concatenate([[0.0], np.geomspace(1e-16, 1e-2, 60)]):
        E = exact_eccentric_anomaly(mean, e)
        assert relative_error(kepler.eccentric_anomaly(mean, e), E) <= FEW_ULP
        assert relative_error(kepler.true_anomaly(mean, e), exact_true_anomaly(E, e)) <= FEW_ULP


def test_the_smallest_double_is_still_an_anomaly():
    # Subnormal numbers have no relative accuracy; E = M/(1 - e) to the quantum of M divided by 1 - e.
    found = kepler.eccentric_anomaly(5e-324, np.array([0.0, 0.5, 0.9999, 1.0 - 2.0**-53]))
    assert found == pytest.approx([5e-324, 1e-323, 5e-320, 4.5e-308], rel=0.02, abs=0)


def test_a_circular_orbit_has_all_three_anomalies_equal():
    mean = np.array([-np.pi, -1e-8, 0.0, 1e-300, 0.5, 3.0, np.pi])
    assert np.array_equal(kepler.eccentric_anomaly(mean, 0.0), mean)
    assert kepler.true_anomaly(mean, 0.0) == pytest.approx(mean, rel=FEW_ULP, abs=0)
    assert np.array_equal(kepler.separation_ratio(mean, 0.0), np.ones(7))


@patient
@given(st.floats(-1e15, 1e15), eccentricities)
def test_a_huge_anomaly_is_the_same_as_its_remainder_after_whole_turns(mean, e):
    with mpmath.workdps(60):
        turns = mpmath.nint(mpmath.mpf(mean) / (2 * mpmath.pi))
        remainder = mpmath.mpf(mean) - turns * 2 * mpmath.pi
    reduced = kepler.mean_from_eccentric(mean, 0.0)  # e = 0: nothing but the reduction
    # A remainder at the very end may appear at the other end of the half-open range.
    assert math.remainder(float(reduced) - float(remainder), math.tau) == pytest.approx(0.0, abs=1e-15)
    assert -np.pi <= reduced <= np.pi
    assert kepler.eccentric_anomaly(mean, e) == kepler.eccentric_anomaly(reduced, e)


@patient
@given(st.floats(-1e6, 1e6), eccentricities)
def test_the_orbit_is_symmetric_about_periastron(mean, e):
    assert kepler.eccentric_anomaly(-mean, e) == -kepler.eccentric_anomaly(mean, e)
    assert kepler.true_anomaly(-mean, e) == -kepler.true_anomaly(mean, e)


@patient
@given(st.floats(-math.pi, math.pi), st.floats(0.0, 0.9999))
def test_forwards_and_back_again_is_where_it_began(mean, e):
    E = kepler.eccentric_anomaly(mean, e)
    # dM/dE <= 1 + e: two ulp of E make at most four of pi.
    assert kepler.mean_from_eccentric(E, e) == pytest.approx(mean, rel=4 * FEW_ULP, abs=1e-300)
    nu = kepler.true_from_eccentric(E, e)
    # Near apastron E is well determined by nu only in absolute terms, with dE/dnu <= sqrt((1+e)/(1-e)).
    assert kepler.eccentric_from_true(nu, e) == pytest.approx(
        E, abs=8 * EPS * math.sqrt((1 + e) / (1 - e)), rel=FEW_ULP
    )


@patient
@given(st.floats(0.0, 0.5), st.floats(1e-6, 0.9999))
def test_the_window_closes_at_the_phase_where_the_separation_is_reached(phase, e):
    E = kepler.eccentric_anomaly(2 * np.pi * phase, e)
    found = kepler.half_window_phase(kepler.separation_ratio(E, e), e)
    # Near periastron and apastron the separation is stationary: a rounding of r/a of 4 eps moves E by
    # up to sqrt(8 eps/e) there, and never more; dM/dE <= 1 + e.
    allowed = (1 + e) * math.sqrt(16 * EPS / e) / (2 * np.pi)
    # At the two ends rounding may also carry the ratio just outside the orbit.
    if math.isnan(found):
        assert phase <= allowed
    else:
        assert float(found) == pytest.approx(phase, abs=allowed)
    with mpmath.workdps(60):
        sine, size = abs(mpmath.sin(mpmath.mpf(float(E)))), mpmath.mpf(float(kepler.separation_ratio(E, e)))
    if sine > 1e-3:  # elsewhere it is the first-order error: dE = d(r/a)/(e sin E), dM = (r/a) dE
        assert float(found) == pytest.approx(phase, abs=float(20 * EPS * (1 + size * size / (e * sine))))


def test_a_separation_that_is_never_reached_gives_no_window_and_one_always_held_gives_all():
    # r/a runs from 1 - e to 1 + e: arithmetic.
    assert np.isnan(kepler.half_window_phase(0.1999, 0.8))
    assert kepler.half_window_phase(1.8, 0.8) == 0.5
    assert kepler.half_window_phase(np.inf, 0.8) == 0.5
    assert kepler.half_window_phase(1.0, 0.0) == 0.5
    assert np.isnan(kepler.half_window_phase(0.999, 0.0))
    assert kepler.half_window_phase(0.25, 0.75) == 0.0
    assert np.isnan(kepler.half_window_phase(-1.0, 0.5))


def test_shapes_broadcast_and_scalars_stay_scalars():
    mean = np.linspace(-3, 3, 10_007)
    e = np.array([[0.0], [0.3], [0.95]])
    both = kepler.eccentric_anomaly(mean, e)
    assert both.shape == (3, 10_007)
    for row, ecc in enumerate([0.0, 0.3, 0.95]):
        assert np.array_equal(both[row], kepler.eccentric_anomaly(mean, ecc))
    assert np.ndim(kepler.eccentric_anomaly(1.0, 0.5)) == 0
    assert kepler.eccentric_anomaly(np.array([]), 0.5).shape == (0,)
    assert kepler.eccentric_anomaly(1, 0) == 1.0


def test_not_a_number_passes_through_and_leaves_its_neighbours_alone():
    found = kepler.true_anomaly(np.array([0.5, np.nan, 0.5]), np.array([0.3, 0.3, np.nan]))
    assert found[0] == kepler.true_anomaly(0.5, 0.3)
    assert np.isnan(found[1:]).all()


@pytest.mark.parametrize("e", [1.0, -1e-9, 1.5, np.inf, -np.inf])
def test_an_eccentricity_that_closes_no_orbit_is_refused(e):
    for function in (kepler.eccentric_anomaly, kepler.half_window_phase, kepler.phase_from_true):
        with pytest.raises(InputRefused) as refusal:
            function(0.5, np.array([0.1, e, np.nan]))
        assert refusal.value.code == "eccentricity-refused"
        assert refusal.value.hint


def test_an_infinite_anomaly_is_refused():
    with pytest.raises(InputRefused, match="mean anomaly is infinite"):
        kepler.eccentric_anomaly(np.array([0.0, np.inf]), 0.5)
