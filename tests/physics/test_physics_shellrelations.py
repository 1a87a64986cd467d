"""Spacing, motion, speed, period, distance: rows of checks_shells.csv and published_shells.csv (source in
each), first-order errors by the uncertainties package, distributions by drawing anew with scipy."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats
from shell_reference import checks, numbers, published, with_error
from uncertainties import correlated_values, ufloat

from campaign.errors import InputRefused
from campaign.physics.constants import AU_KM, KMS_PER_AU_YR
from campaign.physics.shellrelations import ShellInput, solve_shell_relations, what_would_do
from campaign.physics.shellunits import motion_mas_yr


def stated(quantity, value, error, label="given"):
    return ShellInput(quantity, value, error, error, label)


def derived(solution, quantity):
    found = solution.get(quantity)
    assert found is not None and found.origin == "derived"
    return found.spread


# --- reference rows ------------------------------------------------------------------------------------


def test_one_au_a_julian_year_in_kms():
    ((_, expected),) = checks("shell.constant")
    assert pytest.approx(float(expected["kms_per_au_per_julian_yr"]), rel=1e-12) == KMS_PER_AU_YR
    one = float(motion_mas_yr(1.0, 1000.0))
    assert one == pytest.approx(float(expected["mas_per_yr_of_1kms_at_1kpc"]), rel=1e-9)


@pytest.mark.parametrize(("inputs", "expected"), checks("shell.spacing"))
def test_spacing_from_speed_period_and_distance(inputs, expected):
    solution = solve_shell_relations(
        [
            stated("speed_kms", inputs["v_kms"], 0.0),
            stated("period_yr", inputs["P_julian_yr"], 0.0),
            stated("distance_pc", inputs["D_pc"], 0.0),
        ]
    )
    spacing = derived(solution, "spacing_arcsec").value
    motion = derived(solution, "proper_motion_mas_yr").value
    assert spacing == pytest.approx(float(expected["spacing_arcsec"]), rel=1e-10)
    assert motion / 1000.0 == pytest.approx(float(expected["mu_arcsec_yr"]), rel=1e-10)
    # 1 arcsec at 1 pc is 1 au, by definition of the parsec.
    assert spacing * inputs["D_pc"] == pytest.approx(float(expected["spacing_au"]), rel=1e-10)
    back = solve_shell_relations(
        [
            stated("speed_kms", inputs["v_kms"], 0.0),
            stated("period_yr", inputs["P_julian_yr"], 0.0),
            stated("spacing_arcsec", spacing, 0.0),
        ]
    )
    assert derived(back, "distance_pc").value == pytest.approx(
        float(expected["D_from_spacing_pc"]), rel=1e-10
    )


ERROR_ROWS = {
    "shell.spacing_error": (
        {"speed_kms": "v_kms", "period_yr": "P_yr", "distance_pc": "D_pc"},
        ("spacing_arcsec", "spacing_arcsec", "sigma", 1.0),
    ),
    "shell.expansion_parallax_error": (
        {"speed_kms": "v_kms", "proper_motion_mas_yr": "mu_arcsec_yr"},
        ("distance_pc", "D_pc", "sigma_pc", 1.0),
    ),
    "shell.period_from_spacing": (
        {"spacing_arcsec": "spacing_arcsec", "distance_pc": "D_pc", "speed_kms": "v_kms"},
        ("period_yr", "P_yr", "sigma_yr", 1.0),
    ),
    "shell.period_distance_free": (
        {"spacing_arcsec": "spacing_arcsec", "proper_motion_mas_yr": "mu_arcsec_yr"},
        ("period_yr", "P_yr", "sigma_yr", 1.0),
    ),
}


@pytest.mark.parametrize("topic", ERROR_ROWS)
def test_the_error_of_what_is_derived_from_independent_values(topic):
    ((inputs, expected),) = checks(topic)
    names, (quantity, key, sigma_key, scale) = ERROR_ROWS[topic]
    given_values = []
    for name, column in names.items():
        factor = 1000.0 if column == "mu_arcsec_yr" else 1.0
        value, error = with_error(inputs[column])
        given_values.append(stated(name, value * factor, error * factor))
    found = derived(solve_shell_relations(given_values), quantity)
    assert found.value == pytest.approx(float(expected[key]) * scale, rel=1e-8)
    assert found.sigma == pytest.approx(float(expected[sigma_key]) * scale, rel=1e-8)


# --- published -----------------------------------------------------------------------------------------


def test_arcs_of_irc_10216_are_as_old_as_published():
    """S1: spacings and radius published; speed 14.5 km/s and distance 150 pc from memory."""
    row = published("S1")
    first, second, radius, speed, distance = numbers(row["inputs"])
    for angle, years in zip((first, second, radius), numbers(row["published"]), strict=True):
        solution = solve_shell_relations(
            [
                stated("spacing_arcsec", angle, 0),
                stated("speed_kms", speed, 0),
                stated("distance_pc", distance, 0),
            ]
        )
        assert derived(solution, "period_yr").value == pytest.approx(years, rel=0.03)


def test_the_shell_of_u_cam_is_as_old_as_published():
    """S2: all inputs published; lengths in cm, so the distance has no part in it."""
    row = published("S2")
    *lengths_cm, speed = numbers(row["inputs"])
    for length_cm, years in zip(lengths_cm, numbers(row["published"]), strict=True):
        solution = solve_shell_relations(
            [
                stated("spacing_arcsec", length_cm * 1e-5 / AU_KM / 500.0, 0.0),
                stated("speed_kms", speed, 0.0),
                stated("distance_pc", 500.0, 0.0),
            ]
        )
        assert derived(solution, "period_yr").value == pytest.approx(years, rel=0.15)


def test_one_turn_of_the_spiral_of_wr_147():
    """S3: all inputs published (read second-hand)."""
    row = published("S3")
    speed, period = numbers(row["inputs"])
    (turn_au,) = numbers(row["published"])
    for distance in (600.0, 1800.0):
        solution = solve_shell_relations(
            [
                stated("speed_kms", speed, 0.0),
                stated("period_yr", period, 0.0),
                stated("distance_pc", distance, 0.0),
            ]
        )
        turn = derived(solution, "spacing_arcsec").value * distance
        assert turn == pytest.approx(turn_au, rel=0.02)


def test_wr_112_tells_one_story():
    """S4: inputs published, motion and spacing derived from them; four turns are about 80 years old."""
    row = published("S4")
    speed, speed_error, distance, plus, minus, period = numbers(row["inputs"])
    solution = solve_shell_relations(
        [
            stated("speed_kms", speed, speed_error),
            ShellInput("distance_pc", distance * 1000, minus * 1000, plus * 1000),
            stated("period_yr", period, 0.0),
        ],
        {("speed_kms", "distance_pc"): 0.99},
    )
    ((_, expected),) = checks("shell.wr112_consistency")
    motion, spacing = derived(solution, "proper_motion_mas_yr"), derived(solution, "spacing_arcsec")
    assert motion.value == pytest.approx(float(expected["implied_mu_mas_yr"]), abs=0.05)
    assert spacing.value == pytest.approx(float(expected["implied_spacing_arcsec_per_turn"]), abs=0.0005)
    age = derived(
        solve_shell_relations(
            [stated("spacing_arcsec", 4 * spacing.value, 0), stated("proper_motion_mas_yr", motion.value, 0)]
        ),
        "period_yr",
    )
    assert age.value == pytest.approx(80.0, rel=0.05)


def test_wr_112_has_a_period_without_a_distance_and_a_motion_known_better_than_either():
    """Speed and distance there come from one study: their errors nearly cancel in the motion (S4)."""
    pair = [stated("speed_kms", 1230.0, 260.0), ShellInput("distance_pc", 3390.0, 840.0, 890.0)]
    apart = derived(solve_shell_relations(pair), "proper_motion_mas_yr")
    together = derived(
        solve_shell_relations(pair, {("speed_kms", "distance_pc"): 0.99}), "proper_motion_mas_yr"
    )
    assert together.value == pytest.approx(76.5, rel=0.01)
    assert together.sigma < apart.sigma / 5.0
    assert together.hi68 - together.lo68 < (apart.hi68 - apart.lo68) / 4.0
    free = solve_shell_relations(
        [stated("spacing_arcsec", 1.53, 0.02), stated("proper_motion_mas_yr", 76.5, 1.0)]
    )
    assert derived(free, "period_yr").value == pytest.approx(20.0, rel=0.001)
    assert free.get("distance_pc") is None


def test_the_shell_of_r_scl_is_as_old_as_published():
    """S5: age and radius published; speed 14.3 km/s and distance 370 pc from memory."""
    row = published("S5")
    radius, speed, distance = numbers(row["inputs"])
    (years,) = numbers(row["published"])
    solution = solve_shell_relations(
        [
            stated("spacing_arcsec", radius, 0),
            stated("speed_kms", speed, 0),
            stated("distance_pc", distance, 0),
        ]
    )
    assert derived(solution, "period_yr").value == pytest.approx(years, rel=0.05)


# --- errors, against other tools -----------------------------------------------------------------------


@given(rho=st.floats(-0.99, 0.99), v=st.floats(800, 3000), d=st.floats(500, 8000), s=st.floats(0.1, 10))
@settings(max_examples=40, deadline=None)
def test_correlated_errors_agree_with_the_uncertainties_package(rho, v, d, s):
    errors = [0.11 * v, 0.07 * d, 0.02 * s]
    covariance = np.diag(np.square(errors))
    covariance[0, 1] = covariance[1, 0] = rho * errors[0] * errors[1]
    speed, distance, spacing = correlated_values([v, d, s], covariance)
    solution = solve_shell_relations(
        [
            stated("speed_kms", v, errors[0]),
            stated("distance_pc", d, errors[1]),
            stated("spacing_arcsec", s, errors[2]),
        ],
        {("speed_kms", "distance_pc"): rho},
        draws=100,
    )
    period = spacing * distance * KMS_PER_AU_YR / speed
    found = derived(solution, "period_yr")
    assert found.value == pytest.approx(period.nominal_value, rel=1e-12)
    assert found.sigma == pytest.approx(period.std_dev, rel=1e-9)


def test_bounds_of_a_poorly_known_ratio_are_those_of_its_distribution():
    """Against 2 million draws of numpy: errors of 21 % and 16 % make the distance plainly asymmetric."""
    solution = solve_shell_relations(
        [stated("speed_kms", 1230.0, 260.0), stated("proper_motion_mas_yr", 76.5, 12.0)], draws=200_000
    )
    found = derived(solution, "distance_pc")
    rng = np.random.default_rng(4)
    # Both lie more than 4 sigma above zero: the part below matters to none of these quantiles.
    speed, motion = rng.normal(1230, 260, 2_000_000), rng.normal(76.5, 12, 2_000_000)
    expected = np.quantile(speed / (KMS_PER_AU_YR * motion / 1000.0), [0.16, 0.84, 0.025, 0.975])
    # 1 % of sigma is the accuracy promised of the draws; 4 of the two samples' own errors.
    assert np.abs(np.array(found[2:]) - expected).max() < 0.02 * found.sigma


def test_asymmetric_errors_keep_half_of_the_probability_on_each_side():
    solution = solve_shell_relations(
        [stated("proper_motion_mas_yr", 80.0, 0.0), ShellInput("period_yr", 20.0, 0.5, 2.0)]
    )
    found = derived(solution, "spacing_arcsec")
    z = 0.994457883209753  # Abramowitz & Stegun 1964, table 26.5: 84 % quantile
    assert found.lo68 == pytest.approx(1.6 - 0.04 * z, abs=2e-4)
    assert found.hi68 == pytest.approx(1.6 + 0.16 * z, abs=8e-4)


def test_two_ways_to_a_period_are_combined_with_the_weights_of_least_squares():
    """Against scipy's minimum of the weighted squares in logarithms."""
    solution = solve_shell_relations(
        [
            stated("spacing_arcsec", 1.2, 0.05),
            stated("proper_motion_mas_yr", 60.0, 3.0),
            stated("speed_kms", 1800.0, 100.0),
            stated("distance_pc", 6000.0, 400.0),
        ]
    )
    from scipy.optimize import minimize

    values, errors = np.array([1.2, 60.0, 1800.0, 6000.0]), np.array([0.05, 3.0, 100.0, 400.0])

    def badness(x):  # ln s, ln mu, ln D; the speed follows
        logs = np.array([x[0], x[1], np.log(KMS_PER_AU_YR / 1000) + x[1] + x[2], x[2]])
        return np.sum(((logs - np.log(values)) / (errors / values)) ** 2)

    best = minimize(badness, [0.2, 4.0, 8.7], method="Nelder-Mead", options={"xatol": 1e-10, "fatol": 1e-13})
    expected = math.exp(best.x[0] - best.x[1] + math.log(1000))
    assert derived(solution, "period_yr").value == pytest.approx(expected, rel=1e-6)


