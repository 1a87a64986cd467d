"""Which shells an image shows: counted by hand."""

from __future__ import annotations

import numpy as np
import pytest

from campaign.errors import InputRefused
from campaign.physics.shellexpectation import shells_in_view


def test_twenty_shells_of_an_eight_year_binary_in_a_field_of_28_arcsec():
    """Counted by hand: spacing 1 arcsec, the newest at 0.4; out to 14 arcsec there are 14."""
    radius = 0.4 + np.arange(20.0)
    view = shells_in_view(radius, field_arcsec=28.0, resolution_arcsec=0.5)
    assert view.in_view.sum() == 13
    assert (view.within_inner, view.beyond_outer) == (1, 6)
    narrow = shells_in_view(radius, field_arcsec=28.0, outer_radius_arcsec=5.0)
    assert narrow.in_view.sum() == 5
    mask = shells_in_view(radius, resolution_arcsec=2.0)
    assert mask.within_inner == 2


def test_a_shell_that_is_not_launched_is_never_in_view():
    assert shells_in_view([0.0, 1.0]).in_view.tolist() == [False, True]


@pytest.mark.parametrize(
    "limits",
    [
        {"field_arcsec": 0.0},
        {"resolution_arcsec": -0.1},
        {"field_arcsec": 1.0, "resolution_arcsec": 0.6},
    ],
)
def test_views_that_cannot_be_are_refused(limits):
    with pytest.raises(InputRefused) as refused:
        shells_in_view([1.0], **limits)
    assert refused.value.code == "view-refused"
