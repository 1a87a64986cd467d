"""Beginning a database and keeping systems, sites, rules and episodes in it; asking it questions."""

from __future__ import annotations

import sqlite3
from dataclasses import replace
from datetime import timedelta
from pathlib import Path

import pytest
from studies_examples import CLOCK, YEAR_D, exact, find, lag_rule, separation_rule, stamp, system

from campaign.errors import CampaignError, Conflict, DatabaseUnusable, InputRefused, NotFound
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.model.systems import DustRule, Episode, Site, Solution, Star
from campaign.reading.instants import read_instant
from campaign.studies import begin, episodes, rules, sites, solutions, systems, watch
from campaign.studies.cycles import with_cycles
from campaign.studies.sample import load_sample


def content(path):
    """Every row of every table, asked of SQLite itself."""
    with sqlite3.connect(path) as connection:
        names = [n for (n,) in connection.execute("select name from sqlite_master where type = 'table'")]
        return {name: connection.execute(f'select * from "{name}"').fetchall() for name in names}


# -------------------------------------------------------------------------------------- begin


def test_beginning_twice_changes_nothing(tmp_path):
    path = str(tmp_path / "campaign.db")
    first = begin.begin_campaign(path, stamp())
    before = content(path)
    again = begin.begin_campaign(path, stamp())
    assert first.changed and not again.changed
    assert "already there" in again.lines[0]
    assert content(path) == before


def test_beginning_where_systems_are_kept_loses_none(tmp_path):
    path = str(tmp_path / "campaign.db")
    begin.begin_campaign(path, stamp())
    systems.add_system(path, stamp(), system(0))
    assert not begin.begin_campaign(path, stamp()).changed
    assert [r.system.name for r in systems.list_systems(path, True)] == ["Lantern 3"]


def test_the_sample_goes_only_into_an_empty_database(tmp_path):
    path = str(tmp_path / "campaign.db")
    begin.begin_campaign(path, stamp())
    systems.add_system(path, stamp(), system(0))
    before = content(path)
    with pytest.raises(Conflict) as refused:
        begin.begin_sample_campaign(path, stamp())
    assert refused.value.code == "database-not-empty" and "demo.db" in refused.value.hint
    assert content(path) == before


def test_a_retired_system_also_makes_a_database_not_empty(tmp_path):
    path = str(tmp_path / "campaign.db")
    begin.begin_campaign(path, stamp())
    systems.add_system(path, stamp(), system(0))
    systems.retire_system(path, stamp(), "Lantern 3")
    with pytest.raises(Conflict):
        begin.begin_sample_campaign(path, stamp())


@pytest.fixture(scope="module")
def sample_db(tmp_path_factory):
    path = str(tmp_path_factory.mktemp("sample") / "demo.db")
    kept = begin.begin_sample_campaign(path, stamp("campaign begin --sample"))
    return path, kept


def test_the_sample_in_a_database_is_counted(sample_db):
    path, kept = sample_db
    sample = load_sample()
    assert kept.changed
    assert kept.data["systems"] == len(sample.records)
    assert kept.data["observations"] == len(sample.observations())
    assert kept.data["episodes"] == sum(len(r.episodes) for r in sample.records)
    assert any("invented" in line for line in kept.lines)
    with pytest.raises(Conflict):
        begin.begin_sample_campaign(path, stamp())


def asked(campaign, **fields):
    return watch.ask(
        campaign,
        **{
            "now": CLOCK, "as_of": None, "start": None, "end": None, "within_d": None, "events": (),
            "min_probability": 0.0, "draws": None, "seed": None, "solutions": "adopted", **fields,
        },
    )  # fmt: skip


