"""The wind collision of a system, end to end: rows of checks_winds.csv (source and basis in each), errors
by the uncertainties library, Kepler's equation by scipy, and cases in which something is missing."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
import uncertainties
from scipy.optimize import brentq
from studies_examples import exact, find, moment, record, upcoming
from uncertainties import umath
from winds_examples import (
    NOW,
    STRONG,
    WEAK,
    binary,
    collide,
    exact_orbit,
    exact_star,
    orbit,
    pm,
    wind_rows,
)

from campaign.errors import Conflict, InputRefused, NotFound
from campaign.model.compositions import MIXES, mix_for
from campaign.model.measured import Covariance, Limit, Range
from campaign.model.systems import Star
from campaign.model.winds import WindOverrides
from campaign.reading.compositions import read_composition
from campaign.reading.instants import read_instant
from campaign.studies import winds as study
from campaign.studies.winds_draws import Propagation
from campaign.studies.winds_inputs import gather

RSUN_AU = 695_700.0 / 149_597_870.7


def cooling(result, star, law="constant"):
    (found,) = [each for each in result.cooling if (each.star, each.law) == (star, law)]
    return found


def dated(result, name):
    return [event for event in result.events if event.event == name]


# ------------------------------------------------------------------------------------------ reference rows


def test_the_reference_winds_from_the_catalogue():
    ((inputs, expected),) = wind_rows("cwb.momentum_ratio")
    a = exact_star(STRONG, mass_loss_msun_yr=inputs["Mdot_WR"], wind_speed_kms=inputs["v_WR_kms"])
    b = exact_star(WEAK, mass_loss_msun_yr=inputs["Mdot_O"], wind_speed_kms=inputs["v_O_kms"])
    result = collide(binary(exact_orbit(), a=a, b=b))
    assert result.momentum_ratio.value == pytest.approx(float(expected["eta"]), rel=1e-10)
    assert result.momentum_ratio.sigma == 0.0
    assert (result.stronger, result.roles_swapped, result.probability_roles_swapped) == ("A", False, 0.0)
    # The same two winds entered the other way round: the same collision, and it is said.
    turned = collide(binary(exact_orbit(), a=replace(b, star="A"), b=replace(a, star="B")))
    assert turned.momentum_ratio.value == pytest.approx(float(expected["eta"]), rel=1e-10)
    assert (turned.stronger, turned.weaker, turned.roles_swapped) == ("B", "A", True)
    (warning,) = [text for text in turned.warnings if "swapped" in text]
    assert f"{float(expected['inverse_if_swapped']):.4g}, above 1" in warning
    assert not any("swapped" in text for text in result.warnings)


def test_the_velocity_law_of_the_reference_row_through_the_whole_study():
    ((inputs, expected),) = wind_rows("cwb.chi_orbit_betalaw")
    a = exact_star(
        STRONG,
        mass_loss_msun_yr=inputs["Mdot"],
        wind_speed_kms=inputs["v_inf_kms"],
        radius_rsun=inputs["R_core_au"] / RSUN_AU,
    )
    one = binary(exact_orbit(a_au=exact(inputs["a_au"]), eccentricity=exact(inputs["e"])), a=a)
    result = collide(one, momentum_ratio_b_over_a=exact(inputs["eta"]), beta=exact(inputs["beta"]))
    law = cooling(result, "A", "beta")
    assert law.periastron.value == pytest.approx(float(expected["peri"]["chi"]), rel=1e-8)
    assert law.apastron.value == pytest.approx(float(expected["apo"]["chi"]), rel=1e-8)
    # The dated table says the same at periastron and half a period later.
    table = collide(
        one, momentum_ratio_b_over_a=exact(inputs["eta"]), start=60_500.0, end=62_300.0, step_d=1_800.0
    )
    near, far = table.rows
    assert near.speed_a_kms.value == pytest.approx(float(expected["peri"]["v_kms"]), rel=1e-8)
    assert far.speed_a_kms.value == pytest.approx(float(expected["apo"]["v_kms"]), rel=1e-8)
    assert far.chi_a_beta.value / near.chi_a_beta.value == pytest.approx(float(expected["ratio"]), rel=1e-8)
    assert far.chi_a.value / near.chi_a.value == pytest.approx(9.0, rel=1e-9)  # (1 + e)/(1 - e)


@pytest.mark.parametrize(("inputs", "expected"), wind_rows("cwb.separation_window"))
def test_cooling_crosses_1_where_the_separation_says(inputs, expected):
    """Winds made so that chi of A is 1 at the critical separation of the row: its window is the row's."""
    eta, speed = 0.04, 2_000.0
    distance_au = inputs["D_crit_au"] / (1.0 + math.sqrt(eta))
    loss = 1e-7 * 2.0**4 * distance_au * 14.959787070  # chi = 1; 1 au is 14.95978707e12 cm
    period = inputs["P_yr"] * 365.25
    one = binary(
        exact_orbit(a_au=exact(inputs["a_au"]), eccentricity=exact(inputs["e"]), period_d=exact(period)),
        a=exact_star(STRONG, mass_loss_msun_yr=loss, wind_speed_kms=speed),
    )
    result = collide(one, momentum_ratio_b_over_a=exact(eta), start=60_000.0, end=60_000.0 + period)
    found = cooling(result, "A")
    if expected.get("result") == "always":
        assert found.probability_always_below == 1.0 and found.half_window_d.value is None
        assert not dated(result, "chi of star A falls below 1")
        return
    days = float(expected["days_before_periastron"])
    assert found.half_window_d.value == pytest.approx(days, rel=1e-9)
    assert found.half_window_periods.value == pytest.approx(float(expected["phase_out"]), rel=1e-9)
    assert found.probability_crosses == 1.0
    (falls,), (rises,) = (dated(result, f"chi of star A {way}") for way in ("falls below 1", "rises above 1"))
    assert falls.bmjd_tdb.value == pytest.approx(60_500.0 - days, abs=1e-5)
    assert rises.bmjd_tdb.value == pytest.approx(60_500.0 + days, abs=1e-5)
    assert (falls.cycle, rises.cycle) == (0, 0)
    assert falls.utc.startswith("20") and falls.utc.endswith("Z")


