"""``campaign winds`` as people type it: on the catalogue, on the sample, and wrongly."""

from __future__ import annotations

import shutil

import pytest

from campaign.__main__ import run

WINDS = (
    "--mass-loss-a", "(2.0±0.5)e-5 Msun/yr", "--wind-speed-a", "2300±100 km/s",
    "--mass-loss-b", "(8±3)e-7", "--wind-speed-b", "2600±150",
)  # fmt: skip
QUICK = ("--draws", "200", "--step", "500d")


@pytest.fixture(scope="module")
def prepared(tmp_path_factory):
    """A catalogue with one invented system and its orbit, and no wind; made once."""
    path = tmp_path_factory.mktemp("prepared") / "campaign.db"
    for words in (
        ("begin",),
        ("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30", "--type-a", "WC8",
         "--type-b", "O7V", "--mass-a", "12±2", "--mass-b", "24±3"),
        ("solution", "add", "Lantern 3", "--label", "orbit 2019", "--period", "3127.5±4 d", "--epoch",
         "BJD 2457350.0±6", "--eccentricity", "0.71±0.02", "--omega", "143±2", "--omega-of", "A",
         "--inclination", "62±4", "--adopt"),
    ):  # fmt: skip
        assert run((*words, "--db", str(path), *(() if words[0] == "begin" else ("--quiet",)))) == 0
    return path


@pytest.fixture
def watched(prepared, own_database, run_campaign):
    """Commands on a fresh copy of that catalogue."""
    shutil.copy(prepared, own_database)
    return run_campaign


def test_options_stand_in_for_a_catalogue_without_winds(watched):
    ran = watched("winds", "Lantern 3", *WINDS, *QUICK, "--as-of", "2030-01-01", "--json")
    assert ran.status == 0 and ran.document["schema"] == "campaign/winds/1"
    data = ran.document["data"]
    # 8e-7 x 2600 against 2e-5 x 2300, by hand.
    assert data["momentum_ratio"]["value"] == pytest.approx(8e-7 * 2600 / (2e-5 * 2300))
    assert data["rows"][0]["utc"].startswith("2030-01-01")
    origins = {each["name"]: each["origin"] for each in data["inputs"]}
    assert origins["mass loss of star B"] == "option" and origins["eccentricity"] == "catalogue"
    # Kept in the catalogue, the same numbers come out.
    assert watched("system", "change", "Lantern 3", *WINDS).status == 0
    kept = watched("winds", "Lantern 3", *QUICK, "--as-of", "2030-01-01", "--json").document["data"]
    assert kept["rows"] == data["rows"] and kept["cooling"] == data["cooling"]
    assert {each["origin"] for each in kept["inputs"]} == {"catalogue"}


def test_from_until_and_step_are_those_of_the_table(watched):
    span = ("--from", "2031-01-01", "--until", "2031-04-01", "--step", "30d", "--draws", "200")
    rows = watched("winds", "Lantern 3", *WINDS, *span, "--json").document["data"]["rows"]
    assert [row["utc"][:10] for row in rows] == ["2031-01-01", "2031-01-31", "2031-03-02", "2031-04-01"]


def test_the_forecast_does_not_change_with_the_winds(watched):
    """The cooling parameter is an indicator: hot or cold, the dates are the same to the last bit."""
    watched("rule", "set", "Lantern 3", "--separation", "6.4±0.8 au", "--condensation-distance", "100±20 au",
            "--flow-speed", "2000±200 km/s")  # fmt: skip
    asked = ("upcoming", "--as-of", "2030-01-01", "--within", "10yr", "--json")
    before = watched(*asked).document["data"]["events"]
    assert any(event["event"] == "onset" for event in before)
    for loss in ("1e-8", "1e-2"):
        watched("system", "change", "Lantern 3", "--mass-loss-a", f"{loss}±0", "--wind-speed-a", "2300±0",
                "--mass-loss-b", "1e-9±0", "--wind-speed-b", "2600±0")  # fmt: skip
        cooling = watched("winds", "Lantern 3", *QUICK, "--json").document["data"]["cooling"]
        assert (cooling[0]["periastron"]["value"] > 1.0) == (loss == "1e-8")
        assert watched(*asked).document["data"]["events"] == before


def test_it_is_shown_with_its_notes(watched):
    ran = watched("winds", "Lantern 3", *WINDS, *QUICK, "--forms", "--shape")
    assert ran.status == 0 and ran.err == ""
    for words in (
        "Wind collision of Lantern 3 from orbit 2019", "momentum ratio B/A", "half-opening about B",
        "Eichler & Usov 1993", "Cooling parameter chi", "Line of sight", "What changes when",
        "Through the orbit", "an indicator only", "semi-major axis from: masses",
    ):  # fmt: skip
        assert words in ran.out, words


