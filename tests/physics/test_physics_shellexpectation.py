"""Where shells will be: end-to-end row of checks_shells.csv (source there), uncertainties, fresh draws."""

from __future__ import annotations

import math

import numpy as np
import pytest
from shell_images import share_z
from shell_reference import checks
from uncertainties import correlated_values, ufloat

from campaign.errors import InputRefused
from campaign.physics.shellexpectation import (
    expected_radii,
    radii_from_fit,
    resolvable_yr,
    shells_in_view,
)
from campaign.physics.shellmotion import fit_motion_and_period, fit_one_shell
from campaign.physics.shellradii import radius_errors
from campaign.physics.shellrelations import ShellInput, solve_shell_relations
from campaign.physics.shellvalues import Sided, draw_sided


def test_shells_of_the_invented_system_from_one_end_to_the_other():
    ((inputs, expected),) = checks("integrated.pipeline")
    solution = solve_shell_relations(
        [
            ShellInput("speed_kms", inputs["v_exp_kms"], 0.0, 0.0),
            ShellInput("distance_pc", inputs["D_pc"], 0.0, 0.0),
            ShellInput("period_yr", inputs["P_julian_yr"], 0.0, 0.0),
        ]
    )
    spacing = solution.get("spacing_arcsec").spread.value
    motion = solution.uncertain("proper_motion_mas_yr")
    assert spacing == pytest.approx(float(expected["shell_spacing_arcsec"]), rel=1e-10)
    assert motion.value == pytest.approx(float(expected["mu_mas_yr"]), rel=1e-10)
    (name,) = [key for key in expected if key.startswith("shell_radii")]
    periastron_yr = np.array([1.0, 0.0]) * inputs["P_julian_yr"]
    at_yr = (2460310.5 - inputs["T0_BJD_TDB"]) / 365.25
    found = expected_radii(periastron_yr, 0.0, at_yr, motion)
    assert found.radius_arcsec.value == pytest.approx([float(x) for x in expected[name]], rel=1e-8)
    assert found.launched_probability.tolist() == [1.0, 1.0]


@pytest.mark.parametrize("correlation", [0.0, 0.8, -0.6])
def test_the_error_of_a_radius_agrees_with_the_uncertainties_package(correlation):
    covariance = correlation * 0.3 * 0.004
    launch, motion = correlated_values([2011.0, 0.080], [[0.09, covariance], [covariance, 0.004**2]])
    expected = motion * (2030.0 - launch)
    drawn = draw_sided("motion", Sided(80.0, 4.0, 4.0))
    found = expected_radii([2011.0], [0.3], 2030.0, drawn, correlation).radius_arcsec.at(0)
    assert found.value == pytest.approx(expected.nominal_value, rel=1e-12)
    assert found.sigma == pytest.approx(expected.std_dev, rel=1e-9)
    # Nearly normal: the drawn bounds follow, to the square of the errors (5 % by 1.6 %) and 1 % of the draws.
    assert found.hi68 - found.lo68 == pytest.approx(2 * 0.99446 * expected.std_dev, rel=0.03)


def test_a_shell_hardly_launched_has_no_negative_radius():
    found = expected_radii([2030.0, 2030.2], [0.5, 0.0], 2030.1, draw_sided("motion", Sided(80.0, 4.0, 4.0)))
    assert found.radius_arcsec.lo95[0] == 0.0
    assert found.radius_arcsec.value[1] == 0.0
    # Standard normal distribution at 0.2 sigma: 0.5793 (Abramowitz & Stegun 1964, table 26.1).
    assert found.launched_probability[0] == pytest.approx(0.57926, abs=1e-5)
    assert found.launched_probability[1] == 0.0


def test_intervals_of_radii_hold_the_truth():
    """4,000 invented shells with errors of 5 to 12 % in motion and half a year in launch; |z| < 3."""
    rng = np.random.default_rng(601)
    held68, held95 = [], []
    for _ in range(4_000):
        relative = rng.uniform(0.05, 0.12)
        motion, launch = rng.uniform(20, 200), 2000.0 + rng.uniform(0, 20)
        measured = motion * (1 + relative * rng.standard_normal())
        seen = launch + 0.5 * rng.standard_normal()
        drawn = draw_sided("motion", Sided(measured, motion * relative, motion * relative), 1_000)
        found = expected_radii([seen], [0.5], 2030.0, drawn).radius_arcsec.at(0)
        truth = motion * (2030.0 - launch) / 1000.0
        held68.append(found.lo68 <= truth <= found.hi68)
        held95.append(found.lo95 <= truth <= found.hi95)
    z68, z95 = share_z(held68, 0.68), share_z(held95, 0.95)
    print(f"68 % held {np.mean(held68):.4f} (z {z68:+.2f}), 95 % held {np.mean(held95):.4f} (z {z95:+.2f})")
    assert abs(z68) < 3.0
    assert abs(z95) < 3.0