@pytest.mark.parametrize(("inputs", "expected"), wind_rows("cwb.geometry")[3:9:2])
def test_every_published_form_stands_beside_the_thin_shell(inputs, expected):
    (eta,) = inputs.values()
    result = collide(binary(), momentum_ratio_b_over_a=exact(eta))
    columns = {
        "thin shell, mixed": "half_opening_CRW96_deg",
        "fit, radiative": "half_opening_EU93_deg",
        "radiative, not mixed": "half_opening_radiative_unmixed_deg",
        "adiabatic": "half_opening_adiabatic_2atan(eta^1/4)_deg",
        "fit, hydrodynamic": "half_opening_2atan(eta^1/3)_deg",
    }
    assert [form.name for form in result.forms] == list(columns)
    for form in result.forms:
        assert form.half_opening_deg.value == pytest.approx(float(expected[columns[form.name]]), rel=1e-9)
        assert form.source
    # Flare: about 20 degrees (Pittard & Dawson 2018, abstract).
    assert result.shock_opening_deg.value == pytest.approx(result.half_opening_deg.value + 20.0)


@pytest.mark.parametrize(("inputs", "expected"), wind_rows("cwb.crw_shape"))
def test_the_shape_passes_through_the_points_of_the_reference_rows(inputs, expected):
    points = collide(binary(), momentum_ratio_b_over_a=exact(inputs["eta"])).surface
    theta = inputs["theta_from_weaker_star_deg_measured_from_axis_to_stronger"]
    angles = [point.angle_deg for point in points]
    inverse = [1.0 / point.from_weaker_over_d.value for point in points]
    found = 1.0 / float(np.interp(theta, angles, inverse))
    # Linear between 41 points: half a per cent at most.
    assert found == pytest.approx(float(expected["R_from_weaker_over_D"]), rel=5e-3)
    for point in points:
        radius = math.hypot(point.along_over_d - 1.0, point.across_over_d)
        assert radius == pytest.approx(point.from_weaker_over_d.value)


def test_post_shock_gas_of_the_composition_that_the_spectral_type_suggests():
    ((inputs, expected),) = [
        pair for pair in wind_rows("cwb.mean_weight") if "O" in pair[0]["mass_fractions"]
    ]
    assert {k: v.value for k, v in MIXES["WC"].mass_fractions} == inputs["mass_fractions"]
    result = collide(binary())
    carbon, oxygen = result.winds
    assert carbon.mean_weight.value == pytest.approx(float(expected["mu"]), rel=1e-5)
    assert (carbon.composition.name, oxygen.composition.name) == ("WC", "solar")
    assert carbon.composition_origin == "spectral type"
    # T = 3 mu m v^2/(16 k) by hand with CODATA constants.
    by_hand = 3.0 * carbon.mean_weight.value * 1.67262192595e-27 * 2.4e6**2 / (16.0 * 1.380649e-23)
    assert carbon.postshock_temperature_k.value == pytest.approx(by_hand, rel=1e-9)
    assert carbon.postshock_energy_kev.value == pytest.approx(by_hand * 8.617333262e-8, rel=1e-9)


