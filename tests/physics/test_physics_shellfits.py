"""Fits of shells: rows of checks_shells.csv (source in each), scipy and uncertainties as other tools."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import curve_fit, least_squares
from shell_images import period_of
from shell_reference import checks, with_error
from uncertainties import correlated_values, ufloat

from campaign.errors import InputRefused
from campaign.physics.shellfit import with_scaled_errors
from campaign.physics.shellmotion import (
    fit_common_motion,
    fit_each_shell,
    fit_motion_and_period,
    fit_one_shell,
    launch_times_yr,
)
from campaign.physics.shellradii import check_radii, mixed_edges_and_peaks, radius_errors
from campaign.physics.shellspacing import age_in_periods, ages_yr, fit_spacing
from campaign.physics.shellvalues import Sided, draw_sided, ratio_of_normals

# --- one shell through time ----------------------------------------------------------------------------


def one_shell():
    ((inputs, expected),) = checks("shell.multi_epoch_fit")
    errors = radius_errors(inputs["sigma"])
    return inputs, expected, errors


def test_one_shell_through_time_and_its_launch():
    inputs, expected, errors = one_shell()
    found = fit_one_shell(inputs["t_yr"], inputs["r_arcsec"], errors, pivot_yr=inputs["pivot_yr"])
    fit = found.fit
    assert fit.value("radius_arcsec") == pytest.approx(float(expected["r_at_pivot"]), rel=1e-10)
    assert fit.value("motion_arcsec_yr") == pytest.approx(float(expected["mu_arcsec_yr"]), rel=1e-10)
    for place, name in (((0, 0), "cov00"), ((0, 1), "cov01"), ((1, 1), "cov11")):
        assert fit.covariance[place] == pytest.approx(float(expected[name]), rel=1e-8)
    assert fit.chi2 == pytest.approx(float(expected["chi2"]), rel=1e-8)
    assert fit.degrees_of_freedom == expected["dof"]
    launch = launch_times_yr(found).at(0)
    assert launch.value == pytest.approx(float(expected["t_ejection_yr"]), rel=1e-10)
    assert launch.sigma == pytest.approx(float(expected["sigma_t_ejection_yr"]), rel=1e-7)


@pytest.mark.parametrize("pivot", [None, 0.0, 1900.0, 2023.5])
def test_no_choice_of_pivot_changes_the_launch_or_its_error(pivot):
    """Ignoring the covariance would give 34 yr at pivot 0 (reference row)."""
    inputs, expected, errors = one_shell()
    launch = launch_times_yr(fit_one_shell(inputs["t_yr"], inputs["r_arcsec"], errors, pivot)).at(0)
    assert launch.sigma == pytest.approx(float(expected["sigma_t_ejection_yr"]), rel=1e-5)
    assert launch.value == pytest.approx(float(expected["t_ejection_yr"]), abs=1e-5)


def test_errors_are_rescaled_only_when_asked():
    inputs, _, errors = one_shell()
    ((_, expected),) = checks("shell.multi_epoch_fit_scaled")
    fit = fit_one_shell(inputs["t_yr"], inputs["r_arcsec"], errors).fit
    assert fit.sigma("motion_arcsec_yr") == pytest.approx(float(expected["sigma_mu_absolute"]), rel=1e-6)
    assert fit.error_scale is None
    scaled = with_scaled_errors(fit)
    rescaled = float(expected["sigma_mu_rescaled_by_sqrt(chi2/dof)"])
    assert scaled.sigma("motion_arcsec_yr") == pytest.approx(rescaled, rel=1e-6)
    assert scaled.error_scale == pytest.approx(math.sqrt(fit.chi2 / 3), rel=1e-12)
    assert np.array_equal(scaled.values, fit.values)


def test_scaling_leaves_what_radii_share_as_it_was():
    errors = radius_errors([0.03] * 4, plate_scale_error=0.02)
    fit = fit_spacing([1, 2, 3, 4], [0.6, 1.55, 2.66, 3.58], errors)
    scaled = with_scaled_errors(fit)
    own = fit.covariance - fit.common_covariance
    # A common scale multiplies every value: eps^2 times the product of the values.
    assert fit.common_covariance == pytest.approx(0.02**2 * np.outer(fit.values, fit.values), rel=1e-6)
    assert scaled.covariance == pytest.approx(own * fit.chi2 / 2 + fit.common_covariance, rel=1e-9)


def test_nothing_to_scale_by_is_refused():
    with pytest.raises(InputRefused) as refused:
        with_scaled_errors(fit_spacing([1, 2], [0.5, 1.5], radius_errors([0.1, 0.1])))
    assert refused.value.code == "nothing-to-scale-by"


def test_age_from_radius_and_motion_of_different_data():
    ((inputs, expected),) = checks("shell.age_error")
    (theta, s_theta), (mu, s_mu) = with_error(inputs["theta_arcsec"]), with_error(inputs["mu_arcsec_yr"])
    age = ratio_of_normals(theta, mu, s_theta**2, 0.0, s_mu**2).at(0)
    assert age.value == pytest.approx(float(expected["age_yr"]), rel=1e-8)
    assert age.sigma == pytest.approx(float(expected["sigma_yr"]), rel=1e-8)


@given(
    top=st.floats(-3, 3),
    rho=st.floats(-0.95, 0.95),
    top_error=st.floats(0.05, 1.0),
    bottom_error=st.floats(0.05, 0.4),
)
@settings(max_examples=20, deadline=None)
def test_bounds_of_a_ratio_are_those_of_its_distribution(top, rho, top_error, bottom_error):
    """Against 200,000 draws; the lower part of the divisor is cut away as the bounds assume it positive."""
    covariance = rho * top_error * bottom_error
    rng = np.random.default_rng(5)
    u, v = rng.standard_normal((2, 200_000))
    numerator = top + top_error * u
    divisor = 1.0 + bottom_error * (rho * u + math.sqrt(1 - rho**2) * v)
    found = ratio_of_normals(top, 1.0, top_error**2, covariance, bottom_error**2).at(0)
    # The exact definition: the share of numerator < q divisor.
    for bound, share in zip(found[2:], (0.16, 0.84, 0.025, 0.975), strict=True):
        below = np.mean(numerator < bound * divisor)
        assert abs(below - share) < 4 * math.sqrt(share * (1 - share) / 200_000)


def test_a_motion_that_may_be_zero_leaves_the_launch_open():
    fit = fit_one_shell([2010.0, 2012.0], [0.50, 0.52], radius_errors([0.01, 0.01]))
    launch = launch_times_yr(fit).at(0)
    assert math.isnan(launch.lo95) and math.isnan(launch.hi95)
    assert math.isfinite(launch.lo68)


# --- one epoch -----------------------------------------------------------------------------------------


def test_nested_shells_of_one_image():
    ((inputs, expected),) = checks("shell.nested_fit")
    fit = fit_spacing(inputs["k"], inputs["R_arcsec"], radius_errors(inputs["sigma"]))
    assert fit.value("spacing_arcsec") == pytest.approx(float(expected["spacing_arcsec"]), rel=1e-10)
    assert fit.sigma("spacing_arcsec") == pytest.approx(float(expected["sigma_spacing"]), rel=1e-8)
    at_zero = fit.value("intercept_arcsec") - fit.value("spacing_arcsec")
    assert at_zero == pytest.approx(float(expected["intercept_arcsec(k=0)"]), rel=1e-9)
    age = age_in_periods(fit, [1]).at(0)
    assert age.value == pytest.approx(float(expected["age_of_shell1_in_periods"]), rel=1e-8)
    assert age.sigma * inputs["P_yr"] == pytest.approx(float(expected["sigma_yr(P exact)"]), rel=1e-7)
    period = draw_sided("period", Sided(inputs["P_yr"], 0.0, 0.0))
    years = ages_yr(fit, [1], period_yr=period).at(0)
    assert inputs["t_image"] - years.value == pytest.approx(float(expected["t_ejection_shell1_yr"]), rel=1e-8)
    assert years.sigma == pytest.approx(float(expected["sigma_yr(P exact)"]), rel=1e-7)


def test_the_oldest_of_twenty_shells_of_an_eight_year_binary():
    """Launched about 150 years before the newest: common practice, no source. Spacing invented."""
    spacing = 0.7
    radius = spacing * (np.arange(20) + 0.4)
    fit = fit_spacing(np.arange(1, 21), radius, radius_errors(np.full(20, 0.02)))
    ages = ages_yr(fit, [1, 20], period_yr=draw_sided("period", Sided(8.0, 0.01, 0.01)))
    assert ages.value[1] - ages.value[0] == pytest.approx(150.0, rel=0.02)


def test_the_fit_agrees_with_scipy_and_its_ages_with_uncertainties():
    radius, sigma = np.array([0.83, 2.27, 3.75, 5.17, 6.66]), np.array([0.03, 0.03, 0.04, 0.05, 0.06])
    index = np.arange(1, 6)
    fit = fit_spacing(index, radius, radius_errors(sigma))
    values, covariance = curve_fit(
        lambda j, s, b: s * (j - 1) + b, index, radius, sigma=sigma, absolute_sigma=True
    )
    assert fit.values == pytest.approx(values, rel=1e-6)
    assert fit.covariance == pytest.approx(covariance, rel=1e-5)
    s, b = correlated_values(fit.values, fit.covariance)
    for j in (1, 3, 7):
        expected = (b + s * (j - 1)) / s * ufloat(20.0, 0.4)
        found = ages_yr(fit, [j], period_yr=draw_sided("period", Sided(20.0, 0.4, 0.4), 2000)).at(0)
        assert found.value == pytest.approx(expected.nominal_value, rel=1e-10)
        assert found.sigma == pytest.approx(expected.std_dev, rel=1e-8)
        expected = (b + s * (j - 1)) / ufloat(0.072, 0.003)
        found = ages_yr(fit, [j], motion_mas_yr=draw_sided("motion", Sided(72.0, 3.0, 3.0), 2000)).at(0)
        assert found.sigma == pytest.approx(expected.std_dev, rel=1e-8)


def test_period_and_motion_together_weigh_an_age_as_least_squares_would():
    """Against scipy's fit of spacing, intercept, period and motion at once."""
    index, radius, sigma = np.arange(1, 6), np.array([0.83, 2.27, 3.75, 5.17, 6.66]), np.full(5, 0.03)
    period, motion = (20.0, 0.4), (0.0735, 0.0015)

    def residuals(x):  # s, b, P; the motion follows
        return np.concatenate(
            [
                (radius - x[0] * (index - 1) - x[1]) / sigma,
                [(x[2] - period[0]) / period[1], (x[0] / x[2] - motion[0]) / motion[1]],
            ]
        )

    best = least_squares(residuals, [1.45, 0.8, 20.0], xtol=1e-15, ftol=1e-15)
    s, b, p = correlated_values(best.x, np.linalg.inv(best.jac.T @ best.jac))
    expected = (b + 2 * s) / s * p
    fit = fit_spacing(index, radius, radius_errors(sigma))
    found = ages_yr(
        fit,
        [3],
        period_yr=draw_sided("period", Sided(period[0], period[1], period[1])),
        motion_mas_yr=draw_sided("motion", Sided(73.5, 1.5, 1.5)),
    ).at(0)
    # Both are of first order in errors of 2 %, and the draws add 1 % of sigma.
    assert found.value == pytest.approx(expected.nominal_value, abs=0.05 * expected.std_dev)
    assert found.sigma == pytest.approx(expected.std_dev, rel=0.03)