def test_a_fit_of_images_carries_its_covariance_into_the_future():
    times, cycles = [2010.0, 2010.0, 2020.0, 2020.0], [1, 2, 1, 2]
    errors = radius_errors([0.02, 0.02, 0.03, 0.03])
    fit = fit_motion_and_period(times, cycles, [1.0, 0.5, 1.4, 0.9], errors)
    b, s, mu = correlated_values(fit.fit.values, fit.fit.covariance)
    expected = b + s * (2 - 1) + mu * (2035.0 - fit.pivot_yr)
    found = radii_from_fit(fit, [1], 2035.0).at(0)
    assert found.value == pytest.approx(expected.nominal_value, rel=1e-12)
    assert found.sigma == pytest.approx(expected.std_dev, rel=1e-9)
    with pytest.raises(InputRefused) as refused:
        radii_from_fit(fit_one_shell([2010.0, 2020.0], [0.5, 0.9], errors.only([0, 1])), [1], 2035.0)
    assert refused.value.code == "spacing-missing"


def test_twenty_shells_of_an_eight_year_binary_in_a_field_of_28_arcsec():
    """Counted by hand: spacing 1 arcsec, the newest at 0.4; out to 14 arcsec there are 14."""
    radius = 0.4 + np.arange(20.0)
    view = shells_in_view(radius, 0.0, field_arcsec=28.0, resolution_arcsec=0.5, spacing_arcsec=1.0)
    assert view.in_view.sum() == 13
    assert (view.within_inner, view.beyond_outer) == (1, 6)
    assert view.probability.tolist() == view.in_view.astype(float).tolist()
    assert view.separable
    narrow = shells_in_view(radius, 0.0, field_arcsec=28.0, outer_radius_arcsec=5.0)
    assert narrow.in_view.sum() == 5
    mask = shells_in_view(radius, 0.0, resolution_arcsec=0.1, inner_working_angle_arcsec=2.0)
    assert mask.within_inner == 2
    assert not shells_in_view(radius, 0.0, resolution_arcsec=1.2, spacing_arcsec=1.0).separable


def test_a_shell_at_the_edge_is_in_view_by_half():
    view = shells_in_view([14.0], [0.2], field_arcsec=28.0)
    assert view.probability[0] == pytest.approx(0.5)


def test_the_newest_becomes_resolvable_when_it_has_grown_enough():
    motion = ufloat(0.080, 0.004)
    expected = ufloat(2030.0, 0.2) + 0.12 / motion
    found = resolvable_yr(2030.0, 0.2, draw_sided("motion", Sided(80.0, 4.0, 4.0)), 0.12)
    assert found.value == pytest.approx(expected.nominal_value, rel=1e-12)
    assert found.sigma == pytest.approx(expected.std_dev, rel=1e-9)
    assert found.lo68 < found.value < found.hi68
    unknown = resolvable_yr(2030.0, math.nan, draw_sided("motion", Sided(80.0, 4.0, 4.0)), 0.12)
    assert unknown.value == pytest.approx(2031.5) and math.isnan(unknown.lo68)


@pytest.mark.parametrize(
    "call",
    [
        lambda: shells_in_view([1.0], [0.1], field_arcsec=0.0),
        lambda: shells_in_view([1.0], [0.1], resolution_arcsec=-0.1),
        lambda: shells_in_view([1.0], [0.1], field_arcsec=1.0, resolution_arcsec=0.6),
        lambda: resolvable_yr(2030.0, 0.1, draw_sided("motion", Sided(80.0, 4.0, 4.0), 10), 0.0),
        lambda: expected_radii([2020.0], [0.1], 2030.0, draw_sided("m", Sided(80.0, 4.0, 4.0), 10), 1.5),
    ],
)
def test_views_that_cannot_be_are_refused(call):
    with pytest.raises(InputRefused):
        call()