def test_on_the_sample_without_a_database(run_campaign):
    ran = run_campaign("winds", "kettle 7", "--sample", *QUICK)
    assert ran.status == 0 and "Wind collision of Kettle 7" in ran.out
    refused = run_campaign("winds", "Kettle 7", "--sample", "--db", "x.db")
    assert refused.status == 2 and "--db does not go with --sample" in refused.err


def test_swapped_roles_are_said(watched):
    ran = watched("winds", "Lantern 3", "--momentum-ratio", "1.7±0.3", *QUICK, "--json")
    assert ran.status == 0
    assert ran.document["data"]["roles_swapped"] is True
    assert ran.document["data"]["momentum_ratio"]["value"] == pytest.approx(1 / 1.7)
    assert any("roles are swapped" in text for text in ran.document["warnings"])


@pytest.mark.parametrize(
    ("words", "status", "code", "said"),
    [
        ((), 5, "wind-unknown", "campaign system change"),
        (WINDS[:6], 5, "wind-unknown", "--wind-speed-b"),
        ((*WINDS, "--solution", "nope"), 4, "solution-not-found", "solution list"),
        (("--momentum-ratio", "0"), 3, None, "0.71"),
        (("--momentum-ratio", "-0.2"), 3, None, "0.71"),
        ((*WINDS, "--wind-speed-a", "0"), 3, None, "km/s"),
        ((*WINDS, "--wind-speed-a", "-2000"), 3, None, "km/s"),
        ((*WINDS, "--wind-speed-a", "300000"), 3, None, "km/s"),
        ((*WINDS, "--mass-loss-b", "0"), 3, None, "Msun/yr"),
        ((*WINDS, "--mass-loss-b", "nan"), 3, None, "Msun/yr"),
        ((*WINDS, "--radius-a", "0"), 3, None, "Rsun"),
        ((*WINDS, "--beta", "0"), 3, None, "--beta"),
        ((*WINDS, "--flare", "200 deg"), 3, None, "deg"),
        ((*WINDS, "--eccentricity", "1"), 3, None, "--eccentricity"),
        ((*WINDS, "--inclination", "181"), 3, None, "deg"),
        ((*WINDS, "--composition-a", "mud"), 3, "composition-refused", "He=0.5"),
        ((*WINDS, "--composition-a", "He=0.5"), 3, "composition-refused", "He=0.5"),
        ((*WINDS, "--omega", "20"), 2, None, "--omega-of A"),
        ((*WINDS, "--omega-of", "A"), 2, None, "--omega"),
        ((*WINDS, "--step", "0d"), 3, None, "--step"),
        ((*WINDS, "--from", "2032", "--until", "2031"), 3, "span-refused", "--until"),
        ((*WINDS, "--step", "1h"), 3, "span-refused", "--step"),
        ((*WINDS, "--draws", "3"), 3, "out-of-range", "--draws"),
        ((*WINDS, "--seed", "-1"), 3, "out-of-range", "--seed"),
    ],
)  # fmt: skip
def test_what_cannot_be_is_refused_in_three_lines_with_what_to_do(watched, words, status, code, said):
    ran = watched("winds", "Lantern 3", *words)
    assert ran.status == status, ran.err
    assert ran.out == ""
    assert len(ran.err.splitlines()) == 3 and "Traceback" not in ran.err
    assert said in ran.err
    told = watched("winds", "Lantern 3", *words, "--json")
    assert told.status == status and told.out == ""
    assert told.error["hint"]
    if code is not None:
        assert told.error["code"] == code


def test_a_system_that_is_not_in_the_catalogue_is_not_found(watched):
    ran = watched("winds", "Lantrn 3", "--json")
    assert ran.status == 4 and ran.error["code"] == "system-not-found"
    assert "Lantern 3" in ran.error["details"]["nearest"]


def test_without_an_adopted_solution_the_geometry_is_told_all_the_same(run_campaign):
    run_campaign("begin")
    run_campaign("system", "add", "Wick 1", "--ra", "18:02:31.5", "--dec", "-45:12:30")
    ran = run_campaign("winds", "Wick 1", *WINDS, "--json")
    assert ran.status == 0
    data = ran.document["data"]
    assert data["solution"] is None and data["rows"] == [] and data["half_opening_deg"]["sigma"] > 0.0
    assert any("campaign solution add" in text for text in data["assumptions"])
    shown = run_campaign("winds", "Wick 1", *WINDS)
    assert shown.status == 0 and "Through the orbit" not in shown.out
