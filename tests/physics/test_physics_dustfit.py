"""Dust is found again from its own light: temperature, amount, and how sure they are.

Truth is a mass of dust with optical constants and a temperature that the fit does not know, its light made by
the Planck function of astropy and noise added; the intervals must hold it as often as they say.
"""

from __future__ import annotations

import numpy as np
import pytest
from astropy import units as u
from astropy.modeling.models import BlackBody
from scipy.optimize import least_squares
from scipy.stats import norm

from campaign.errors import InputRefused
from campaign.physics.dustfit import (
    BandFluxes,
    amount_at,
    draw_dust,
    fit_dust,
    flux_sensitivities,
    upper_amount,
)
from campaign.physics.opacity import opacity_cm2_g, opacity_named

CARBON = opacity_named("zubko-0.1")
KLM = np.array([2.159, 3.3526, 4.6028])
JKLM = np.array([1.235, 2.159, 3.3526, 4.6028])
SHARES = np.array([0.025, 0.16, 0.5, 0.84, 0.975])


def light_of(mass_msun, temperature_k, wavelength_um, distance_pc=1000.0):
    """Flux of optically thin dust by astropy alone, Jy."""
    kappa = opacity_cm2_g(CARBON, wavelength_um) * u.cm**2 / u.g
    intensity = BlackBody(temperature_k * u.K)(wavelength_um * u.um) * u.sr
    return (mass_msun * u.Msun * kappa * intensity / (distance_pc * u.pc) ** 2).to_value(u.Jy)


def bands(wavelength_um, flux, sigma, side=None):
    sides = np.zeros(flux.size, dtype=np.int8) if side is None else np.asarray(side, dtype=np.int8)
    return BandFluxes(wavelength_um, opacity_cm2_g(CARBON, wavelength_um), flux, sigma, sides)


def stratified(rng, draws):
    return [(rng.permutation(draws) + rng.random(draws)) / draws for _ in range(2)]


def found(fit, rng, draws=400):
    """Quantiles of temperature and of the natural logarithm of the mass at 1 kpc."""
    t, amount = draw_dust(fit, *stratified(rng, draws))
    return np.quantile(t, SHARES), np.quantile(np.log(amount * 1000.0**2), SHARES)


def case_three_bands(rng):
    t, mass = rng.uniform(500.0, 1500.0), 10.0 ** rng.uniform(-9.5, -7.0)
    flux = light_of(mass, t, KLM)
    sigma = 0.05 * flux
    return t, mass, bands(KLM, flux + sigma * rng.normal(size=3), sigma)


def case_two_bands(rng):
    t, mass = rng.uniform(600.0, 1400.0), 10.0 ** rng.uniform(-9.5, -7.0)
    wavelength = KLM[:2]
    flux = light_of(mass, t, wavelength)
    sigma = 0.07 * flux
    return t, mass, bands(wavelength, flux + sigma * rng.normal(size=2), sigma)


def case_with_a_limit(rng):
    """J is not seen: a flux below 3 sigma is told as a limit, one above it as it was measured."""
    t, mass = rng.uniform(600.0, 1400.0), 10.0 ** rng.uniform(-9.5, -7.0)
    flux = light_of(mass, t, JKLM)
    sigma = 0.06 * flux
    sigma[0] = flux[0] * rng.uniform(0.3, 3.0)
    seen, side = flux + sigma * rng.normal(size=4), np.zeros(4, dtype=np.int8)
    if seen[0] < 3.0 * sigma[0]:
        seen[0], side[0] = 3.0 * sigma[0], 1
    return t, mass, bands(JKLM, seen, sigma, side)


def case_with_a_saturated_band(rng):
    """L is brighter than the detector stands, a bound without luck; K and M are measured."""
    t, mass = rng.uniform(600.0, 1400.0), 10.0 ** rng.uniform(-9.5, -7.0)
    flux = light_of(mass, t, KLM)
    sigma = 0.06 * flux
    seen = flux + sigma * rng.normal(size=3)
    bound = flux[1] * rng.uniform(0.8, 1.2)
    side = np.zeros(3, dtype=np.int8)
    if seen[1] > bound:
        seen[1], side[1] = bound, -1
    return t, mass, bands(KLM, seen, sigma, side)


