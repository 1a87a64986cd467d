"""``shells date`` and ``shells expect`` as somebody types them."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest
from uncertainties import ufloat

REFERENCE = Path(__file__).parent.parent / "reference"
YEAR_D = 365.25


def rows(topic):
    """Rows of checks_shells.csv with this topic; each names its source."""
    with (REFERENCE / "checks_shells.csv").open(newline="") as file:
        found = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert found
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in found]


def value_of(text):
    return text.replace("+-", "±")


@pytest.fixture
def dated(run_campaign):
    """``shells date`` with these words, as its JSON data."""

    def run(*words):
        ran = run_campaign("shells", "date", *words, "--json")
        assert ran.status == 0, ran.err
        return ran.document["data"]

    return run


# ---------------------------------------------------------------------------------- without a catalogue


def test_the_oldest_of_twenty_shells_of_an_eight_year_binary_is_150_years_older_than_the_newest(dated):
    # Common practice, no source: 19 orbits of 8 years. The spacing is invented.
    radii = [f"--radius={0.17 + 0.43 * j:.3f}±0.02 arcsec" for j in range(20)]
    data = dated(*radii, "--period", "8.00±0.05 yr")
    assert data["span_yr"] == pytest.approx(150.0, abs=5.0)
    ages = [shell["age_yr"] for shell in data["shells"]]
    assert ages[-1] - ages[0] == pytest.approx(19 * 8.0, abs=1.5)
    assert [shell["index"] for shell in data["shells"]] == list(range(1, 21))
    # Nineteen periods carry nineteen times the error of one.
    assert data["span_sigma_yr"] == pytest.approx(19 * 0.05, rel=0.1)


@pytest.mark.parametrize(("inputs", "expected"), rows("shell.spacing"))
def test_the_spacing_follows_from_speed_period_and_distance(dated, inputs, expected):
    data = dated(
        "--speed", f"{inputs['v_kms']} km/s", "--period", f"{inputs['P_julian_yr']} yr",
        "--distance", f"{inputs['D_pc']} pc",
    )  # fmt: skip
    assert data["spacing_arcsec"]["value"] == pytest.approx(float(expected["spacing_arcsec"]), rel=1e-10)
    motion = data["proper_motion_mas_yr"]
    assert motion["value"] == pytest.approx(1000.0 * float(expected["mu_arcsec_yr"]), rel=1e-10)
    # No error was typed: it is unknown, and not zero.
    assert motion["sigma"] is None and motion["lo68"] is None
    assert motion["origin"] == "derived" and data["speed_kms"]["origin"] == "given"


@pytest.mark.parametrize(
    ("topic", "words", "name", "value", "sigma"),
    [
        ("shell.spacing_error",
         {"v_kms": "--speed=% km/s", "P_yr": "--period=% yr", "D_pc": "--distance=% pc"},
         "spacing_arcsec", "spacing_arcsec", "sigma"),
        ("shell.expansion_parallax_error",
         {"v_kms": "--speed=% km/s", "mu_arcsec_yr": "--motion=% arcsec/yr"},
         "distance_pc", "D_pc", "sigma_pc"),
        ("shell.period_from_spacing",
         {"spacing_arcsec": "--spacing=% arcsec", "D_pc": "--distance=% pc", "v_kms": "--speed=% km/s"},
         "period_yr", "P_yr", "sigma_yr"),
        ("shell.period_distance_free",
         {"spacing_arcsec": "--spacing=% arcsec", "mu_arcsec_yr": "--motion=% arcsec/yr"},
         "period_yr", "P_yr", "sigma_yr"),
    ],
)  # fmt: skip
def test_what_is_missing_is_derived_with_its_error(dated, topic, words, name, value, sigma):
    for inputs, expected in rows(topic):
        typed = [form.replace("%", value_of(inputs[key])) for key, form in words.items()]
        found = dated(*typed)[name]
        assert found["value"] == pytest.approx(float(expected[value]), rel=1e-8)
        assert found["sigma"] == pytest.approx(float(expected[sigma]), rel=1e-8)


def test_a_radius_and_a_motion_give_an_age(dated):
    ((inputs, expected),) = rows("shell.age_error")
    (shell,) = dated(
        "--radius", value_of(inputs["theta_arcsec"]) + " arcsec",
        "--motion", value_of(inputs["mu_arcsec_yr"]) + " arcsec/yr",
    )["shells"]  # fmt: skip
    assert shell["age_yr"] == pytest.approx(float(expected["age_yr"]), rel=1e-8)
    assert shell["age_sigma_yr"] == pytest.approx(float(expected["sigma_yr"]), rel=1e-6)
    # Nobody said when the image was taken.
    assert shell["launched_utc"] is None and shell["launched_bmjd_tdb"] is None


def test_nested_shells_of_one_image_are_dated_by_slope_and_intercept(dated):
    ((inputs, expected),) = rows("shell.nested_fit")
    radii = [f"--radius={r}±{s} arcsec" for r, s in zip(inputs["R_arcsec"], inputs["sigma"], strict=True)]
    data = dated(*radii, "--period", f"{inputs['P_yr']}±0 yr", "--on", f"J{inputs['t_image']} TDB ±0 d")
    spacing = data["spacing_arcsec"]
    assert spacing["value"] == pytest.approx(float(expected["spacing_arcsec"]), rel=1e-8)
    assert spacing["sigma"] == pytest.approx(float(expected["sigma_spacing"]), rel=1e-8)
    assert data["phase_of_youngest"] == pytest.approx(float(expected["age_of_shell1_in_periods"]), rel=1e-8)
    launched = 2000.0 + (data["shells"][0]["launched_bmjd_tdb"] - 51_544.5) / YEAR_D
    assert launched == pytest.approx(float(expected["t_ejection_shell1_yr"]), abs=1e-5)
    sigma_yr = data["shells"][0]["launched_sigma_d"] / YEAR_D
    assert sigma_yr == pytest.approx(float(expected["sigma_yr(P exact)"]), rel=1e-6)


def test_one_shell_through_time_is_dated_with_the_correlated_error(dated):
    ((inputs, expected),) = rows("shell.multi_epoch_fit")
    columns = zip(inputs["t_yr"], inputs["r_arcsec"], inputs["sigma"], strict=True)
    radii = [f"--radius=1={r}±{s} arcsec on J{t} TDB ±0 d" for t, r, s in columns]
    data = dated(*radii)
    motion = data["proper_motion_mas_yr"]["value"]
    assert motion == pytest.approx(1000.0 * float(expected["mu_arcsec_yr"]), rel=1e-7)
    launched = {round(2000.0 + (s["launched_bmjd_tdb"] - 51_544.5) / YEAR_D, 6) for s in data["shells"]}
    assert list(launched) == [pytest.approx(float(expected["t_ejection_yr"]), abs=1e-5)]
    sigma_yr = data["shells"][0]["launched_sigma_d"] / YEAR_D
    assert sigma_yr == pytest.approx(float(expected["sigma_t_ejection_yr"]), rel=1e-6)
    assert data["error_scale"] is None
    scaled = dated(*radii, "--scale-errors")
    ((_, wrong),) = rows("shell.multi_epoch_fit_scaled")
    ratio = float(wrong["sigma_mu_rescaled_by_sqrt(chi2/dof)"]) / float(wrong["sigma_mu_absolute"])
    assert scaled["proper_motion_mas_yr"]["sigma"] == pytest.approx(
        ratio * data["proper_motion_mas_yr"]["sigma"], rel=1e-6
    )
    assert scaled["error_scale"] == pytest.approx(ratio, rel=1e-6)


def test_the_errors_of_speed_and_distance_may_be_one_error(dated):
    # WR 112, Lau et al. 2020 (ApJ 900, 190): the distance is from the expansion and the speed.
    ((_, expected),) = rows("shell.wr112_consistency")
    words = ("--speed", "1230±260 km/s", "--distance", "3.39 +0.89 -0.84 kpc", "--period", "20±0 yr")
    apart, as_one = dated(*words), dated(*words, "--correlation", "speed,distance=0.95")
    for data in (apart, as_one):
        motion = data["proper_motion_mas_yr"]["value"]
        assert motion == pytest.approx(float(expected["implied_mu_mas_yr"]), rel=1e-4)
        spacing = data["spacing_arcsec"]["value"]
        assert spacing == pytest.approx(float(expected["implied_spacing_arcsec_per_turn"]), rel=1e-3)
    assert as_one["spacing_arcsec"]["sigma"] < 0.4 * apart["spacing_arcsec"]["sigma"]


def test_the_period_of_a_spiral_from_spacing_and_motion_needs_no_distance(dated):
    # WR 112: 76.5 mas/yr and 1.53 arcsec a turn (derived from the published values) are about 20 yr.
    data = dated("--spacing", "1.53±0.02 arcsec", "--motion", "76.5±2 mas/yr")
    assert data["period_yr"]["value"] == pytest.approx(20.0, rel=0.01)
    assert data["distance_pc"] is None and data["speed_kms"] is None
    assert any("--distance" in note for note in data["not_told"])


@pytest.mark.parametrize(
    ("words", "name", "published_yr"),
    [
        # S1: published ages and angles of the arcs of IRC+10216; v and D from memory; 3 %.
        (("--spacing", "10 arcsec", "--speed", "14.5 km/s", "--distance", "150 pc"), "period_yr", 500.0),
        (("--spacing", "35 arcsec", "--speed", "14.5 km/s", "--distance", "150 pc"), "period_yr", 1700.0),
        (("--radius", "320 arcsec", "--speed", "14.5 km/s", "--distance", "150 pc"), "age_yr", 16_000.0),
        # S5: published age and radius of the shell of R Scl; D from memory; 5 %.
        (("--radius", "19.5 arcsec", "--speed", "14.3 km/s", "--distance", "370 pc"), "age_yr", 2300.0),
    ],
)
def test_published_ages_come_out(dated, words, name, published_yr):
    data = dated(*words)
    found = data["shells"][0]["age_yr"] if name == "age_yr" else data[name]["value"]
    tolerance = 0.05 if published_yr == 2300.0 else 0.03
    assert found == pytest.approx(published_yr, rel=tolerance)


def test_values_that_do_not_go_together_are_a_tension_and_no_refusal(run_campaign):
    # 1.2 arcsec at 2.1 kpc and 1800 km/s are 6.64 yr: P = 4.740470464 s D / v.
    words = ("--spacing", "1.20±0.05 arcsec", "--speed", "1800±100 km/s", "--distance", "2.1±0.1 kpc")
    ran = run_campaign("shells", "date", *words, "--period", "20±1 yr", "--json")
    assert ran.status == 0
    (tension,) = [t for t in ran.document["data"]["tensions"] if t["quantity"] == "period_yr"]
    relative = ((0.05 / 1.2) ** 2 + (100 / 1800) ** 2 + (0.1 / 2.1) ** 2) ** 0.5
    expected = (6.6367 - 20.0) / (1.0**2 + (6.6367 * relative) ** 2) ** 0.5
    assert tension["sigma"] == pytest.approx(expected, rel=2e-3)
    assert tension["value"] == pytest.approx(6.6367, rel=1e-4)
    assert {"quantity", "from", "against", "sigma"} <= tension.keys()


def test_a_triple_from_which_nothing_more_follows_still_tells_its_tension(dated):
    # 1.2 arcsec at 80 mas/yr are 15 yr; errors of 0.05/1.2 and 1/80 of that, and 0.2 yr (first order).
    data = dated("--spacing", "1.2±0.05 arcsec", "--motion", "80±1 mas/yr", "--period", "10±0.2 yr")
    (tension,) = data["tensions"]
    error = ((15.0 * 0.05 / 1.2) ** 2 + (15.0 / 80.0) ** 2 + 0.2**2) ** 0.5
    assert tension["sigma"] == pytest.approx(5.0 / error, rel=1e-6)


def test_a_missing_shell_is_found_and_the_next_way_to_count_is_told(dated):
    # Spacing 1 arcsec, the fourth shell left out; errors of 3 % of the spacing.
    radii = [f"--radius={r}±0.03 arcsec" for r in (0.41, 1.38, 2.42, 4.40, 5.39, 6.42)]
    data = dated(*radii, "--period", "10±0.1 yr")
    assert [shell["index"] for shell in data["shells"]] == [1, 2, 3, 5, 6, 7]
    best, second, *_ = data["assignments"]
    assert best["missing"] == [4] and "4 missing" in best["meaning"]
    assert best["probability"] > 0.95 > second["probability"]


def test_wrong_indices_that_somebody_stated_are_not_believed(dated):
    radii = [f"--radius={index}={r}±0.01 arcsec" for index, r in ((1, 0.5), (2, 1.5), (3, 3.5), (4, 4.5))]
    document = dated(*radii, "--period", "10±0.1 yr")
    assert [shell["index"] for shell in document["shells"]] == [1, 2, 4, 5]
    assert [shell["stated_index"] for shell in document["shells"]] == [1, 2, 3, 4]


def test_radii_alone_give_the_spacing_and_ages_in_periods(run_campaign):
    ran = run_campaign(
        "shells", "date", "--radius", "0.5±0.02 arcsec", "--radius", "1.5±0.02 arcsec",
        "--radius", "2.5±0.02 arcsec", "--json",
    )  # fmt: skip
    data = ran.document["data"]
    assert data["spacing_arcsec"]["value"] == pytest.approx(1.0)
    assert [shell["age_periods"] for shell in data["shells"]] == pytest.approx([0.5, 1.5, 2.5])
    assert all(shell["age_yr"] is None for shell in data["shells"])
    assert any("--period" in note for note in data["not_told"])


def test_a_plate_scale_error_moves_no_age_in_periods(dated):
    radii = ["--radius=0.5±0.02 arcsec", "--radius=1.5±0.02 arcsec", "--radius=2.5±0.02 arcsec"]
    plain = dated(*radii, "--period", "9±0.1 yr")
    scaled = dated(*radii, "--period", "9±0.1 yr", "--plate-scale-error", "5 %")
    assert scaled["spacing_arcsec"]["sigma"] == pytest.approx(
        (plain["spacing_arcsec"]["sigma"] ** 2 + 0.05**2) ** 0.5, rel=1e-3
    )
    for one, other in zip(plain["shells"], scaled["shells"], strict=True):
        assert one["age_yr"] == pytest.approx(other["age_yr"], rel=1e-6)
        assert one["age_sigma_yr"] == pytest.approx(other["age_sigma_yr"], rel=1e-3)


def test_one_date_in_several_forms_is_one_image(dated):
    # MJD 58849.0 is 2020-01-01 00:00, and J2000.0 is JD 2451545.0: J2020.0 lies at noon of that day.
    dates = ("2020-01-01", "JD 2458849.5", "J2020.0")
    radii = [f"--radius={1.2 * (j + 1)}±0.1 arcsec on {date}" for j, date in enumerate(dates)]
    data = dated(*radii, "--period", "8±0.1 yr")
    assert len({shell["image_bmjd_tdb"] for shell in data["shells"]}) == 1
    assert [shell["index"] for shell in data["shells"]] == [1, 2, 3]
    assert data["shells"][0]["age_yr"] == pytest.approx(8.0, abs=0.1)


def test_images_a_month_apart_are_dated_by_the_period(dated):
    # In a month the shells move by 1/96 of a spacing, a tenth of an error: radius over spacing times period.
    radii = [
        f"--radius={r}±0.1 arcsec on {day}"
        for r, day in ((1.2, "2020-01-01"), (2.4, "2020-01-01"), (1.25, "2020-02-01"), (2.5, "2020-02-01"))
    ]
    data = dated(*radii, "--period", "8±0.1 yr")
    ages = [shell["age_yr"] for shell in data["shells"]]
    assert ages == pytest.approx([8.0, 16.0, 8.0, 16.0], abs=0.2)
    motion = data["proper_motion_mas_yr"]
    assert abs(motion["value"] - 1000.0 * 1.2 / 8.0) < motion["sigma"]
    assert not [t for t in data["tensions"] if abs(t["sigma"] or 0.0) > 2.0]


# ------------------------------------------------------------------------------------------- refused


@pytest.mark.parametrize(
    ("words", "status", "code", "hint"),
    [
        ((), 2, "shells-unstated", "--spacing"),
        (("--radius", "1.2±0.05 arcsec"), 3, "shells-insufficient", "--motion"),
        (("--radius", "1.2±0.05 arcsec", "--distance", "2 kpc"), 3, "shells-insufficient", "--speed"),
        (("--spacing", "1.2±0.05 arcsec"), 3, "shells-insufficient", "--period"),
        (("--radius", "-1.2±0.05 arcsec", "--motion", "80 mas/yr"), 3, "out-of-range", "arcsec"),
        (("--radius", "0 arcsec", "--motion", "80 mas/yr"), 3, "out-of-range", "arcsec"),
        (("--radius", "1=2.5±0.1 arcsec", "--radius", "2=1.5±0.1 arcsec", "--period", "8 yr"), 3,
         "shell-order-refused", ""),
        (("--radius", "1=2.5±0.1 arcsec", "--radius", "1=3.5±0.1 arcsec", "--period", "8 yr"), 3,
         "index-repeated", ""),
        (("--radius", "0=2.5±0.1 arcsec", "--period", "8 yr"), 3, "index-refused", "1="),
        (("--spacing", "5±0.1 arcsec", "--radius", "0.5±0.1 arcsec", "--radius", "1.2±0.1 arcsec",
          "--period", "8 yr"), 3, "spacing-refused", "unit"),
        (("--spacing", "5±0.1 arcsec", "--radius", "1.2±0.1 arcsec", "--period", "8 yr"), 3,
         "spacing-refused", "--period"),
        (("--radius", "1.2", "--radius", "2400 mas", "--period", "8 yr"), 3, "mixed-units", "arcsec"),
        (("--radius", "1.2 arcsec ± 50 mas", "--period", "8 yr"), 3, "value-unreadable", "arcsec"),
        (("--spacing", "5 au", "--speed", "1800 km/s", "--distance", "2 kpc"), 3, "unit-not-accepted", ""),
        (("--spacing", "1.2", "--speed", "300000 km/s", "--distance", "2 kpc"), 3, "out-of-range", "km/s"),
        (("--spacing", "1.2", "--speed", "0 km/s", "--distance", "2 kpc"), 3, "out-of-range", "km/s"),
        (("--spacing", "1.2 arcsec", "--period", "8"), 3, "unit-missing", "yr"),
        (("--radius", "1.2 arcsec on 2020", "--radius", "2.2 arcsec", "--period", "8 yr"), 3,
         "image-unclear", "on 2031"),
        (("--radius", "1.2 arcsec on 2020", "--on", "2021", "--period", "8 yr"), 3, "image-unclear", "--on"),
        (("--spacing", "1.2", "--speed", "1800 km/s", "--distance", "2 kpc", "--correlation", "speed=1"), 3,
         "correlation-refused", "speed,distance"),
        (("--spacing", "1.2", "--speed", "1800 km/s", "--distance", "2 kpc",
          "--correlation", "speed,distance=1.2"), 3, "out-of-range", "speed,distance"),
        (("--spacing", "1.2", "--speed", "1800 km/s", "--distance", "2 kpc",
          "--correlation", "speed,distance=0.5", "--correlation", "distance,speed=0.9"), 3,
         "correlation-refused", "once"),
        (("--radius", "1.2±0.1 arcsec", "--motion", "80±1 mas/yr", "--measured-at", "edge",
          "--edge-offset", "5±1 arcsec"), 3, "edge-offset-refused", "--edge-offset"),
        (("--radius", "=1.2 arcsec", "--motion", "80 mas/yr"), 3, "number-unreadable", "1=1.20±0.05 arcsec"),
        (("--radius", "1e-300 arcsec", "--motion", "80 mas/yr"), 3, "out-of-range", "arcsec"),
        (("--radius", "1.2±1e90 arcsec", "--motion", "80 mas/yr"), 3, "out-of-range", "arcsec"),
        (("--spacing", "1.2±1e300 arcsec", "--motion", "80 mas/yr"), 3, "out-of-range", "arcsec"),
        (("--spacing", "1.2", "--period", "1e-300 yr"), 3, "out-of-range", "8.6±0.1 yr"),
        (("--spacing", "1.2", "--period", "8 to 9 yr"), 3, "value-unreadable", "8.6±0.1 yr"),
        (("--spacing", "1.2", "--motion", "\u221280 mas/yr"), 3, "out-of-range", "80±5 mas/yr"),
        (("--radius", "<1.2 arcsec", "--motion", "80 mas/yr"), 3, "value-unreadable", "1.20±0.05 arcsec"),
        (("--radius", "1.2±0.1 arcsec", "--motion", "80±1 mas/yr", "--scale-errors"), 3,
         "nothing-to-scale-by", "--scale-errors"),
        (("--spacing", "1.2", "--speed", "9 km/s", "--sample"), 2, "system-needed", "--sample"),
        (("--radius", "1.2 arcsec", "--feature", "blob", "--motion", "80 mas/yr"), 3, "choice-refused",
         "limb"),
        (("--radius", "1.2±0.03 arcsec on 2020", "--radius", "0.8±0.03 arcsec on 2024"), 3, "shells-shrink",
         "--period"),
        (("--radius", "1.20±0.1 arcsec on 2020", "--radius", "1.18±0.1 arcsec on 2024"), 3,
         "motion-undetermined", "--period"),
    ],
)  # fmt: skip
def test_what_cannot_be_is_refused_and_what_would_do_is_said(run_campaign, words, status, code, hint):
    ran = run_campaign("shells", "date", *words, "--json")
    assert (ran.status, ran.error["code"]) == (status, code)
    assert hint in ran.error["hint"]
    plain = run_campaign("shells", "date", *words)
    assert plain.out == "" and "\n  why: " in plain.err and "\n  next: " in plain.err


# ------------------------------------------------------------------------------------------- the sample


TRUTH = {
    each["name"]: each
    for each in json.loads(
        (Path(__file__).parents[2] / "sample_catalog" / "truth.json").read_text(encoding="utf-8")
    )["systems"]
}


def true_launches(name):
    """Middle of the production window by cycle, bmjd_tdb."""
    return {int(row[0]): 0.5 * (row[2] + row[4]) for row in TRUTH[name]["cycles"] if row[2] is not None}


@pytest.mark.parametrize("name", ["Kettle 7", "Tallow 8"])
def test_the_shells_of_the_sample_are_given_to_the_episodes_that_made_them(run_campaign, name):
    data = run_campaign("shells", "date", name, "--sample", "--json").document["data"]
    launches = true_launches(name)
    speed, distance = TRUTH[name]["dust_speed_kms"], TRUTH[name]["elements"]["distance_pc"]
    true_motion = 1000.0 * speed / (4.740470464 * distance)
    for shell in data["shells"]:
        # The truth: which cycle's dust has come that far.
        image = shell["image_bmjd_tdb"]
        radius = {c: true_motion * (image - t) / YEAR_D / 1000.0 for c, t in launches.items() if t < image}
        nearest = min(radius, key=lambda cycle: abs(radius[cycle] - shell["radius_arcsec"]))
        assert shell["cycle"] == nearest
        # Episodes scatter about the clock by their own windows, some tens of days here.
        size = (shell["launched_sigma_d"] ** 2 + 30.0**2) ** 0.5
        assert abs(shell["launched_bmjd_tdb"] - launches[nearest]) < 4.0 * size
    motion = data["proper_motion_mas_yr"]
    assert abs(motion["value"] - true_motion) < 4.0 * motion["sigma"]
    spacing = true_motion * TRUTH[name]["elements"]["period_d"] / YEAR_D / 1000.0
    assert abs(data["spacing_arcsec"]["value"] - spacing) < 4.0 * data["spacing_arcsec"]["sigma"]


def test_the_shell_that_nobody_saw_in_the_second_image_is_missed_there(run_campaign):
    data = run_campaign("shells", "date", "Kettle 7", "--sample", "--json").document["data"]
    images = sorted({shell["image_bmjd_tdb"] for shell in data["shells"]})
    second = [shell for shell in data["shells"] if shell["image_bmjd_tdb"] == images[1]]
    assert [shell["index"] for shell in second] == [1, 2, 3, 5]
    unseen = [f for f in data["foreseen"] if not f["measured"] and f["image_bmjd_tdb"] == images[1]]
    assert [f["cycle"] for f in unseen] == [-3]
    assert any("2022-08-11" in note and "cycle -3" in note for note in data["not_told"])


def test_the_catalogue_is_held_against_the_shells(run_campaign):
    data = run_campaign("shells", "date", "Kettle 7", "--sample", "--json").document["data"]
    by_pair = {(t["quantity"], t["from"], t["against"]): t["sigma"] for t in data["tensions"]}
    told = {(quantity, against) for quantity, _, against in by_pair}
    assert ("period_yr", "period of the orbit") in told
    assert ("distance_pc", "distance in the catalogue") in told
    assert ("speed_kms", "terminal wind of star A") in told
    assert ("launch", "middle of the production window") in told
    # The dust truly moves at 2080 km/s, slower than the wind of 2550 km/s.
    assert all(s < 0.0 for (quantity, _, _), s in by_pair.items() if quantity == "speed_kms")
    assert all(abs(s) < 3.0 for (quantity, _, _), s in by_pair.items() if quantity in ("period_yr", "launch"))


def test_an_option_stands_in_place_of_the_catalogue(run_campaign):
    ran = run_campaign("shells", "date", "Kettle 7", "--sample", "--distance", "1.9±0.01 kpc", "--json")
    data = ran.document["data"]
    assert data["distance_pc"]["value"] == pytest.approx(1900.0)
    # v = 4.740470464 mu D
    speed = 4.740470464e-3 * data["proper_motion_mas_yr"]["value"] * 1900.0
    assert data["speed_kms"]["value"] == pytest.approx(speed, rel=1e-9)


def test_what_was_observed_later_is_not_looked_at(run_campaign):
    early = run_campaign("shells", "date", "Kettle 7", "--sample", "--as-of", "2020-01-01", "--json")
    data = early.document["data"]
    assert len({shell["image_bmjd_tdb"] for shell in data["shells"]}) == 1 and len(data["shells"]) == 5
    # One image and the period of the orbit: the motion follows.
    assert data["proper_motion_mas_yr"]["origin"] == "derived"
    assert {shell["cycle"] for shell in data["shells"]} == {0, -1, -2, -3, -4}


def test_a_system_without_shells_says_how_to_log_them(run_campaign):
    ran = run_campaign("shells", "date", "Thistle 2", "--sample", "--json")
    assert ran.status == 5 and ran.error["code"] == "no-shells"
    assert "campaign log shell" in ran.error["hint"]


# ------------------------------------------------------------------------------------------- end to end


@pytest.fixture
def pipeline(run_campaign):
    """The invented end-to-end system, kept through the command line, and what its reference row expects."""
    ((inputs, expected),) = rows("integrated.pipeline")
    for words in (
        ("begin",),
        ("system", "add", "Wick 4", "--ra", "10:11:12.0", "--dec", "-20:00:00",
         "--distance", f"{inputs['D_pc']}±0 pc"),
        ("solution", "add", "Wick 4", "--label", "orbit",
         "--period", f"{inputs['P_julian_yr'] * YEAR_D}±{inputs['sigma_P_d']} d",
         "--epoch", f"BJD {inputs['T0_BJD_TDB']}±{inputs['sigma_T0_d']} d",
         "--eccentricity", f"{inputs['e']}±0", "--a", f"{inputs['a_au']}±0 au", "--adopt"),
        ("rule", "set", "Wick 4", "--separation", f"{inputs['D_crit_au']}±0 au",
         "--condensation-distance", f"{inputs['r_cond_au']}±0 au",
         "--flow-speed", f"{inputs['v_exp_kms']}±0 km/s"),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    return run_campaign, expected


def test_spacing_and_motion_of_the_end_to_end_case(pipeline):
    run, expected = pipeline
    ran = run("shells", "expect", "Wick 4", "--on", "2031-01-01", "--as-of", "2026-01-01", "--json")
    assert ran.status == 0, ran.err
    data = ran.document["data"]
    # Row integrated.pipeline (computed): spacing 2.663237773 arcsec, mu 263.6869 mas/yr.
    assert data["spacing_arcsec"]["value"] == pytest.approx(2.663237773, rel=1e-9)
    assert data["proper_motion_mas_yr"]["value"] == pytest.approx(263.6869, rel=1e-6)
    newest = data["views"][0]["shells"][0]
    window = expected["E=2"]
    middle = 0.5 * (float(window["first_dust_BJD_TDB"]) + float(window["last_dust_BJD_TDB"])) - 2_400_000.5
    assert newest["cycle"] == 2
    assert newest["launched_bmjd_tdb"] == pytest.approx(middle, abs=2.0)
    # Half of the window counts as error beside that of the orbit.
    half = 0.5 * (float(window["last_dust_BJD_TDB"]) - float(window["first_dust_BJD_TDB"]))
    orbit = float(window["sigma_d(T0 20 d, P 12 d, independent)"])
    assert newest["launched_sigma_d"] == pytest.approx((half**2 + orbit**2) ** 0.5, rel=0.02)
    age = (data["views"][0]["bmjd_tdb"] - middle) / YEAR_D
    assert newest["radius_arcsec"] == pytest.approx(0.2636869 * age, rel=0.005)


def test_shells_of_the_end_to_end_case_are_dated_back_to_their_cycles(pipeline):
    run, expected = pipeline
    window = expected["E=2"]
    middle = 0.5 * (float(window["first_dust_BJD_TDB"]) + float(window["last_dust_BJD_TDB"])) - 2_400_000.5
    image = 63_000.0
    for turns in range(4):
        radius = 0.263686908212 * (image - middle) / YEAR_D + 2.663237772942 * turns
        ran = run("log", "shell", "Wick 4", "--radius", f"{radius:.5f}±0.01 arcsec",
                  "--at", f"MJD {image} TDB")  # fmt: skip
        assert ran.status == 0, ran.err
    data = run("shells", "date", "Wick 4", "--as-of", "2032-01-01", "--json").document["data"]
    assert [shell["cycle"] for shell in data["shells"]] == [2, 1, 0, -1]
    assert data["spacing_arcsec"]["value"] == pytest.approx(2.663237773, abs=1e-4)
    assert data["shells"][0]["launched_bmjd_tdb"] == pytest.approx(middle, abs=2.0)
    # The window is symmetric about periastron but for the delay to condensation, 69.26 d.
    delay_periods = 69.25827 / (10.1 * YEAR_D)
    assert data["shells"][0]["phase"] == pytest.approx(delay_periods, abs=5e-4)
    assert abs(data["shells"][0]["window_sigma"]) < 0.1


def test_the_shell_of_the_end_to_end_case_becomes_resolvable(pipeline):
    run, expected = pipeline
    ran = run(
        "upcoming", "--event", "resolvable", "--resolution", "0.1 arcsec", "--as-of", "2026-01-01",
        "--within", "5yr", "--json",
    )  # fmt: skip
    assert ran.status == 0, ran.err
    (event,) = ran.document["data"]["events"]
    window = expected["E=2"]
    middle = 0.5 * (float(window["first_dust_BJD_TDB"]) + float(window["last_dust_BJD_TDB"])) - 2_400_000.5
    # 0.1 arcsec at 263.6869 mas/yr take 138.5 d.
    assert event["bmjd_tdb"]["median"] == pytest.approx(middle + 0.1 / 0.2636869 * YEAR_D, abs=2.0)
    assert (event["event"], event["cycle"], event["status"]) == ("resolvable", 2, "expected")


def test_shells_that_leave_at_periastron_are_where_the_end_to_end_row_has_them(run_campaign):
    # The row counts ages from periastron itself: no dust rule is given here, and every error is zero.
    ((inputs, expected),) = rows("integrated.pipeline")
    for words in (
        ("begin",),
        ("system", "add", "Wick 4", "--ra", "10:11:12.0", "--dec", "-20:00:00",
         "--distance", f"{inputs['D_pc']}±0 pc"),
        ("solution", "add", "Wick 4", "--label", "orbit",
         "--period", f"{inputs['P_julian_yr'] * YEAR_D}±0 d", "--epoch", f"BJD {inputs['T0_BJD_TDB']}±0 d",
         "--adopt"),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    ran = run_campaign(
        "shells", "expect", "Wick 4", "--speed", f"{inputs['v_exp_kms']}±0 km/s",
        "--on", "MJD 60310.0 TDB", "--as-of", "2024-01-01", "--json",
    )  # fmt: skip
    assert ran.status == 0, ran.err
    (view,) = ran.document["data"]["views"]
    radius = {shell["cycle"]: shell["radius_arcsec"] for shell in view["shells"]}
    (name,) = [key for key in expected if key.startswith("shell_radii")]
    newest, older = (float(text) for text in expected[name])
    assert radius[1] == pytest.approx(newest, rel=1e-6)
    assert radius[0] == pytest.approx(older, rel=1e-6)


def test_the_error_of_an_expected_radius_is_that_of_launch_and_motion(run_campaign):
    # r = mu (t - launch); errors by the uncertainties package. A window of 400 d: half of it is error.
    for words in (
        ("begin",),
        ("system", "add", "Wick 4", "--ra", "10:11:12.0", "--dec", "-20:00:00", "--distance", "2000±0 pc"),
        ("solution", "add", "Wick 4", "--label", "orbit", "--period", "4000±0 d",
         "--epoch", "MJD 58000 TDB±30 d", "--adopt"),
        ("rule", "set", "Wick 4", "--lag-onset", "-200±0 d", "--lag-end", "200±0 d"),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    ran = run_campaign(
        "shells", "expect", "Wick 4", "--motion", "80±4 mas/yr", "--resolution", "0.12 arcsec",
        "--on", "MJD 61000 TDB", "--as-of", "2025-01-01", "--json",
    )  # fmt: skip
    assert ran.status == 0, ran.err
    motion, launch = ufloat(0.080, 0.004), ufloat(58_000.0, 30.0) + ufloat(0.0, 200.0)
    radius = motion * (61_000.0 - launch) / YEAR_D
    (shell,) = [s for s in ran.document["data"]["views"][0]["shells"] if s["cycle"] == 0]
    # The median of a product of two normals lies g sigma/6 below its mean, of skewness g (Cornish & Fisher
    # 1938): 6 a^2 b^2/(a^2 + b^2)^1.5 for the relative errors a = 0.05 and b = 202.2/3000, here 0.12.
    median = radius.nominal_value - 0.12 * radius.std_dev / 6.0
    assert shell["radius_arcsec"] == pytest.approx(median, abs=0.02 * radius.std_dev)
    assert shell["radius_sigma_arcsec"] == pytest.approx(radius.std_dev, rel=0.02)
    reached = launch + 4000.0 + 0.12 / motion * YEAR_D
    (date,) = [d for d in ran.document["data"]["resolvable"] if d["cycle"] == 1]
    assert date["bmjd_tdb"] == pytest.approx(reached.nominal_value, abs=3.0)
    assert date["sigma_d"] == pytest.approx(reached.std_dev, rel=0.02)


def test_launches_without_a_dust_rule_have_no_error_and_say_so(run_campaign):
    for words in (
        ("begin",),
        ("system", "add", "Wick 4", "--ra", "10:11:12.0", "--dec", "-20:00:00", "--distance", "2000±100 pc"),
        ("solution", "add", "Wick 4", "--label", "orbit", "--period", "4000±5 d",
         "--epoch", "MJD 58000 TDB±30 d", "--adopt"),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    asked = ("shells", "expect", "Wick 4", "--motion", "80±4 mas/yr", "--on", "2026-12-01")
    data = run_campaign(*asked, "--json").document["data"]
    shell = data["views"][0]["shells"][0]
    assert shell["radius_sigma_arcsec"] is None and shell["launched_sigma_d"] is None
    # What is known keeps its error.
    assert shell["proper_motion_sigma_mas_yr"] == pytest.approx(4.0)
    assert any("periastron alone" in note and "width" in note for note in data["assumptions"])
    assert not any("middle of" in note for note in data["assumptions"])


def test_a_shell_that_is_more_likely_still_to_come_is_not_in_view(run_campaign):
    for words in (
        ("begin",),
        ("system", "add", "Wick 4", "--ra", "10:11:12.0", "--dec", "-20:00:00"),
        ("solution", "add", "Wick 4", "--label", "orbit", "--period", "4000±0 d",
         "--epoch", "MJD 58000 TDB±300 d", "--adopt"),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    asked = (
        "shells",
        "expect",
        "Wick 4",
        "--motion",
        "800±4 mas/yr",
        "--field",
        "20 arcsec",
        "--resolution",
        "0.01 arcsec",
        "--on",
        "MJD 61800 TDB",
        "--as-of",
        "2025-01-01",
        "--json",
    )
    # 200 d before periastron 1, which has an error of 300 d; without a dust rule the launch has none.
    (view,) = run_campaign(*asked).document["data"]["views"]
    assert view["shells"][0]["cycle"] == 0
    assert view["in_view"] == 1 and view["within_limit"] == 0
    ran = run_campaign("rule", "set", "Wick 4", "--lag-onset", "-10±0 d", "--lag-end", "10±0 d")
    assert ran.status == 0, ran.err
    (view,) = run_campaign(*asked).document["data"]["views"]
    coming = view["shells"][0]
    # Standard normal distribution at -200/300: 0.2525 (Abramowitz & Stegun 1964, table 26.1).
    assert coming["cycle"] == 1 and coming["probability"] == pytest.approx(0.2525, abs=0.01)
    assert coming["in_view"] is False
    assert view["in_view"] == 1 and view["within_limit"] == 0


def test_a_missing_shell_is_found_where_the_ephemeris_has_no_error(run_campaign):
    # Radii 0.4 arcsec plus whole arcsec, the third left out; the orbit alone says nothing of the launch.
    for words in (
        ("begin",),
        ("system", "add", "Wick 4", "--ra", "10:11:12.0", "--dec", "-20:00:00"),
        ("solution", "add", "Wick 4", "--label", "orbit", "--period", "4000±5 d",
         "--epoch", "MJD 58000 TDB±30 d", "--adopt"),
    ):  # fmt: skip
        ran = run_campaign(*words)
        assert ran.status == 0, ran.err
    radii = [f"--radius={r}±0.03 arcsec" for r in (0.41, 1.38, 3.42, 4.40, 5.39)]
    ran = run_campaign("shells", "date", "Wick 4", *radii, "--on", "2022-01-01", "--json")
    assert ran.status == 0, ran.err
    data = ran.document["data"]
    assert [shell["index"] for shell in data["shells"]] == [1, 2, 4, 5, 6]
    best, second, *_ = data["assignments"]
    assert best["missing"] == [3] and best["probability"] > 0.95 > second["probability"]
    # The nearest cycle is given, and no probability is made up for it.
    assert {shell["cycle_probability"] for shell in data["shells"]} == {None}


# ------------------------------------------------------------------------------------------- upcoming


def test_upcoming_has_no_resolvable_shell_unless_a_resolution_is_given(run_campaign):
    plain = run_campaign("upcoming", "--sample", "--json").document["data"]["events"]
    asked = run_campaign("upcoming", "--sample", "--resolution", "0.1arcsec", "--json").document["data"][
        "events"
    ]
    assert not [event for event in plain if event["event"] == "resolvable"]
    others = [event for event in asked if event["event"] != "resolvable"]
    assert others == plain
    assert len(asked) > len(plain)


def test_upcoming_asks_for_the_resolution(run_campaign):
    ran = run_campaign("upcoming", "--sample", "--event", "resolvable", "--json")
    assert ran.status == 3 and ran.error["code"] == "resolution-unstated"
    assert "--resolution 0.1arcsec" in ran.error["hint"]


def test_a_coarser_image_sees_the_shell_later(run_campaign):
    dates = []
    for size in ("0.05arcsec", "0.1arcsec", "0.2arcsec"):
        ran = run_campaign(
            "upcoming", "--sample", "--system", "Kettle 7", "--event", "resolvable", "--resolution", size,
            "--within", "10yr", "--json",
        )  # fmt: skip
        events = ran.document["data"]["events"]
        dates.append(next(e["bmjd_tdb"]["median"] for e in events if e["cycle"] == 1))
    first, second, third = dates
    # The way is travelled at one speed.
    assert second - first > 0.0 and third - second == pytest.approx(2.0 * (second - first), rel=0.02)


# ------------------------------------------------------------------------------------------- expect


def test_shells_in_the_field_are_counted(run_campaign):
    words = ("shells", "expect", "Kettle 7", "--sample", "--on", "2029-01-01", "--json")
    data = run_campaign(*words, "--field", "28arcsec", "--resolution", "0.1arcsec").document["data"]
    (view,) = data["views"]
    inside = [s for s in view["shells"] if 0.1 <= s["radius_arcsec"] <= 14.0]
    assert view["in_view"] == len(inside) == sum(1 for s in view["shells"] if s["in_view"])
    narrow = run_campaign(*words, "--field", "28arcsec", "--outer-radius", "6arcsec").document["data"]
    # The shell of cycle 1 is launched by then with a probability of a quarter, and is not counted.
    near = [s for s in view["shells"] if s["radius_arcsec"] <= 6.0 and s["probability"] >= 0.5]
    assert narrow["views"][0]["in_view"] == len(near) == 2


def test_where_the_sample_s_shells_truly_are_is_inside_the_errors(run_campaign):
    ran = run_campaign("shells", "expect", "Kettle 7", "--sample", "--on", "2033-01-01", "--json")
    (view,) = ran.document["data"]["views"]
    launches = true_launches("Kettle 7")
    motion = TRUTH["Kettle 7"]["dust_speed_kms"] / (4.740470464 * 1900.0)
    checked = 0
    for shell in view["shells"]:
        if shell["cycle"] in launches:
            true = motion * (view["bmjd_tdb"] - launches[shell["cycle"]]) / YEAR_D
            # An episode's own scatter about the clock, 30 d, is 0.02 arcsec.
            assert (
                abs(shell["radius_arcsec"] - true)
                < 4.0 * (shell["radius_sigma_arcsec"] ** 2 + 0.02**2) ** 0.5
            )
            checked += 1
    assert checked >= 5


def test_the_radius_grows_by_the_motion_between_two_dates(run_campaign):
    ran = run_campaign(
        "shells", "expect", "Kettle 7", "--sample", "--on", "2029-01-01", "--until", "2033-01-01", "--json"
    )
    before, after = ran.document["data"]["views"]
    then = {s["cycle"]: s for s in after["shells"]}
    for shell in before["shells"]:
        if shell["probability"] == 1.0:
            gone = then[shell["cycle"]]["radius_arcsec"] - shell["radius_arcsec"]
            assert gone == pytest.approx(0.001 * shell["proper_motion_mas_yr"] * 1461.0 / YEAR_D, rel=1e-3)


def test_grains_are_warmer_nearer_the_stars_and_by_the_law_of_small_grains(run_campaign):
    ran = run_campaign("shells", "expect", "Kettle 7", "--sample", "--on", "2029-01-01", "--json")
    shells = [s for s in ran.document["data"]["views"][0]["shells"] if s["probability"] == 1.0]
    heats = [s["grain_temperature_k"] for s in shells]
    assert heats == sorted(heats, reverse=True)
    # T falls as r^(-2/5) for an emissivity that falls as 1/wavelength (formula of the literature; memory).
    near, far = shells[0], shells[-1]
    law = (near["radius_arcsec"] / far["radius_arcsec"]) ** 0.4
    assert far["grain_temperature_k"] / near["grain_temperature_k"] == pytest.approx(law, rel=1e-9)


@pytest.mark.parametrize(
    ("words", "status", "code"),
    [
        (("Kettle 7", "--on", "2030-01-01", "--until", "2029-01-01"), 3, "span-refused"),
        (("Kettle 7", "--field", "0.1arcsec", "--resolution", "0.1arcsec"), 3, "view-refused"),
        (("Kettle 7", "--field", "-3arcsec"), 3, "out-of-range"),
        (("Hearth 9",), 5, "no-ephemeris"),
        (("Nobody 1",), 4, "system-not-found"),
    ],
)
def test_what_cannot_be_expected_is_said(run_campaign, words, status, code):
    ran = run_campaign("shells", "expect", *words, "--sample", "--json")
    assert (ran.status, ran.error["code"]) == (status, code), ran.err
