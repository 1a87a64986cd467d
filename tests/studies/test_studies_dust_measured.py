"""Dust of known mass and temperature is found again from magnitudes, and what means nothing is said to.

Truth: stars, dust (Planck function of astropy), zero points wrong by their published errors, a distance wrong
by its error, an opacity wrong by 30 %, noise. The intervals must hold it as often as they say.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from dust_examples import AT_MJD, BANDS, Points, dust_jy, instant, photometry, system, told

from campaign.errors import InputRefused, NotFound
from campaign.model.dust import DustOpacity, DustOverrides, LevelGiven, ZeroPointGiven
from campaign.model.instants import Moment
from campaign.model.measured import Measured, Range
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.systems import Star
from campaign.physics.zeropoints import zero_point

LOG_OPACITY_ERROR = np.log(1.3)


def coverage(count, seed, log_mass, **made):
    """Shares of cases in which the 68 and 95 % intervals hold the truth, and in which the median is above."""
    rng = np.random.default_rng(seed)
    held = []
    for case in range(count):
        t, mass = rng.uniform(600.0, 1300.0), 10.0 ** rng.uniform(*log_mass)
        distance = rng.uniform(1500.0, 3000.0)
        light = photometry(
            rng, {AT_MJD: (mass, t)}, distance_pc=distance,
            opacity_factor=float(np.exp(LOG_OPACITY_ERROR * rng.normal())), **made,
        )  # fmt: skip
        far = Measured(distance * (1.0 + 0.08 * rng.normal()), 0.08 * distance, 0.08 * distance)
        dust = told(light, record=SystemRecord(system(distance_pc=far)), draws=400, seed=case).measured
        if dust.mass_msun is None:
            continue
        both = ((t, dust.temperature_k), (mass, dust.mass_msun))
        held.append(
            [x for truth, one in both for x in (one.lo68 <= truth <= one.hi68, one.lo95 <= truth <= one.hi95)]
            + [one.median > truth for truth, one in both]
        )
    assert len(held) > 0.95 * count
    return np.array(held, dtype=float)


def check(held):
    shares = np.array([0.68, 0.95, 0.68, 0.95, 0.5, 0.5])
    z = (held.mean(axis=0) - shares) / np.sqrt(shares * (1.0 - shares) / len(held))
    assert np.all(np.abs(z) < 3.0), (held.mean(axis=0), z)


CLASSES = {
    "much dust": {"log_mass": (-8.5, -7.0)},
    "stars that flicker": {"log_mass": (-8.5, -7.0), "flicker_mag": 0.03},
    "little dust": {"log_mass": (-9.2, -8.5)},
    "a faint limit in J": {"log_mass": (-8.5, -7.5), "deepest_mag": {"J": 6.9}},
}


@pytest.mark.parametrize("name", ["much dust"])
def test_known_dust_comes_back_from_magnitudes(name):
    check(coverage(60, 5, **CLASSES[name]))


@pytest.mark.slow
@pytest.mark.parametrize("name", CLASSES)
def test_known_dust_comes_back_from_magnitudes_in_six_hundred_cases(name):
    # 600 cases a class, 2400 in all: what a minute or so allows.
    check(coverage(600, 11, **CLASSES[name]))


@pytest.mark.slow
def test_one_band_with_a_given_temperature_holds_the_mass_as_often_as_it_says():
    # 600 cases: the temperature is wrong by its stated error, too.
    rng = np.random.default_rng(41)
    held = []
    for case in range(600):
        t, mass, distance = (
            rng.uniform(600.0, 1300.0),
            10.0 ** rng.uniform(-8.5, -7.0),
            rng.uniform(1500, 3000),
        )
        factor = float(np.exp(LOG_OPACITY_ERROR * rng.normal()))
        light = photometry(
            rng, {AT_MJD: (mass, t)}, distance_pc=distance, opacity_factor=factor, bands=only("W1")
        )
        far = Measured(distance * (1.0 + 0.08 * rng.normal()), 0.08 * distance, 0.08 * distance)
        given = {"temperature_k": Measured(t + 50.0 * rng.normal(), 50.0, 50.0)}
        dust = told(
            light,
            DustOverrides(inputs=given),
            record=SystemRecord(system(distance_pc=far)),
            draws=400,
            seed=case,
        ).measured.mass_msun
        if dust is not None:
            held.append([dust.lo68 <= mass <= dust.hi68, dust.lo95 <= mass <= dust.hi95, dust.median > mass])
    assert len(held) > 570
    shares = np.array([0.68, 0.95, 0.5])
    z = (np.mean(held, axis=0) - shares) / np.sqrt(shares * (1.0 - shares) / len(held))
    assert np.all(np.abs(z) < 3.0), np.mean(held, axis=0)


def test_without_noise_every_number_is_that_of_the_dust():
    dust = told(photometry(None, {AT_MJD: (2e-8, 900.0)})).measured
    assert dust.temperature_k.value == pytest.approx(900.0, rel=2e-3)
    assert dust.mass_msun.value == pytest.approx(2e-8, rel=0.01)
    assert dust.mass_g.value == pytest.approx(dust.mass_msun.value * 1.98841e33, rel=1e-4)  # CODATA, IAU
    for band in dust.bands:
        wavelength = zero_point(band.photometric_system, band.band).wavelength_um
        assert band.dust_jy == pytest.approx(dust_jy(2e-8, 900.0, 2100.0, wavelength), rel=1e-6)
    assert not dust.verdicts
    pair = {(p.first, p.second): p for p in dust.pairs}["Ks", "W1"]
    assert pair.temperature_k.value == pytest.approx(900.0, rel=1e-6)


def test_distance_opacity_and_fluxes_share_the_error_of_the_mass_as_by_hand():
    # ln M: twice the relative error of the distance, ln 1.3 of the opacity, and what the fluxes leave.
    light = photometry(None, {AT_MJD: (2e-8, 900.0)})
    far = Measured(2100.0, 420.0, 420.0)
    mass = told(light, record=SystemRecord(system(distance_pc=far)), draws=20_000).measured.mass_msun
    assert mass.dominant == "distance"
    exact = told(
        light,
        DustOverrides(opacity=DustOpacity(error=0.0)),
        record=SystemRecord(system(distance_pc=Measured(2100.0, 0.0, 0.0))),
        draws=20_000,
    ).measured.mass_msun
    assert exact.dominant == "the fluxes"
    fluxes = 0.5 * np.log(exact.hi68 / exact.lo68)
    # 0.9945 sigma on each side hold 68 %; the square of a distance known to 20 % is drawn by hand.
    z = np.random.default_rng(3).normal(size=(3, 200_000))
    by_hand = 2.0 * np.log1p(0.2 * z[0]) + LOG_OPACITY_ERROR * z[1] + fluxes / 0.9945 * z[2]
    low, high = np.quantile(by_hand[np.isfinite(by_hand)], [0.16, 0.84])
    assert np.log(mass.hi68 / mass.lo68) == pytest.approx(high - low, rel=0.04)


def test_an_unknown_distance_error_leaves_the_mass_without_intervals_and_says_which():
    light = photometry(None, {AT_MJD: (2e-8, 900.0)})
    mass = told(light, record=SystemRecord(system(distance_pc=Measured(2100.0)))).measured.mass_msun
    assert mass.value == pytest.approx(2e-8, rel=0.01)
    assert mass.lo68 is None
    assert mass.unknown_errors == ("distance",)


def test_without_a_distance_there_is_a_temperature_and_no_mass():
    result = told(photometry(None, {AT_MJD: (2e-8, 900.0)}), record=SystemRecord(system(distance_pc=None)))
    assert result.measured.temperature_k is not None
    assert result.measured.mass_msun is None
    assert result.measured.luminosity_lsun is None
    assert any("no distance" in note for note in result.assumptions)


def verdicts(result):
    return {verdict.code: verdict.meaningless for verdict in result.measured.verdicts}


def only(*names):
    return tuple(band for band in BANDS if band[0] in names)


def test_one_band_gives_no_mass_until_a_temperature_is_given():
    light = photometry(None, {AT_MJD: (2e-8, 900.0)}, bands=only("Ks"))
    alone = told(light)
    assert verdicts(alone)["one-band"]
    assert alone.measured.mass_msun is None
    assert alone.measured.luminosity_lsun is None
    given = told(light, DustOverrides(inputs={"temperature_k": Measured(900.0, 50.0, 50.0)}), draws=20_000)
    mass = given.measured.mass_msun
    assert given.measured.temperature_origin == "given"
    assert mass.value == pytest.approx(2e-8, rel=1e-3)
    # By hand: d ln M/d ln T = -x/(1 - e^-x), x = 14387.77/(2.159 x 900), so that 50 K are 41 %.
    x = 14_387.77 / (2.159 * 900.0)
    assert mass.dominant == "temperature of the dust"
    spread = 0.5 * np.log(mass.hi68 / mass.lo68)
    others = np.hypot(LOG_OPACITY_ERROR, 2.0 * 150.0 / 2100.0)
    assert spread == pytest.approx(0.9945 * np.hypot(x * 50.0 / 900.0, others), rel=0.05)


def test_a_range_of_temperatures_is_as_good_as_a_value():
    light = photometry(None, {AT_MJD: (2e-8, 900.0)}, bands=only("Ks"))
    result = told(light, DustOverrides(inputs={"temperature_k": Range(800.0, 1000.0)}))
    assert result.measured.mass_msun.lo95 < 2e-8 < result.measured.mass_msun.hi95


def test_stars_alone_are_called_star_dominated_and_bound_the_mass_at_a_given_temperature():
    light = photometry(None, {AT_MJD: (1e-13, 900.0)})
    result = told(light, DustOverrides(inputs={"temperature_k": Measured(900.0, 0.0, 0.0)}))
    assert verdicts(result) == {"star-dominated": True}
    assert result.measured.mass_msun is None
    limit = result.measured.mass_upper_msun
    # By hand for W1, which says most: three times the noise of that band in Msun, to the factor that five
    # bands together and an even prior make of it.
    w1 = next(band for band in result.measured.bands if band.band == "W1")
    alone = 3.0 * w1.sigma_jy / dust_jy(1.0, 900.0, 2100.0, w1.wavelength_um)
    assert 0.5 * alone < limit < 1.2 * alone


def test_a_saturated_band_is_a_bound_and_alone_it_is_nothing():
    points = Points([])
    for i in range(12):
        points.add(AT_MJD - 3000.0 + 60.0 * i, 6.2, 0.02, "Ks", "2MASS")
    points.add(AT_MJD, 4.0, 0.0, "Ks", "2MASS", -1)
    result = told(points.arrays())
    assert verdicts(result)["saturated"]
    assert result.measured.bands[0].use == "brighter than"
    assert result.measured.mass_msun is None


def test_a_saturated_band_pushes_the_temperature_up():
    light = photometry(None, {AT_MJD: (2e-8, 700.0)}, bands=only("W1", "W2"), error_mag=0.1)
    free = told(light).measured.temperature_k
    points = Points(list(zip(light.bmjd_tdb, light.mag, light.mag_plus, light.limit_side, light.band,
                             light.photometric_system, strict=True)))  # fmt: skip
    for i in range(12):
        points.add(AT_MJD - 3000.0 + 60.0 * i, 6.2, 0.02, "Ks", "2MASS")
    # Brighter than dust of 700 K would make it.
    star = 666.7 * 10.0 ** (-0.4 * 6.2)
    bound = star + 2.0 * dust_jy(2e-8, 700.0, 2100.0, 2.159)
    points.add(AT_MJD, float(-2.5 * np.log10(bound / 666.7)), 0.0, "Ks", "2MASS", -1)
    bounded = told(points.arrays()).measured.temperature_k
    assert bounded.median > free.median + 0.5 * free.sigma


def test_a_limit_that_the_dust_breaks_is_told():
    # Dust of 900 K saturates Ks; said to be of 500 K, what W1 shows of it would not.
    light = photometry(None, {AT_MJD: (2e-8, 900.0)}, bands=only("Ks", "W1"))
    rows = zip(light.bmjd_tdb, light.mag, light.mag_plus, light.limit_side, light.band,
               light.photometric_system, strict=True)  # fmt: skip
    points = Points([row for row in rows if row[4] == "W1" or row[0] < AT_MJD])
    star = 666.7 * 10.0 ** (-0.4 * 6.2)
    bound = star + 0.9 * dust_jy(2e-8, 900.0, 2100.0, 2.159)
    points.add(AT_MJD, float(-2.5 * np.log10(bound / 666.7)), 0.0, "Ks", "2MASS", -1)
    for t, crossed in ((500.0, True), (900.0, False)):
        result = told(points.arrays(), DustOverrides(inputs={"temperature_k": Measured(t, 0.0, 0.0)}))
        assert ("limit-crossed" in verdicts(result)) is crossed


def test_a_limit_that_pulls_two_bands_off_is_told():
    # Ks shows dust. H shows none, as of cool dust, which a limit in W1 forbids: it allows six tenths of what
    # dust of 900 K would give there. With H as dust of 900 K has it and twice its W1 allowed, all agrees.
    light = photometry(None, {AT_MJD: (2e-8, 900.0)}, bands=only("H", "Ks", "W1"))
    rows = list(zip(light.bmjd_tdb, light.mag, light.mag_plus, light.limit_side, light.band,
                    light.photometric_system, strict=True))  # fmt: skip
    hidden = (AT_MJD, 6.6, 0.03, 0, "H", "2MASS")
    shown = next(row for row in rows if row[0] >= AT_MJD and row[4] == "H")
    for h, depth, told_so in ((hidden, 0.6, True), (shown, 2.0, False)):
        points = Points([*(row for row in rows if row[0] < AT_MJD or row[4] == "Ks"), h])
        bound = 309.54 * 10.0 ** (-0.4 * 5.9) + depth * dust_jy(2e-8, 900.0, 2100.0, 3.3526)
        points.add(AT_MJD, float(-2.5 * np.log10(bound / 309.54)), 0.0, "W1", "WISE", 1)
        found = verdicts(told(points.arrays()))
        assert ("one-temperature-does-not-fit" in found) is told_so, found


def test_a_band_below_the_stars_is_no_dust_and_is_left_out():
    points = Points([])
    for band, star, dusty in (("J", 7.0, 7.5), ("Ks", 6.2, 5.0)):
        for i in range(12):
            points.add(AT_MJD - 3000.0 + 60.0 * i, star, 0.02, band, "2MASS")
        points.add(AT_MJD, dusty, 0.02, band, "2MASS")
    result = told(points.arrays())
    j = next(band for band in result.measured.bands if band.band == "J")
    assert j.dust_jy < 0.0
    assert not j.fitted
    assert "below the stars' level" in j.reason
    assert "band-negative" in verdicts(result)
    only_j = Points([row for row in points.rows if row[4] == "J"])
    assert verdicts(told(only_j.arrays()))["negative-excess"]


def test_too_much_light_for_its_temperature_is_called_opaque():
    # A black body of 600 K has to be as large as a sphere of grains of 600 K: shrink the stars' light until
    # the sphere is small.
    dim = {"luminosity_lsun": Measured(200.0, 20.0, 20.0)}
    result = told(photometry(None, {AT_MJD: (3e-7, 700.0)}), DustOverrides(inputs=dim))
    assert verdicts(result)["optically-thick"]
    assert verdicts(result)["more-light-than-the-stars"]
    assert result.measured.mass_msun is None
    assert result.measured.optical_depth > 1.0
    # The two sizes by hand: F = pi (R/D)^2 B, and grains in the light of 200 Lsun.
    assert result.measured.blackbody_radius_au > result.measured.grain_distance_au


def test_without_a_luminosity_thickness_is_not_known_and_that_is_said():
    dark = SystemRecord(system(star_a=Star("A"), star_b=Star("B")))
    result = told(photometry(None, {AT_MJD: (2e-8, 900.0)}), record=dark)
    assert verdicts(result) == {"thickness-unknown": False}
    assert result.measured.mass_msun is not None


def test_interstellar_extinction_is_taken_out_with_its_error():
    # By hand: 0.4 mag in K are 0.4 (2.2/lambda)^1.8 mag elsewhere, and a magnitude is a factor of 10^0.4.
    light = photometry(None, {AT_MJD: (2e-8, 900.0)})
    plain, clear = (
        told(light, DustOverrides(extinction_k_mag=veil)).measured for veil in (None, Measured(0.4, 0.1, 0.1))
    )
    for before, after in zip(plain.bands, clear.bands, strict=True):
        a = 0.4 * (2.2 / before.wavelength_um) ** 1.8
        assert after.dust_jy / before.dust_jy == pytest.approx(10.0 ** (0.4 * a), rel=1e-9)
        assert after.excess_sigma == before.excess_sigma
    assert clear.mass_msun.sigma / clear.mass_msun.value > plain.mass_msun.sigma / plain.mass_msun.value


def reddened(light, veil_mag):
    """The same behind an extinction in K, by Martin & Whittet 1990: (2.2 um/lambda)^1.8 of it (memory)."""
    waves = {band: zero_point(photometric, band).wavelength_um for band, photometric, _ in BANDS}
    share = np.array([(2.2 / waves[band]) ** 1.8 for band in light.band.tolist()])
    return replace(light, mag=light.mag + veil_mag * share)


def test_an_extinction_moves_all_bands_together_and_is_named():
    # By hand: what another extinction makes of the same magnitudes is its error, whatever the bands' own.
    light = reddened(photometry(None, {AT_MJD: (2e-8, 900.0)}, error_mag=0.003), 1.0)
    overrides = {"inputs": {"distance_pc": Measured(2100.0, 0.0, 0.0)}, "opacity": DustOpacity(error=0.0)}
    low, high, both = (
        told(light, DustOverrides(extinction_k_mag=veil, **overrides)).measured
        for veil in (Measured(0.8, 0.0, 0.0), Measured(1.2, 0.0, 0.0), Measured(1.0, 0.2, 0.2))
    )
    for name in ("temperature_k", "mass_msun", "luminosity_lsun"):
        ends, found = [getattr(each, name).value for each in (low, high)], getattr(both, name)
        alone = [getattr(each, name).sigma / getattr(each, name).value for each in (low, high)]
        whole = np.hypot(0.5 * np.log(max(ends) / min(ends)), np.mean(alone))
        assert 0.5 * np.log(found.hi68 / found.lo68) == pytest.approx(whole, rel=0.1)
    assert both.luminosity_lsun.dominant == "interstellar extinction in K"


@pytest.mark.slow
@pytest.mark.parametrize("given", [False, True])
def test_an_extinction_that_is_wrong_by_its_error_leaves_the_intervals_true(given):
    rng, held = np.random.default_rng(5), []
    for case in range(250):
        t, mass, veil = rng.uniform(700.0, 1200.0), 10.0 ** rng.uniform(-8.0, -7.0), rng.uniform(0.8, 1.2)
        light = reddened(photometry(rng, {AT_MJD: (mass, t)}), veil)
        overrides = DustOverrides(
            inputs={"distance_pc": Measured(2100.0, 0.0, 0.0)}
            | ({"temperature_k": Measured(t, 0.0, 0.0)} if given else {}),
            opacity=DustOpacity(error=0.0),
            extinction_k_mag=Measured(veil + 0.2 * rng.normal(), 0.2, 0.2),
        )
        dust = told(light, overrides, draws=400, seed=case).measured
        both = ((mass, dust.mass_msun), (mass, dust.mass_msun) if given else (t, dust.temperature_k))
        held.append(
            [x for truth, one in both for x in (one.lo68 <= truth <= one.hi68, one.lo95 <= truth <= one.hi95)]
            + [one.median > truth for truth, one in both]
        )
    check(np.array(held, dtype=float))


def test_two_temperatures_are_not_one():
    points = Points([])
    for band, photometric, star_mag in BANDS:
        zero = zero_point(photometric, band)
        star = zero.flux_jy * 10.0 ** (-0.4 * star_mag)
        both = sum(dust_jy(m, t, 2100.0, zero.wavelength_um) for m, t in ((3e-9, 1500.0), (6e-7, 450.0)))
        for i in range(12):
            points.add(AT_MJD - 3000.0 + 60.0 * i, star_mag, 0.01, band, photometric)
        points.add(AT_MJD, float(-2.5 * np.log10((star + both) / zero.flux_jy)), 0.01, band, photometric)
    assert verdicts(told(points.arrays())) == {"one-temperature-does-not-fit": False}


def test_a_source_without_quiet_points_has_no_level_and_is_left_out_until_one_is_given():
    points = Points([])
    points.add(AT_MJD, 4.6, 0.02, "Ks", "2MASS")
    points.add(AT_MJD, 3.6, 0.02, "W1", "WISE")
    result = told(points.arrays())
    assert verdicts(result) == {"nothing-usable": True}
    assert all("level is not known" in band.reason for band in result.measured.bands)
    levels = (LevelGiven("Ks", Measured(6.2, 0.02, 0.02)), LevelGiven("W1", Measured(5.9, 0.02, 0.02)))
    assert told(points.arrays(), DustOverrides(levels=levels)).measured.mass_msun is not None
    free = told(points.arrays(), DustOverrides(levels=(LevelGiven("Ks", None), LevelGiven("W1", None))))
    assert {band.star_jy for band in free.measured.bands} == {0.0}


def of_cold_mesa(light):
    return replace(light, photometric_system=np.full(light.mag.size, "Cold Mesa JHKLM"))


def test_bands_without_zero_points_are_refused_and_a_stand_in_is_told():
    light = of_cold_mesa(photometry(None, {AT_MJD: (2e-8, 900.0)}, bands=only("Ks")))
    with pytest.raises(NotFound) as refused:
        told(light)
    assert refused.value.code == "zero-point-not-found"
    assert "--zero-points" in refused.value.hint
    temperature = {"temperature_k": Measured(900.0, 0.0, 0.0)}
    stand_in = told(light, DustOverrides(inputs=temperature, zero_points_of={"*": "2MASS"}))
    assert stand_in.measured.mass_msun.value == pytest.approx(2e-8, rel=1e-3)
    assert any("stand in for 'Cold Mesa JHKLM'" in note for note in stand_in.assumptions)
    given = ZeroPointGiven("Ks", None, Measured(666.7, 12.6, 12.6), 2.159)
    own = told(light, DustOverrides(inputs=temperature, zero_points=(given,)))
    assert own.measured.mass_msun.value == pytest.approx(2e-8, rel=1e-3)


def test_a_stand_in_that_is_not_known_is_refused_with_those_that_are():
    light = of_cold_mesa(photometry(None, {AT_MJD: (2e-8, 900.0)}))
    with pytest.raises(NotFound) as refused:
        told(light, DustOverrides(zero_points_of={"*": "Jonson"}))
    assert "'Jonson'" in refused.value.message
    assert "2MASS" in refused.value.why


def test_a_stand_in_does_not_touch_what_is_known():
    light = photometry(None, {AT_MJD: (2e-8, 900.0)})
    result = told(light, DustOverrides(zero_points_of={"*": "MKO"}))
    assert {band.zero_points for band in result.measured.bands} == {"2MASS", "WISE"}


def test_a_date_without_photometry_is_refused_with_the_nearest_one():
    with pytest.raises(NotFound) as refused:
        told(photometry(None, {AT_MJD: (2e-8, 900.0)}), on=instant(AT_MJD + 40.0))
    assert refused.value.code == "no-photometry-near"
    assert refused.value.details["days_away"] == pytest.approx(40.0, abs=0.01)
    with pytest.raises(NotFound):
        told(None)


def flux_of(value_jy, error_jy, frequency_ghz, mjd=AT_MJD):
    return Observation(
        1, "u", 1, "flux", Moment(mjd, 0.0, 0.0), Measured(value_jy, error_jy, error_jy), "jy",
        frequency_ghz=frequency_ghz,
    )  # fmt: skip


def test_a_logged_flux_counts_where_the_stars_are_said_not_to_matter():
    ghz = 299_792.458 / 10.0
    flux = dust_jy(2e-8, 900.0, 2100.0, 10.0)
    light = photometry(None, {AT_MJD: (2e-8, 900.0)}, bands=only("Ks"))
    extra = (flux_of(flux, 0.05 * flux, ghz), flux_of(0.02, 0.001, 8.4))
    from dust_examples import NOW

    from campaign.studies.dust import DustQuestion, tell_dust
    from campaign.studies.watch import Campaign

    result = tell_dust(
        Campaign((SystemRecord(system()),), {1: light}),
        DustOverrides(levels=(LevelGiven("10 um", None),)),
        DustQuestion(NOW, on=instant(AT_MJD), draws=2000),
        extra,
    )
    assert [band.band for band in result.measured.bands] == ["Ks", "10 um"]
    assert result.measured.temperature_k.value == pytest.approx(900.0, rel=3e-3)


def test_another_opacity_is_told_beside_and_can_be_chosen():
    light = photometry(None, {AT_MJD: (2e-8, 900.0)})
    beside = {other.name: other for other in told(light).measured.other_opacities}
    chosen = told(light, DustOverrides(opacity=DustOpacity(table="preibisch-0.1"))).measured
    assert beside["preibisch-0.1"].mass_msun == pytest.approx(chosen.mass_msun.value, rel=1e-6)
    law = DustOpacity(kappa_cm2_g=Measured(1000.0, 0.0, 0.0), wavelength_um=10.0, index=1.2)
    result = told(light, DustOverrides(opacity=law))
    assert result.measured.mass_msun.dominant != "opacity"
    with pytest.raises(NotFound):
        told(light, DustOverrides(opacity=DustOpacity(table="graphite")))
    with pytest.raises(InputRefused):
        told(light, DustOverrides(opacity=DustOpacity(kappa_cm2_g=Measured(1000.0))))


def test_the_photometry_of_the_date_itself_never_makes_the_level():
    # Six points of the episode against five quiet ones: a level from all of them would hide the dust.
    points = Points([])
    for band, photometric, star_mag in only("Ks", "W1"):
        for i in range(5):
            points.add(AT_MJD - 3000.0 + 60.0 * i, star_mag, 0.02, band, photometric)
        for i in range(6):
            points.add(AT_MJD - 3.0 + i, star_mag - 1.5, 0.02, band, photometric)
    result = told(points.arrays())
    assert all(band.star_jy < 0.3 * band.observed_jy for band in result.measured.bands)


def test_an_episode_gives_masses_and_the_rates_between_them():
    dates = {AT_MJD: (1e-8, 900.0), AT_MJD + 100.0: (3e-8, 900.0), AT_MJD + 300.0: (2e-8, 700.0)}
    result = told(
        photometry(None, dates), start=instant(AT_MJD - 10.0), end=instant(AT_MJD + 400.0), draws=4000
    )
    masses = [epoch.mass_msun.value for epoch in result.through.epochs]
    assert masses == pytest.approx([1e-8, 3e-8, 2e-8], rel=0.01)
    rates = [rate.rate_msun_yr.value for rate in result.through.rates]
    # By hand: 2e-8 Msun in 100 d, -1e-8 Msun in 200 d.
    assert rates == pytest.approx([2e-8 / (100.0 / 365.25), -1e-8 / (200.0 / 365.25)], rel=0.03)


def test_no_rate_goes_past_a_date_without_dust():
    dates = {AT_MJD: (1e-8, 900.0), AT_MJD + 100.0: (1e-13, 900.0), AT_MJD + 200.0: (3e-8, 900.0)}
    through = told(
        photometry(None, dates), start=instant(AT_MJD - 10.0), end=instant(AT_MJD + 250.0)
    ).through  # fmt: skip
    assert [epoch.mass_msun is None for epoch in through.epochs] == [False, True, False]
    assert through.rates == ()


def test_a_source_that_saw_the_span_alone_makes_its_level_there_and_it_is_told():
    # Quiet years, half a year of dust and quiet years again, all inside the span that is asked about.
    dates = {AT_MJD + 40.0 * i: (2e-8, 900.0) for i in range(5)}
    light = photometry(None, dates, bands=only("Ks", "W1"))
    span = {"start": instant(AT_MJD - 4000.0), "end": instant(AT_MJD + 4000.0)}
    result = told(light, **span)
    masses = [epoch.mass_msun.value for epoch in result.through.epochs if epoch.mass_msun is not None]
    assert masses == pytest.approx([2e-8] * 5, rel=0.02)
    assert any("levels from points inside the span" in note for note in result.assumptions)
    narrow = told(light, start=instant(AT_MJD - 10.0), end=instant(AT_MJD + 200.0))
    assert not any("levels from points inside" in note for note in narrow.assumptions)


def test_a_temperature_that_only_the_range_bounds_is_none():
    # H and Ks alone with a tenth of a magnitude: dust of 100 K fits nearly as well, with any mass.
    light = photometry(
        np.random.default_rng(8), {AT_MJD: (3e-9, 800.0)}, bands=only("H", "Ks"), error_mag=0.1
    )
    result = told(light)
    assert result.measured.mass_msun is None
    assert set(verdicts(result)) <= {"one-band", "temperature-unbounded", "star-dominated"}


def test_rates_share_distance_and_opacity_and_their_common_errors_cancel():
    # The same dust at two dates: distance and opacity scale nothing, so that only the fluxes are left.
    dates = {AT_MJD: (2e-8, 900.0), AT_MJD + 100.0: (2e-8, 900.0)}
    span = {"start": instant(AT_MJD - 10.0), "end": instant(AT_MJD + 200.0)}
    rate = told(photometry(None, dates), **span).through.rates[0].rate_msun_yr
    assert rate.dominant == "the fluxes"
    assert abs(rate.median) < 0.2 * rate.sigma
    loose = SystemRecord(system(distance_pc=Measured(2100.0, 600.0, 600.0)))
    wide = told(photometry(None, dates), record=loose, **span).through.rates[0].rate_msun_yr
    assert wide.sigma < 1.5 * rate.sigma


@pytest.mark.slow
def test_rates_are_as_sure_as_they_say():
    # 400 cases: truth with two masses, zero points wrong alike at both dates.
    rng = np.random.default_rng(77)
    held = []
    for case in range(400):
        t, mass = rng.uniform(700.0, 1200.0), 10.0 ** rng.uniform(-8.3, -7.3)
        second = mass * rng.uniform(0.5, 2.0)
        distance = rng.uniform(1500.0, 3000.0)
        factor = float(np.exp(LOG_OPACITY_ERROR * rng.normal()))
        light = photometry(
            rng, {AT_MJD: (mass, t), AT_MJD + 100.0: (second, t)}, distance_pc=distance, opacity_factor=factor
        )
        far = Measured(distance * (1.0 + 0.08 * rng.normal()), 0.08 * distance, 0.08 * distance)
        rates = told(
            light, record=SystemRecord(system(distance_pc=far)), start=instant(AT_MJD - 10.0),
            end=instant(AT_MJD + 150.0), draws=400, seed=case,
        ).through.rates  # fmt: skip
        if not rates:
            continue
        rate, truth = rates[0].rate_msun_yr, (second - mass) / (100.0 / 365.25)
        held.append([rate.lo68 <= truth <= rate.hi68, rate.lo95 <= truth <= rate.hi95, rate.median > truth])
    assert len(held) > 380
    shares = np.array([0.68, 0.95, 0.5])
    z = (np.mean(held, axis=0) - shares) / np.sqrt(shares * (1.0 - shares) / len(held))
    assert np.all(np.abs(z) < 3.0), np.mean(held, axis=0)


def test_a_given_temperature_carries_a_whole_episode_in_one_band():
    dates = {AT_MJD: (1e-8, 900.0), AT_MJD + 100.0: (3e-8, 900.0)}
    result = told(
        photometry(None, dates, bands=only("Ks")),
        DustOverrides(inputs={"temperature_k": Measured(900.0, 30.0, 30.0)}),
        start=instant(AT_MJD - 10.0), end=instant(AT_MJD + 150.0),
    )  # fmt: skip
    assert [e.mass_msun.value for e in result.through.epochs] == pytest.approx([1e-8, 3e-8], rel=0.01)
    assert result.through.rates[0].rate_msun_yr.value == pytest.approx(2e-8 / (100.0 / 365.25), rel=0.02)


@pytest.mark.parametrize(
    ("question", "code"),
    [
        ({"start": instant(AT_MJD)}, "span-refused"),
        ({"start": instant(AT_MJD), "end": instant(AT_MJD - 5.0)}, "span-refused"),
        ({"cycle": 3}, "episode-not-found"),
        ({"start": instant(AT_MJD + 50.0), "end": instant(AT_MJD + 60.0)}, "no-photometry-near"),
    ],
)
def test_a_span_that_cannot_be_is_refused(question, code):
    with pytest.raises((InputRefused, NotFound)) as refused:
        told(photometry(None, {AT_MJD: (2e-8, 900.0)}), **question)
    assert refused.value.code == code
