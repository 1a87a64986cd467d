"""What ``upcoming`` tells at a glance: an empty watch, mixtures told once, options that go together."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
NOW = ("--as-of", "2026-12-01")


def test_an_empty_watch_says_what_to_do_next(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    ran = run_campaign("upcoming")
    assert ran.status == 0
    assert "No system is under watch" in ran.out
    assert "campaign system add" in ran.out and "--sample" in ran.out
    assert "Monte Carlo" not in ran.out
    assert run_campaign("upcoming", "--json").document["data"]["events"] == []


def test_a_watch_of_retired_systems_is_empty_too(kept: RunCampaign) -> None:
    assert kept("system", "retire", "ln3").status == 0
    assert "No system is under watch" in kept("upcoming", *NOW).out
    # By name it can still be asked for.
    assert "periastron" in kept("upcoming", "--system", "LN3", "--within", "10yr", *NOW).out


@pytest.fixture
def mixture(kept: RunCampaign) -> RunCampaign:
    """Two weighted solutions 100 d apart; only the first has e and omega."""
    kept(
        "solution", "add", "LN3", "--label", "dust dates", "--period", "3127.5±9 d", "--epoch", "MJD 61333±9"
    )
    kept("rule", "set", "LN3", "--lag-onset", "-40±10 d", "--lag-end", "200±20 d", "--scatter", "9 d")
    assert kept("solution", "adopt", "LN3", "orbit=0.6", "dust dates=0.4").status == 0
    return kept


def test_how_far_the_solutions_of_a_mixture_are_apart_is_told_in_one_line(mixture: RunCampaign) -> None:
    lines = [
        line
        for line in mixture("upcoming", "--within", "10yr", *NOW).out.splitlines()
        if "mixture of" in line
    ]
    assert len(lines) == 1
    assert "onset 1, periastron 1, end 1" in lines[0]
    assert "with weights 0.6, 0.4, which disagree by" in lines[0] and " to " in lines[0]


def test_what_one_solution_lacks_is_not_said_of_the_system(mixture: RunCampaign) -> None:
    data = mixture("upcoming", "--within", "10yr", *NOW, "--json").document["data"]
    assert any(event["event"] == "A in front" for event in data["events"])
    assert "'dust dates': no e and omega" in data["bases"][0]["text"]


def test_a_cycle_of_many_dates_a_year_is_no_share_of_a_year(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    run_campaign("system", "add", "Spinner 2", "--ra", "10", "--dec", "10")
    run_campaign("solution", "add", "Spinner 2", "--period", "100±40 d", "--epoch", "2020-01-01", "--adopt")
    assert "each year" in run_campaign("upcoming", *NOW).out


def test_names_are_found_whatever_their_case_and_spaces(kept: RunCampaign) -> None:
    for name in ("Lantern 3", "lantern3", " LANTERN  3 ", "ln3", "L N 3"):
        assert kept("upcoming", "--system", name, *NOW).status == 0, name


def _conjunctions(run: RunCampaign, *more: str) -> list[dict[str, Any]]:
    words = ("upcoming", "--from", "2027-01-01", "--until", "2040-01-01", *NOW, "--json", *more)
    events = run(*words).document["data"]["events"]
    return [event for event in events if event["event"] == "B in front"]


@pytest.mark.parametrize("omegas", [("88±1", "92±1"), ("92±1", "88±1"), ("359±1", "3±1"), ("271±1", "267±1")])
def test_a_conjunction_near_apastron_is_one_event_for_two_solutions(
    run_campaign: RunCampaign, omegas: tuple[str, str]
) -> None:
    """With omega of B at 90 deg it passes in front at apastron, as near to one periastron as to the next."""
    run_campaign("begin")
    run_campaign("system", "add", "Twin 1", "--ra", "10", "--dec", "10")
    for label, omega in zip(("first", "second"), omegas, strict=True):
        run_campaign(
            "solution", "add", "Twin 1", "--label", label, "--period", "3000±1 d", "--epoch", "MJD 61233.7±1",
            "--eccentricity", "0.3±0.01", "--omega", omega, "--omega-of", "B",
        )  # fmt: skip
    assert run_campaign("solution", "adopt", "Twin 1", "first=0.5", "second=0.5").status == 0
    mixed = _conjunctions(run_campaign)
    assert mixed
    for event in mixed:
        # 4 deg of the orbit at its slowest are under 90 d; a miscounted cycle would be 3000 d.
        assert event["bmjd_tdb"]["hi95"] - event["bmjd_tdb"]["lo95"] < 200.0
    apart = _conjunctions(run_campaign, "--solutions")
    for cycle in {event["cycle"] for event in apart}:
        dates = [event["bmjd_tdb"]["median"] for event in apart if event["cycle"] == cycle]
        assert max(dates) - min(dates) < 200.0
