"""Zero points as published; magnitudes and fluxes against reference rows, and against each other.

Each row of checks_photometry.csv names its source and whether it was read or recalled (``memory``).
"""

from __future__ import annotations

import csv
import json
import math
from typing import Any

import numpy as np
import pytest
from physics_reference import FOLDER
from scipy.stats import norm, truncnorm

from campaign.errors import InputRefused, NotFound
from campaign.physics import photometry
from campaign.physics.zeropoints import ZERO_POINTS, wavelength_um, zero_point

# What the reference rows call each photometric system.
NAMES = {
    "2MASS": "2MASS",
    "WISE(steep, F*nu0)": "WISE",
    "WISE(Fnu0, Vega-like/constant table)": "WISE second column",
    "MKO(Tokunaga&Vacca 2005)": "MKO",
    "Johnson-Glass/Bessell-Brett-type": "Johnson-Glass",
    "Johnson-type generic": "Johnson",
}
SYSTEM_OF_BAND = {"Ks": "2MASS", "J": "2MASS", "W1": "WISE", "W2": "WISE", "W3": "WISE"}


def rows(topic: str) -> list[Any]:
    with (FOLDER / "checks_photometry.csv").open(newline="") as file:
        found = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert found, topic
    return [
        pytest.param(json.loads(row["inputs"]), json.loads(row["expected"]), row["basis"], id=row["inputs"])
        for row in found
    ]


def numbers(expected: dict[str, Any]) -> dict[str, float]:
    return {name: float(value) for name, value in expected.items()}


def point_of(inputs: dict[str, Any]):
    """The zero point of a row's band, which must be the one that the row states."""
    point = zero_point(SYSTEM_OF_BAND[inputs["band"]], inputs["band"])
    assert point.flux_jy == inputs["F0_Jy"]
    return point


@pytest.mark.parametrize(("inputs", "expected", "basis"), rows("phot.zero_point"))
def test_zero_points_are_as_published(inputs, expected, basis):
    point = zero_point(NAMES[inputs["system"]], inputs["band"])
    assert point.flux_jy == expected["F0_Jy"]
    assert (
        point.wavelength_um == expected["lambda_um"] == wavelength_um(NAMES[inputs["system"]], inputs["band"])
    )
    if "sigma_F0_Jy" in expected:
        assert point.sigma_jy == expected["sigma_F0_Jy"]
    assert point.basis == ("memory" if basis == "memory" else "published")


# Cohen, Wheaton & Megeath 2003; Jarrett et al. 2011; Tokunaga & Vacca 2005, values read in a collection of
# formulas that marks them as published. The Johnson values there are marked memory.
@pytest.mark.parametrize(
    ("photometric_system", "fluxes_jy"),
    [
        ("2MASS", {"J": 1594, "H": 1024, "Ks": 666.7}),
        ("WISE", {"W1": 309.540, "W2": 171.787, "W3": 31.674, "W4": 8.363}),
        ("WISE second column", {"W1": 306.682, "W2": 170.663, "W3": 29.045, "W4": 8.284}),
        ("MKO", {"J": 1560, "H": 1040, "Ks": 670, "K": 645, "L'": 249, "M'": 163}),
        ("Johnson-Glass", {"J": 1589, "H": 1021, "K": 640, "L": 285, "M": 154}),
        ("Johnson", {"J": 1603, "H": 1075, "K": 667, "L": 288, "M": 170, "N": 36}),
    ],
)
def test_the_table_holds_these_bands_and_no_others(photometric_system, fluxes_jy):
    table = {p.band: p.flux_jy for p in ZERO_POINTS if p.photometric_system == photometric_system}
    assert table == fluxes_jy


def test_the_flux_per_wavelength_of_ks_agrees_with_the_published_one():
    # Cohen, Wheaton & Megeath 2003: 4.283e-14 W cm^-2 um^-1; the isophotal wavelength is that of F_lambda,
    # which leaves 0.2 per cent.
    (row,) = rows("phot.zero_point_flam_check")
    published = row.values[1]["F_lambda_W_cm2_um_published"]
    point = zero_point("2MASS", "Ks")
    wavelength_m = 1e-6 * point.wavelength_um
    per_m = point.flux_jy * 1e-26 * 299_792_458.0 / wavelength_m**2
    assert per_m * 1e-4 * 1e-6 == pytest.approx(published, rel=2e-3)


