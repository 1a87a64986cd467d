"""Statements about the sky that hold whatever the numbers: stars, conjunctions, epochs, extreme orbits.

Geometry from the conventions of the DEVELOPERS.md (omega_A = omega_B + 180 deg; B is behind A at
nu + omega_B = 90 deg and in front at 270 deg); phases by scalar formulas of this file's own.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from studies_examples import (
    NOW,
    dates,
    exact,
    find,
    lag_rule,
    moment,
    record,
    separation_rule,
    solution,
    upcoming,
)

from campaign.model.measured import Measured
from campaign.studies.periastron import omega_b_deg, periastron_epoch

FEW = {"draws": 2_000}


def phase_at(nu_deg, e):
    """Periods from periastron at a true anomaly within half a turn, by the orbit's textbook formulas."""
    nu = math.radians(math.remainder(nu_deg, 360.0))
    big_e = 2.0 * math.atan2(math.sqrt(1 - e) * math.sin(nu / 2), math.sqrt(1 + e) * math.cos(nu / 2))
    return (big_e - e * math.sin(big_e)) / (2 * math.pi)


def orbit(e=0.4, omega=40.0, of="B", period=3_000.0, epoch=60_500.0, **fields):
    return solution(
        exact(period),
        epoch,
        epoch_error=0.0,
        eccentricity=exact(e),
        omega_deg=exact(omega),
        omega_of=of,
        **fields,
    )


@pytest.mark.parametrize("e", [0.0, 0.3, 0.8, 0.95])
@pytest.mark.parametrize("omega_b", [0.0, 40.0, 95.0, 185.0, 300.0])
def test_conjunctions_fall_where_the_geometry_puts_them(e, omega_b):
    result = upcoming(record(orbit(e, omega_b)), years=25, **FEW)
    for event, angle in (("A in front", 90.0), ("B in front", 270.0)):
        found = find(result, event)
        offset = (found.bmjd_tdb.median - 60_500.0) / 3_000.0
        assert (offset - phase_at(angle - omega_b, e) + 0.5) % 1.0 - 0.5 == pytest.approx(0.0, abs=1e-8)
        # It belongs to the cycle of the nearest periastron.
        assert found.cycle == round(offset)


@given(omega=st.floats(0.0, 359.9), e=st.floats(0.0, 0.95), minus=st.floats(0.1, 20), plus=st.floats(0.1, 20))
@settings(max_examples=25, deadline=None)
def test_omega_of_either_star_describes_the_same_orbit(omega, e, minus, plus):
    by_b = orbit(e, 0.0, "B")
    by_b = replace(by_b, omega_deg=Measured(omega, minus, plus))
    by_a = replace(by_b, omega_deg=Measured((omega + 180.0) % 360.0, minus, plus), omega_of="A")
    first, second = (upcoming(record(s), **FEW) for s in (by_b, by_a))
    assert [(e.event, e.cycle) for e in first.events] == [(e.event, e.cycle) for e in second.events]
    for one, other in zip(first.events, second.events, strict=True):
        assert dates(one) == pytest.approx(dates(other), abs=1e-6)


def test_the_star_of_omega_matters():
    # The trap of the reference sheet, section 2: e = 0.8, omega = 120 deg: companion behind at phase
    # 0.994209, with the wrong star's omega at 0.160130.
    right, wrong = (find(upcoming(record(orbit(0.8, 120.0, star))), "A in front") for star in ("B", "A"))
    phases = [(e.bmjd_tdb.median - 60_500.0) / 3_000.0 % 1.0 for e in (right, wrong)]
    assert phases == pytest.approx([0.994209, 0.160130], abs=1e-6)