def test_an_unknown_error_is_never_zero():
    solution = solve_shell_relations(
        [stated("spacing_arcsec", 1.2, 0.05), ShellInput("proper_motion_mas_yr", 60.0)]
    )
    period = derived(solution, "period_yr")
    assert period.value == pytest.approx(20.0)
    assert all(math.isnan(x) for x in period[1:])


# --- tensions ------------------------------------------------------------------------------------------


def test_an_inconsistent_triple_is_a_tension_and_keeps_what_was_stated():
    solution = solve_shell_relations(
        [
            stated("spacing_arcsec", 1.2, 0.03),
            stated("proper_motion_mas_yr", 60.0, 1.0),
            stated("period_yr", 10.0, 0.2, "orbit"),
        ]
    )
    (tension,) = solution.tensions
    s, mu = ufloat(1.2, 0.03), ufloat(0.060, 0.001)
    difference = s / mu - ufloat(10.0, 0.2)
    assert tension.quantity == "period_yr"
    assert tension.sigma == pytest.approx(difference.nominal_value / difference.std_dev, rel=1e-9)
    assert solution.get("period_yr").origin == "given"
    assert solution.get("period_yr").spread.value == 10.0


@pytest.mark.parametrize(
    ("against", "expected"),
    [
        # By hand: (3390 - 2550)/840, the error below; (3390 - 4280)/890, the error above.
        (ShellInput("distance_pc", 2550.0, 5.0, 0.0, "other"), 1.0),
        (ShellInput("distance_pc", 4280.0, 0.0, 5.0, "other"), -1.0),
        (ShellInput("distance_pc", 2550.0, None, None, "other"), None),
    ],
)
def test_only_errors_that_face_each_other_make_a_tension(against, expected):
    solution = solve_shell_relations([ShellInput("distance_pc", 3390.0, 840.0, 890.0), against], draws=10)
    (tension,) = solution.tensions
    assert tension.sigma == (None if expected is None else pytest.approx(expected))


