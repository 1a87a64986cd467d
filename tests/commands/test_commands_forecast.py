"""The record of forecasts from the command line: kept, listed, scored, rehearsed; and what goes wrong."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
RULE = ("rule", "set", "LN3", "--lag-onset", "-40±10 d", "--lag-end", "200±20 d")
# The orbit's periastron of BJD 2461234.2 less 40 d is 2026-05-29, and ten periods later 2112-01-18: beyond
# any day on which these tests are run, since an entry made after an event may know it.
KEEP = ("forecast", "keep", "--within", "100yr", "--draws", "500")


@pytest.fixture(scope="module")
def _sample_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    from campaign.model.kept import Stamp
    from campaign.studies.begin import begin_sample_campaign
    from campaign.studies.watch import MJD_ZERO

    path = tmp_path_factory.mktemp("sample") / "campaign.db"
    begin_sample_campaign(str(path), Stamp(MJD_ZERO.replace(year=2026), "Ida Vik", "campaign test"))
    return path


@pytest.fixture
def sample(run_campaign: RunCampaign, own_database: Path, _sample_file: Path) -> RunCampaign:
    """The program on the invented sample campaign."""
    shutil.copy(_sample_file, own_database)
    return run_campaign


@pytest.fixture
def ruled(kept: RunCampaign) -> RunCampaign:
    """Lantern 3 with an orbit and a dust rule."""
    assert kept(*RULE).status == 0
    return kept


def test_today_is_kept_listed_waited_for_and_scored(ruled: RunCampaign) -> None:
    ran = ruled(*KEEP, "--label", "spring")
    assert (ran.status, ran.err) == (0, "")
    assert "keeping 1 'spring'" in ran.out and "campaign forecast score" in ran.out
    listed = ruled("forecast", "list", "--json").document
    assert listed["schema"] == "campaign/forecast-list/1"
    (keeping,) = listed["data"]["keepings"]
    assert (keeping["label"], keeping["draws"], keeping["seed"]) == ("spring", 500, 1)
    assert keeping["kept_at"].endswith("Z") and listed["data"]["forecasts"] is None
    told = ruled("forecast", "list", "SPRING", "--json").document["data"]["forecasts"]
    (onset,) = [one for one in told if one["event"] == "onset" and one["cycle"] == 10]
    assert len(onset["quantiles_bmjd_tdb"]) == len(onset["quantile_shares"]) == 101
    assert onset["inputs"]["rule"]["kind"] == "lag"
    assert onset["inputs"]["rule"]["set_at"].endswith("Z")
    assert "spring" in ruled("forecast", "list").out
    assert "onset 10" in ruled("forecast", "list", "1").out
    waiting = ruled("forecast", "score")
    assert waiting.status == 0 and "campaign episodes confirm" in waiting.out
    assert ruled("episodes", "add", "LN3", "--onset", "2112-01-26±4 d").status == 0
    # The solution was entered before that date, and so was the rule.
    scored = ruled("forecast", "score", "--as-of", "2113-06-01")
    assert scored.status == 0
    assert "too few to judge (1)" in scored.out and "Lantern 3" in scored.out
    data = ruled("forecast", "score", "--as-of", "2113-06-01", "--json").document["data"]
    (one,) = data["scored"]
    assert one["keeping_label"] == "spring" and 0.0 < one["pit"] < 1.0 and one["crps_d"] > 0.0
    assert one["outcome"]["decided_at"].endswith("Z")
    assert data["groups"][0]["calibration"] == "too-few"
    # What is not yet to be known is hidden.
    assert ruled("forecast", "score", "--as-of", "2110-01-01", "--json").document["data"]["scored"] == []


def test_nothing_kept_says_what_to_do(kept: RunCampaign) -> None:
    ran = kept("forecast", "score")
    assert (ran.status, ran.err) == (0, "")
    assert "campaign forecast keep" in ran.out and "campaign forecast rehearse" in ran.out
    assert "campaign forecast keep" in kept("forecast", "list").out
    assert kept("forecast", "score", "--json").document["data"]["scored"] == []
    assert kept("forecast", "list", "--json").document["data"]["keepings"] == []


def test_the_same_day_twice_changes_nothing(ruled: RunCampaign, fingerprint: Callable[[], str]) -> None:
    assert ruled(*KEEP, "--as-of", "2027-03-01", "--json").document["data"]["changed"] is True
    before = fingerprint()
    again = ruled(*KEEP, "--as-of", "2027-03-01")
    assert again.status == 0 and "nothing has changed since keeping 1" in again.out
    assert fingerprint() == before
    assert ruled(*KEEP, "--as-of", "2027-03-02", "--json").document["data"]["changed"] is True


def test_a_label_used_twice_is_refused(ruled: RunCampaign, fingerprint: Callable[[], str]) -> None:
    assert ruled(*KEEP, "--label", "spring", "--as-of", "2027-03-01").status == 0
    before = fingerprint()
    ran = ruled(*KEEP, "--label", "Spring", "--as-of", "2027-06-01")
    assert (ran.status, len(ran.err.splitlines())) == (5, 3)
    assert "--label" in ran.err and fingerprint() == before
    error = ruled(*KEEP, "--label", "spring", "--as-of", "2027-06-01", "--json").error
    assert (error["code"], error["details"]["keeping"]) == ("label-taken", 1)


def test_an_undo_takes_a_keeping_back_and_the_history_tells_both(ruled: RunCampaign) -> None:
    ruled(*KEEP, "--label", "spring")
    told = ruled("history").out
    assert "kept forecasts of Lantern 3" in told and "onset 1" in told
    assert ruled("undo", "--yes").status == 0
    assert ruled("forecast", "list", "--json").document["data"]["keepings"] == []
    assert "No forecast is kept yet" in ruled("forecast", "score").out
    newest = ruled("history", "--json").document["data"]["operations"][0]["operation"]
    assert ruled("undo", str(newest), "--yes").status == 0
    assert len(ruled("forecast", "list", "--json").document["data"]["keepings"]) == 1


def test_a_forecast_for_the_past_is_refused_by_the_score(ruled: RunCampaign) -> None:
    assert ruled("episodes", "add", "LN3", "--onset", "2026-06-01±4 d").status == 0
    ran = ruled(*KEEP, "--as-of", "2025-01-01")
    assert ran.status == 0 and "campaign forecast rehearse SYSTEM" in ran.err
    scored = ruled("forecast", "score")
    assert "the outcome was in the catalogue already" in scored.out
    (one, *_) = ruled("forecast", "score", "--json").document["data"]["unscored"]
    assert (one["code"], one["containing"][0]) == ("contains-outcome", "entries")


@pytest.mark.parametrize(
    ("words", "status", "hint"),
    [
        (("forecast", "list", "autumn"), 4, "campaign forecast"),
        (("forecast", "score", "--keeping", "autumn"), 4, "campaign forecast"),
        (("forecast", "score", "--system", "Lantern 9"), 4, "Lantern 3"),
        (("forecast", "keep", "--within", "soon"), 3, "5 yr"),
        (("forecast", "keep", "--label", "a\x1bb"), 3, ""),
        (("forecast", "keep", "--label", "x" * 101), 3, ""),
        (("forecast", "keep", "--seed", "4294967295"), 3, "--seed"),
        (("forecast", "rehearse", "Lantern 3"), 5, "campaign episodes find"),
        (("forecast", "rehearse", "Lantern 9"), 4, "Lantern 3"),
        (("forecast", "rehearse", "Lantern 3", "--lead", "soon"), 3, "--lead"),
        (("forecast", "rehearse", "Lantern 3", "--lead", "0.1d"), 3, "--lead 90d"),
        (("forecast", "rehearse", "Lantern 3", "--event", "periastron"), 3, "onset"),
    ],
)
def test_what_cannot_be_is_told_in_three_lines(
    ruled: RunCampaign, words: tuple[str, ...], status: int, hint: str
) -> None:
    ran = ruled(*words)
    assert (ran.status, ran.out) == (status, "")
    assert len(ran.err.splitlines()) == 3
    assert hint in ran.err
    assert "\x1b" not in ran.err


def test_one_episode_alone_cannot_be_rehearsed_and_says_why(ruled: RunCampaign) -> None:
    assert ruled("episodes", "add", "LN3", "--onset", "2026-06-01±4 d").status == 0
    ran = ruled("forecast", "rehearse", "LN3")
    assert ran.status == 0
    assert "could be forecast" in ran.out and "--entered-any-time" in ran.out
    # Nobody said until when the data of its orbit reach, so that it stays hidden all the same.
    ran = ruled("forecast", "rehearse", "LN3", "--entered-any-time")
    assert "nobody said until when its data reach" in ran.out and "--entered-any-time" not in ran.out


def test_a_rehearsal_of_the_sample_scores_each_episode_at_each_lead(sample: RunCampaign) -> None:
    words = ("forecast", "rehearse", "Thistle 2", "--entered-any-time", "--lead", "90d", "--lead", "1yr")
    document = sample(*words, "--json").document
    assert document["schema"] == "campaign/forecast-rehearse/1"
    data = document["data"]
    assert data["leads_d"] == [90.0, 365.25]
    assert [one["lead_asked_d"] for one in data["scored"]] == [90.0, 365.25] * 3
    # Each was forecast from earlier dates alone, so the solution from all of them did not speak.
    assert all(one["solution"] is None for one in data["scored"])
    assert "velocities 2025" in data["hidden"][0]
    out = sample(*words).out
    assert "onset  90 d" in out and "skill is against the last date" in out
    strict = sample("forecast", "rehearse", "Thistle 2")
    assert "knew nothing before" in strict.out
    assert 'campaign forecast rehearse "Thistle 2" --entered-any-time' in strict.out
