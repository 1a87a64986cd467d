"""The cooling parameter decides nothing: published dust makers are adiabatic at every phase and are forecast.

Periods, eccentricities and behaviour from the rows cwb.published_systems of checks_winds.csv (source and
basis in each). Winds are typical of the spectral types (common practice, no source); that of WR 112 has the
published speed of its dust.
"""

from __future__ import annotations

from dataclasses import replace

import pytest
from studies_examples import episode, lag_rule, numbers_in, separation_rule, upcoming
from winds_examples import binary, collide, exact, pm, solution, wind_rows

from campaign.model.measured import Measured
from campaign.model.systems import DustRule, Star

YEAR_D = 365.25
NOW = 61_000.0


def published(name):
    (row,) = [expected for inputs, expected in wind_rows("cwb.published_systems") if name in inputs["system"]]
    return row


def wr_48a(mass_loss=3e-5, rule=None, episodes=()):
    row = published("WR 48a")
    (years,), (e,) = numbers_in(row["recurrence_yr"]), numbers_in(row["e"])
    orbit = solution(
        pm(years * YEAR_D, 60.0), 55_000.0, epoch_error=200.0, eccentricity=pm(e, 0.05), a_au=pm(34.0, 3.0)
    )
    a = Star("A", "WC8", mass_loss_msun_yr=pm(mass_loss, 0.2 * mass_loss), wind_speed_kms=pm(2_000.0, 150.0))
    b = Star("B", "O5 V", mass_loss_msun_yr=pm(1e-6, 2e-7), wind_speed_kms=pm(2_600.0, 200.0))
    # The rise takes more than a decade (the row): production over a third of the orbit.
    default = DustRule(1, 1, "phase", onset=exact(-0.25), maximum=exact(0.02), end=exact(0.10))
    return binary(orbit, a=a, b=b, name="WR 48a", rule=rule or default, episodes=episodes)


def wr_112(mass_loss=3e-5):
    row = published("WR 112")
    (years,), (speed, error) = numbers_in(row["P_yr"]), numbers_in(row["v_kms"])
    orbit = solution(
        pm(years * YEAR_D, 200.0), 58_000.0, epoch_error=300.0, eccentricity=pm(0.1, 0.03), a_au=pm(25.0, 3.0)
    )
    a = Star("A", "WC8", mass_loss_msun_yr=pm(mass_loss, 0.1 * mass_loss), wind_speed_kms=pm(speed, error))
    b = Star("B", "O8 V", mass_loss_msun_yr=pm(6e-7, 6e-8), wind_speed_kms=pm(2_300.0, 100.0))
    rule = DustRule(1, 1, "phase", onset=exact(-0.4), maximum=exact(0.0), end=exact(0.4))
    return binary(orbit, a=a, b=b, name="WR 112", rule=rule)


@pytest.mark.parametrize("make", [wr_48a, wr_112])
def test_a_published_dust_maker_with_hot_shocks_at_every_phase_keeps_its_dust_window(make):
    one = make()
    result = collide(one, draws=2_000)
    for each in result.cooling:
        assert each.periastron.value > 1.0
        assert each.half_window_periods.value is None
        assert each.probability_always_above > 0.75
    assert not [event for event in result.events if "chi" in event.event]
    assert any("no forecast depends on it" in text for text in result.assumptions)
    forecast = upcoming(one, now=NOW, years=40)
    onsets = [event for event in forecast.events if event.event == "onset"]
    assert onsets and all(event.probability == 1.0 for event in onsets)
    assert max(max(window.probability) for window in forecast.dust_windows) > 0.99


@pytest.mark.parametrize(
    ("name", "period_d", "e"),
    [
        (inputs["system"], days, e)
        for inputs, expected in wind_rows("cwb.published_systems")
        for key in ("P_d", "P_yr", "P_yr_2019", "recurrence_yr", "optical_quasi_period_d")
        if key in expected
        for days in [numbers_in(str(expected[key]))[0] * (1.0 if key.endswith("_d") else YEAR_D)]
        for e in [(numbers_in(str(expected.get("e", "0.0"))) or [0.0])[0]]
    ],
)
def test_every_published_dust_maker_is_forecast_whatever_its_shocks_do(name, period_d, e):
    orbit = solution(
        pm(period_d, 0.004 * period_d),
        60_000.0,
        eccentricity=exact(e),
        a_au=exact((period_d / YEAR_D) ** (2 / 3) * 3.4),
    )
    a = Star("A", "WC8", mass_loss_msun_yr=exact(1e-6), wind_speed_kms=exact(2_000.0))
    b = Star("B", "O8 V", mass_loss_msun_yr=exact(1e-7), wind_speed_kms=exact(2_300.0))
    rule = DustRule(1, 1, "phase", onset=exact(-0.05), maximum=exact(0.01), end=exact(0.15))
    one = binary(orbit, a=a, b=b, name=name, rule=rule)
    assert all(each.periastron.value > 1.0 for each in collide(one, draws=100).cooling)
    forecast = upcoming(one, now=NOW, years=40, draws=2_000)
    assert any(event.event == "onset" and event.probability == 1.0 for event in forecast.events)
    assert forecast.dust_windows


@pytest.mark.parametrize(
    "rule",
    [
        None,
        lag_rule(-900.0, 100.0, 700.0),
        separation_rule(Measured(20.0, 1.0, 1.0), condensation_distance_au=pm(100.0, 20.0),
                        flow_speed_kms=pm(2_000.0, 100.0)),
        DustRule(1, 1, "learned"),
    ],
    ids=["phase", "lag", "separation", "learned"],
)  # fmt: skip
def test_no_rule_looks_at_cooling(rule):
    """Hot at every phase, cold at every phase, or no wind known: the forecast is the same to the last bit."""
    episodes = (episode(-1, 43_100.0), episode(0, 54_800.0)) if rule and rule.kind == "learned" else ()
    hot, cold = (wr_48a(loss, rule, episodes) for loss in (3e-5, 3e-1))
    assert all(each.probability_always_above == 1.0 for each in collide(hot).cooling)
    assert any(each.probability_always_below == 1.0 for each in collide(cold).cooling)
    bare = replace(hot, system=replace(hot.system, star_a=Star("A"), star_b=Star("B")))
    forecasts = [upcoming(one, now=NOW, years=40, draws=2_000) for one in (hot, cold, bare)]
    assert forecasts[0].events and forecasts[0].dust_windows
    assert forecasts[0] == forecasts[1] == forecasts[2]