def test_two_exact_values_agree_or_have_no_scale_of_disagreement():
    for other, expected in ((10.0, 0.0), (11.0, None)):
        pair = [stated("period_yr", 10.0, 0.0), stated("period_yr", other, 0.0, "other")]
        (tension,) = solve_shell_relations(pair, draws=10).tensions
        assert tension.sigma == expected


def test_what_two_ways_share_is_counted_once():
    """Both ways to the speed use the distance; uncertainties keeps track of it by itself."""
    s, mu, d, p = ufloat(1.2, 0.03), ufloat(0.066, 0.002), ufloat(2100.0, 300.0), ufloat(20.0, 0.3)
    solution = solve_shell_relations(
        [
            stated("spacing_arcsec", 1.2, 0.03),
            stated("proper_motion_mas_yr", 66.0, 2.0),
            stated("distance_pc", 2100.0, 300.0),
            stated("period_yr", 20.0, 0.3),
        ]
    )
    difference = KMS_PER_AU_YR * d * mu - KMS_PER_AU_YR * d * s / p
    (speeds,) = [t for t in solution.tensions if t.quantity == "speed_kms"]
    expected = difference.nominal_value / difference.std_dev
    assert abs(speeds.sigma) == pytest.approx(abs(expected), rel=1e-9)
    assert speeds.shared == ("distance_pc:given",)


