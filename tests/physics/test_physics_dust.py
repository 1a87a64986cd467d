"""Dust grains in starlight and what their light says: rows of checks_dust.csv (source in each row)."""

from __future__ import annotations

import csv
import json
import math

import numpy as np
import pytest
from physics_reference import FOLDER
from scipy.integrate import quad

from campaign.errors import InputRefused, NotFound
from campaign.physics.condensation import (
    condensation_radius_au,
    power_law_condensation_radius_au,
    power_law_temperature_k,
    travel_distance_au,
)
from campaign.physics.constants import AU_KM, PARSEC_AU, SOLAR_MASS_KG
from campaign.physics.dustmass import (
    blackbody_radius_au,
    colour_temperature_k,
    dust_flux_jy,
    dust_mass_msun,
)
from campaign.physics.dustwindow import travel_delay_d
from campaign.physics.grains import grain_temperature_k, power_law_emission
from campaign.physics.opacity import (
    OPACITIES,
    dust_luminosity_lsun,
    opacity_cm2_g,
    opacity_named,
    planck_mean_cm2_g,
    power_law_opacity,
    reaches,
)
from campaign.physics.planck import flux_per_wavelength_w_cm2_um, log_planck_slope, planck_jy_sr
from campaign.physics.radiationpressure import (
    geometric_opacity_cm2_g,
    radiation_pressure_ratio,
    terminal_speed_kms,
)


def rows(topic):
    with (FOLDER / "checks_dust.csv").open(newline="") as file:
        chosen = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert chosen
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in chosen]


def near(text, rel=1e-6):
    return pytest.approx(float(text), rel=rel)


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.T_blackbody"))
def test_a_grey_grain_has_the_temperature_of_the_reference_rows(inputs, expected):
    assert float(grain_temperature_k(inputs["L_Lsun"], inputs["r_au"], 0.0)) == near(expected["T_K"])


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.T_powerlaw"))
def test_one_power_law_at_all_wavelengths_gives_the_reference_rows(inputs, expected):
    light, star, s = inputs["L_Lsun"], inputs["Tstar_K"], inputs["s (Q~lambda^-s at all wavelengths)"]
    for r in (20, 100, 500):
        found = float(power_law_temperature_k(light, r, star, s))
        assert found == near(expected[f"T_at_{r}au_K"])
    for t in (1000, 1200, 1500, 1800):
        found = float(power_law_condensation_radius_au(light, t, star, s))
        assert found == near(expected[f"r_cond_T{t}_au"])
    r = np.array([100.0, 110.0])
    slope = np.diff(np.log(power_law_temperature_k(light, r, star, s))) / np.diff(np.log(r))
    assert float(slope[0]) == near(expected["exponent_dlnT/dlnr"])


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.T_Quv1"))
def test_carbon_condenses_where_the_reference_rows_have_it(inputs, expected):
    radius_um = inputs["lam0_um"] / (2.0 * math.pi)
    for t in (1000, 1200, 1500, 1800):
        found = float(condensation_radius_au(inputs["L_Lsun"], t, inputs["s"], radius_um))
        assert found == near(expected[f"r_cond_T{t}_au"])
    assert float(power_law_emission(1200.0, inputs["s"], radius_um)) == near(expected["QPlanck_1200K"])


def test_the_power_law_carried_into_the_ultraviolet_puts_condensation_three_times_too_far_out():
    # Published sheet of formulas: 190.2 au against 65.77 au for 3e5 Lsun, 1200 K, s = 1 (computed: mpmath).
    far = float(power_law_condensation_radius_au(3e5, 1200.0, 50_000.0, 1.0))
    near_ = float(condensation_radius_au(3e5, 1200.0, 1.0, 0.628 / (2.0 * math.pi)))
    assert far / near_ == pytest.approx(190.2007701 / 65.76857272, rel=1e-6)


@pytest.mark.parametrize("radius_um", [0.01, 0.1, 0.5, 2.0])
@pytest.mark.parametrize("s", [0.0, 1.0, 1.7])
def test_temperature_and_condensation_radius_undo_each_other_also_for_grains_that_turn_grey(radius_um, s):
    t = np.linspace(150.0, 2500.0, 60)
    r = condensation_radius_au(3e5, t, s, radius_um)
    assert np.allclose(grain_temperature_k(3e5, r, s, radius_um), t, rtol=1e-12)


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.onset_delay"))
def test_the_gas_needs_as_long_as_the_reference_rows_say(inputs, expected):
    found = float(travel_delay_d(np.float64(inputs["r_cond_au"]), np.float64(inputs["v_kms"])))
    assert found == near(expected["delay_d"], 1e-9)
    assert found / 365.25 == near(expected["delay_yr"], 1e-9)