def test_a_plate_scale_is_common_to_a_group_as_a_scale_fitted_with_them_would_be():
    """Against scipy with each group's scale as a further unknown, known to 1 + N(0, error)."""
    index = np.array([1, 2, 3, 1, 2, 3, 4])
    radius = np.array([0.61, 1.63, 2.58, 0.60, 1.55, 2.53, 3.49])
    sigma, scale, group = np.full(7, 0.02), np.array([0.03] * 3 + [0.01] * 4), np.array([0] * 3 + [1] * 4)
    fit = fit_spacing(index, radius, radius_errors(sigma, scale, group))

    def residuals(x):
        model = (1.0 + x[2 + group]) * (x[0] * (index - 1) + x[1])
        return np.concatenate([(radius - model) / sigma, x[2:] / [0.03, 0.01]])

    best = least_squares(residuals, [1.0, 0.6, 0.0, 0.0], xtol=1e-15, ftol=1e-15)
    covariance = np.linalg.inv(best.jac.T @ best.jac)[:2, :2]
    assert fit.values == pytest.approx(best.x[:2], abs=0.02 * math.sqrt(covariance[0, 0]))
    # There the scale multiplies the fitted values, here the data: apart by the scales' errors, 1 to 3 %.
    sizes = np.sqrt(np.outer(np.diag(covariance), np.diag(covariance)))
    assert np.abs((fit.covariance - covariance) / sizes).max() < 0.02


