"""From elements to dated dust: rows of tests/reference/checks_forecast.csv (source and basis in each row)."""

from __future__ import annotations

import pytest
from studies_examples import (
    YEAR_D,
    check_rows,
    exact,
    find,
    record,
    separation_rule,
    solution,
    upcoming,
)

from campaign.model.measured import Measured
from campaign.studies.ephemeris import ephemeris

MJD_JD = 2_400_000.5
((PIPELINE, EXPECTED),) = check_rows("integrated.pipeline")
CYCLES = {2: EXPECTED["E=2"], 3: EXPECTED["E=3"]}


def pipeline_record(sigma_epoch_d=0.0, sigma_period_d=0.0, delayed=True):
    row = PIPELINE
    orbit = solution(
        Measured(row["P_julian_yr"] * YEAR_D, sigma_period_d, sigma_period_d),
        row["T0_BJD_TDB"] - MJD_JD,
        epoch_error=sigma_epoch_d,
        eccentricity=exact(row["e"]),
        a_au=exact(float(row["a_au"])),
    )
    delay = {
        "condensation_distance_au": exact(float(row["r_cond_au"])),
        "flow_speed_kms": exact(float(row["v_exp_kms"])),
    }
    rule = separation_rule(row["D_crit_au"], **(delay if delayed else {}))
    return record(orbit, rule=rule, distance_pc=exact(float(row["D_pc"])))


@pytest.fixture(scope="module")
def forecast():
    return upcoming(pipeline_record(), now=61_000.0, years=15)


@pytest.mark.parametrize("cycle", CYCLES)
def test_the_whole_chain_from_elements_to_first_and_last_dust(forecast, cycle):
    row = CYCLES[cycle]
    for event, key in (
        ("periastron", "T_peri_BJD_TDB"),
        ("onset", "first_dust_BJD_TDB"),
        ("end", "last_dust_BJD_TDB"),
    ):
        found = find(forecast, event, cycle)
        assert found.bmjd_tdb.median + MJD_JD == pytest.approx(float(row[key]), abs=0.001)
        assert found.bmjd_tdb.sigma_d == pytest.approx(0.0, abs=1e-6)
    assert find(forecast, "periastron", cycle).utc.median == row["T_peri_utc_no_barycentric_corr"] + "Z"
    assert find(forecast, "onset", cycle).utc.median == row["first_dust_utc"] + "Z"


@pytest.mark.parametrize("cycle", CYCLES)
def test_without_a_way_to_condensation_dust_appears_when_the_conditions_are_met(cycle):
    result = upcoming(pipeline_record(delayed=False), now=61_000.0, years=15)
    onset = find(result, "onset", cycle).bmjd_tdb.median
    assert onset + MJD_JD == pytest.approx(float(CYCLES[cycle]["conditions_met_from"]), abs=0.001)
    periastron = find(result, "periastron", cycle).bmjd_tdb.median
    assert periastron - onset == pytest.approx(float(EXPECTED["half_window_d"]), abs=1e-6)
    assert any("without delay" in text for text in result.assumptions)


@pytest.mark.parametrize("cycle", CYCLES)
def test_the_delay_separates_the_maximum_from_periastron(forecast, cycle):
    # Design, section 4: under the rule 'separation' the maximum is periastron plus the delay.
    wait = (
        find(forecast, "maximum", cycle).bmjd_tdb.median - find(forecast, "periastron", cycle).bmjd_tdb.median
    )
    assert wait == pytest.approx(float(EXPECTED["delay_d"]), abs=1e-6)


@pytest.mark.parametrize("cycle", CYCLES)
def test_the_errors_of_epoch_and_period_carry_to_every_event(cycle):
    row = PIPELINE
    result = upcoming(pipeline_record(row["sigma_T0_d"], row["sigma_P_d"]), now=61_000.0, years=15)
    sigma = float(CYCLES[cycle]["sigma_d(T0 20 d, P 12 d, independent)"])
    assert find(result, "periastron", cycle).bmjd_tdb.sigma_d == pytest.approx(sigma, rel=1e-8)
    # A few hours of the window's own dependence on the period stay within the 2 % of a drawn sigma.
    for event in ("onset", "maximum", "end"):
        assert find(result, event, cycle).bmjd_tdb.sigma_d == pytest.approx(sigma, rel=0.02)


def test_the_ephemeris_knows_the_phase_and_the_critical_anomaly():
    one = pipeline_record()
    orbit = one.solutions[0]
    table = ephemeris(one, orbit, 2460310.5 - MJD_JD, 2460310.5 - MJD_JD, 1.0, "")
    phase = float(EXPECTED["phase_at_JD2460310.5"])
    # Phases run from -0.5 to 0.5 here, so that an onset before periastron keeps its sign.
    assert table.rows[0].phase % 1.0 == pytest.approx(phase, abs=1e-9)
    start = float(CYCLES[2]["conditions_met_from"]) - MJD_JD
    (row,) = ephemeris(one, orbit, start, start, 1.0, "").rows
    assert -row.true_anomaly_deg == pytest.approx(float(EXPECTED["nu_crit_deg"]), abs=1e-4)
    assert row.separation_au == pytest.approx(PIPELINE["D_crit_au"], abs=1e-5)


WINDOWS = check_rows("cwb.separation_window")


@pytest.mark.parametrize(("inputs", "expected"), [w for w in WINDOWS if "result" not in w[1]])
def test_the_window_opens_and_closes_at_the_critical_separation(inputs, expected):
    period = inputs["P_yr"] * YEAR_D
    orbit = solution(
        exact(period), 61_500.0, epoch_error=0.0, eccentricity=exact(inputs["e"]), a_au=exact(inputs["a_au"])
    )
    result = upcoming(record(orbit, rule=separation_rule(inputs["D_crit_au"])), years=3)
    onset, end = (find(result, event, 0).bmjd_tdb.median for event in ("onset", "end"))
    assert 61_500.0 - onset == pytest.approx(float(expected["days_before_periastron"]), abs=1e-6)
    assert (onset - 61_500.0) / period % 1.0 == pytest.approx(float(expected["phase_in"]), abs=1e-9)
    assert (end - 61_500.0) / period == pytest.approx(float(expected["phase_out"]), abs=1e-9)
    assert (end - onset) / period == pytest.approx(float(expected["fraction_of_orbit"]), abs=2e-9)
    (row,) = ephemeris(record(orbit), orbit, end, end, 1.0, "").rows
    assert row.true_anomaly_deg == pytest.approx(float(expected["nu_crit_deg"]), abs=1e-7)


def test_a_critical_separation_beyond_apastron_has_neither_onset_nor_end():
    ((inputs, expected),) = [w for w in WINDOWS if "result" in w[1]]
    assert expected["result"] == "always"
    orbit = solution(
        inputs["P_yr"] * YEAR_D, 61_500.0, eccentricity=exact(inputs["e"]), a_au=exact(inputs["a_au"])
    )
    result = upcoming(record(orbit, rule=separation_rule(inputs["D_crit_au"])))
    events = {e.event for e in result.events}
    assert "periastron" in events
    assert not events & {"onset", "end"}
