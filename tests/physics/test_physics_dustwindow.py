"""When the separation is small enough for dust: rows of checks_forecast.csv (source in each), geometry."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from physics_reference import FOLDER

from campaign.physics.dustwindow import production_half_window_d, travel_delay_d


def rows(topic):
    with (FOLDER / "checks_forecast.csv").open(newline="") as file:
        chosen = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert chosen
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in chosen]


@pytest.mark.parametrize(("inputs", "expected"), rows("cwb.separation_window"))
def test_the_window_of_the_reference_rows(inputs, expected):
    found = production_half_window_d(
        inputs["P_yr"] * 365.25, inputs["e"], inputs["a_au"], inputs["D_crit_au"]
    )
    if expected.get("result") == "always":
        assert found == np.inf
    else:
        assert float(found) == pytest.approx(float(expected["days_before_periastron"]), rel=1e-10)


@pytest.mark.parametrize(("inputs", "expected"), rows("dust.onset_delay"))
def test_the_delay_of_the_reference_rows(inputs, expected):
    found = float(travel_delay_d(inputs["r_cond_au"], inputs["v_kms"]))
    assert found == pytest.approx(float(expected["delay_d"]), rel=1e-9)
    assert found / 365.25 == pytest.approx(float(expected["delay_yr"]), rel=1e-9)


@given(
    e=st.floats(0.01, 0.97),
    a=st.floats(1.0, 60.0),
    share=st.floats(0.001, 0.999),
    period=st.floats(200.0, 20_000.0),
)
@settings(max_examples=200, deadline=None)
def test_at_the_edge_of_the_window_the_pair_is_at_the_critical_separation(e, a, share, period):
    # Kepler's equation solved here by bisection, not by the package.
    critical = a * ((1.0 - e) + share * 2.0 * e)
    half = float(production_half_window_d(period, e, a, critical))
    mean = 2.0 * np.pi * half / period
    low, high = 0.0, np.pi
    for _ in range(80):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if middle - e * np.sin(middle) < mean else (low, middle)
    assert a * (1.0 - e * np.cos(low)) == pytest.approx(critical, rel=1e-9)


@given(e=st.floats(0.0, 0.99), a=st.floats(1.0, 60.0), off=st.floats(1e-6, 0.5))
@settings(max_examples=100, deadline=None)
def test_nearer_than_periastron_never_and_farther_than_apastron_always(e, a, off):
    assert np.isnan(production_half_window_d(3000.0, e, a, a * (1.0 - e) * (1.0 - off)))
    assert production_half_window_d(3000.0, e, a, a * (1.0 + e) * (1.0 + off)) == np.inf


def test_many_draws_at_once_keep_to_themselves():
    e = np.array([[0.8, np.nan, 0.2]])
    found = production_half_window_d(3000.0, e, 16.0, np.array([[6.4, 6.4, 6.4]]))
    assert np.isfinite(found[0, 0]) and np.isnan(found[0, 1:]).all()