def test_edges_lie_outside_peaks_by_an_offset_with_an_error_of_its_own():
    """Against scipy with the offset as a further unknown, known to 0.10 +- 0.04 arcsec."""
    index, radius = np.arange(1, 6), np.array([0.60, 1.62, 2.61, 3.73, 4.70])
    edge = np.array([False, False, False, True, True])
    errors = radius_errors([0.02] * 5, is_edge=edge, edge_offset_arcsec=0.1, edge_offset_sigma_arcsec=0.04)
    fit = fit_spacing(index, radius, errors)

    def residuals(x):
        model = x[0] * (index - 1) + x[1] + edge * x[2]
        return np.concatenate([(radius - model) / 0.02, [(x[2] - 0.1) / 0.04]])

    best = least_squares(residuals, [1.0, 0.6, 0.1], xtol=1e-15, ftol=1e-15)
    assert fit.values == pytest.approx(best.x[:2], rel=1e-7)
    assert fit.covariance == pytest.approx(np.linalg.inv(best.jac.T @ best.jac)[:2, :2], rel=1e-6)


@given(scale=st.floats(0.2, 5.0), epsilon=st.floats(0.0, 0.2))
@settings(max_examples=40, deadline=None)
def test_an_age_in_periods_needs_no_plate_scale(scale, epsilon):
    radius = np.array([0.83, 2.27, 3.75, 5.17])
    plain = age_in_periods(fit_spacing([1, 2, 3, 4], radius, radius_errors([0.03] * 4)), [1, 4])
    scaled = fit_spacing([1, 2, 3, 4], radius * scale, radius_errors([0.03 * scale] * 4, epsilon))
    found = age_in_periods(scaled, [1, 4])
    assert found.value == pytest.approx(plain.value, rel=1e-9)
    assert found.sigma == pytest.approx(plain.sigma, rel=1e-5)


