"""Magnitudes of different photometric systems are told apart, warned about and never averaged.

Common practice, no source: K of one photometric system differs from K of another by 0.1 to 0.2 mag.
"""

import numpy as np
import pytest
from studies_examples import CLOCK, NOW, YEAR_D, exact, light_curve, moment, record, stamp, system

from campaign.catalogue import observations, store, systems
from campaign.model.bands import BandUse, MixedBand
from campaign.model.observations import Observation
from campaign.studies.bands import band_warnings, mixed_bands
from campaign.studies.begin import begin_campaign
from campaign.studies.judging import judge
from campaign.studies.observations import Wanted, list_observations
from campaign.studies.quietness import suspected_since

SYSTEM = "Lantern 3"


def use(band, photometric_system, points=1, system=SYSTEM):
    return BandUse(system, band, photometric_system, points)


def test_one_photometric_system_a_band_is_no_mixture():
    assert mixed_bands([use("K", "2MASS", 40), use("L", "MKO", 7), use("K", "2MASS", 2)]) == ()


def test_two_photometric_systems_of_one_band_are_a_mixture():
    assert mixed_bands([use("K", "MKO", 3), use("K", "2MASS", 40), use("J", "2MASS", 5)]) == (
        MixedBand(SYSTEM, "K", ("2MASS", "MKO"), 0, 43),
    )


def test_magnitudes_that_state_no_photometric_system_are_found():
    assert mixed_bands([use("K", None, 3), use("K", "2MASS", 40), use("L", None, 2)]) == (
        MixedBand(SYSTEM, "K", ("2MASS",), 3, 43),
        MixedBand(SYSTEM, "L", (), 2, 2),
    )


def test_the_same_name_in_other_case_and_spacing_is_one_photometric_system():
    assert mixed_bands([use("K", "2MASS"), use("K", "2mass"), use("K", "2 MASS")]) == ()


def test_bands_of_different_systems_and_case_are_different_bands():
    assert mixed_bands([use("K", "2MASS"), use("K", "MKO", system="Lantern 4"), use("k", "MKO")]) == ()


@pytest.mark.parametrize(
    ("uses", "told"),
    [
        ([use("K", "2MASS", 40), use("K", "MKO", 3)],
         "Lantern 3, band K: 43 magnitudes in different photometric systems (2MASS, MKO);"
         " they are never averaged together."),
        ([use("K", "2MASS", 40), use("K", "MKO", 3), use("K", None, 5)],
         "Lantern 3, band K: 48 magnitudes in different photometric systems (2MASS, MKO);"
         " they are never averaged together, and 5 of 48 magnitudes do not say their photometric system."),
        ([use("K", "2MASS", 40), use("K", None, 5)],
         "Lantern 3, band K: 5 of 45 magnitudes do not say their photometric system,"
         " the others are in 2MASS; they are never averaged together."),
        ([use("K", None, 5)], "Lantern 3, band K: no magnitude of 5 says its photometric system."),
    ],
)  # fmt: skip
def test_a_warning_says_where_and_what(uses, told):
    assert band_warnings(mixed_bands(uses)) == (told,)


def test_many_mixed_bands_are_told_in_a_few_lines():
    told = band_warnings(mixed_bands(use(f"b{number:02}", None) for number in range(37)))
    assert len(told) == 11
    assert told[-1] == "Photometric systems are mixed or unknown in 27 more bands."


def half_and_half(first, second, shift_mag):
    """Years of quiet photometry; every second point lies ``shift_mag`` brighter and says ``second``."""
    times = np.arange(50_000.0, 50_000.0 + 4 * YEAR_D, 10.0)
    odd = np.arange(times.size) % 2 == 1
    mags = np.where(odd, 7.5 - shift_mag, 7.5) + 0.005 * np.sin(np.arange(times.size))
    stated = [second if each else first for each in odd]
    return light_curve(times.tolist(), mags.tolist(), photometric_system=stated), odd


def test_levels_are_taken_of_one_photometric_system_alone():
    curve, _ = half_and_half("2MASS", "MKO", 0.2)
    judged = judge(record(), curve, 60_000.0)
    # Each photometric system has its own level, so that no point stands out and all are quiet.
    assert np.abs(judged.excess_sigma).max() < 1.0
    assert judged.is_quiet.all()


def test_a_change_of_photometric_system_is_no_onset():
    times = np.arange(50_000.0, 52_000.0, 10.0)
    late = times > 51_500.0
    mags = np.where(late, 7.3, 7.5) + 0.005 * np.sin(np.arange(times.size))
    for stated, suspected in (
        (["MKO" if each else "2MASS" for each in late], False),
        (["2MASS"] * times.size, True),
    ):
        judged = judge(record(), light_curve(times.tolist(), mags.tolist(), photometric_system=stated), 6e4)
        assert (suspected_since(judged, 51_000.0, 52_000.0) is not None) is suspected


def test_names_that_differ_in_case_share_a_level():
    curve, _ = half_and_half("2MASS", "2mass", 0.0)
    assert judge(record(), curve, 60_000.0).is_quiet.all()


def test_a_list_of_observations_warns_of_bands_that_mix_and_not_of_those_that_state_none(tmp_path):
    path = str(tmp_path / "campaign.db")
    begin_campaign(path, stamp())
    with store.writing(path, at=CLOCK, who="Ida Vik", command="campaign test") as writing:
        number = systems.add_system(writing, system())
        for day, (band, own) in enumerate((("K", "2MASS"), ("K", "MKO"), ("L", None), ("J", "MKO"))):
            observations.add_observation(
                writing,
                Observation(0, "", number, "photometry", moment(NOW + day), exact(7.0), "mag", band=band,
                            photometric_system=own),
            )  # fmt: skip
    listed = list_observations(path, Wanted())
    (told,) = listed.warnings
    assert told.startswith("Lantern 3, band K: 2 magnitudes in different photometric systems (2MASS, MKO)")
    assert list_observations(path, Wanted(bands=("L", "J"))).warnings == ()
