"""Logging: what is added, what the catalogue then knows, and what is said of the instant."""

from __future__ import annotations

import sqlite3
from dataclasses import replace

import numpy as np
import pytest
from studies_examples import CLOCK, stamp, system

from campaign.catalogue import observations, store
from campaign.errors import InputRefused, NotFound
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.systems import Episode, Site
from campaign.reading.instants import read_instant
from campaign.studies import episodes, sites, systems
from campaign.studies.log import log_observations

MESA = Site(0, "Cold Mesa", latitude_deg=-31.2, longitude_deg_east=-70.0, height_m=2_300.0)


@pytest.fixture
def lantern(db):
    systems.add_system(db, stamp(), system(0))
    sites.add_site(db, stamp(), MESA)
    return db


def draft(**fields):
    from campaign.model.instants import Moment

    return Observation(
        **{"id": 0, "uid": "", "system_id": 0, "kind": "photometry", "moment": Moment(0.0), **fields}
    )


def magnitude(mag, band="K", error=0.02, **fields):
    return draft(value=Measured(mag, error, error), unit="mag", band=band, **fields)


def log(db, drafts, at="2031-04-06T03:12:10Z", site="Cold Mesa", who=None):
    given = [drafts] if isinstance(drafts, Observation) else drafts
    return log_observations(db, who or stamp("campaign log photometry"), "Lantern 3", given, at, site)


def rows(db):
    """Counts of rows in every table, asked of SQLite itself."""
    with sqlite3.connect(db) as connection:
        names = [n for (n,) in connection.execute("select name from sqlite_master where type = 'table'")]
        return {name: connection.execute(f'select count(*) from "{name}"').fetchone()[0] for name in names}


def quiet_past(db, nights=8, mag=7.5, month=3):
    """Photometry of earlier weeks that gives the star its level; one operation a night."""
    for night in range(nights):
        wobble = 0.01 * float(np.sin(night))
        log(db, magnitude(mag + wobble), at=f"2031-{month:02d}-{10 + 2 * night:02d}T03:00:00Z")


def test_one_observation_is_one_row_with_its_observer_and_site(lantern):
    before = rows(lantern)
    logged = log(lantern, magnitude(7.31, error=0.03))
    assert logged.system == "Lantern 3" and logged.site == "Cold Mesa"
    assert [e.already_logged for e in logged.entries] == [False]
    after = rows(lantern)
    assert after["observations"] - before["observations"] == 1
    with store.reading(lantern) as connection:
        kept = observations.get_observation(connection, logged.entries[0].id)
    assert (kept.value, kept.unit, kept.band, kept.site) == (
        Measured(7.31, 0.03, 0.03),
        "mag",
        "K",
        "Cold Mesa",
    )
    assert kept.observer == "Ida Vik"
    assert kept.moment.text == "2031-04-06T03:12:10Z" and kept.moment.scale == "utc"


def test_the_instant_is_said_back_and_carried_to_the_barycentre(lantern):
    logged = log(lantern, magnitude(7.31))
    assert "2031-04-06T03:12:10" in logged.understood and "UTC" in logged.understood
    assert logged.moment_text.startswith("BMJD_TDB 62962.13") and "at the barycentre" in logged.moment_text
    # Light time is at most 8.4 min; UTC to TDB is 69 s.
    shift_s = (logged.moment.bmjd_tdb - read_instant("2031-04-06T03:12:10Z").mjd) * 86_400.0 - 69.184
    assert abs(shift_s) < 505.0 and abs(shift_s) > 1.0


def test_the_same_observation_again_adds_nothing(lantern):
    first = log(lantern, [magnitude(7.31), magnitude(6.02, "L")])
    before = rows(lantern)
    again = log(lantern, [magnitude(7.31), magnitude(6.02, "L")])
    assert rows(lantern) == before
    assert [e.already_logged for e in again.entries] == [True, True]
    assert [e.id for e in again.entries] == [e.id for e in first.entries]
    # Another error bar or note of the same value is no new observation either.
    noted = log(lantern, replace(magnitude(7.31, error=0.05), text="thin cloud"))
    assert noted.entries[0].already_logged
    assert rows(lantern) == before