def test_a_conjunction_at_apastron_is_one_event_whichever_way_its_draws_fall():
    # omega_B = 90 deg puts 'B in front' at nu = 180 deg: half of the draws lie before apastron, half after.
    one = replace(orbit(0.6, 90.0), omega_deg=Measured(90.0, 5.0, 5.0))
    found = find(upcoming(record(one), years=12), "B in front")
    median, sigma, low68, high68, low95, high95 = dates(found)
    # Second law at apastron: d(phase)/d(nu) = (1 - e^2)^1.5 / (1 - e)^2 / (2 pi).
    rate = (1.0 - 0.6**2) ** 1.5 / (1.0 - 0.6) ** 2 / (2.0 * math.pi)
    assert sigma == pytest.approx(3_000.0 * rate * math.radians(5.0), rel=0.02)
    assert (median - 60_500.0) / 3_000.0 % 1.0 == pytest.approx(0.5, abs=0.002)
    assert high95 - low95 < 3_000.0 / 4.0
    assert low95 < low68 < median < high68 < high95


@pytest.mark.parametrize("omega", [89.9, 90.0, 90.1, 269.9, 270.0, 270.1])
def test_dates_move_continuously_as_omega_passes_apastron(omega):
    one = replace(orbit(0.5, omega), omega_deg=Measured(omega, 4.0, 4.0))
    result = upcoming(record(one), years=25, **FEW)
    for event, angle in (("A in front", 90.0), ("B in front", 270.0)):
        found = find(result, event)
        offset = (found.bmjd_tdb.median - 60_500.0) / 3_000.0
        expected = phase_at(angle - omega, 0.5)
        # To the draws' median; a jump would be half a period or more.
        assert (offset - expected + 0.5) % 1.0 - 0.5 == pytest.approx(0.0, abs=0.005)
        assert found.bmjd_tdb.sigma_d < 200.0


@pytest.mark.parametrize("marks", ["A in front", "B in front"])
@pytest.mark.parametrize(("e", "omega"), [(0.0, 10.0), (0.3, 200.0), (0.8, 75.0), (0.95, 271.0)])
def test_an_epoch_of_conjunction_leads_to_the_same_periastron_and_dust(marks, e, omega):
    """The same orbit told by its periastron and by a conjunction: every event at the same instant."""
    told = orbit(e, omega)
    angle = 90.0 if marks == "A in front" else 270.0
    conjunction = 60_500.0 + 3_000.0 * phase_at(angle - omega, e)
    retold = replace(told, epoch=moment(conjunction, 0.0), epoch_marks=marks)
    rule = lag_rule(-40.0, 60.0, 200.0)
    first, second = (upcoming(record(s, rule=rule), **FEW) for s in (told, retold))
    table = {(e.event, e.cycle): e.bmjd_tdb.median for e in first.events}
    again = {(e.event, e.cycle): e.bmjd_tdb.median for e in second.events}
    assert again.keys() == table.keys()
    assert len(table) == 2 * len({event for event, _ in table}) or len(table) >= 6
    for key, median in table.items():
        assert again[key] == pytest.approx(median, abs=1e-5)
    assert periastron_epoch(retold, 3_000.0) == pytest.approx(60_500.0, abs=1e-6)


def test_an_epoch_of_conjunction_without_omega_dates_that_conjunction_alone():
    one = replace(solution(3_000.0, 60_500.0, epoch_marks="B in front"), eccentricity=exact(0.4))
    result = upcoming(record(one, rule=lag_rule()))
    assert {e.event for e in result.events} == {"B in front"}
    assert find(result, "B in front").bmjd_tdb.median == pytest.approx(63_500.0, abs=1e-6)
    (basis,) = result.bases
    assert "periastron cannot be derived" in basis.text
    assert periastron_epoch(one, 3_000.0) is None and omega_b_deg(one) is None


def test_the_error_of_a_marked_conjunction_is_only_that_of_epoch_and_period():
    one = solution(
        3_000.0, 60_500.0, period_error=6.0, epoch_error=8.0, epoch_marks="A in front",
        eccentricity=Measured(0.5, 0.05, 0.05), omega_deg=Measured(30.0, 10.0, 10.0), omega_of="B",
    )  # fmt: skip
    result = upcoming(record(one))
    found = find(result, "A in front")
    assert found.bmjd_tdb.median == pytest.approx(63_500.0, abs=1e-6)
    assert found.bmjd_tdb.sigma_d == pytest.approx(10.0, rel=1e-6)
    assert find(result, "periastron").bmjd_tdb.sigma_d > 15.0


