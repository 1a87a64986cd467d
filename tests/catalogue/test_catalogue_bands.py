"""Counting magnitudes by band and photometric system, and light curves that carry it."""

from __future__ import annotations

import pytest
from catalogue_examples import bare_system, full_site, later, photometry

from campaign.catalogue import observations, sites, store, systems
from campaign.model.bands import BandUse


@pytest.fixture
def filled(write):
    """Two systems; four magnitudes in K of one of them, one of which is withdrawn."""
    with write() as writing:
        dim = systems.add_system(writing, bare_system("Dim"))
        faint = systems.add_system(writing, bare_system("Faint"))
        sites.add_site(writing, full_site())
        for day, own in enumerate(("2MASS", "MKO", "MKO", None)):
            observations.add_observation(writing, photometry(dim, 61500.0 + day, photometric_system=own))
        observations.add_observation(writing, photometry(dim, 61510.0, band="L", photometric_system="MKO"))
        observations.add_observation(writing, photometry(faint, 61520.0, photometric_system="MKO"))
        observations.add_observation(writing, photometry(faint, 61530.0, kind="flux", unit="jy"))
    with write(later(1)) as writing:
        observations.withdraw_observation(writing, 2)
    return dim, faint


def test_magnitudes_in_use_are_counted_by_system_band_and_photometric_system(filled, database):
    _, faint = filled
    with store.reading(database) as connection:
        everything = observations.band_uses(connection)
        of_one = observations.band_uses(connection, [faint])
        of_none = observations.band_uses(connection, [])
    assert set(everything) == {
        BandUse("Dim", "K", "2MASS", 1),
        BandUse("Dim", "K", "MKO", 1),
        BandUse("Dim", "K", None, 1),
        BandUse("Dim", "L", "MKO", 1),
        BandUse("Faint", "K", "MKO", 1),
    }
    assert len(everything) == 5
    assert of_one == [BandUse("Faint", "K", "MKO", 1)]
    assert of_none == []


def test_light_curves_carry_the_photometric_system_of_each_point(filled, database):
    dim, _ = filled
    with store.reading(database) as connection:
        curve = observations.photometry_arrays(connection, [dim])[dim]
    assert list(curve.band) == ["K", "K", "K", "L"]
    assert list(curve.photometric_system) == ["2MASS", "MKO", "", "MKO"]
