"""How warm grains are in starlight: rows of checks_grains.csv (source in each), and limits of the law."""

from __future__ import annotations

import csv
import json
import math

import numpy as np
import pytest
from physics_reference import FOLDER
from scipy.integrate import quad

from campaign.physics.grains import grain_temperature_k, peak_wavelength_um


def rows(topic):
    with (FOLDER / "checks_grains.csv").open(newline="") as file:
        chosen = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert chosen
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in chosen]


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.T_blackbody"))
def test_the_grey_temperatures_of_the_reference_rows(inputs, expected):
    found = float(grain_temperature_k(inputs["L_Lsun"], inputs["r_au"], 0.0))
    assert found == pytest.approx(float(expected["T_K"]), rel=1e-6)


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.T_Quv1"))
@pytest.mark.parametrize("temperature", [1000, 1200, 1500, 1800])
def test_a_small_grain_has_each_temperature_where_the_reference_rows_have_it(inputs, expected, temperature):
    # The rows take lam0 = 0.628 um for 2 pi a, a = 0.1 um to three digits.
    radius = inputs["lam0_um"] / (2.0 * math.pi)
    r_au = float(expected[f"r_cond_T{temperature}_au"])
    found = float(grain_temperature_k(inputs["L_Lsun"], r_au, inputs["s"], radius))
    assert found == pytest.approx(temperature, rel=1e-6)


@pytest.mark.parametrize("s", [0.0, 1.0, 1.7])
def test_the_peak_is_where_the_spectrum_has_its_maximum(s):
    # The spectrum itself, searched on a fine grid.
    temperature = 640.0
    grid = np.linspace(1.0, 12.0, 200_001)
    hc_k = 14_387.768775  # um K: second radiation constant, CODATA 2018
    spectrum = grid ** -(5.0 + s) / np.expm1(hc_k / (grid * temperature))
    assert float(peak_wavelength_um(temperature, s)) == pytest.approx(grid[np.argmax(spectrum)], abs=1e-4)


def test_wien_s_constant_is_that_of_codata():
    # 2897.771955 um K: CODATA 2018.
    assert float(peak_wavelength_um(1.0, 0.0)) == pytest.approx(2897.771955, rel=1e-9)


def test_what_a_small_grain_absorbs_it_emits():
    # The emitted power integrated over the spectrum (scipy.quad), against the starlight that hits it.
    luminosity, r_au, s, radius_um = 2.4e5, 310.0, 1.0, 0.1
    temperature = float(grain_temperature_k(luminosity, r_au, s, radius_um))
    h, c, k = 6.62607015e-34, 299_792_458.0, 1.380649e-23

    def emitted(wavelength_m):
        planck = 2.0 * h * c**2 / wavelength_m**5 / math.expm1(h * c / (wavelength_m * k * temperature))
        return 4.0 * math.pi * planck * (2.0 * math.pi * radius_um * 1e-6 / wavelength_m) ** s

    power = quad(emitted, 2e-7, 2e-3, limit=500, points=[2e-6, 5e-6, 2e-5])[0]
    flux = luminosity * 3.828e26 / (4.0 * math.pi * (r_au * 1.495978707e11) ** 2)
    # A sphere of radius a takes pi a^2 of the light and gives off from 4 pi a^2, pi B a unit of surface.
    assert power == pytest.approx(flux, rel=1e-3)


def test_no_grain_is_cooler_than_a_grey_one():
    r = np.geomspace(0.1, 1e5, 200)
    assert np.all(grain_temperature_k(3e5, r, 1.0, 0.1) >= grain_temperature_k(3e5, r, 0.0))