def test_every_zero_point_names_its_source_and_there_is_one_of_each():
    assert all(p.source and p.flux_jy > 0 and p.wavelength_um > 0 for p in ZERO_POINTS)
    assert len({(p.photometric_system, p.band) for p in ZERO_POINTS}) == len(ZERO_POINTS)
    # A recalled value is marked, and so is a recalled error (of the WISE zero points, all four).
    assert {p.photometric_system for p in ZERO_POINTS if p.basis == "memory"} == {
        "Johnson-Glass", "Johnson", "MKO",
    }  # fmt: skip
    assert {p.band for p in ZERO_POINTS if p.sigma_basis == "memory"} == {"W1", "W2", "W3", "W4"}


@pytest.mark.parametrize(
    ("photometric_system", "band", "known"),
    [("2MASS", "K", ["J", "H", "Ks"]), ("Gaia", "G", ["2MASS", "WISE", "WISE second column", "MKO"])],
)
def test_what_is_not_in_the_table_is_refused_with_what_is(photometric_system, band, known):
    with pytest.raises(NotFound) as refused:
        zero_point(photometric_system, band)
    assert refused.value.details["known"][: len(known)] == known


# ---------------------------------------------------------------------------------------- conversions


@pytest.mark.parametrize(("inputs", "expected", "basis"), rows("phot.mag_to_flux"))
def test_fluxes_of_magnitudes(inputs, expected, basis):
    wanted = numbers(expected)
    point = point_of(inputs)
    flux = photometry.mag_to_flux(inputs["mag"], inputs["sigma_mag"], point.flux_jy, point.sigma_jy or 0.0)
    assert float(flux.flux_jy) == pytest.approx(wanted["F_Jy"], rel=1e-10)
    assert float(flux.sigma_jy) == pytest.approx(wanted["sigma_F_Jy_linear"], rel=1e-10)
    assert float(flux.high_jy) == pytest.approx(wanted["F_hi_Jy(m-s)"], rel=1e-10)
    assert float(flux.low_jy) == pytest.approx(wanted["F_lo_Jy(m+s)"], rel=1e-10)
    assert float(flux.sigma_total_jy) == pytest.approx(wanted["sigma_F_with_zero_point_error"], rel=1e-10)


@pytest.mark.parametrize(("inputs", "expected", "basis"), rows("phot.flux_to_mag"))
def test_magnitudes_of_fluxes(inputs, expected, basis):
    wanted = numbers(expected)
    found = photometry.flux_to_mag(inputs["F_Jy"], inputs["sigma_F_Jy"], point_of(inputs).flux_jy)
    assert float(found.mag) == pytest.approx(wanted["mag"], rel=1e-10)
    assert float(found.sigma_mag) == pytest.approx(wanted["sigma_mag_linear"], rel=1e-10)
    assert -float(found.minus_mag) == pytest.approx(wanted["m_bright_minus_m"], rel=1e-10)
    assert float(found.plus_mag) == pytest.approx(wanted["m_faint_minus_m"], rel=1e-10)


@pytest.mark.parametrize(("inputs", "expected", "basis"), rows("phot.upper_limit"))
def test_upper_limits_of_fluxes_are_lower_limits_of_magnitudes(inputs, expected, basis):
    wanted = numbers(expected)
    flux, sigma, zero_jy = inputs["F_Jy"], inputs["sigma_F_Jy"], point_of(inputs).flux_jy
    limit = photometry.flux_upper_limit_jy(flux, sigma)
    assert float(limit) == pytest.approx(wanted["U_max(F,0)+3s_Jy"], rel=1e-9)
    assert float(photometry.faint_limit_mag(limit, zero_jy)) == pytest.approx(
        wanted["mag_limit(fainter than)"], rel=1e-9
    )
    assert float(photometry.flux_upper_limit_flat_jy(flux, sigma)) == pytest.approx(
        wanted["U_bayes_flat_F>0_99.865%_Jy"], rel=1e-9
    )
    assert float(photometry.faint_limit_mag(3.0 * sigma, zero_jy)) == pytest.approx(
        wanted["3sigma_only_mag"], rel=1e-9
    )


def test_a_deeper_flux_limit_is_a_fainter_magnitude_limit():
    limits = photometry.faint_limit_mag([0.01, 0.003, 0.001], 309.54)
    assert (np.diff(limits) > 0).all()


