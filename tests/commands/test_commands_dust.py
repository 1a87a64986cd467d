"""``campaign dust`` as an observer meets it, on the sample campaign and on a campaign just begun."""

from __future__ import annotations

import json
from collections.abc import Callable
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
KETTLE = ("dust", "Kettle 7", "--sample", "--draws", "1000")
GLASS = ("--zero-points", "Johnson-Glass")


def test_the_physics_is_told_with_the_line_for_the_rule(run_campaign: RunCampaign) -> None:
    ran = run_campaign(*KETTLE)
    assert ran.status == 0
    for words in ("condenses at, au", "onset delay, d", "light over gravity", "mostly from", "what went in"):
        assert words in ran.out
    assert 'campaign rule set "Kettle 7" --separation' in ran.out


def test_every_option_of_the_physics_changes_its_input(run_campaign: RunCampaign) -> None:
    given = {
        "luminosity": "5e5±1e4 Lsun", "star-temperature": "50±2 kK", "mass": "40±2 Msun",
        "mass-loss-a": "(2±1)e-5", "mass-loss-b": "(2±1)e-6", "wind-speed-a": "2000±50",
        "wind-speed-b": "2500±50", "separation": "5±1 au", "condensation": "1200±100 K", "index": "1.0±0.1",
        "grain-radius": "0.05±0.01 um", "grain-density": "2.0±0.1 g/cm3", "flow-speed": "1500±100 km/s",
        "launch-speed": "1000±100", "dust-share": "2±1 %",
    }  # fmt: skip
    words = [word for name, text in given.items() for word in (f"--{name}", text)]
    told = json.loads(run_campaign(*KETTLE, *words, "--json").out)["data"]
    origins = {one["key"]: one["origin"] for one in told["inputs"]}
    assert set(origins.values()) == {"option"}
    # A flow of 1500 km/s and a launch of 1000 km/s are told apart.
    assert told["physics"]["launch_speed_kms"]["value"] == 1000.0
    values = {one["key"]: one["value"]["value"] for one in told["inputs"]}
    assert values["flow_speed_kms"] == 1500.0
    assert values["dust_share"] == pytest.approx(0.02)


def test_a_date_is_told_band_by_band(run_campaign: RunCampaign) -> None:
    ran = run_campaign(*KETTLE, "--on", "2018-06-10", *GLASS)
    assert ran.status == 0
    for words in ("stars, Jy", "dust, no gas, Msun", "K/L", "optical depth", "no interstellar extinction"):
        assert words in ran.out


def test_the_document_has_units_in_its_keys_and_says_what_is_meaningless(run_campaign: RunCampaign) -> None:
    told = run_campaign(*KETTLE, "--on", "2018-06-10", *GLASS, "--json").document
    assert told["schema"] == "campaign/dust/1"
    dust = told["data"]["measured"]
    assert dust["is_meaningless"] is False
    for key in ("temperature_k", "mass_msun", "luminosity_lsun"):
        assert {"value", "median", "sigma", "lo68", "hi68", "lo95", "hi95", "dominant"} <= dust[key].keys()
    assert {"dust_jy", "sigma_jy", "star_jy", "wavelength_um"} <= dust["bands"][0].keys()
    saturated = run_campaign(*KETTLE, "--on", "2017-12-04", *GLASS, "--json").document["data"]["measured"]
    assert saturated["is_meaningless"] is True
    assert saturated["mass_msun"] is None
    assert [verdict["code"] for verdict in saturated["verdicts"]] == ["saturated"]


def test_an_episode_is_told_date_by_date_with_its_rates(run_campaign: RunCampaign) -> None:
    ran = run_campaign(*KETTLE, "--cycle", "0", "--within", "20d", *GLASS)
    assert ran.status == 0
    assert "dust, Msun/yr" in ran.out
    assert "star-dominated" in ran.out