def test_the_way_is_counted_from_the_stagnation_point_and_the_centre_of_light():
    # Geometry by hand: A at 0, B at 6 au, A four times as bright, so the light's centre is at 1.2 au; from a
    # stagnation point at 5 au to 60 au beyond that centre the way is 56.2 au.
    assert float(travel_distance_au(60.0, 6.0, 5.0, 4e5, 1e5)) == pytest.approx(56.2, rel=1e-12)
    assert float(travel_distance_au(2.0, 6.0, 5.9, 4e5, 1e5)) == 0.0


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.kappa"))
def test_the_tables_hold_the_opacities_of_the_reference_rows(inputs, expected):
    author = inputs["optical_constants"].split()[0].lower()
    table = opacity_named(f"{author}-{inputs['a_um']:g}")
    for wavelength, value in expected.items():
        if wavelength.endswith("um") and isinstance(value, dict):
            found = float(opacity_cm2_g(table, float(wavelength.removesuffix("um"))))
            assert found == near(value["kappa_abs_cm2_g"], 1e-9)
    k = opacity_cm2_g(table, [3.3526, 10.0])
    slope = -math.log(k[1] / k[0]) / math.log(10.0 / 3.3526)
    assert slope == pytest.approx(expected["slope_s_3.35_to_10um"], abs=6e-4)  # given to three decimals
    assert "A&A" in table.source or "MNRAS" in table.source


def test_large_grains_have_the_opacities_of_the_published_sheet():
    # Zubko+ 1996 constants, 0.5 um (rho 1.8), Mie by miepython 3.3.0: cm^2 per gram of dust.
    table = opacity_named("zubko-0.5")
    found = opacity_cm2_g(table, [2.159, 3.3526, 4.6028, 10.0, 11.5608, 22.0883])
    assert found.round(6).tolist() == [13165.0, 15036.0, 9597.0, 1656.0, 1263.0, 413.0]


@pytest.mark.parametrize("table", [t for t in OPACITIES if t.name != "zubko-0.5"], ids=lambda t: t.name)
def test_between_its_wavelengths_a_table_is_straight_enough(table):
    # Each inner node left out and found again from its neighbours, twice as far apart as in use, where a
    # straight line errs four times as much: a fifth of the 30 % between published materials here is a
    # twentieth of it in use.
    for i in range(1, len(table.wavelength_um) - 1):
        rest = table._replace(
            wavelength_um=table.wavelength_um[:i] + table.wavelength_um[i + 1 :],
            kappa_cm2_g=table.kappa_cm2_g[:i] + table.kappa_cm2_g[i + 1 :],
        )
        found = float(opacity_cm2_g(rest, table.wavelength_um[i]))
        assert found == pytest.approx(table.kappa_cm2_g[i], rel=0.06)


def test_a_table_says_where_it_ends_and_an_unknown_one_is_refused_with_the_names():
    assert not reaches(opacity_named("zubko-0.1"), 450.0)
    assert reaches(power_law_opacity(1000.0, 10.0, 1.2), 450.0)
    with pytest.raises(NotFound) as refused:
        opacity_named("graphite")
    assert "zubko-0.1" in refused.value.details["known"]


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.mass"))
def test_a_flux_is_as_many_grams_of_dust_as_the_reference_rows_say(inputs, expected):
    b = float(planck_jy_sr(inputs["lam_um"], inputs["T_K"]))
    assert b == near(expected["B_nu_Jy_sr"])
    m = dust_mass_msun(*(inputs[k] for k in ("F_Jy", "lam_um", "D_pc", "T_K", "kappa_cm2_g")))
    # The rows' solar mass and ours differ by 2e-6 of G.
    assert float(m) == near(expected["M_Msun"], 5e-6)
    assert float(m) * SOLAR_MASS_KG == near(expected["M_kg"])
    back = dust_flux_jy(m, *(inputs[k] for k in ("lam_um", "D_pc", "T_K", "kappa_cm2_g")))
    assert float(back) == near(inputs["F_Jy"], 1e-12)


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.colour_temperature"))
def test_a_ratio_of_fluxes_is_the_temperature_of_the_reference_rows(inputs, expected):
    pair = inputs["lam1_um"], inputs["lam2_um"]
    ratio, kappas = float(expected["F1_over_F2"]), (pair[1] / pair[0]) ** inputs["s"]
    found = float(colour_temperature_k(ratio, *pair, kappas))
    assert found == near(expected["T_recovered_same_s_K"], 1e-7)
    assert float(colour_temperature_k(ratio, *pair, 1.0)) == near(expected["T_if_s=0_assumed_K"], 1e-7)
    assert float(colour_temperature_k(1.0 / ratio, pair[1], pair[0], 1.0 / kappas)) == pytest.approx(found)
    if "W1-W2_mag(zero points 309.540,171.787)" in expected:
        colour = -2.5 * math.log10(ratio * 171.787 / 309.540)
        assert colour == near(expected["W1-W2_mag(zero points 309.540,171.787)"], 1e-7)


