"""The bend of a light curve and what a limit says, against values computed elsewhere.

Expected values from tests/reference/checks_episodes.csv, each with its source and basis in the row.
"""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest
import ruptures

from campaign.errors import InputRefused
from campaign.physics.censored import limit_log_likelihood
from campaign.physics.hinge import fit_hinge

FILE = Path(__file__).parent.parent / "reference" / "checks_episodes.csv"


def row(topic: str) -> tuple[dict, dict]:
    with FILE.open(newline="") as file:
        (found,) = [row for row in csv.DictReader(file) if row["topic"] == topic]
    return json.loads(found["inputs"]), json.loads(found["expected"])


@pytest.fixture(scope="module")
def curve():
    inputs, expected = row("phot.onset_hinge")
    return np.array(inputs["t_mjd"]), np.array(inputs["mag"]), inputs["sigma"], expected


def test_the_bend_of_the_reference_curve_and_its_interval(curve):
    t, mag, sigma, expected = curve
    fit = fit_hinge(t, mag, np.full(t.size, sigma))
    # Tolerances of the row: 0.05 d on the bend, 0.5 d on its ends.
    assert fit.bend == pytest.approx(float(expected["tb_mjd"]), abs=0.05)
    assert fit.low == pytest.approx(float(expected["tb_minus_1sigma(dchi2=1)"]), abs=0.5)
    assert fit.high == pytest.approx(float(expected["tb_plus_1sigma"]), abs=0.5)
    assert fit.level == pytest.approx(float(expected["a"]), rel=1e-6)
    assert fit.slope_per_d == pytest.approx(float(expected["b_mag_per_d"]), rel=1e-5)
    assert (fit.chi2, fit.dof) == (pytest.approx(float(expected["chi2"]), rel=1e-4), expected["dof"])
    assert fit.low < float(expected["truth"]) < fit.high


def test_a_step_and_a_first_bright_point_date_the_rise_much_too_late(curve):
    t, mag, sigma, expected = curve
    _, steps = row("phot.changepoint_l2")
    # jump = 1: the default looks at every fifth point only.
    found = ruptures.Dynp(model="l2", min_size=1, jump=1).fit(mag).predict(n_bkps=1)
    assert found == steps["ruptures_Dynp_l2_n1"]
    bend = fit_hinge(t, mag, np.full(t.size, sigma)).bend
    step = t[found[0]]
    first_bright = t[mag < float(expected["a"]) - 3.0 * sigma][0]
    assert first_bright == float(expected["first_point_above_3sigma_mjd"])
    # The step is half a thousand days late, the first bright point half a year: neither dates an onset.
    assert step - bend > 500.0
    assert first_bright - bend > 150.0
    assert abs(bend - float(expected["truth"])) < 1.0


def test_a_limit_counts_with_the_tail_below_it_not_with_a_density_at_it():
    inputs, expected = row("phot.censored_loglike")
    value = limit_log_likelihood(inputs["model_flux"], inputs["limit_flux_3sigma"], inputs["sigma"])
    assert float(value) == pytest.approx(float(expected["lnL=ln Phi((limit-model)/sigma)"]), rel=1e-9)
    assert float(value) != pytest.approx(float(expected["WRONG_gaussian_at_limit"]), rel=0.1)


def test_a_saturated_point_says_the_opposite_of_a_faint_one():
    # Phi(x) + Phi(-x) = 1: definition of the normal distribution.
    below, above = (np.exp(limit_log_likelihood(2.0, 2.3, 0.4, side)) for side in (1, -1))
    assert float(below + above) == pytest.approx(1.0, abs=1e-12)


@pytest.mark.parametrize("count", [0, 1, 3])
def test_too_few_points_are_refused(count):
    with pytest.raises(InputRefused) as refused:
        fit_hinge(np.arange(float(count)), np.zeros(count), np.ones(count))
    assert refused.value.code == "too-few-points"


def test_points_of_two_dates_are_refused():
    with pytest.raises(InputRefused):
        fit_hinge(np.array([1.0, 1.0, 2.0, 2.0, 2.0]), np.zeros(5), np.ones(5))