CASES = {
    "three bands": case_three_bands,
    "two bands": case_two_bands,
    "a limit": case_with_a_limit,
    "a saturated band": case_with_a_saturated_band,
}


def check_coverage(case, count, seed):
    rng = np.random.default_rng(seed)
    inside68, inside95, pulls = np.zeros((3, 2, count))
    for i in range(count):
        t, mass, seen = case(rng)
        for which, (truth, q) in enumerate(zip((t, np.log(mass)), found(fit_dust(seen), rng), strict=True)):
            inside68[which, i] = q[1] <= truth <= q[3]
            inside95[which, i] = q[0] <= truth <= q[4]
            pulls[which, i] = (q[2] - truth) / (0.5 * (q[3] - q[1]))
    for inside, share in ((inside68, 0.68), (inside95, 0.95)):
        z = (inside.mean(axis=1) - share) / np.sqrt(share * (1.0 - share) / count)
        assert np.all(np.abs(z) < 3.0), (share, inside.mean(axis=1))
    # Without bias: the median is above the truth as often as below it.
    z = ((pulls > 0.0).mean(axis=1) - 0.5) / np.sqrt(0.25 / count)
    assert np.all(np.abs(z) < 3.0), pulls.mean(axis=1)


@pytest.mark.parametrize("name", CASES)
def test_dust_is_found_again_as_surely_as_is_said(name):
    check_coverage(CASES[name], 100, 20_611)


@pytest.mark.slow
@pytest.mark.parametrize("name", CASES)
def test_dust_is_found_again_as_surely_as_is_said_in_four_thousand_cases(name):
    check_coverage(CASES[name], 4000, 31)


def test_without_noise_mass_and_temperature_come_back():
    flux = light_of(3e-8, 870.0, KLM)
    fit = fit_dust(bands(KLM, flux, 0.01 * flux))
    t, mass = found(fit, np.random.default_rng(1))
    assert t[2] == pytest.approx(870.0, rel=2e-3)
    assert np.exp(mass[2]) == pytest.approx(3e-8, rel=1e-2)
    # The best point of a grid of temperatures: a twentieth of sigma in each of three bands is nothing.
    assert fit.chi2 < 0.05


def test_the_errors_are_those_of_least_squares_where_the_data_are_good():
    # scipy.optimize.least_squares: covariance of the linearised problem.
    flux = light_of(3e-8, 870.0, JKLM)
    sigma = 0.02 * flux

    def residuals(p):
        return (light_of(np.exp(p[1]), p[0] * 1000.0, JKLM) - flux) / sigma

    solved = least_squares(residuals, [0.87, np.log(3e-8)], x_scale=[0.01, 0.05])
    t_error, mass_error = np.sqrt(np.diag(np.linalg.inv(solved.jac.T @ solved.jac)))
    seen = bands(JKLM, flux, sigma)
    fit = fit_dust(seen)
    t, amount = draw_dust(fit, *stratified(np.random.default_rng(3), 20_000))
    assert np.std(t) == pytest.approx(1000.0 * t_error, rel=0.03)
    assert np.std(np.log(amount)) == pytest.approx(mass_error, rel=0.03)
    slopes = flux_sensitivities(seen, fit.best_temperature_k, fit.best_amount)
    linear = np.sqrt((slopes**2 * sigma**2).sum(axis=1))
    assert linear[0] == pytest.approx(mass_error, rel=0.03)
    assert linear[1] == pytest.approx(t_error / 0.87, rel=0.03)