def test_the_sample_forecasts_the_same_from_a_database_and_without_one(sample_db):
    """Storing and loading loses nothing: every date, interval and status is the same."""
    stored = watch.load_campaign(sample_db[0], None, None, None)
    direct = watch.load_sample_campaign(None)
    assert stored.is_sample and stored.own_as_of == pytest.approx(direct.own_as_of, abs=3e-8)  # 2 ms
    first, second = (watch.upcoming(c, asked(c)) for c in (stored, direct))
    one, two = ({(e.system, e.event, e.cycle): e for e in r.events} for r in (first, second))
    assert one.keys() == two.keys()
    for key, event in one.items():
        other = two[key]
        assert (event.status, event.notes) == (other.status, other.notes)
        assert event.utc == other.utc
        assert event.probability == other.probability


# -------------------------------------------------------------------------------------- systems


def test_a_system_is_kept_as_given_and_found_by_any_of_its_names(db):
    given = system(
        0, aliases=("Net 12",), distance_pc=Measured(2_100.0, 200.0, 300.0), priority=1,
        star_a=Star("A", "WC7", wind_speed_kms=Measured(2_800.0, 100.0, 100.0)),
    )  # fmt: skip
    systems.add_system(db, stamp(), given)
    for name in ("Lantern 3", "lantern3", "  LANTERN   3", "net12"):
        found = systems.load_record(db, name).system
        assert replace(found, id=0) == given
    with pytest.raises(Conflict):
        systems.add_system(db, stamp(), system(0, name="NET 12"))


def test_an_unknown_system_offers_the_nearest_names(db):
    systems.add_system(db, stamp(), system(0))
    with pytest.raises(NotFound) as missing:
        systems.show_system(db, "Lantren 3")
    assert missing.value.details["nearest"] == ["Lantern 3"]


def test_only_what_is_given_changes(db):
    systems.add_system(db, stamp(), system(0, star_a=Star("A", "WC7"), notes="old"))
    kept = systems.change_system(
        db, stamp(), "Lantern 3", {"star_a": {"mass_msun": exact(12.0)}, "priority": 2}
    )
    assert kept.changed
    found = systems.load_record(db, "Lantern 3").system
    assert found.star_a == Star("A", "WC7", mass_msun=exact(12.0))
    assert (found.priority, found.notes) == (2, "old")
    assert not systems.change_system(db, stamp(), "Lantern 3", {"priority": 2}).changed


def test_a_replaced_name_stays_as_an_alias(db):
    systems.add_system(db, stamp(), system(0, aliases=("Net 12",)))
    systems.change_system(db, stamp(), "Lantern 3", {"name": "Lantern 3 A"})
    found = systems.load_record(db, "lantern 3").system
    assert found.name == "Lantern 3 A" and set(found.aliases) == {"Lantern 3", "Net 12"}


def test_a_retired_system_is_out_of_the_watch_and_in_the_catalogue(db):
    systems.add_system(db, stamp(), system(0))
    assert systems.retire_system(db, stamp(), "Lantern 3").changed
    assert not systems.retire_system(db, stamp(), "Lantern 3").changed
    assert systems.list_systems(db, False) == []
    assert systems.list_systems(db, True)[0].system.state == "retired"
    assert watch.load_campaign(db, None, None, None).records == ()


@pytest.mark.parametrize(
    ("parallax", "method"),
    [
        (Measured(0.5, 0.02, 0.02), "plain inversion"),
        (Measured(0.5, 0.2, 0.2), "exponentially decreasing"),
        (Measured(0.5), "error unknown"),
    ],
)
def test_a_parallax_is_turned_into_a_distance_and_the_way_is_said(db, parallax, method):
    kept = systems.add_system(db, stamp(), system(0, parallax_mas=parallax))
    solutions.add_solution(
        db, stamp(), "Lantern 3", Solution(0, 0, "first", period_d=exact(3_000.0), a_arcsec=exact(0.008)),
        read_instant("MJD 58000", default_scale="tdb", default_place="barycentre"), None, None, True,
    )  # fmt: skip
    derived = {(d.quantity, d.unit): d for d in systems.show_system(db, "Lantern 3").derived}
    distance, size = derived["distance", "pc"], derived["semi-major axis", "au"]
    assert method in distance.how
    assert size.value.value == pytest.approx(0.008 * distance.value.value, rel=0.01)
    if parallax.error_known:
        assert method in "\n".join(kept.lines)
        assert distance.value.minus > 0 and distance.value.plus > 0
    else:
        assert (distance.value.value, distance.value.minus) == (2_000.0, None)
        assert size.value.minus is None  # unknown stays unknown
    if method == "plain inversion":
        assert (
            distance.value == pytest.approx(Measured(2_000.0, 80.0, 80.0)) or distance.value.value == 2_000.0
        )