def test_a_colour_bluer_than_any_black_body_has_no_temperature():
    # Rayleigh-Jeans: the ratio of two fluxes of a black body is below (nu1/nu2)^2.
    steepest = (4.6028 / 3.3526) ** 2
    assert np.isnan(colour_temperature_k([steepest * 1.01, -0.2, 0.0], 3.3526, 4.6028, 1.0)).all()
    assert not np.isnan(colour_temperature_k(steepest * 0.99, 3.3526, 4.6028, 1.0))


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.beta_rp"))
def test_light_pushes_as_in_the_reference_rows(inputs, expected):
    found = radiation_pressure_ratio(inputs["L_Lsun"], inputs["M_Msun"], inputs["kappa_pr_cm2_g"])
    assert float(found) == near(expected["beta"])


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.acceleration"))
def test_grains_end_with_the_speed_of_the_reference_rows(inputs, expected):
    found = terminal_speed_kms(inputs["v0_kms"], inputs["r0_au"], inputs["M_Msun"], inputs["beta"])
    assert float(found) == near(expected["v_inf_kms"], 1e-9)


def test_what_is_too_slow_and_too_dark_falls_back():
    # Escape speed at 10 au of 15 Msun is 51.6 km/s (sqrt(2 G M/r); common practice, no source).
    assert np.isnan(terminal_speed_kms(50.0, 10.0, 15.0, 0.0))
    assert float(terminal_speed_kms(52.0, 10.0, 15.0, 0.0)) > 0.0


def test_a_sphere_has_three_quarters_of_its_area_over_its_mass_times_size():
    a_cm, rho = 0.1e-4, 1.8
    area, mass = math.pi * a_cm**2, 4.0 / 3.0 * math.pi * a_cm**3 * rho
    assert float(geometric_opacity_cm2_g(0.1, rho, 1.3)) == pytest.approx(1.3 * area / mass, rel=1e-12)


@pytest.mark.parametrize(("inputs", "expected"), rows("phot.zero_point_flam_check"))
def test_a_zero_point_per_micron_is_that_of_the_reference_row(inputs, expected):
    found = float(flux_per_wavelength_w_cm2_um(inputs["F0_Jy"], inputs["lambda_um"]))
    assert found == pytest.approx(float(expected["from_Fnu_c/lam^2"]), rel=2e-5)  # printed to five digits
    # Isophotal wavelength and frequency are not the same place: 0.2 %, as the row says.
    assert found == pytest.approx(expected["F_lambda_W_cm2_um_published"], rel=2e-3)


def test_planck_function_and_units_agree_with_astropy():
    from astropy import units as u
    from astropy.modeling.models import BlackBody

    for t in (60.0, 300.0, 1000.0, 30_000.0):
        wavelength = np.array([1.235, 2.159, 3.45, 10.6, 100.0])
        theirs = BlackBody(t * u.K)(wavelength * u.um).to_value(u.Jy / u.sr)
        assert np.allclose(planck_jy_sr(wavelength, t), theirs, rtol=1e-12)
    theirs = (666.7 * u.Jy).to_value(u.W / u.cm**2 / u.um, u.spectral_density(2.159 * u.um))
    assert float(flux_per_wavelength_w_cm2_um(666.7, 2.159)) == pytest.approx(theirs, rel=1e-12)
    mass = 3.1 * u.Jy * (2400 * u.pc) ** 2 / (2700 * u.cm**2 / u.g) / (
        BlackBody(850 * u.K)(4.6 * u.um) * u.sr
    )  # fmt: skip
    ours = float(dust_mass_msun(3.1, 4.6, 2400.0, 850.0, 2700.0)) * SOLAR_MASS_KG
    assert ours == pytest.approx(mass.to_value(u.kg), rel=1e-9)
    # The nominal GM over G of CODATA 2018 against the kilograms of astropy: 2e-5 is the error of G.
    assert pytest.approx(u.Msun.to(u.kg), rel=5e-5) == SOLAR_MASS_KG