def test_a_limit_counts_as_the_probability_of_staying_below_it():
    # Ratio of the two likelihoods by scipy.stats.norm: the fit with the limit over the fit without.
    flux = light_of(3e-8, 870.0, JKLM)
    sigma = 0.1 * flux
    limit = flux.copy()
    limit[0] = 2.0 * flux[0]
    sigma[0] = 2.0 / 3.0 * flux[0]
    with_limit = fit_dust(bands(JKLM, limit, sigma, [1, 0, 0, 0]))
    kappa, t, a = opacity_cm2_g(CARBON, JKLM), with_limit.temperature_k, with_limit.amount
    without = fit_dust(bands(KLM, flux[1:], sigma[1:]))
    weight = np.exp(
        -0.5 * ((flux[1:, None, None] - a * _shape(kappa[1:], KLM, t)) / sigma[1:, None, None]) ** 2
    ).prod(axis=0)
    weight *= norm.cdf((limit[0] - a * _shape(kappa[:1], JKLM[:1], t)[0]) / sigma[0])
    # The prior: even in what the amount would make in the measured bands.
    weight *= (
        np.gradient(a, axis=1)
        * np.sqrt((_shape(kappa[1:], KLM, t)[:, :, 0] ** 2 / sigma[1:, None] ** 2).sum(axis=0))[:, None]
    )
    weight /= weight.sum()
    assert np.abs(weight.sum(axis=1) - with_limit.weight.sum(axis=1)).max() < 1e-4
    assert with_limit.best_temperature_k < without.best_temperature_k + 1.0


def _shape(kappa, wavelength_um, t):
    """Flux of 1 Msun/pc^2 by astropy, shape (bands, temperatures, 1)."""
    out = [
        (k * u.cm**2 / u.g * u.Msun / u.pc**2 * BlackBody(t * u.K)(w * u.um) * u.sr).to_value(u.Jy)
        for k, w in zip(kappa, wavelength_um, strict=True)
    ]
    return np.array(out)[:, :, None]


def test_two_bands_too_blue_for_dust_are_not_bounded_by_the_data():
    # A star's own light: Rayleigh-Jeans in both bands.
    flux = np.array([10.0, 10.0 * (2.159 / 3.3526) ** 2])
    fit = fit_dust(bands(KLM[:2], flux, 0.05 * flux))
    assert "hot" in fit.cut
    assert not fit_dust(bands(KLM, light_of(1e-8, 900.0, KLM), 0.05 * light_of(1e-8, 900.0, KLM))).cut


def test_with_the_temperature_given_the_amount_is_the_weighted_mean_of_the_bands():
    flux = light_of(3e-8, 870.0, KLM)
    sigma = np.array([0.05, 0.1, 0.2]) * flux
    one, error = (x[0] for x in amount_at(bands(KLM, flux * [1.1, 1.0, 0.9], sigma), 870.0))
    # By hand: each band gives its own mass, with the weights of its relative errors.
    weight = np.array([0.05, 0.1, 0.2]) ** -2.0
    assert one * 1e6 == pytest.approx(3e-8 * (weight @ [1.1, 1.0, 0.9]) / weight.sum(), rel=1e-4)
    assert error * 1e6 == pytest.approx(3e-8 / np.sqrt(weight.sum()), rel=1e-4)


def test_what_was_not_seen_gives_an_upper_limit_of_the_amount():
    # An even prior above zero and a flux of zero: 3 sigma one-sided is the 0.99865 quantile of a half-normal.
    sigma = np.array([0.1])
    limit = upper_amount(bands(KLM[:1], np.zeros(1), sigma), 900.0)[0]
    bound = limit * 1e6 / 1e-8 * light_of(1e-8, 900.0, KLM[:1])[0]
    assert bound == pytest.approx(0.1 * norm.ppf(0.5 + 0.5 * 0.9986501019683699), rel=0.01)


@pytest.mark.parametrize(
    ("seen", "code"),
    [
        (bands(KLM[:1], np.ones(1), np.ones(1), [1]), "dust-not-measured"),
        (bands(KLM[:1], np.ones(1), np.zeros(1)), "error-refused"),
    ],
)
def test_limits_alone_and_errors_of_zero_are_refused(seen, code):
    with pytest.raises(InputRefused) as refused:
        fit_dust(seen)
    assert refused.value.code == code