@pytest.mark.parametrize(
    "other",
    [
        {"at": "2031-04-06T03:12:11Z"},
        {"site": None},
        {"drafts": magnitude(7.32)},
        {"drafts": magnitude(7.31, "H")},
        {"drafts": draft(kind="velocity", star="A", value=Measured(7.31, 0.02, 0.02), unit="kms")},
    ],
    ids=["instant", "site", "value", "band", "kind"],
)
def test_an_observation_that_differs_in_what_makes_it_is_added(lantern, other):
    log(lantern, magnitude(7.31))
    again = log(lantern, **{"drafts": magnitude(7.31), **other})
    assert not again.entries[0].already_logged
    assert rows(lantern)["observations"] == 2


def test_one_known_and_one_new_in_one_line_adds_the_new_one(lantern):
    log(lantern, magnitude(7.31))
    again = log(lantern, [magnitude(7.31), magnitude(7.95, "H")])
    assert [e.already_logged for e in again.entries] == [True, False]
    assert rows(lantern)["observations"] == 2


def test_all_or_nothing(lantern):
    before = rows(lantern)
    bad = draft(value=Measured(float("nan"), 0.1, 0.1), unit="mag", band="H")
    with pytest.raises(InputRefused):
        log(lantern, [magnitude(7.31), bad])
    assert rows(lantern) == before


def test_unknown_system_and_site_leave_everything_alone(lantern):
    before = rows(lantern)
    with pytest.raises(NotFound) as missing:
        log_observations(lantern, stamp(), "Lantren 3", [magnitude(7.3)], "2031-04-06", None)
    assert "Lantern 3" in missing.value.details["nearest"]
    with pytest.raises(NotFound):
        log(lantern, magnitude(7.3), site="Warm Mesa")
    assert rows(lantern) == before


@pytest.mark.parametrize(
    ("at", "warned"),
    [("2031-04-06T03:00:00Z", False), ("2031-04-07T23:00:00Z", False), ("2031-04-09", True), ("2041", True)],
)
def test_a_date_in_the_future_is_warned_of(lantern, at, warned):
    # The clock of these tests reads 2031-04-07T03:12:10Z.
    assert CLOCK.isoformat() == "2031-04-07T03:12:10+00:00"
    logged = log(lantern, magnitude(7.3), at=at)
    assert any("future" in text for text in logged.warnings) is warned
    assert rows(lantern)["observations"] == 1  # warned, not refused


def test_a_missing_site_is_warned_of_where_it_matters(lantern):
    assert any("no site" in text for text in log(lantern, magnitude(7.3), site=None).warnings)
    assert not log(lantern, magnitude(7.3)).warnings
    assert not log(lantern, magnitude(7.3), at="BJD 2462962.6", site=None).warnings


def test_a_night_is_that_of_the_site(lantern):
    # At 70 deg West the middle of the night of 6/7 April is 04:40 UT on the 7th.
    logged = log(lantern, magnitude(7.3), at="2031-04-06/07")
    middle = read_instant("2031-04-07T04:40:00Z").mjd
    assert logged.moment.bmjd_tdb == pytest.approx(middle, abs=0.02)
    assert logged.moment.plus_d > 0.05


# ------------------------------------------------------------------------ what is known now


def test_before_there_is_a_level_nothing_is_concluded(lantern):
    for night in range(4):
        logged = log(lantern, magnitude(7.5), at=f"2031-03-{10 + night}T03:00:00Z")
        assert logged.knowledge == (
            "K: no stellar level yet; it takes 5 points of this band and source outside episodes",
        )
    assert log(lantern, magnitude(7.5), at="2031-03-20T03:00:00Z").knowledge == ("K: quiet, no onset yet",)


