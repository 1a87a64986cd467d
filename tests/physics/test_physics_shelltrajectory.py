"""Dust pushed by starlight: rows of checks_shells.csv (closed form in 40 digits, source in each), and an
integration of the equation of motion by scipy that knows no closed form."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import solve_ivp
from shell_reference import checks

from campaign.physics.radiationpressure import radiation_pressure_ratio, terminal_speed_kms
from campaign.physics.shelltrajectory import (
    radius_after,
    radius_slopes,
    speed_at,
    travel_time,
)

# 149 597 870.7 km an au (IAU 2012 Resolution B2).
AU_D = 86_400 / 149_597_870.7
AU_YR = AU_D * 365.25


@pytest.mark.parametrize(("inputs", "expected"), checks("dust.beta_rp"))
def test_radiation_pressure_over_gravity(inputs, expected):
    found = radiation_pressure_ratio(inputs["L_Lsun"], inputs["M_Msun"], inputs["kappa_pr_cm2_g"])
    assert float(found) == pytest.approx(float(expected["beta"]), rel=1e-6)


@pytest.mark.parametrize(("inputs", "expected"), checks("dust.acceleration"))
def test_speed_and_time_of_accelerated_dust(inputs, expected):
    r0, v0 = inputs["r0_au"], inputs["v0_kms"]
    terminal = float(terminal_speed_kms(v0, r0, inputs["M_Msun"], inputs["beta"]))
    assert terminal == pytest.approx(float(expected["v_inf_kms"]), rel=1e-9)
    for radius in (100, 150, 500, 5000):
        if f"r={radius}au" not in expected:
            continue
        there = expected[f"r={radius}au"]
        time = float(travel_time(radius, r0, v0 * AU_D, terminal * AU_D))
        assert time == pytest.approx(float(there["t_d"]), rel=1e-9)
        assert float(speed_at(radius, r0, v0, terminal)) == pytest.approx(float(there["v_kms"]), rel=1e-9)
        naive = (radius - r0) / (terminal * AU_D)
        assert naive == pytest.approx(float(there["t_naive_r-r0_over_vinf_d"]), rel=1e-9)
    lag = terminal * AU_D * float(travel_time(5000, r0, v0 * AU_D, terminal * AU_D)) - (5000 - r0)
    assert lag == pytest.approx(float(expected["radius_lag_at_last_au(v_inf t - (r-r0))"]), abs=1e-5)


@pytest.mark.parametrize(("inputs", "expected"), checks("shell.acceleration_bias"))
def test_what_a_constant_speed_gets_wrong(inputs, expected):
    r0, v0, r = inputs["r0_au"], inputs["v0_kms"], inputs["r_au"]
    terminal = float(terminal_speed_kms(v0, r0, inputs["M_Msun"], inputs["beta"]))
    age = float(travel_time(r, r0, v0 * AU_YR, terminal * AU_YR))
    assert age == pytest.approx(float(expected["true_age_since_launch_yr"]), rel=1e-9)
    assert r / (terminal * AU_YR) == pytest.approx(float(expected["age_r/v_inf_yr"]), rel=1e-9)
    assert r / (terminal * AU_YR) - age == pytest.approx(float(expected["bias_vinf_yr"]), abs=1e-8)


@given(share=st.floats(0.05, 2.0), far=st.floats(1.2, 300.0))
@settings(max_examples=25, deadline=None)
def test_the_closed_form_is_the_solution_of_the_equation_of_motion(share, far):
    """dv/dt = k/r^2 by scipy's DOP853; lengths in launch radii, terminal speed 1."""
    push = 0.5 * (1.0 - share**2)
    time = float(travel_time(far, 1.0, share, 1.0))
    found = solve_ivp(
        lambda t, y: [y[1], push / y[0] ** 2],
        (0, time),
        [1.0, share],
        method="DOP853",
        rtol=1e-11,
        atol=1e-12,
    )
    assert found.y[0, -1] == pytest.approx(far, rel=1e-8)
    assert float(speed_at(far, 1.0, share, 1.0)) == pytest.approx(found.y[1, -1], rel=1e-8)


@given(share=st.floats(0.02, 3.0), time=st.floats(0.0, 500.0))
@settings(max_examples=100, deadline=None)
def test_radius_and_time_are_inverse(share, time):
    radius = float(radius_after(time, 1.0, share, 1.0))
    assert float(travel_time(radius, 1.0, share, 1.0)) == pytest.approx(time, rel=1e-10, abs=1e-12)


@given(share=st.floats(0.1, 1.9), time=st.floats(0.05, 50.0))
@settings(max_examples=50, deadline=None)
def test_slopes_are_differences(share, time):
    """Central differences of the radius itself; h^2 and rounding leave about 1e-6 of each slope's size."""
    step, base = 1e-5, (time, 1.3, share, 0.7)

    def radius(t, r0, w, v):
        return float(radius_after(t, r0, w * v, v))

    slopes = radius_slopes(np.array([radius(*base)]), np.array([time]), *base[1:])
    for place, slope in enumerate(slopes):
        up, down = (list(base) for _ in range(2))
        up[place] += step
        down[place] -= step
        difference = (radius(*up) - radius(*down)) / (2 * step)
        assert float(slope[0]) == pytest.approx(difference, rel=1e-5, abs=1e-6)


def test_dust_that_starts_from_rest_is_on_its_way():
    """From rest, terminal speed 1, lengths in r0: the time is sqrt(r(r-1)) + ln(sqrt r + sqrt(r-1))."""
    expected = np.sqrt(4 * 3) + np.log(2 + np.sqrt(3))
    assert float(travel_time(4.0, 1.0, 1e-9, 1.0)) == pytest.approx(expected, rel=1e-8)


def test_dust_too_slow_to_escape_has_no_terminal_speed():
    assert np.isnan(terminal_speed_kms(10.0, 50.0, 15.0, 0.0))
