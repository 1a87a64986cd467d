"""What ``upcoming --system`` and ``ephemeris`` say of a system whose errors or sizes are not all known."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

RunCampaign = Callable[..., Any]
NOW = ("--as-of", "2026-12-01")
PUBLISHED = ("--period", "3140±4 d", "--epoch", "BJD 2461300±3", "--eccentricity", "0.70±0.02")


def _mixture(kept: RunCampaign) -> None:
    """Two weighted solutions, one of which needs a mass whose error nobody gave."""
    kept("system", "change", "LN3", "--mass-a", "12±2", "--mass-b", "25", "--distance", "2.1±0.2 kpc")
    kept("rule", "set", "LN3", "--separation", "6.4±0.8 au", "--scatter", "5 d")
    kept("solution", "add", "LN3", "--label", "other", *PUBLISHED, "--a", "7.9±0.3 mas")
    assert kept("solution", "adopt", "LN3", "orbit=0.7", "other=0.3").status == 0


def test_an_unknown_error_in_a_mixture_is_said_and_is_no_number(kept: RunCampaign) -> None:
    _mixture(kept)
    ran = kept("upcoming", "--system", "LN3", "--within", "10yr", *NOW)
    assert (ran.status, ran.err) == (0, "")
    assert "nan" not in ran.out.lower().split()
    assert "within the solutions" in ran.out
    assert "unknown" in ran.out
    assert "(error unknown, 68 %)" not in ran.out


def test_each_solution_of_a_mixture_has_a_line_of_its_own(kept: RunCampaign) -> None:
    _mixture(kept)
    ran = kept("upcoming", "--system", "LN3", "--within", "10yr", *NOW)
    lines = [line.strip() for line in ran.out.splitlines()]
    assert any(line.startswith("orbit (0.7): T(1)") for line in lines)
    assert any(line.startswith("other (0.3): T(1)") for line in lines)


def test_what_the_semi_major_axis_is_computed_from_is_listed(kept: RunCampaign) -> None:
    _mixture(kept)
    told = kept("upcoming", "--system", "LN3", *NOW, "--json").document["data"]["explanation"]["elements"]
    said = {(each["element"], each["value"], each["origin"]) for each in told}
    # 7.9 mas at 2100 pc: 16.59 au, by the definition of the parsec.
    assert ("other: distance", "2100 ± 200 pc", "") in said
    assert ("other: a", "16.59 au", "from a in arcsec times the distance") in said
    assert any(name == "orbit: mass of star B" for name, _, _ in said)


def test_a_cycle_count_is_not_called_safe_without_an_error(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    run_campaign("system", "add", "Bare 1", "--ra", "18:02:31.5", "--dec", "-45:12:30")
    run_campaign("solution", "add", "Bare 1", "--period", "3000 d", "--epoch", "BJD 2461234.2", "--adopt")
    ran = run_campaign("upcoming", "--system", "Bare 1", "--within", "10yr", *NOW)
    assert "cannot be checked" in ran.out
    assert "count is safe" not in ran.out


def test_a_system_without_anything_is_told_in_few_words(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    run_campaign("system", "add", "Bare 2", "--ra", "18:02:31.5", "--dec", "-45:12:30")
    ran = run_campaign("upcoming", "--system", "Bare 2", *NOW)
    assert ran.status == 0
    assert "no adopted solution" in ran.out
    assert "How the dates" not in ran.out
    assert "periastron alone" not in ran.out


def test_an_ephemeris_says_which_numbers_it_used(kept: RunCampaign) -> None:
    _mixture(kept)
    table = kept("ephemeris", "LN3", "--from", "2027-01-01", "--until", "2027-03-01", "--step", "30d")
    assert "one of 2 adopted solutions" in table.out
    assert "from the masses of the stars and the period" in table.out
    assert "nominal elements" in table.out
    kept("solution", "add", "LN3", "--label", "vague", "--period", "28..32 yr", "--epoch", "2001-05-20±20 d")
    vague = kept("ephemeris", "LN3", "--solution", "vague")
    assert "its middle, 10957.5 d, is used" in vague.out  # 30 Julian years