def test_errors_of_derived_values_follow_from_those_of_the_elements(db):
    systems.add_system(db, stamp(), system(0, distance_pc=Measured(2_000.0, 100.0, 100.0)))
    draft = Solution(
        0, 0, "first", period_d=exact(3_000.0), eccentricity=exact(0.5), k_a_kms=Measured(30.0, 0.3, 0.3),
        k_b_kms=Measured(15.0, 0.3, 0.3), a_arcsec=Measured(0.008, 0.0002, 0.0002),
    )  # fmt: skip
    epoch = read_instant("MJD 58000", default_scale="tdb", default_place="barycentre")
    solutions.add_solution(db, stamp(), "Lantern 3", draft, epoch, None, None, True)
    derived = {d.quantity: d.value for d in systems.show_system(db, "Lantern 3").derived}
    # Relative errors of a product and of a quotient add in squares.
    size, ratio = derived["semi-major axis"], derived["mass ratio B/A"]
    assert size.value == pytest.approx(16.0, rel=0.005)
    assert 0.5 * (size.minus + size.plus) == pytest.approx(16.0 * (0.05**2 + 0.025**2) ** 0.5, rel=0.03)
    assert ratio.value == pytest.approx(2.0, rel=0.005)
    assert 0.5 * (ratio.minus + ratio.plus) == pytest.approx(2.0 * (0.01**2 + 0.02**2) ** 0.5, rel=0.03)


# -------------------------------------------------------------------------------- rules, sites, episodes


def test_a_rule_is_kept_and_replaced(db):
    systems.add_system(db, stamp(), system(0))
    assert rules.show_rule(db, "Lantern 3") == ("Lantern 3", None)
    rules.set_rule(db, stamp(), "Lantern 3", lag_rule(-40.0, 60.0, 200.0, scatter_onset_d=5.0))
    rules.set_rule(db, stamp(), "Lantern 3", separation_rule(6.4))
    _, found = rules.show_rule(db, "lantern 3")
    assert found.kind == "separation" and found.critical_separation_au == exact(6.4) and found.onset is None


@pytest.mark.parametrize(
    ("rule", "code"),
    [
        (DustRule(0, 0, "lag"), "rule-empty"),
        (DustRule(0, 0, "phase"), "rule-empty"),
        (DustRule(0, 0, "separation"), "rule-empty"),
        (separation_rule(6.4, flow_speed_kms=exact(2_000.0)), "rule-half"),
        (separation_rule(6.4, condensation_distance_au=exact(100.0)), "rule-half"),
        (lag_rule(60.0, -40.0, 200.0), "rule-order"),
        (lag_rule(10.0, None, -20.0), "rule-order"),
    ],
)
def test_a_rule_that_lacks_something_or_runs_backwards_is_refused(db, rule, code):
    systems.add_system(db, stamp(), system(0))
    before = content(db)
    with pytest.raises(InputRefused) as refused:
        rules.set_rule(db, stamp(), "Lantern 3", rule)
    assert refused.value.code == code and refused.value.hint
    assert content(db) == before


