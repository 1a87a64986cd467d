"""Dated bursts: entered once, never twice by mistake, and a second entry may complete the first."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
ADD = ("episodes", "add", "LN3")


@pytest.fixture
def bare(run_campaign: RunCampaign) -> RunCampaign:
    """A system without any orbit: its period can only come from its bursts."""
    run_campaign("begin")
    run_campaign("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30", "--alias", "LN3")
    return run_campaign


def _listed(run: RunCampaign) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = run("episodes", "list", "--json").document["data"]["episodes"]
    return found


def test_the_same_episode_again_is_known_and_not_added(bare: RunCampaign) -> None:
    words = (*ADD, "--onset", "2001-05-20±10 d", "--maximum", "2001-08", "--band", "K")
    assert bare(*words, "--json").document["data"]["changed"] is True
    again = bare(*words)
    assert (again.status, again.err) == (0, "")
    assert "already known as episode 1" in again.out
    assert bare(*words, "--json").document["data"]["changed"] is False
    assert len(_listed(bare)) == 1


def test_one_burst_dated_twice_is_not_taken_for_two(bare: RunCampaign) -> None:
    assert bare(*ADD, "--onset", "1993-02-03±10 d").status == 0
    assert bare(*ADD, "--onset", "2001-05-20±10 d").status == 0
    ran = bare(*ADD, "--onset", "2001-05-25±10 d")
    assert (ran.status, len(ran.err.splitlines())) == (5, 3)
    assert "5.0 d from this one" in ran.err and "--cycle" in ran.err
    assert len(_listed(bare)) == 2
    # From 1993 to 2001, so the next is due in 2009, 2018, 2026: eight years, and not five days.
    dates = [
        event["bmjd_tdb"]["median"]
        for event in bare("upcoming", "--from", "2009-01-01", "--until", "2011-01-01", "--json").document[
            "data"
        ]["events"]
        if event["event"] == "onset"
    ]
    assert len(dates) == 1
    assert dates[0] == pytest.approx(52_049.5 + 3028.0, abs=30.0)


def test_two_bursts_near_each_other_may_be_said_to_be_two(bare: RunCampaign) -> None:
    assert bare(*ADD, "--onset", "2001-05-20±10 d", "--cycle", "3").status == 0
    assert bare(*ADD, "--onset", "2001-06-10±10 d", "--cycle", "4").status == 0
    assert [episode["cycle"] for episode in _listed(bare)] == [3, 4]


def test_an_end_that_is_known_later_completes_its_onset(kept: RunCampaign) -> None:
    assert kept(*ADD, "--onset", "2018-01-14±5 d").status == 0
    assert kept(*ADD, "--end", "2018-07-20±20 d").status == 0
    assert len(_listed(kept)) == 2


def test_a_date_in_the_future_is_warned_of(bare: RunCampaign) -> None:
    ran = bare(*ADD, "--onset", "2150-01-01±5 d")
    assert ran.status == 0
    assert "dated in the future" in ran.err


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ((), "no date"),
        (("--onset", "2019-01-01±4 d", "--end", "2018-01-01"), "before the onset"),
        (("--onset", "2019", "--cycle", "1.2"), "whole number"),
        (("--onset", "2019", "--cycle", "1e30"), "whole number"),
    ],
)
def test_an_impossible_episode_is_refused(bare: RunCampaign, words: tuple[str, ...], says: str) -> None:
    ran = bare(*ADD, *words)
    assert (ran.status, len(ran.err.splitlines())) == (3, 3)
    assert says in ran.err
    assert _listed(bare) == []