@pytest.mark.parametrize(
    ("words", "status", "code"),
    [
        (("--condensation", "2600 K"), 3, "condensation-temperature-refused"),
        (("--condensation", "1500..3000 K"), 3, "condensation-temperature-refused"),
        (("--luminosity", "-3e5 Lsun"), 3, "out-of-range"),
        (("--opacity", "graphite"), 4, "opacity-not-found"),
        (("--on", "2018-06-10"), 4, "zero-point-not-found"),
        (("--on", "2016-01-01", *GLASS), 4, "no-photometry-near"),
        (("--on", "2018-06-10", "--zero-points", "Nowhere JHK"), 4, "zero-point-not-found"),
        (("--cycle", "7", *GLASS), 4, "episode-not-found"),
        (("--on", "2018-06-10", "--cycle", "0"), 2, "usage"),
        (("--within", "20d"), 2, "usage"),
        (("--from", "2018-01-01"), 3, "span-refused"),
        (("--temperature", "5000 K"), 3, "out-of-range"),
        (("--level", "K=7.3", "--on", "2018-06-10"), 3, "error-missing"),
    ],
)
def test_what_cannot_be_is_refused_in_three_lines(
    run_campaign: RunCampaign, words: tuple[str, ...], status: int, code: str
) -> None:
    ran = run_campaign(*KETTLE, *words)
    assert ran.status == status
    assert len(ran.err.strip().splitlines()) == 3
    assert not ran.out
    assert run_campaign(*KETTLE, *words, "--json").error["code"] == code


def test_an_unknown_system_is_named_with_its_nearest(run_campaign: RunCampaign) -> None:
    ran = run_campaign("dust", "Kettel 7", "--sample")
    assert ran.status == 4
    assert "Kettle 7" in ran.err


def test_a_campaign_just_begun_asks_for_a_luminosity_and_takes_it_from_the_line(kept: RunCampaign) -> None:
    ran = kept("dust", "Lantern 3")
    assert ran.status == 5
    assert "--luminosity" in ran.err
    ran = kept("dust", "LN3", "--luminosity", "3e5±3e4 Lsun", "--condensation", "1200±50 K", "--draws", "500")
    assert ran.status == 0
    assert "no temperature of a star is known" in ran.out


def test_logged_magnitudes_and_fluxes_make_the_dust(kept: RunCampaign) -> None:
    for i in range(6):
        ran = kept("log", "photometry", "Lantern 3", "K=7.30±0.02", "--at", f"2030-0{i + 1}-11T05:00:00Z")
        assert ran.status == 0, ran.err
    kept("log", "photometry", "Lantern 3", "K=6.30±0.02", "--at", "2031-04-07T05:00:00Z")
    kept(
        "log", "flux", "Lantern 3", "--value", "3.0±0.2 Jy", "--frequency", "30000 GHz",
        "--at", "2031-04-07T06:00:00Z",
    )  # fmt: skip
    ran = kept(
        "dust", "Lantern 3", "--on", "2031-04-07", "--distance", "2.1±0.2 kpc", "--luminosity", "3e5±3e4",
        "--zero-points", "MKO", "--level", "9.993 um=none", "--json", "--draws", "1000",
        "--as-of", "2031-05-01",
    )  # fmt: skip
    assert ran.status == 0, ran.err
    dust = ran.document["data"]["measured"]
    assert [band["band"] for band in dust["bands"]] == ["K", "9.993 um"]
    assert dust["mass_msun"]["value"] > 0.0
    hidden = kept(
        "dust", "Lantern 3", "--on", "2031-04-07", "--as-of", "2031-01-01", "--zero-points", "MKO",
        "--luminosity", "3e5±3e4",
    )  # fmt: skip
    assert hidden.status == 4


def test_the_same_seed_gives_the_same_bytes(run_campaign: RunCampaign) -> None:
    line = (*KETTLE, "--on", "2018-06-10", *GLASS, "--json")
    assert run_campaign(*line).out == run_campaign(*line).out
    assert run_campaign(*line, "--seed", "2").out != run_campaign(*line).out