def test_sites_on_the_ground_and_in_space_are_kept_and_described(db):
    kept = sites.add_site(
        db, stamp(), Site(0, "Cold Mesa", latitude_deg=-31.2, longitude_deg_east=-70.0, height_m=2_300.0)
    )
    assert "31.2000 S, 70.0000 W, 2300 m" in kept.lines[0]
    kept = sites.add_site(
        db, stamp(), Site(0, "High Kite", "space", elongation_min_deg=85.0, elongation_max_deg=135.0)
    )
    assert "85 to 135 deg from the Sun" in kept.lines[0]
    assert [s.name for s in sites.list_sites(db)] == ["Cold Mesa", "High Kite"]


@pytest.mark.parametrize(
    "site",
    [
        Site(0, "Nowhere"),
        Site(0, "Half", latitude_deg=10.0),
        Site(0, "Kite", "space"),
        Site(0, "Kite", "space", elongation_min_deg=135.0, elongation_max_deg=85.0),
    ],
)
def test_a_site_without_a_place_is_refused(db, site):
    with pytest.raises(InputRefused):
        sites.add_site(db, stamp(), site)
    assert sites.list_sites(db) == []


def dated(**texts):
    return {
        name: (read_instant(text, default_place="geocentre"), "K", "broken line")
        for name, text in texts.items()
    }


def test_an_episode_is_kept_with_its_dates_as_understood(db):
    systems.add_system(db, stamp(), system(0))
    kept = episodes.add_episode(
        db,
        stamp(),
        "Lantern 3",
        Episode(0, 0, 2, source="Night book"),
        dated(onset="2019-03-14±5 d", end="2019-11±20 d"),
    )
    assert any("onset understood as BMJD_TDB 58556" in line for line in kept.lines)
    ((name, found),) = episodes.list_episodes(db, "lantern 3")
    assert name == "Lantern 3" and (found.cycle, found.source, found.maximum) == (2, "Night book", None)
    assert found.onset.band == "K" and found.onset.method == "broken line"
    assert found.onset.moment.plus_d == pytest.approx(5.0)
    assert found.end.moment.bmjd_tdb > found.onset.moment.bmjd_tdb
    assert episodes.list_episodes(db, None) == [(name, found)]


def test_episodes_out_of_order_or_without_a_date_are_refused(db):
    systems.add_system(db, stamp(), system(0))
    with pytest.raises(InputRefused) as refused:
        episodes.add_episode(
            db, stamp(), "Lantern 3", Episode(0, 0, 2), dated(onset="2019-03-14", maximum="2018-03-14")
        )
    assert refused.value.code == "episode-order"
    with pytest.raises(InputRefused) as refused:
        episodes.add_episode(db, stamp(), "Lantern 3", Episode(0, 0, 2), {})
    assert refused.value.code == "episode-empty"
    assert episodes.list_episodes(db, None) == []


def test_a_cycle_has_one_onset_and_what_was_undated_may_come_later(db):
    systems.add_system(db, stamp(), system(0))
    episodes.add_episode(db, stamp(), "Lantern 3", Episode(0, 0, 2), dated(onset="2019-03-14±5 d"))
    with pytest.raises(Conflict) as refused:
        episodes.add_episode(db, stamp(), "Lantern 3", Episode(0, 0, 2), dated(onset="2019-04-14±5 d"))
    assert refused.value.code == "episode-known" and "episodes list" in refused.value.hint
    episodes.add_episode(db, stamp(), "Lantern 3", Episode(0, 0, 2), dated(end="2019-11-20±20 d"))
    episodes.add_episode(db, stamp(), "Lantern 3", Episode(0, 0, 3), dated(onset="2027-03-14±5 d"))
    (one,) = watch.load_campaign(db, None, None, None).records
    told = with_cycles(one, [], None)
    assert [(e.cycle, e.onset is not None, e.end is not None) for e in told] == [
        (2, True, True),
        (3, True, False),
    ]


# -------------------------------------------------------------------------------------- asking