def test_a_radius_without_an_error_gives_an_age_without_one():
    fit = fit_spacing([1, 2, 3], [0.5, 1.5, 2.5], radius_errors([0.1, math.nan, 0.1]))
    ages = ages_yr(fit, [1], period_yr=draw_sided("period", Sided(8.0, 0.1, 0.1)))
    assert ages.value[0] == pytest.approx(4.0)
    assert math.isnan(ages.sigma[0]) and math.isnan(ages.lo68[0])


# --- several epochs ------------------------------------------------------------------------------------

TIME = np.array([2004.0, 2004.0, 2012.0, 2012.0, 2012.0, 2020.0, 2020.0, 2020.0])
CYCLE = np.array([1, 2, 1, 2, 3, 2, 3, 4])
RADIUS = np.array([1.02, 0.42, 1.51, 0.91, 0.29, 1.37, 0.80, 0.19])
SIGMA = np.array([0.02, 0.03, 0.02, 0.02, 0.03, 0.02, 0.02, 0.03])


def test_all_shells_and_the_period_together_agree_with_scipy():
    found = fit_motion_and_period(TIME, CYCLE, RADIUS, radius_errors(SIGMA))

    def model(_, launch, period, motion):
        return motion * (TIME - launch - period * (CYCLE - 4))

    values, covariance = curve_fit(
        model, TIME, RADIUS, p0=[2016, 10, 0.06], sigma=SIGMA, absolute_sigma=True, xtol=1e-14, ftol=1e-14
    )
    launch, period = launch_times_yr(found, [4]).at(0), period_of(found)
    errors = np.sqrt(np.diag(covariance))
    assert launch.value == pytest.approx(values[0], abs=1e-4 * errors[0])
    assert launch.sigma == pytest.approx(errors[0], rel=1e-4)
    assert period.value == pytest.approx(values[1], abs=1e-4 * errors[1])
    assert period.sigma == pytest.approx(errors[1], rel=1e-4)
    assert found.fit.sigma("motion_arcsec_yr") == pytest.approx(errors[2], rel=1e-4)


def test_a_period_known_from_the_orbit_agrees_with_scipy():
    found = fit_motion_and_period(TIME, CYCLE, RADIUS, radius_errors(SIGMA), period_yr=Sided(10.1, 0.1, 0.1))

    def residuals(x):
        return np.concatenate(
            [(RADIUS - x[2] * (TIME - x[0] - x[1] * (CYCLE - 4))) / SIGMA, [(x[1] - 10.1) / 0.1]]
        )

    best = least_squares(residuals, [2016, 10, 0.06], xtol=1e-15, ftol=1e-15, x_scale=[1, 1, 0.01])
    errors = np.sqrt(np.diag(np.linalg.inv(best.jac.T @ best.jac)))
    launch = launch_times_yr(found, [4]).at(0)
    # The stated period enters to first order: squares of its relative error, 1 %, are left out.
    assert launch.value == pytest.approx(best.x[0], abs=0.03 * errors[0])
    assert launch.sigma == pytest.approx(errors[0], rel=0.03)