@pytest.mark.parametrize("critical", [11.0, 9.0])
def test_a_circular_orbit_has_a_date_of_periastron_but_neither_onset_nor_end(critical):
    """The separation never changes: dust is made always (11 au > 10 au) or never (9 au < 10 au)."""
    circle = orbit(0.0, 40.0, a_au=exact(10.0))
    result = upcoming(record(circle, rule=separation_rule(critical)), **FEW)
    assert find(result, "periastron").bmjd_tdb.median == pytest.approx(63_500.0, abs=1e-6)
    assert not {"onset", "end"} & {e.event for e in result.events if e.bmjd_tdb is not None}
    for event in result.events:
        if event.event in ("onset", "end"):
            assert event.probability == 0.0
    # Somebody who waits for an onset is told why there is none.
    (basis,) = result.bases
    assert ("never stops" if critical > 10.0 else "never reached") in basis.text


@pytest.mark.parametrize("e", [0.0, 0.2, 0.95])
def test_orbits_of_any_eccentricity_keep_the_order_of_their_dust(e):
    one = orbit(e, 100.0, a_au=exact(10.0))
    rule = lag_rule(-40.0, 60.0, 200.0)
    result = upcoming(record(one, rule=rule), **FEW)
    periastron = find(result, "periastron", 1).bmjd_tdb.median
    offsets = [find(result, event, 1).bmjd_tdb.median - periastron for event in ("onset", "maximum", "end")]
    assert offsets == pytest.approx([-40.0, 60.0, 200.0], abs=1e-6)


def test_a_nearly_parabolic_orbit_makes_dust_only_close_to_periastron():
    one = orbit(0.95, 100.0, a_au=exact(20.0))
    result = upcoming(record(one, rule=separation_rule(2.0)), **FEW)
    onset, end = (find(result, event, 1).bmjd_tdb.median for event in ("onset", "end"))
    # Ellipse: 2 au = 20 au (1 - 0.95 cos E), M = E - e sin E.
    big_e = math.acos((1 - 2.0 / 20.0) / 0.95)
    half = 3_000.0 * (big_e - 0.95 * math.sin(big_e)) / (2 * math.pi)
    assert [63_500.0 - onset, end - 63_500.0] == pytest.approx([half, half], abs=1e-6)


def test_an_onset_before_periastron_k_belongs_to_cycle_k():
    one = orbit(0.5, 40.0)
    result = upcoming(record(one, rule=lag_rule(-700.0, 0.0, 300.0)), years=25, **FEW)
    for cycle in (1, 2):
        assert find(result, "onset", cycle).bmjd_tdb.median == pytest.approx(
            60_500.0 + cycle * 3_000.0 - 700.0
        )


def test_the_phase_rule_counts_in_periods_and_the_lag_rule_in_days():
    one = orbit(0.5, 40.0)
    rule = replace(lag_rule(-40.0, None, None), kind="phase", onset=exact(-0.04))
    by_phase = find(upcoming(record(one, rule=rule), **FEW), "onset", 1).bmjd_tdb.median
    assert by_phase == pytest.approx(63_500.0 - 0.04 * 3_000.0, abs=1e-6)


def test_times_before_now_are_past_and_times_to_come_expected():
    result = upcoming(record(orbit(0.5, 40.0)), now=NOW, start=NOW - 4_000.0, end=NOW + 4_000.0)
    for event in result.events:
        assert event.status == ("past" if event.bmjd_tdb.median <= NOW else "expected")
    assert {e.status for e in result.events} == {"past", "expected"}
    assert all(np.isfinite(e.bmjd_tdb.median) for e in result.events)
