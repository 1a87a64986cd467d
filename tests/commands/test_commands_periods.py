"""Which cycles ``upcoming`` looks at: none is missed, and no period asked for makes it hang or flood."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import pytest

from campaign.studies.forecast import MOST_CYCLES

RunCampaign = Callable[..., Any]
T0_BMJD = 61_233.7
NOW = ("--as-of", "2026-12-01")


def _system(run: RunCampaign, name: str, *solution: str, epoch: str = "BJD 2461234.2±0.5") -> None:
    assert run("system", "add", name, "--ra", "18:02:31.5", "--dec", "-45:12:30").status == 0
    added = run("solution", "add", name, "--epoch", epoch, "--adopt", *solution)
    assert added.status == 0, added.err


def _events(ran: Any, **wanted: object) -> list[dict[str, object]]:
    assert ran.status == 0, ran.err
    return [
        e for e in ran.document["data"]["events"] if all(e[key] == value for key, value in wanted.items())
    ]


def test_a_periastron_is_listed_as_soon_as_its_interval_reaches_into_the_period(
    run_campaign: RunCampaign,
) -> None:
    run_campaign("begin")
    _system(run_campaign, "Drift 1", "--period", "3000±490 d")
    end = T0_BMJD + 3000.0 - 1.5 * 490.0
    listed = _events(
        run_campaign("upcoming", "--until", f"MJD {end} tdb", *NOW, "--json"), event="periastron", cycle=1
    )
    assert len(listed) == 1
    # Source: the normal law; T0 + P before a bound 1.5 sigma below its mean.
    expected = 0.5 * math.erfc(1.5 / math.sqrt(2.0))
    assert listed[0]["probability_in_window"] == pytest.approx(expected, abs=2e-3)
    too_early = T0_BMJD + 3000.0 - 2.2 * 490.0
    ran = run_campaign("upcoming", "--until", f"MJD {too_early} tdb", *NOW, "--json")
    assert not _events(ran, event="periastron")


def test_a_period_too_uncertain_to_count_cycles_is_said_and_not_left_out(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    _system(run_campaign, "Drift 2", "--period", "3000±2000 d")
    ran = run_campaign("upcoming", "--within", "5yr", *NOW, "--json")
    assert [e["status"] for e in _events(ran, event="periastron")] == ["phase lost"]


def test_more_cycles_than_anybody_reads_are_cut_and_counted(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    _system(run_campaign, "Spinner 1", "--period", "1±1e-9 d", epoch="BJD 2461234.2±0.01")
    ran = run_campaign("upcoming", "--within", "100yr", *NOW, "--json")
    assert len(_events(ran, event="periastron")) <= MOST_CYCLES
    (warning,) = ran.document["warnings"]
    assert "Spinner 1" in warning and "365" in warning and str(MOST_CYCLES) in warning


def test_a_system_without_dust_by_its_rule_is_told_and_not_only_missing(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    for name, critical in (("Wide 1", "1±0.1 au"), ("Close 1", "50±1 au")):
        _system(run_campaign, name, "--period", "3000±1 d", "--eccentricity", "0.1±0.01", "--a", "10±0.5 au")
        assert run_campaign("rule", "set", name, "--separation", critical).status == 0
    bases = run_campaign("upcoming", "--within", "12yr", *NOW, "--json").document["data"]["bases"]
    told = {each["system"]: each["text"] for each in bases}
    # a (1 - e) = 9 au > 1 au: never near enough; a (1 + e) = 11 au < 50 au: never far enough.
    assert "never reached" in told["Wide 1"]
    assert "never stops" in told["Close 1"]


@pytest.mark.parametrize("period", [("--within", "1e9yr"), ("--from", "9990-01-01", "--within", "20yr")])
def test_a_period_beyond_the_calendar_is_refused(kept: RunCampaign, period: tuple[str, ...]) -> None:
    ran = kept("upcoming", *period)
    assert (ran.status, len(ran.err.splitlines()), ran.out) == (3, 3, "")
    assert "1 to 9999" in ran.err


def test_an_onset_without_error_is_not_open_for_centuries(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    _system(run_campaign, "Old 1", "--period", "3000 d")
    assert run_campaign("rule", "set", "Old 1", "--lag-onset", "-40 d").status == 0
    long_ago = run_campaign("upcoming", "--from", "1900-01-01", "--until", "1910-01-01", *NOW, "--json")
    assert {e["status"] for e in _events(long_ago, event="onset")} == {"unseen"}