def test_there_and_back_is_the_same_magnitude_and_the_exact_ends_swap():
    mags = np.linspace(-5.0, 25.0, 301)
    flux = photometry.mag_to_flux(mags, 0.1, 666.7)
    back = photometry.flux_to_mag(flux.flux_jy, flux.flux_jy - flux.low_jy, 666.7)
    assert back.mag == pytest.approx(mags, abs=1e-13)
    # The fainter end of the flux is the fainter end of the magnitude.
    assert back.plus_mag == pytest.approx(np.full(301, 0.1), rel=1e-12)


def test_small_errors_are_the_same_on_both_sides_and_to_first_order():
    flux = photometry.mag_to_flux(7.0, 1e-6, 666.7)
    assert float(flux.high_jy - flux.flux_jy) == pytest.approx(float(flux.sigma_jy), rel=1e-5)
    assert float(flux.flux_jy - flux.low_jy) == pytest.approx(float(flux.sigma_jy), rel=1e-5)


def test_five_magnitudes_are_a_factor_of_a_hundred():
    # Pogson 1856, the definition.
    flux = photometry.mag_to_flux([0.0, 5.0, -2.5], 0.0, 1594.0).flux_jy
    assert flux.tolist() == pytest.approx([1594.0, 15.94, 15940.0], rel=1e-14)


def test_an_error_as_large_as_the_flux_leaves_the_faint_side_open():
    found = photometry.flux_to_mag([0.002, 0.002], [0.002, 0.003], 309.54)
    assert np.isinf(found.plus_mag).all()
    assert found.minus_mag[0] == pytest.approx(2.5 * math.log10(2.0), rel=1e-14)


def test_what_is_unknown_stays_unknown_and_no_flux_has_no_magnitude():
    flux = photometry.mag_to_flux([7.0, np.nan], [np.nan, 0.1], 666.7)
    assert np.isfinite(flux.flux_jy[0])
    assert all(np.isnan(part).tolist() == [True, True] for part in (flux.sigma_jy, flux.low_jy, flux.high_jy))
    found = photometry.flux_to_mag([-0.1, 0.0, 0.1], [0.01, 0.01, np.nan], 666.7)
    assert np.isnan(found.mag).tolist() == [True, True, False]
    assert np.isnan(found.plus_mag).all()


@pytest.mark.parametrize("flux_over_sigma", [-30.0, -3.0, 0.0, 3.0, 8.0])
@pytest.mark.parametrize("probability", [0.5, 0.95, 0.9986501019683699])
def test_the_flat_limit_is_the_quantile_of_a_normal_cut_at_zero(flux_over_sigma, probability):
    # Independent of the formula in use: scipy's truncated normal distribution.
    expected = truncnorm(-flux_over_sigma, np.inf, loc=flux_over_sigma).ppf(probability)
    found = float(photometry.flux_upper_limit_flat_jy(flux_over_sigma, 1.0, probability))
    assert found == pytest.approx(expected, rel=1e-6)


def test_the_probability_of_three_sigma():
    assert pytest.approx(norm.cdf(3.0), rel=1e-15) == photometry.DEFAULT_LIMIT_PROBABILITY


@pytest.mark.parametrize(
    ("function", "values"),
    [
        (photometry.mag_to_flux, (7.0, 0.1, 0.0)),
        (photometry.mag_to_flux, (7.0, 0.1, math.nan)),
        (photometry.mag_to_flux, (7.0, 0.1, 666.7, -1.0)),
        (photometry.mag_to_flux, (7.0, -0.1, 666.7)),
        (photometry.flux_to_mag, (0.1, -0.1, 666.7)),
        (photometry.flux_to_mag, (0.1, 0.1, -666.7)),
        (photometry.flux_upper_limit_jy, (0.1, -0.1)),
        (photometry.flux_upper_limit_jy, (0.1, 0.1, 0.0)),
        (photometry.flux_upper_limit_flat_jy, (0.1, 0.1, 1.0)),
        (photometry.flux_upper_limit_flat_jy, (0.1, -0.1)),
        (photometry.faint_limit_mag, (0.0, 666.7)),
        (photometry.faint_limit_mag, ([0.1, -0.1], 666.7)),
    ],
)
def test_what_cannot_be_is_refused(function, values):
    with pytest.raises(InputRefused):
        function(*values)