def test_one_epoch_with_a_period_is_the_fit_of_its_spacing():
    radius, errors = [0.5, 1.52, 2.49, 3.5], radius_errors([0.02] * 4)
    joint = fit_motion_and_period(
        [2020.0] * 4, [0, -1, -2, -3], radius, errors, period_yr=Sided(8.0, 0.1, 0.1)
    )
    ages = ages_yr(
        fit_spacing([1, 2, 3, 4], radius, errors), [1, 4], draw_sided("period", Sided(8.0, 0.1, 0.1))
    )
    launch = launch_times_yr(joint, [0, -3])
    assert 2020.0 - launch.value == pytest.approx(ages.value, rel=1e-9)
    assert launch.sigma == pytest.approx(ages.sigma, rel=1e-6)
    exact = fit_motion_and_period(
        [2020.0] * 4, [0, -1, -2, -3], radius, errors, period_yr=Sided(8.0, 0.0, 0.0)
    )
    assert 2020.0 - launch_times_yr(exact, [0]).value[0] == pytest.approx(ages.value[0], rel=1e-9)


def test_one_epoch_without_period_or_motion_dates_nothing():
    with pytest.raises(InputRefused) as refused:
        fit_motion_and_period([2020.0] * 3, [0, -1, -2], [0.5, 1.5, 2.5], radius_errors([0.02] * 3))
    assert refused.value.code == "shells-too-few"
    assert "period" in refused.value.hint


def test_each_shell_by_itself_and_all_with_one_motion():
    each = fit_each_shell(TIME, CYCLE, RADIUS, radius_errors(SIGMA))
    assert list(each) == [1, 2, 3]
    chosen = CYCLE == 2
    slope, offset = np.polyfit(TIME[chosen] - 2012, RADIUS[chosen], 1, w=1 / SIGMA[chosen])
    assert each[2].fit.value("motion_arcsec_yr") == pytest.approx(slope, rel=1e-9)
    assert launch_times_yr(each[2]).value[0] == pytest.approx(2012 - offset / slope, rel=1e-9)
    common = fit_common_motion(TIME, CYCLE, RADIUS, radius_errors(SIGMA))

    def model(_, motion, *launches):
        return motion * (TIME - np.array(launches)[CYCLE - 1])

    values, covariance = curve_fit(
        model, TIME, RADIUS, p0=[0.06, 1986, 1996, 2006, 2016], sigma=SIGMA, absolute_sigma=True, xtol=1e-14
    )
    errors = np.sqrt(np.diag(covariance))
    assert common.fit.sigma("motion_arcsec_yr") == pytest.approx(errors[0], rel=1e-4)
    launches = launch_times_yr(common, [1, 2, 3, 4])
    assert launches.value == pytest.approx(values[1:], abs=1e-3)
    assert launches.sigma == pytest.approx(errors[1:], rel=1e-4)


# --- what cannot be ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("radius", "index", "spacing", "code"),
    [
        ([-0.5, 1.5], None, None, "radius-refused"),
        ([0.0], None, None, "radius-refused"),
        ([math.nan], None, None, "radius-refused"),
        ([1.5, 0.5], [1, 2], None, "shell-order-refused"),
        ([0.5, 1.5], [0, 1], None, "shell-index-refused"),
        ([0.5, 1.5], [1, 2], 2.0, "spacing-refused"),
    ],
)
def test_radii_that_cannot_be_are_refused(radius, index, spacing, code):
    with pytest.raises(InputRefused) as refused:
        check_radii(radius, index, spacing)
    assert refused.value.code == code
    assert refused.value.why and refused.value.hint


def test_one_feature_may_be_measured_in_several_places():
    check_radii([0.50, 0.48, 1.5], [1, 1, 2])


@pytest.mark.parametrize("sigma", [0.0, -0.1, math.inf])
def test_an_error_that_is_not_above_zero_is_refused(sigma):
    with pytest.raises(InputRefused) as refused:
        radius_errors([0.1, sigma])
    assert refused.value.code == "radius-error-refused"


@pytest.mark.parametrize("scale", [-0.01, 1.0, math.nan])
def test_a_plate_scale_error_is_a_share(scale):
    with pytest.raises(InputRefused) as refused:
        radius_errors([0.1], plate_scale_error=scale)
    assert refused.value.code == "plate-scale-error-refused"


def test_one_shell_has_no_spacing():
    with pytest.raises(InputRefused) as refused:
        fit_spacing([1], [0.5], radius_errors([0.1]))
    assert refused.value.code == "shells-too-few"
    with pytest.raises(InputRefused):
        fit_spacing([2, 2], [0.5, 0.52], radius_errors([0.1, 0.1]))


def test_edges_beside_peaks_need_an_offset():
    assert mixed_edges_and_peaks(radius_errors([0.1, 0.1], is_edge=[True, False]))
    assert not mixed_edges_and_peaks(radius_errors([0.1, 0.1], is_edge=[True, True]))
    assert not mixed_edges_and_peaks(
        radius_errors([0.1, 0.1], is_edge=[True, False], edge_offset_sigma_arcsec=0.05)
    )