@pytest.mark.parametrize(
    ("spectral_type", "mix"),
    [("WC8", "WC"), ("WN5ha", "WNh"), ("WN4", "WN"), ("WO2", "WO"), ("O7 V", "solar"), ("B0.5Ia", "solar"),
     ("[WC9]", "WC"), ("WC7+O5", "WC"), ("WN7+h O", "WN")],
)  # fmt: skip
def test_the_mix_of_a_spectral_type(spectral_type, mix):
    assert mix_for(spectral_type) is MIXES[mix]


# -------------------------------------------------------------------------------------------------- errors


def test_errors_agree_with_linear_propagation_by_another_library():
    """Small errors, so that linear propagation (uncertainties library) holds."""
    number = uncertainties.ufloat
    a = replace(STRONG, mass_loss_msun_yr=pm(2e-5, 4e-7), wind_speed_kms=pm(2400.0, 30.0))
    b = replace(WEAK, mass_loss_msun_yr=pm(1e-6, 3e-8), wind_speed_kms=pm(2800.0, 40.0))
    one = binary(orbit(a_au=pm(15.0, 0.2), eccentricity=pm(0.7, 0.003)), a=a, b=b)
    result = collide(one, draws=20_000)
    m_a, v_a, m_b, v_b = number(2e-5, 4e-7), number(2400.0, 30.0), number(1e-6, 3e-8), number(2800.0, 40.0)
    size, e = number(15.0, 0.2), number(0.7, 0.003)
    eta = m_b * v_b / (m_a * v_a)
    share = 1.0 / (1.0 + umath.sqrt(eta))
    chi = (v_a / 1000.0) ** 4 * size * (1.0 - e) * share * 14.95978707 / (m_a / 1e-7)
    chi_b = (v_b / 1000.0) ** 4 * size * (1.0 + e) * (1.0 - share) * 14.95978707 / (m_b / 1e-7)
    pairs = [
        (eta, result.momentum_ratio),
        (share, result.stagnation_from_stronger_over_d),
        (1.0 - share, result.stagnation_from_weaker_over_d),
        (chi, cooling(result, "A").periastron),
        (chi_b, cooling(result, "B").apastron),
    ]
    for expected, found in pairs:
        assert found.value == pytest.approx(expected.nominal_value, rel=1e-9)
        # Second-order terms are below 2 % of the errors here.
        assert found.sigma == pytest.approx(expected.std_dev, rel=0.03)
        assert 0.5 * (found.hi68 - found.lo68) == pytest.approx(0.994458 * expected.std_dev, rel=0.04)
        assert found.lo95 < found.lo68 < found.median < found.hi68 < found.hi95
        (largest, size_of_it) = max(expected.error_components().items(), key=lambda item: item[1])
        word = {m_a: "mass loss of star A", v_a: "wind speed of star A", m_b: "mass loss of star B",
                v_b: "wind speed of star B", size: "semi-major axis", e: "eccentricity"}  # fmt: skip
        assert found.dominant == word[largest]
        assert found.dominant_share == pytest.approx((size_of_it / expected.std_dev) ** 2, abs=0.04)


def test_the_errors_of_a_date_are_in_its_line():
    """Far from periastron D moves as dD/dt times the error of the date: epoch and period in square."""
    one = binary(exact_orbit(period_d=pm(3_600.0, 4.0), epoch=moment(60_500.0, 5.0)),
                 a=exact_star(STRONG), b=exact_star(WEAK))  # fmt: skip
    at = 60_500.0 + 3 * 3_600.0 + 700.0
    (row,) = collide(one, start=at, end=at, draws=20_000).rows

    def separation(days):
        mean = 2.0 * math.pi * days / 3_600.0
        anomaly = brentq(lambda x: x - 0.7 * math.sin(x) - mean, -10.0, 10.0, xtol=1e-13)
        return 15.0 * (1.0 - 0.7 * math.cos(anomaly))

    slope = (separation(701.0) - separation(699.0)) / 2.0
    # 3 whole periods and 700/3600 of one have gone by: an error of the period moves the phase by that many.
    lag = math.hypot(5.0, 4.0 * (3.0 + 700.0 / 3_600.0))
    assert row.separation_au.value == pytest.approx(separation(700.0), rel=1e-9)
    assert row.separation_au.sigma == pytest.approx(slope * lag, rel=0.02)
    assert row.separation_au.dominant == "period"
    assert row.phase.value == pytest.approx(700.0 / 3_600.0)
    assert row.phase.sigma == pytest.approx(lag / 3_600.0, rel=0.02)
    assert row.cycle == 3