def test_a_quiet_point_says_so_in_each_band(lantern):
    quiet_past(lantern)
    logged = log(lantern, [magnitude(7.51), magnitude(6.0, "L")])
    assert logged.knowledge[0] == "K: quiet, no onset yet"
    assert logged.knowledge[1].startswith("L: no stellar level yet")
    assert not logged.suspected


def test_a_strong_excess_suspects_an_onset(lantern):
    quiet_past(lantern)
    logged = log(lantern, magnitude(7.1))
    assert logged.suspected
    assert logged.knowledge[0].endswith("onset suspected since 2031-04-06")
    assert logged.knowledge[1].startswith("confirm it with: campaign episodes add 'Lantern 3' --onset ")
    assert logged.knowledge[2] == "or reject it with: campaign amend N --quality bad"
    assert logged.suspicion is not None and logged.suspicion.bands == ("K",)


def test_a_weak_excess_asks_for_another_look_and_the_second_one_suspects(lantern):
    quiet_past(lantern)
    first = log(lantern, magnitude(7.38), at="2031-04-01T03:00:00Z")
    assert not first.suspected and "observe again within 30 d" in first.knowledge[0]
    second = log(lantern, magnitude(7.38), at="2031-04-05T03:00:00Z")
    assert second.suspected and "onset suspected" in second.knowledge[0]


def test_an_excess_within_a_confirmed_episode_is_explained(lantern):
    quiet_past(lantern, month=1)  # a level is taken well before the onset
    onset = read_instant("2031-03-30", default_place="geocentre")
    episodes.add_episode(lantern, stamp(), "Lantern 3", Episode(0, 0, 2), {"onset": (onset, "K", None)})
    logged = log(lantern, magnitude(6.9))
    assert not logged.suspected
    assert "as in the confirmed episode of cycle 2" in logged.knowledge[0]


@pytest.mark.parametrize("quality", ["doubtful", "bad"])
def test_nothing_is_concluded_from_a_point_that_is_not_good(lantern, quality):
    quiet_past(lantern)
    logged = log(lantern, magnitude(5.0, quality=quality))
    assert not logged.suspected
    assert logged.knowledge == (f"K: {quality}, so nothing is concluded from it",)


def test_limits_reassure_only_where_they_reach_deep_enough(lantern):
    quiet_past(lantern)
    deep, shallow = (
        log(
            lantern,
            draft(value=Measured(bound), unit="mag", band="K", limit_side="above", limit_sigma=3.0),
            at=at,
        )
        for bound, at in ((7.45, "2031-04-02T03:00:00Z"), (5.0, "2031-04-03T03:00:00Z"))
    )
    assert deep.knowledge == ("K: quiet, no onset yet",)
    assert shallow.knowledge == ("K: the limit says nothing about an excess here",)


def test_a_point_too_uncertain_says_so(lantern):
    quiet_past(lantern)
    assert log(lantern, magnitude(7.4, error=0.5)).knowledge == ("K: too uncertain to tell an excess",)


def test_other_kinds_are_counted(lantern):
    def velocity(kms):
        return draft(kind="velocity", star="A", value=Measured(kms, 1.0, 1.0), unit="kms")

    assert log(lantern, velocity(-20.0)).knowledge == ("1 velocity of this system logged so far",)
    assert log(lantern, velocity(-21.0)).knowledge == ("2 velocities of this system logged so far",)
    remark = draft(kind="remark", text="looks redder")
    assert log(lantern, remark).knowledge == ("1 remark of this system logged so far",)


def test_who_observed_may_differ_from_who_types(lantern):
    logged = log(lantern, magnitude(7.3, observer="Per Lund"), who=Stamp(CLOCK, "Ida Vik", "campaign log"))
    assert logged.entries[0].observation.observer == "Per Lund"