def test_the_slope_with_temperature_is_the_derivative_of_the_planck_function():
    h = 1e-6
    for wavelength, t in ((2.2, 900.0), (10.6, 400.0), (500.0, 1e5)):
        rise = math.log(float(planck_jy_sr(wavelength, t * (1 + h)) / planck_jy_sr(wavelength, t * (1 - h))))
        assert float(log_planck_slope(wavelength, t)) == pytest.approx(rise / (2 * h), rel=1e-6)


@pytest.mark.parametrize("t", [200.0, 900.0, 1500.0])
@pytest.mark.parametrize("name", ["zubko-0.1", "zubko-0.5", "preibisch-0.01"])
def test_the_light_of_dust_is_its_spectrum_integrated(name, t):
    # scipy.quad over ln nu of what each gram emits, 4 pi kappa B.
    table, mass = opacity_named(name), 3e-8

    def emitted(log_wavelength):
        wavelength = math.exp(log_wavelength)
        hertz = 299_792_458.0 / (wavelength * 1e-6)
        kappa = 0.1 * float(opacity_cm2_g(table, wavelength))
        return 4.0 * math.pi * kappa * float(planck_jy_sr(wavelength, t)) * 1e-26 * hertz

    nodes = [math.log(w) for w in table.wavelength_um]
    watts = quad(emitted, math.log(0.3), math.log(3000.0), points=nodes, limit=400)[0]
    expected = watts * mass * SOLAR_MASS_KG / 3.828e26
    assert float(dust_luminosity_lsun(mass, t, table)) == pytest.approx(expected, rel=1e-4)


def test_the_planck_mean_of_a_power_law_is_the_closed_form():
    # (k T lam0/hc)^s Gamma(4+s) zeta(4+s)/(Gamma(4) zeta(4)), checked against scipy.quad elsewhere.
    law = power_law_opacity(1000.0, 0.628, 1.0)
    mean = float(planck_mean_cm2_g(law, 1200.0))
    assert mean == pytest.approx(1000.0 * float(rows("dust.T_Quv1")[0][1]["QPlanck_1200K"]), rel=1e-4)


def test_a_black_disc_of_the_least_size_gives_the_flux_back():
    r = float(blackbody_radius_au(10.0, 11.5608, 2000.0, 600.0))
    solid = math.pi * (r / (2000.0 * PARSEC_AU)) ** 2
    assert solid * float(planck_jy_sr(11.5608, 600.0)) == pytest.approx(10.0, rel=1e-12)
    assert pytest.approx(206_264.806, rel=1e-8) == PARSEC_AU
    assert AU_KM == 149_597_870.7


@pytest.mark.parametrize(
    ("call", "code"),
    [
        (lambda: condensation_radius_au(3e5, 2600.0), "condensation-temperature-refused"),
        (lambda: condensation_radius_au(3e5, -1.0), "condensation-temperature-refused"),
        (lambda: condensation_radius_au(-3e5, 1200.0), "luminosity-refused"),
        (lambda: condensation_radius_au(3e5, 1200.0, 7.0), "emissivity-index-refused"),
        (lambda: radiation_pressure_ratio(3e5, 0.0, 5000.0), "mass-refused"),
        (lambda: planck_jy_sr(-2.0, 1000.0), "wavelength-refused"),
        (lambda: dust_mass_msun(1.0, 2.2, 2000.0, 0.0, 1000.0), "temperature-refused"),
        (lambda: power_law_opacity(-5.0, 10.0, 1.0), "opacity-refused"),
    ],
)
def test_what_cannot_be_is_refused(call, code):
    with pytest.raises(InputRefused) as refused:
        call()
    assert refused.value.code == code
    assert refused.value.hint