def test_asymmetric_errors_keep_the_stated_value_as_median():
    two_piece = replace(WEAK, mass_loss_msun_yr=replace(pm(1e-6, None), minus=1e-7, plus=4e-7))
    two_piece = replace(two_piece, wind_speed_kms=exact(2800.0))
    result = collide(binary(a=exact_star(STRONG), b=two_piece), draws=4_000)
    ratio = result.momentum_ratio
    assert ratio.median == pytest.approx(ratio.value, rel=0.01)
    assert (ratio.hi68 - ratio.median) / (ratio.median - ratio.lo68) == pytest.approx(4.0, rel=0.05)


def test_an_unknown_error_is_never_zero():
    a = replace(STRONG, wind_speed_kms=pm(2400.0, None))
    result = collide(binary(orbit(), a=a))
    ratio = result.momentum_ratio
    assert ratio.value is not None
    assert (ratio.median, ratio.sigma, ratio.lo68, ratio.hi95, ratio.dominant) == (None,) * 5
    assert ratio.unknown_errors == ("wind speed of star A",)
    assert result.probability_roles_swapped is None
    row = result.rows[0]
    # What does not rest on that speed has its error all the same.
    assert row.separation_au.sigma > 0.0 and row.sightline_deg.sigma > 0.0
    assert row.chi_a.lo68 is None and row.chi_a.value > 0.0
    assert row.probability_cavity is None and row.seen_through is not None
    assert cooling(result, "A").probability_crosses is None
    assert result.winds[1].postshock_temperature_k.sigma > 0.0


def test_the_chance_that_the_roles_are_the_other_way_round():
    # A momentum ratio of 0.9 +- 0.1 is above 1 with the probability of one sigma, 0.1587.
    result = collide(binary(), draws=4_000, momentum_ratio_b_over_a=pm(0.9, 0.1))
    assert result.probability_roles_swapped == pytest.approx(0.1587, abs=2e-3)
    assert any("other way round" in text for text in result.warnings)
    # Half-opening angles pass 90 degrees without a fold.
    assert result.half_opening_deg.hi95 > 90.0


def test_the_same_question_has_the_same_answer_and_another_seed_nearly_so():
    one = binary(orbit())
    assert collide(one) == collide(one)
    first, second = (collide(binary(), draws=2_000, seed=seed) for seed in (1, 2))
    assert first.momentum_ratio != second.momentum_ratio
    assert first.momentum_ratio.hi68 == pytest.approx(second.momentum_ratio.hi68, rel=0.03)


@pytest.mark.slow
def test_intervals_hold_the_truth_as_often_as_they_say():
    """4,000 invented pairs of winds, measured with errors of 10 % in mass loss and 5 % in speed: the
    true momentum ratio lies in the 68 % and 95 % intervals as often as that.

    Angle and stagnation point grow with the ratio, so their intervals hold as often.
    """
    rng = np.random.default_rng(20_311)
    cases = 4_000
    hits = {68: 0, 95: 0}
    for case in range(cases):
        truth = {
            "A": (10 ** rng.uniform(-5.2, -4.3), rng.uniform(1200.0, 3000.0)),
            "B": (10 ** rng.uniform(-7.0, -5.8), rng.uniform(1500.0, 3200.0)),
        }
        measured = {
            star: [
                pm(x + share * x * rng.standard_normal(), share * x)
                for x, share in zip(pair, (0.1, 0.05), strict=True)
            ]
            for star, pair in truth.items()
        }
        stars = [
            Star(s, mass_loss_msun_yr=loss, wind_speed_kms=speed) for s, (loss, speed) in measured.items()
        ]
        inputs = gather(binary(a=stars[0], b=stars[1]), None, WindOverrides())
        found = Propagation(inputs, 2_000, case).one(lambda d: d.eta, inputs.momentum_needs())
        weaker, stronger = truth[inputs.weaker], truth[inputs.stronger]
        eta = math.prod(weaker) / math.prod(stronger)
        hits[68] += found.lo68 <= eta <= found.hi68
        hits[95] += found.lo95 <= eta <= found.hi95
    for nominal, count in ((0.68, hits[68]), (0.95, hits[95])):
        z = (count / cases - nominal) / math.sqrt(nominal * (1.0 - nominal) / cases)
        assert abs(z) < 3.0, (nominal, count / cases)


# ------------------------------------------------------------------------------------------- line of sight


