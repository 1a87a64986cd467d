"""Phases from periastron beyond half a turn, without jumps."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad

from campaign.physics.eventtimes import conjunction_offset_phase


def swept_area_share(e, nu):
    """Kepler's second law by quadrature: share of the ellipse's area swept from periastron."""
    area, _ = quad(lambda v: 0.5 * ((1 - e * e) / (1 + e * np.cos(v))) ** 2, 0.0, nu, epsabs=1e-13, limit=400)
    return area / (np.pi * np.sqrt(1 - e * e))


@pytest.mark.parametrize("e", [0.0, 0.3, 0.8, 0.95])
@pytest.mark.parametrize("nu_deg", [-350.0, -181.0, -179.0, -20.0, 0.0, 90.0, 179.9, 180.1, 270.0, 400.0])
def test_the_phase_is_the_share_of_the_area_swept(e, nu_deg):
    found = float(conjunction_offset_phase(e, np.radians(nu_deg)))
    assert found == pytest.approx(swept_area_share(e, np.radians(nu_deg)), abs=1e-9)


@given(e=st.floats(0.0, 0.95), nu_deg=st.floats(-720.0, 720.0))
@settings(max_examples=200, deadline=None)
def test_a_whole_turn_more_is_one_period_later(e, nu_deg):
    first, second = (float(conjunction_offset_phase(e, np.radians(nu_deg + turn))) for turn in (0.0, 360.0))
    assert second - first == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("e", [0.0, 0.5, 0.95])
def test_the_phase_grows_without_a_jump_through_apastron(e):
    nu = np.radians(np.linspace(170.0, 190.0, 2001))
    steps = np.diff(conjunction_offset_phase(e, nu))
    assert (steps > 0.0).all()
    assert steps.max() < 3.0 * (1 + e) ** 2 / (1 - e * e) ** 1.5 * np.radians(0.01) / (2 * np.pi) + 1e-12
    assert float(conjunction_offset_phase(e, np.pi)) == pytest.approx(0.5, abs=1e-12)
