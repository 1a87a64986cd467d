"""What is said back at once after an entry: how it was understood, and what was not kept of it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

RunCampaign = Callable[..., Any]
AT = ("--at", "2025-04-07T03:12:10Z")


def test_a_position_is_echoed_in_degrees_so_that_hours_are_not_mistaken(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    degrees = run_campaign("system", "add", "Ember 1", "--ra", "18", "--dec", "5")
    assert "RA 18.00000 deg (1.20000 h), Dec +5.00000 deg" in degrees.out
    hours = run_campaign("system", "add", "Ember 2", "--ra", "18:00:00", "--dec", "-05:30")
    assert "RA 270.00000 deg (18.00000 h), Dec -5.50000 deg" in hours.out


def test_an_error_that_has_no_place_is_refused_and_not_lost(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    ran = run_campaign("system", "add", "Ember 1", "--ra", "18", "--dec", "5", "--pm-ra", "-3.2±0.1 mas/yr")
    assert ran.status == 3
    assert "without an error" in ran.err
    assert "±" not in ran.err.splitlines()[2]
    unread = run_campaign("system", "add", "Ember 1", "--ra", "18", "--dec", "5", "--pm-ra", "fast")
    assert "±" not in unread.err.splitlines()[2]


def test_a_rule_is_echoed_with_its_numbers(kept: RunCampaign) -> None:
    said = kept(
        "rule", "set", "LN3", "--lag-onset", "-40±10 d", "--lag-end", "200±20 d", "--scatter", "9"
    ).out
    for words in ("dust rule lag", "-40 ± 10 d", "200 ± 20 d", "scatter of the onset 9 d"):
        assert words in said


def test_a_flux_is_echoed_with_its_place_in_the_spectrum(kept: RunCampaign) -> None:
    radio = kept("log", "flux", "LN3", "--value", "2.3±0.2 mJy", "--frequency", "8.4 GHz", *AT)
    assert "8.4 GHz" in radio.out
    value = "(4.1±0.3)e-12 erg/s/cm2"
    assert "0.5..10 keV" in kept("log", "flux", "LN3", "--value", value, "--energy", "0.5..10 keV", *AT).out


def test_one_line_holds_one_magnitude_a_band(kept: RunCampaign) -> None:
    ran = kept("log", "photometry", "LN3", "K=7.3", "J=8.9", "K=7.4", *AT)
    assert ran.status == 3
    assert "K is given twice" in ran.err
    assert kept("system", "show", "LN3", "--json").document["data"]["observation_counts"] == {}


def test_the_same_value_with_another_error_is_not_taken_for_kept(kept: RunCampaign) -> None:
    first = kept("log", "photometry", "LN3", "K=7.31±0.03", *AT)
    assert "logged as 1" in first.out
    again = kept("log", "photometry", "LN3", "K=7.31±0.03", *AT)
    assert (again.status, "already logged as 1" in again.out) == (0, True)
    assert "was not kept" not in again.err
    other = kept("log", "photometry", "LN3", "K=7.31±0.05", *AT)
    assert other.status == 0
    assert "already logged as 1: Lantern 3, photometry K 7.310 ± 0.030 mag" in other.out
    assert "±0.05, was not kept" in other.err


def test_an_observation_of_long_ago_says_nothing_of_today(kept: RunCampaign) -> None:
    for day in range(10, 20):
        kept("log", "photometry", "LN3", "K=7.31±0.03", "--at", f"2025-04-{day}T03:12:10Z", "--source", "own")
    then = kept("log", "photometry", "LN3", "K=7.31±0.03", "--at", "1998-04-01T03:12:10Z", "--source", "own")
    assert "K: quiet, no onset then" in then.out
    now = kept("log", "photometry", "LN3", "K=7.31±0.03", "--at", "2025-04-21T03:12:10Z", "--source", "own")
    assert "K: quiet, no onset yet" in now.out