def test_correlated_speed_and_distance_do_not_hide_a_tension():
    """With one common error the motion is known well, and a wrong period shows."""
    pair = [
        stated("speed_kms", 1230.0, 260.0),
        ShellInput("distance_pc", 3390.0, 840.0, 890.0),
        stated("spacing_arcsec", 1.53, 0.02),
        stated("period_yr", 30.0, 0.5, "orbit"),
    ]

    def period_tension(correlation):
        solution = solve_shell_relations(pair, {("speed_kms", "distance_pc"): correlation})
        (found,) = [t for t in solution.tensions if t.quantity == "period_yr"]
        return found.sigma

    assert -2.5 < period_tension(0.0) < -1.0
    assert period_tension(0.99) < -6.0


def test_a_terminal_wind_speed_is_compared_and_never_used():
    solution = solve_shell_relations(
        [
            stated("proper_motion_mas_yr", 80.0, 4.0),
            ShellInput("speed_kms", 2500.0, 200.0, 200.0, "wind", compare_only=True),
            stated("distance_pc", 2100.0, 100.0),
        ]
    )
    speed = derived(solution, "speed_kms")
    assert speed.value == pytest.approx(KMS_PER_AU_YR * 0.08 * 2100.0)
    (tension,) = [t for t in solution.tensions if t.quantity == "speed_kms"]
    assert tension.against == ("speed_kms:wind",)
    assert tension.sigma < -6.0