def test_the_period_asked_about_runs_from_now_for_five_years_unless_said(db):
    campaign = watch.load_campaign(db, None, None, None)
    plain = asked(campaign)
    assert plain.start == plain.as_of == pytest.approx(watch.mjd_of(CLOCK))
    assert plain.end - plain.start == pytest.approx(5 * YEAR_D)
    within = asked(campaign, within_d=100.0, start=read_instant("2031-06-01"))
    assert within.end - within.start == pytest.approx(100.0)
    until = asked(campaign, end=read_instant("2032-01-01T00:00:00Z"))
    assert until.end == pytest.approx(watch.axis_instant(read_instant("2032-01-01T00:00:00Z")))
    other = asked(campaign, as_of=read_instant("2025-01-01T00:00:00Z"))
    assert other.start == other.as_of < plain.as_of


def test_a_clock_reading_is_carried_to_the_axis_with_its_leap_seconds():
    # TDB - UTC is 69.184 s in 2031 as far as anybody knows (reference sheet, section 3).
    as_text = read_instant("2031-04-07T03:12:10Z")
    assert (watch.mjd_of(CLOCK) - as_text.mjd) * 86_400.0 == pytest.approx(69.184, abs=0.003)
    assert watch.mjd_of(CLOCK + timedelta(days=1)) - watch.mjd_of(CLOCK) == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize(
    "fields",
    [
        {"end": "2030-01-01"},
        {"start": "2031-06-01", "end": "2031-05-01"},
        {"within_d": -5.0},
        {"within_d": 100.0, "end": "2033-01-01"},
    ],
)
def test_a_period_that_ends_before_it_begins_or_is_given_twice_is_refused(db, fields):
    campaign = watch.load_campaign(db, None, None, None)
    read = {k: read_instant(v) if isinstance(v, str) else v for k, v in fields.items()}
    with pytest.raises(InputRefused) as refused:
        asked(campaign, **read)
    assert refused.value.code == "span-refused"


def test_an_unknown_name_in_the_sample_offers_the_nearest():
    with pytest.raises(NotFound) as missing:
        watch.load_sample_campaign(["Kettel 7"])
    assert "Kettle 7" in missing.value.details["nearest"]


def test_known_at_hides_what_was_entered_later_and_as_of_what_happened_later(db):
    def at(days):
        return Stamp(CLOCK + timedelta(days=days), "Ida Vik", "campaign test")

    systems.add_system(db, at(0), system(0))
    epoch = read_instant("2031-05-01±9 d", default_scale="tdb", default_place="barycentre")
    first = Solution(0, 0, "first", period_d=Measured(3_000.0, 5.0, 5.0))
    solutions.add_solution(db, at(0), "Lantern 3", first, epoch, None, None, True)
    rules.set_rule(db, at(0), "Lantern 3", lag_rule(-40.0, 60.0, 200.0))
    seen = dated(onset="2031-03-20±3 d")
    episodes.add_episode(db, at(10), "Lantern 3", Episode(0, 0, 0), seen)

    def onset(as_of, known_at=None):
        now, known = read_instant(as_of), None if known_at is None else read_instant(known_at)
        campaign = watch.load_campaign(db, None, known, now)
        return find(
            watch.upcoming(campaign, asked(campaign, as_of=now, start=read_instant("2031-01-01"))), "onset", 0
        )

    assert onset("2031-04-20").observed
    assert not onset("2031-04-20", "2031-04-10").observed  # not yet entered
    assert not onset("2031-03-10").observed  # not yet happened
    assert onset("2031-04-20", "2031-04-18").status == "under way"


def test_a_database_that_is_not_there_says_how_to_begin(tmp_path):
    with pytest.raises(DatabaseUnusable) as refused:
        systems.list_systems(str(tmp_path / "none.db"), True)
    assert "begin" in refused.value.hint
    assert not Path(tmp_path / "none.db").exists()
    assert isinstance(refused.value, CampaignError) and refused.value.exit_status == 7