def brute_force(e, omega_weaker_deg, tilt_deg, opening_deg, points=1_001):
    """Phases, and whether the observer is inside the cone at each, with Kepler's equation solved by scipy."""
    phases = (np.arange(points) + 0.5) / points - 0.5
    anomalies = np.array(
        [brentq(lambda x, m=m: x - e * math.sin(x) - m, -10.0, 10.0) for m in 2.0 * np.pi * phases]
    )
    nu = 2.0 * np.arctan2(np.sqrt(1.0 + e) * np.sin(anomalies / 2), np.sqrt(1.0 - e) * np.cos(anomalies / 2))
    towards = -np.sin(nu + math.radians(omega_weaker_deg)) * math.sin(math.radians(tilt_deg))
    return phases, towards > math.cos(math.radians(opening_deg))


@pytest.mark.parametrize(("omega", "of"), [(40.0, "B"), (300.0, "B"), (110.0, "A")])
@pytest.mark.parametrize("ratio", [0.02, 0.3, 4.0])
def test_the_time_in_the_cavity_is_what_counting_gives(omega, of, ratio):
    one = binary(exact_orbit(omega_deg=exact(omega), omega_of=of))
    result = collide(one, momentum_ratio_b_over_a=exact(ratio))
    weaker = "A" if ratio > 1.0 else "B"
    assert result.weaker == weaker
    omega_weaker = omega if of == weaker else omega + 180.0
    cavity = result.sightline.cavity
    phases, inside = brute_force(0.7, omega_weaker, 62.0, cavity.opening_deg.value)
    assert cavity.share_of_orbit.value == pytest.approx(float(inside.mean()), abs=2.1e-3)
    if inside.any():
        start, end = cavity.from_phase.value, cavity.until_phase.value
        within = [any(start <= p + k <= end for k in (-1, 0, 1)) for p in phases]
        assert np.sum(np.array(within) != inside) <= 2  # a step of the count at either end
        assert cavity.probability_ever == 1.0
    rim_only = result.sightline.cavity_and_rim
    _, both = brute_force(0.7, omega_weaker, 62.0, rim_only.opening_deg.value)
    assert rim_only.share_of_orbit.value == pytest.approx(float(both.mean()), abs=2.1e-3)
    for row in result.rows:
        zone = (
            "cavity"
            if row.sightline_deg.value < cavity.opening_deg.value
            else ("rim" if row.sightline_deg.value < rim_only.opening_deg.value else "stronger wind")
        )
        assert row.seen_through == zone
        assert row.probability_cavity == (1.0 if zone == "cavity" else 0.0)


def test_we_look_into_the_cavity_around_the_conjunction_that_the_forecast_dates():
    one = binary(exact_orbit())
    result = collide(one, start=60_600.0, end=64_300.0, momentum_ratio_b_over_a=exact(0.1))
    front = find(upcoming(record(exact_orbit()), now=60_600.0, years=10), "B in front").bmjd_tdb.median
    entered = [e.bmjd_tdb.value for e in dated(result, "line of sight enters the cavity")]
    left = [e.bmjd_tdb.value for e in dated(result, "line of sight leaves the cavity")]
    assert any(a < front < b for a in entered for b in left if b - a < 3_600.0)
    assert result.sightline.least_angle_deg.value == pytest.approx(28.0)  # 90 deg minus i
    assert result.sightline.greatest_angle_deg.value == pytest.approx(152.0)


def test_face_on_the_line_of_sight_never_enters_a_narrow_cavity():
    result = collide(binary(exact_orbit(inclination_deg=exact(10.0))), momentum_ratio_b_over_a=exact(0.05))
    cavity = result.sightline.cavity
    assert (cavity.probability_ever, cavity.share_of_orbit.value, cavity.from_phase.value) == (0.0, 0.0, None)
    assert not dated(result, "line of sight enters the cavity")


def test_a_wide_cavity_is_never_left():
    result = collide(
        binary(exact_orbit(inclination_deg=exact(5.0))),
        momentum_ratio_b_over_a=exact(1.0),
        flare_deg=exact(30.0),
    )
    both = result.sightline.cavity_and_rim
    assert (both.probability_always, both.share_of_orbit.value) == (1.0, 1.0)
    assert not dated(result, "line of sight enters the rim")


def test_events_recur_with_the_period_and_count_their_cycles():
    result = collide(binary(exact_orbit()), start=60_000.0, end=60_000.0 + 3 * 3_600.0)
    entered = dated(result, "line of sight enters the cavity")
    times = [event.bmjd_tdb.value for event in entered]
    assert len(times) == 3
    assert np.diff(times) == pytest.approx([3_600.0, 3_600.0])
    assert np.diff([event.cycle for event in entered]).tolist() == [1, 1]
    for event in result.events:
        periastron = 60_500.0 + event.cycle * 3_600.0
        assert abs(event.bmjd_tdb.value - periastron) <= 1_800.0 + 1e-6
        assert event.phase == pytest.approx((event.bmjd_tdb.value - periastron) / 3_600.0, abs=1e-9)