def test_tensions_of_true_values_are_standard_normal():
    """4,000 invented triples with 3 % errors: shares beyond 1 and 2 sigma; |z| < 3."""
    rng = np.random.default_rng(20261201)
    pulls = []
    for _ in range(4_000):
        p, mu = rng.uniform(5, 40), rng.uniform(20, 200)
        truth = np.array([p * mu / 1000, mu, p])
        measured = truth * (1 + 0.03 * rng.standard_normal(3))
        solution = solve_shell_relations(
            [
                stated(name, value, 0.03 * true)
                for name, value, true in zip(
                    ("spacing_arcsec", "proper_motion_mas_yr", "period_yr"), measured, truth, strict=True
                )
            ],
            draws=10,
        )
        pulls.append(solution.tensions[0].sigma)
    for bound in (1.0, 2.0):
        share = 2 * stats.norm.sf(bound)
        beyond = np.sum(np.abs(pulls) > bound)
        assert abs(beyond - 4000 * share) < 3 * math.sqrt(4000 * share * (1 - share))


# --- what is missing, what is refused ------------------------------------------------------------------


def test_an_insufficient_set_says_what_else_would_do():
    assert what_would_do({"spacing_arcsec", "speed_kms"}, ["period_yr"]) == (
        ("proper_motion_mas_yr",),
        ("period_yr",),
        ("distance_pc",),
    )
    assert min(len(extra) for extra in solve_shell_relations([]).would_do) == 3
    solution = solve_shell_relations([stated("spacing_arcsec", 1.2, 0.05)])
    assert set(solution.unknown) == {"proper_motion_mas_yr", "speed_kms", "period_yr", "distance_pc"}
    assert all(len(extra) == 2 for extra in solution.would_do)
    assert solution.get("period_yr") is None


def test_any_three_that_are_independent_give_all_five():
    from itertools import combinations

    truth = {
        "speed_kms": 1800.0,
        "distance_pc": 2100.0,
        "period_yr": 12.0,
        "proper_motion_mas_yr": 1000 * 1800.0 / (KMS_PER_AU_YR * 2100.0),
        "spacing_arcsec": 12.0 * 1800.0 / (KMS_PER_AU_YR * 2100.0),
    }
    dependent = [{"spacing_arcsec", "proper_motion_mas_yr", "period_yr"}]
    dependent.append({"speed_kms", "proper_motion_mas_yr", "distance_pc"})
    for chosen in combinations(truth, 3):
        solution = solve_shell_relations([stated(name, truth[name], 0.0) for name in chosen], draws=10)
        if set(chosen) in dependent:
            assert solution.unknown
            continue
        assert not solution.unknown
        for name, value in truth.items():
            assert solution.get(name).spread.value == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("quantity", "value", "code"),
    [
        ("spacing_arcsec", 0.0, "shell-value-refused"),
        ("period_yr", -3.0, "shell-value-refused"),
        ("distance_pc", math.nan, "shell-value-refused"),
        ("distance_pc", math.inf, "shell-value-refused"),
        ("speed_kms", 299_792.458, "speed-above-light"),
        ("redshift", 1.0, "shell-quantity-refused"),
    ],
)
def test_what_cannot_be_is_refused(quantity, value, code):
    with pytest.raises(InputRefused) as refused:
        solve_shell_relations([ShellInput(quantity, value, 0.1, 0.1)])
    assert refused.value.code == code
    assert refused.value.why and refused.value.hint


@pytest.mark.parametrize(
    "correlations",
    [
        {("speed_kms", "distance_pc"): 1.2},
        {("speed_kms", "distance_pc"): math.nan},
        {("speed_kms", "period_yr"): 0.5},
        {("speed_kms", "speed_kms"): 0.5},
        {
            ("speed_kms", "distance_pc"): 0.9,
            ("distance_pc", "spacing_arcsec"): 0.9,
            ("speed_kms", "spacing_arcsec"): -0.9,
        },
    ],
)  # fmt: skip
def test_correlations_that_cannot_be_are_refused(correlations):
    three = [
        stated("speed_kms", 1800.0, 100.0),
        stated("distance_pc", 2100.0, 200.0),
        stated("spacing_arcsec", 1.2, 0.05),
    ]
    with pytest.raises(InputRefused) as refused:
        solve_shell_relations(three, correlations)
    assert refused.value.code == "correlation-refused"
