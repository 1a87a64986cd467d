"""The phase of a launch, carried by hand."""

from __future__ import annotations

import pytest

from campaign.errors import InputRefused
from campaign.physics.shellcycles import phase_of_launch


def test_phases_are_counted_from_the_nearest_periastron():
    assert phase_of_launch([1999.2, 2000.8, 2003.999, 2004.0], 2000.0, 8.0).tolist() == pytest.approx(
        [-0.1, 0.1, 0.499875, -0.5]
    )


def test_a_phase_without_a_period_is_refused():
    with pytest.raises(InputRefused):
        phase_of_launch([2000.0], 2000.0, -8.0)