def test_the_profile_has_periastron_in_its_middle():
    result = collide(binary(exact_orbit()))
    middle = result.profile[len(result.profile) // 2]
    assert middle.phase == 0.0
    assert middle.separation_au == pytest.approx(15.0 * 0.3)
    assert middle.chi_a == pytest.approx(cooling(result, "A").periastron.value)
    assert result.profile[0].chi_b == pytest.approx(cooling(result, "B").apastron.value)


def test_the_orbital_motion_turns_the_cone_near_its_apex():
    # Relative speed at periastron 2 pi a/P sqrt((1 + e)/(1 - e)) against the slower wind (kinematics).
    result = collide(binary(exact_orbit()))
    orbital = 2 * math.pi * 15.0 * 149_597_870.7 / (3_600.0 * 86_400.0) * math.sqrt(1.7 / 0.3)
    assert result.skew_periastron_deg == pytest.approx(math.degrees(math.atan(orbital / 2_400.0)), rel=1e-6)
    assert any("turns it" in text for text in result.assumptions)


# --------------------------------------------------------------------------------- what stands in, what lacks


@pytest.mark.parametrize(
    ("star", "field", "value"),
    [
        ("a", "mass_loss_msun_yr", pm(5e-6, 1e-6)),
        ("b", "mass_loss_msun_yr", pm(3e-6, 1e-6)),
        ("b", "wind_speed_kms", pm(1_700.0, 90.0)),
        ("a", "radius_rsun", pm(7.0, 1.0)),
    ],
)
def test_an_option_does_what_the_catalogue_would(star, field, value):
    """The result differs from that of a changed catalogue in nothing but where the value came from."""
    one = binary(orbit())
    stars = {"a": STRONG, "b": WEAK}
    stars[star] = replace(stars[star], **{field: value})
    kept = collide(binary(orbit(), **stars))
    said = collide(one, **{f"star_{star}": {field: value}})
    assert replace(said, inputs=()) == replace(kept, inputs=())
    origins = {each.name: each.origin for each in said.inputs}
    assert "option" in origins.values() and set(origins) == {each.name for each in kept.inputs}
    assert said != kept


@pytest.mark.parametrize(
    "change",
    [
        {"a_au": pm(9.0, 1.0)}, {"eccentricity": pm(0.3, 0.1)}, {"inclination_deg": pm(40.0, 5.0)},
        {"omega_deg": pm(200.0, 5.0), "omega_of": "A"}, {"period_d": pm(2_000.0, 3.0)},
    ],
    ids=lambda change: next(iter(change)),
)  # fmt: skip
def test_an_element_of_the_orbit_may_be_replaced(change):
    kept = collide(binary(replace(orbit(), **change)))
    said = collide(binary(orbit()), elements=change)
    assert replace(said, inputs=()) == replace(kept, inputs=())


def test_a_replaced_element_takes_its_correlation_with_it():
    names = ("period_d", "epoch", "eccentricity")
    matrix = ((16.0, -16.0, 0.0), (-16.0, 25.0, 0.0), (0.0, 0.0, 0.0004))
    one = replace(orbit(), covariance=Covariance(names, matrix))
    at = {"start": 75_000.0, "end": 75_000.0}
    tied = collide(binary(one), **at).rows[0].phase.sigma
    free = collide(binary(replace(one, covariance=None)), **at).rows[0].phase.sigma
    replaced = collide(binary(one), elements={"period_d": pm(3_600.0, 4.0)}, **at).rows[0].phase.sigma
    # Turns after the epoch: its variance, twice the covariance times the turns, and that of the period.
    turns = (75_000.0 - 60_500.0) / 3_600.0
    assert tied == pytest.approx(math.sqrt(25 - 32 * turns + 16 * turns**2) / 3_600.0, rel=0.05)
    assert free == pytest.approx(math.sqrt(25 + 16 * turns**2) / 3_600.0, rel=0.05)
    assert replaced == pytest.approx(free, rel=1e-9)


def test_an_epoch_of_periastron_may_be_replaced_and_keeps_the_count():
    result = collide(binary(orbit()), epoch=read_instant("BJD 2464100.5±3"))
    # 2464100.5 is MJD 64100.0: exactly one period after the epoch of the solution.
    first = result.rows[0]
    assert first.phase.value == pytest.approx((NOW - 60_500.0) / 3_600.0, abs=1e-6)
    assert first.cycle == 0


def test_fractions_with_errors_make_the_temperature_uncertain():
    mix = read_composition("He=0.55±0.15 C=0.35±0.15 O=0.10")
    sure = collide(binary(a=exact_star(STRONG)))
    unsure = collide(binary(a=exact_star(STRONG)), composition_a=mix)
    assert sure.winds[0].postshock_temperature_k.sigma == 0.0
    assert unsure.winds[0].mean_weight.sigma > 0.0
    assert unsure.winds[0].postshock_temperature_k.dominant in {
        "He in the wind of star A",
        "C in the wind of star A",
    }


def test_winds_without_an_orbit_are_told_as_far_as_they_go():
    result = collide(binary())
    assert result.solution is None
    assert result.momentum_ratio.sigma > 0.0 and result.half_opening_deg.sigma > 0.0
    assert result.surface and not (result.rows or result.events or result.cooling or result.profile)
    assert result.sightline is None
    assert any("campaign solution add" in text for text in result.assumptions)


def test_an_orbit_from_the_options_alone():
    elements = {"eccentricity": pm(0.5, 0.05), "a_au": pm(10.0, 1.0)}
    result = collide(binary(), elements=elements)
    assert result.solution == "options"
    assert cooling(result, "A").periastron.value > 0.0
    assert cooling(result, "A").half_window_d is None
    assert not result.rows and any("--period and --epoch" in text for text in result.assumptions)


@pytest.mark.parametrize(
    ("orbit_fields", "said"),
    [
        ({"eccentricity": None}, "no eccentricity"),
        ({"a_au": None}, "the size of the orbit is not known"),
        ({"inclination_deg": None}, "no line of sight"),
        ({"omega_deg": None, "omega_of": None}, "no line of sight"),
        ({"epoch": None}, "periastron cannot be dated"),
        ({"period_d": Limit(9_000.0, "above")}, "only a limit"),
        ({"epoch_marks": "onset"}, "periastron cannot be dated"),
    ],
)  # fmt: skip
def test_what_an_orbit_lacks_is_said_and_the_rest_is_told(orbit_fields, said):
    result = collide(binary(replace(orbit(), **orbit_fields)))
    assert any(said in text for text in result.assumptions), result.assumptions
    assert result.momentum_ratio.value > 0.0
    assert bool(result.rows) == (said not in {"periastron cannot be dated", "only a limit"})


def test_a_period_that_is_a_range_serves_with_its_width():
    one = binary(replace(orbit(), period_d=Range(3_500.0, 3_700.0)))
    assert collide(one).rows[-1].phase.sigma > 0.005


def test_the_size_may_come_from_masses_or_an_angle_and_is_said():
    heavy = {"mass_msun": pm(15.0, 2.0)}
    by_mass = binary(replace(orbit(), a_au=None), a=replace(STRONG, **heavy), b=replace(WEAK, **heavy))
    result = collide(by_mass)
    # Kepler's third law: a^3 = M P^2 in au, Msun, Julian years (to 1e-4 for the Gaussian year).
    expected = (30.0 * (3_600.0 / 365.25) ** 2) ** (1 / 3) * 0.3
    assert result.rows and cooling(result, "A").periastron.value > 0.0
    at = collide(by_mass, start=60_500.0, end=60_500.0).rows[0]
    assert at.separation_au.value == pytest.approx(expected, rel=1e-3)
    assert "semi-major axis from: masses" in result.assumptions
    by_angle = binary(replace(orbit(), a_au=None, a_arcsec=pm(0.0075, 1e-4)), distance_pc=pm(2_000.0, 100.0))
    assert "semi-major axis from: angle and distance" in collide(by_angle).assumptions
    moved = collide(by_angle, system={"distance_pc": pm(1_000.0, 50.0)}, start=60_500.0, end=60_500.0)
    assert moved.rows[0].separation_au.value == pytest.approx(7.5 * 0.3, rel=1e-6)


def test_an_option_that_changes_nothing_is_named():
    result = collide(binary(orbit()), system={"distance_pc": pm(2_000.0, 100.0)})
    assert any(text.startswith("--distance changes nothing") for text in result.assumptions)


def test_without_a_spectral_type_solar_gas_is_assumed_and_said():
    result = collide(binary(a=replace(STRONG, spectral_type=None)))
    assert result.winds[0].composition_origin == "assumed"
    assert any("no spectral type of star A" in text for text in result.assumptions)


@pytest.mark.parametrize("lacking", ["wind_speed_kms", "mass_loss_msun_yr"])
@pytest.mark.parametrize("star", ["a", "b"])
def test_a_wind_that_is_not_known_is_refused_with_what_to_type(lacking, star):
    stars = {"a": STRONG, "b": WEAK}
    stars[star] = replace(stars[star], **{lacking: None})
    with pytest.raises(Conflict) as refused:
        collide(binary(orbit(), **stars))
    option = {"wind_speed_kms": "--wind-speed", "mass_loss_msun_yr": "--mass-loss"}[lacking] + f"-{star}"
    assert refused.value.code == "wind-unknown"
    assert refused.value.details["options"] == [option]
    assert f'campaign system change "Lantern 3" {option} "' in refused.value.hint
    # The ratio alone gives the geometry; the cooling of that wind stays unknown, and it is said.
    result = collide(binary(orbit(), **stars), momentum_ratio_b_over_a=pm(0.1, 0.02))
    assert result.half_opening_deg.sigma > 0.0
    assert {each.star for each in result.cooling} == {"A", "B"} - {star.upper()}
    assert any(f"no cooling of the wind of star {star.upper()}" in text for text in result.assumptions)


def test_a_contact_point_inside_a_star_is_warned_of():
    swollen = replace(WEAK, radius_rsun=pm(400.0, 20.0))
    result = collide(binary(orbit(), b=swollen))
    assert any("balance inside star B in 100 % of the draws" in text for text in result.warnings)
    near = collide(binary(exact_orbit(), b=swollen), start=60_500.0, end=60_500.0).rows[0]
    assert near.chi_b_beta.value is None and near.chi_b_beta.probability < 1.0
    assert near.chi_b.value > 0.0


def test_a_zero_from_a_program_is_refused_as_from_the_terminal():
    with pytest.raises(InputRefused):
        collide(binary(a=replace(STRONG, mass_loss_msun_yr=pm(0.0, 1e-6))))
    with pytest.raises(InputRefused):
        collide(binary(), momentum_ratio_b_over_a=pm(-0.1, 0.01))


def test_spans_and_steps_that_cannot_be_are_refused():
    one = binary(orbit())
    for asked in ({"step_d": 0.0}, {"step_d": -3.0}, {"start": 62_000.0, "end": 61_000.0}, {"step_d": 0.5}):
        with pytest.raises(InputRefused):
            collide(one, **asked)
    with pytest.raises(NotFound):
        collide(one, solution="no such")


def test_a_long_table_is_drawn_more_thinly_and_says_so(monkeypatch):
    monkeypatch.setattr(study, "_TABLE_DRAWS", 20_000)
    monkeypatch.setattr(study, "_LEAST_DRAWS", 100)
    asked = {"momentum_ratio_b_over_a": exact(0.1), "draws": 200}
    one = binary(exact_orbit(a_au=None), a=Star("A"), b=Star("B"))
    assert not any("drawn" in text for text in collide(one, **asked, step_d=90.0).assumptions)
    result = collide(one, **asked, step_d=18.0)
    assert len(result.rows) == 201
    assert any("drawn 100 times instead of 200" in text for text in result.assumptions)


def test_one_of_several_adopted_solutions_is_named():
    two = (orbit(weight=0.5), orbit(id=2, label="other", weight=0.5))
    assert any("one of 2 adopted" in text for text in collide(binary(*two)).assumptions)


def test_dates_of_a_solution_that_marks_a_conjunction_are_the_same():
    plain = exact_orbit()
    # B in front at nu = 270 - 40 = -130 deg: phase by the orbit's textbook formulas.
    nu = math.radians(-130.0)
    anomaly = 2.0 * math.atan2(math.sqrt(0.3) * math.sin(nu / 2), math.sqrt(1.7) * math.cos(nu / 2))
    phase = (anomaly - 0.7 * math.sin(anomaly)) / (2.0 * math.pi)
    marked = replace(plain, epoch=moment(60_500.0 + 3_600.0 * phase, 0.0), epoch_marks="B in front")
    first, second = collide(binary(plain)), collide(binary(marked))
    for one, other in zip(first.rows, second.rows, strict=True):
        assert one.separation_au.value == pytest.approx(other.separation_au.value, rel=1e-7)


def test_values_are_finite_for_extreme_orbits_and_winds():
    for e, ratios in ((0.0, (1e-6,)), (0.99, (1.0, 1e5))):
        for ratio in ratios:
            one = binary(replace(orbit(), eccentricity=pm(e, 0.003)))
            result = collide(one, momentum_ratio_b_over_a=pm(ratio, 0.2 * ratio), draws=100, step_d=600.0)
            for row in result.rows:
                assert math.isfinite(row.separation_au.median) and row.chi_a.median > 0.0
                assert 0.0 <= row.sightline_deg.median <= 180.0
