"""Finding, proposing, confirming and rejecting episodes from the command line, on the invented sample."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

from campaign.model.kept import Stamp
from campaign.studies.begin import begin_sample_campaign

RunCampaign = Callable[..., Any]
SYSTEM = "Thistle 2"


@pytest.fixture(scope="module")
def sample_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("sample") / "campaign.db"
    begin_sample_campaign(str(path), _stamp())
    return path


def _stamp() -> Stamp:
    return Stamp(datetime(2027, 3, 1, tzinfo=UTC), "Ida Vik", "campaign begin --sample")


@pytest.fixture
def sampled(sample_file: Path, own_database: Path, run_campaign: RunCampaign) -> RunCampaign:
    shutil.copy(sample_file, own_database)
    return run_campaign


def states(run: RunCampaign) -> dict[int, str]:
    found = run("episodes", "list", SYSTEM, "--json").document["data"]["episodes"]
    return {one["id"]: one["state"] for one in found}


def test_what_is_found_is_shown_with_its_intervals_and_drawn(sampled: RunCampaign) -> None:
    ran = sampled("episodes", "find", SYSTEM)
    assert ran.status == 0
    assert f"{SYSTEM}: 6 episodes in the light curve" in ran.out
    assert "confirmed" in ran.out and "new" in ran.out
    assert "rise not covered" in ran.out
    assert "level of the stars" in ran.out
    assert "hold several photometric systems" in ran.err
    assert "Traceback" not in ran.err


def test_the_document_has_units_in_its_keys_and_no_points(sampled: RunCampaign) -> None:
    document = sampled("episodes", "find", SYSTEM, "--band", "K", "--as-of", "2012-01-01", "--json").document
    assert document["schema"] == "campaign/episodes-find/1"
    assert document["as_of"].startswith("2012-01-01T")
    data = document["data"]
    assert data["bands"] == ["K"]
    assert "curves" not in data
    last = data["episodes"][-1]
    onset, maximum, end = last["onset"], last["maxima"][0]["date"], last["end"]
    assert onset["band"] == maximum["band"] == "K"
    assert onset["bmjd_tdb"]["lo95"] < onset["bmjd_tdb"]["lo68"] < onset["bmjd_tdb"]["median"]
    assert onset["bmjd_tdb"]["median"] < maximum["bmjd_tdb"]["median"] < end["bmjd_tdb"]["median"]
    assert onset["utc"]["median"].endswith("Z")
    assert last["half"]["bmjd_tdb"]["median"] > maximum["bmjd_tdb"]["median"]
    assert {"rise_d", "decay_d", "first_bright_bmjd_tdb", "last_quiet_bmjd_tdb"} <= last.keys()


def test_nothing_is_written_unless_it_is_asked_for(sampled: RunCampaign) -> None:
    before = states(sampled)
    sampled("episodes", "find", SYSTEM)
    assert states(sampled) == before


def test_a_proposal_is_confirmed_in_one_operation_and_undone_in_one(sampled: RunCampaign) -> None:
    before = states(sampled)
    ran = sampled("episodes", "find", SYSTEM, "--propose", "--json")
    (number,) = ran.document["data"]["proposed_ids"]
    assert states(sampled) == before | {number: "proposed"}
    confirmed = sampled("episodes", "confirm", str(number))
    assert confirmed.status == 0
    assert f"episode {number} confirmed" in confirmed.out
    assert states(sampled)[number] == "confirmed"
    assert sampled("undo", "--yes").status == 0
    assert states(sampled) == before | {number: "proposed"}
    assert sampled("undo", "--yes").status == 0
    assert states(sampled) == before


def test_what_was_proposed_once_is_known_and_not_proposed_again(sampled: RunCampaign) -> None:
    (number,) = sampled("episodes", "find", SYSTEM, "--propose", "--json").document["data"]["proposed_ids"]
    assert sampled("episodes", "reject", str(number)).status == 0
    again = sampled("episodes", "find", SYSTEM, "--propose", "--json").document["data"]
    assert again["proposed_ids"] == []
    assert {"id": number, "state": "rejected"} in [one["known"] for one in again["episodes"]]


def test_a_confirmed_episode_changes_the_forecast_and_a_proposed_one_does_not(sampled: RunCampaign) -> None:
    def learnt() -> Any:
        ran = sampled("upcoming", "--system", SYSTEM, "--json", "--draws", "2000")
        return ran.document["data"]["events"], len(states(sampled))

    before, count = learnt()
    (number,) = sampled("episodes", "find", SYSTEM, "--propose", "--json").document["data"]["proposed_ids"]
    assert learnt() == (before, count + 1)
    assert sampled("episodes", "confirm", str(number)).status == 0
    shown = sampled("episodes", "list", SYSTEM, "--json").document["data"]["episodes"]
    (mine,) = [one for one in shown if one["id"] == number]
    # The cycle between 1996-07 (cycle -4) and 2009-02 (cycle -2) of the sample's truth.
    assert mine["cycle"] == -3


def test_two_confirmed_episodes_never_lie_over_each_other(sampled: RunCampaign) -> None:
    (number,) = sampled("episodes", "find", SYSTEM, "--propose", "--json").document["data"]["proposed_ids"]
    assert (
        sampled("episodes", "add", SYSTEM, "--onset", "2002-12-20±9 d", "--end", "2004-01-01±20 d").status
        == 0
    )
    ran = sampled("episodes", "confirm", str(number))
    assert (ran.status, len(ran.err.splitlines())) == (5, 3)
    assert "lies over the confirmed episode" in ran.err
    assert states(sampled)[number] == "proposed"


def test_deciding_again_changes_nothing(sampled: RunCampaign) -> None:
    number = next(number for number, state in states(sampled).items() if state == "confirmed")
    assert sampled("episodes", "confirm", str(number), "--json").document["data"]["changed"] is False
    assert sampled("episodes", "reject", str(number), "--json").document["data"]["changed"] is True
    assert sampled("episodes", "reject", str(number), "--json").document["data"]["changed"] is False


@pytest.mark.parametrize(
    ("words", "status", "says"),
    [
        (("find", "Nobody"), 4, "no system named"),
        (("find", SYSTEM, "--band", "Z"), 3, "no magnitude in band Z"),
        (("find", SYSTEM, "--as-of", "1980-01-01"), 3, "no photometry before that date"),
        (("find", SYSTEM, "--as-of", "1987-10-01"), 3, "too few"),
        (("find", SYSTEM, "--episode", "99"), 3, "--episode"),
        (("find", SYSTEM, "--episode", "one"), 3, "--episode"),
        (("confirm", "9999"), 4, "no episode number 9999"),
        (("confirm", "x"), 3, "not the number of an entry"),
        (("reject", "1", "1"), 3, "stands there twice"),
        (("confirm",), 2, "{N}..."),
    ],
)
def test_what_cannot_be_done_is_said_in_three_lines(
    sampled: RunCampaign, words: tuple[str, ...], status: int, says: str
) -> None:
    before = states(sampled)
    ran = sampled("episodes", *words)
    assert (ran.status, ran.out, len(ran.err.splitlines())) == (status, "", 3)
    assert says in ran.err
    assert states(sampled) == before


def test_all_or_none_are_decided(sampled: RunCampaign) -> None:
    before = states(sampled)
    assert sampled("episodes", "reject", str(min(before)), "9999").status == 4
    assert states(sampled) == before
