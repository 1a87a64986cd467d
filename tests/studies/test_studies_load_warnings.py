"""Each warning of a load in a case where it must come and in cases where it must not.

Expectations: the words of the issue (5 sigma from neighbours, the future, outside the night, a band whose
system is unknown, an implausible error, HJD declared as UTC by its seasons, another alias) and, for the Sun,
local noon from the longitude of the site. The clock of the tests stands at 2031-04-07T03:12:10Z.
"""

from __future__ import annotations

import math
import shutil

import pytest
from load_examples import begin, kept, load
from studies_examples import CLOCK, stamp

from campaign.catalogue import observations, store
from campaign.studies.undo import undo

HEAD = "system,{time},band,mag,e_mag,photometric_system\n"


@pytest.fixture(scope="module")
def begun(tmp_path_factory):
    return begin(tmp_path_factory.mktemp("warnings") / "campaign.db")


@pytest.fixture
def db(begun, tmp_path):
    return shutil.copy(begun, tmp_path / "campaign.db")


def warned(loaded):
    assert not loaded.bad
    return {warning.code: warning for warning in loaded.warnings}


def curve(rows, *, time="BJD_TDB", system="Lantern 3", band="K"):
    """A light curve of (days, magnitude, error)."""
    lines = [f"{system},{at:.5f},{band},{mag},{error},Vega" for at, mag, error in rows]
    return HEAD.format(time=time) + "\n".join(lines) + "\n"


QUIET = [(2461000.5 + n, 7.3, 0.02) for n in range(5)]


def with_middle(mag, error):
    return [*QUIET[:2], (QUIET[2][0], mag, error), *QUIET[3:]]


# Errors of 0.02 mag each: the difference to a neighbour has an error of 0.029 mag, 5 sigma are 0.146 mag.
@pytest.mark.parametrize(
    ("rows", "told"),
    [
        (with_middle(7.45, 0.02), True),
        (with_middle(7.43, 0.02), False),
        (with_middle(5.0, 0.7), False),
        (with_middle(5.0, ""), False),
        (with_middle(">5.0", ""), False),
        ([*QUIET, (QUIET[-1][0] + 1.0, 5.0, 0.02)], True),
        ([(QUIET[0][0] - 1.0, 5.0, 0.02), *QUIET], True),
        ([*QUIET, (QUIET[-1][0] + 40.0, 5.0, 0.02)], False),
        ([*QUIET[:2], (QUIET[2][0], 6.9, 0.02), (QUIET[3][0], 6.5, 0.02)], False),
    ],
    ids=["5.1 sigma", "4.6 sigma", "large error", "no error", "limit", "last", "first", "later", "rising"],
)
def test_a_magnitude_5_sigma_from_its_neighbours(db, rows, told):
    assert ("outlier" in warned(load(db, curve(rows)))) == told


def test_neighbours_are_of_the_same_system_and_band(db):
    load(db, curve(QUIET))
    between = [(2461002.0, 5.0, 0.02)]
    assert "outlier" in warned(load(db, curve(between), rehearse=True))
    assert "outlier" not in warned(load(db, curve(between, band="J"), rehearse=True))
    assert "outlier" not in warned(load(db, curve(between, system="Keel 9"), rehearse=True))


@pytest.mark.parametrize(
    ("date", "told"),
    [
        ("2031-04-07T03:10:00Z", False),
        ("2031-04-07T04:00:00Z", True),
        ("2031-04-07", False),
        ("2031-04-09", True),
        ("2031-04", False),
        ("2040", True),
    ],
)
def test_a_date_in_the_future(db, date, told):
    text = f"system,date,band,mag,e_mag\nLantern 3,{date},K,7.3,0.02\n"
    assert ("future" in warned(load(db, text))) == told


@pytest.mark.parametrize(
    ("column", "time", "told"),
    [
        ("MJD_UTC", "9001.5", True),
        ("MJD_UTC", "59001.5", False),
        ("date", "1899-12-30", True),
        ("date", "1900-01-02", False),
    ],
)
def test_a_date_long_ago_as_of_a_count_from_another_day(db, column, time, told):
    text = f"system,{column},band,mag\nLantern 3,{time},K,7.3\n"
    assert ("long-ago" in warned(load(db, text))) == told


# At 70.75 W local noon is near 16:43 UTC, and midnight near 04:43 UTC.
@pytest.mark.parametrize(
    ("column", "time", "site", "told"),
    [
        ("date", "2030-06-01T16:43:00Z", "Cold Mesa", True),
        ("date", "2030-06-01T04:43:00Z", "Cold Mesa", False),
        ("date", "2030-06-01", "Cold Mesa", False),
        ("date", "2030-06-01T16:43:00Z", "High Kite", False),
        ("date", "2030-06-01T16:43:00Z", "", False),
        ("HJD_UTC", "2462654.1965", "Cold Mesa", True),
        ("HJD_UTC", "2462653.6965", "Cold Mesa", False),
        ("HJD_UTC", "2462654.1965", "", False),
    ],
    ids=["noon", "midnight", "whole day", "in space", "no site", "noon hjd", "midnight hjd", "hjd no site"],
)
def test_a_time_outside_the_night_at_its_site(db, column, time, site, told):
    text = f"system,{column},band,mag,e_mag,site\nLantern 3,{time},K,7.3,0.02,{site}\n"
    assert ("daylight" in warned(load(db, text))) == told


@pytest.mark.parametrize(
    ("column", "site", "told"),
    [
        ("MJD_UTC", "", True),
        ("MJD_UTC", "Cold Mesa", False),
        ("HMJD_UTC", "", False),
        ("BMJD_TDB", "", False),
    ],
)
def test_a_clock_on_the_earth_without_a_site(db, column, site, told):
    text = f"system,{column},band,mag,e_mag,site\nLantern 3,61000.2,K,7.3,0.02,{site}\n"
    assert ("no-site" in warned(load(db, text))) == told


def test_a_band_whose_photometric_system_is_unknown(db):
    unknown = curve(QUIET).replace(",Vega", ",")
    found = warned(load(db, unknown, rehearse=True))["photometric-system-unknown"]
    assert (found.rows, "K" in found.text) == (5, True)
    said = {"constants": {"photometric_system": "2MASS"}}
    assert "photometric-system-unknown" not in warned(
        load(db, unknown.replace(",photometric_system", ",x"), **said)
    )
    text = "system,BJD_TDB,RV,e_RV,star\nKeel 9,2461000.5,12,2,A\n"
    assert "photometric-system-unknown" not in warned(load(db, text))


def test_systems_of_one_band_that_would_be_mixed(db):
    load(db, curve(QUIET))
    later = [(at + 100.0, mag, error) for at, mag, error in QUIET]
    assert "photometric-systems-mixed" not in warned(load(db, curve(later), rehearse=True))
    other = curve(later).replace("Vega", "AB")
    assert "photometric-systems-mixed" in warned(load(db, other, rehearse=True))
    assert "photometric-systems-mixed" not in warned(load(db, other.replace(",K,", ",J,"), rehearse=True))
    elsewhere = other.replace("Lantern 3", "Keel 9")
    assert "photometric-systems-mixed" not in warned(load(db, elsewhere, rehearse=True))


@pytest.mark.parametrize(
    ("columns", "cells", "told"),
    [
        ("mag,e_mag,band", "7.3,0,K", True),
        ("mag,e_mag,band", "7.3,0.0001,K", True),
        ("mag,e_mag,band", "7.3,1.5,K", True),
        ("mag,e_mag,band", "7.3,0.5,K", False),
        ("mag,e_mag,band", "7.3,,K", False),
        ("mag,e_mag,band", ">7.3,,K", False),
        ("RV,e_RV,star", "12,700,A", True),
        ("RV,e_RV,star", "12,30,A", False),
        ("rho_mas,e_rho,theta", "12,30,140", True),
        ("rho_mas,e_rho,theta", "12,3,140", False),
        ("flux,e_flux,band", "0.2,0.5,N", True),
        ("flux,e_flux,band", "0.2,0.02,N", False),
        ("flux,e_flux,band", "1e308,1.5e308,N", False),
    ],
)
def test_an_implausible_error(db, columns, cells, told):
    text = f"system,BJD_TDB,{columns}\nLantern 3,2461000.5,{cells}\n"
    assert ("implausible-error" in warned(load(db, text))) == told


def seasons(rows, time):
    return curve([(at, 7.3 + 0.001 * n, 0.02) for n, at in enumerate(rows)], time=time)


DAYS = [2461000.5 + 30.4 * n for n in range(12)]


@pytest.mark.parametrize(
    ("first", "second", "shift_d", "told"),
    [
        ("HJD_UTC", "JD_UTC", 0.0, "heliocentric already"),
        ("JD_UTC", "HJD_UTC", 0.0, "as observed from the Earth"),
        ("HJD_UTC", "HJD_UTC", 0.003, None),
        ("JD_UTC", "JD_UTC", 0.003, None),
        ("HJD_UTC", "HJD_TT", 0.0, None),
    ],
    ids=["hjd as jd", "jd as hjd", "later", "later jd", "another scale"],
)
def test_heliocentric_times_declared_as_clock_times_show_by_their_seasons(db, first, second, shift_d, told):
    load(db, seasons(DAYS, first))
    found = warned(load(db, seasons([day + shift_d for day in DAYS], second), rehearse=True))
    if told is None:
        assert "light-time-seasonal" not in found
    else:
        assert told in found["light-time-seasonal"].text
        assert found["light-time-seasonal"].rows == 12


def test_other_points_of_the_same_season_say_nothing_of_light_time(db):
    load(db, seasons(DAYS, "HJD_UTC"))
    other = curve([(at, 8.0 + 0.01 * math.sin(at), 0.02) for at in DAYS], time="JD_UTC")
    assert "light-time-seasonal" not in warned(load(db, other, rehearse=True))


@pytest.mark.parametrize(
    ("name", "told"), [("LAMP  C", True), ("lampc", True), ("Lantern 3", False), ("LANTERN  3", False)]
)
def test_a_system_called_by_another_alias(db, name, told):
    assert ("alias" in warned(load(db, curve(QUIET, system=name)))) == told


def test_an_alias_in_tables_of_solutions_and_episodes_is_told_too(db):
    text = "system,label,P,epoch\n{},one,900±2,BJD 2457001±3\n"
    assert "alias" not in warned(load(db, text.format("Lantern 3"), kind="solutions", rehearse=True))
    assert "'Lantern 3'" in warned(load(db, text.format("Lamp C"), kind="solutions"))["alias"].text
    text = "system,onset\nLamp C,2021-03-14±5 d\n"
    assert "alias" in warned(load(db, text))
    assert "future" in warned(load(db, "system,onset\nLantern 3,2033-03-14±5 d\n"))


def test_an_exported_table_under_an_alias_is_told(db):
    from campaign.output.exchange import table_text
    from campaign.studies.export import Asked, outgoing_table

    load(db, curve(QUIET))
    with outgoing_table(str(db), Asked("observations")) as table:
        text = "".join(table_text(table, "csv"))
    assert "alias" not in warned(load(db, text))
    assert "alias" in warned(load(db, text.replace("Lantern 3", "Lamp C")))


def test_what_was_withdrawn_and_comes_again(db):
    text = curve(QUIET)
    load(db, text)
    assert "withdrawn-before" not in warned(load(db, text, rehearse=True))
    with store.writing(db, at=CLOCK, who="Ida Vik", command="campaign test") as writing:
        observations.withdraw_observation(writing, 3, "the wrong star")
    found = load(db, text, rehearse=True)
    assert (found.added, found.already_known) == (1, 4)
    assert warned(found)["withdrawn-before"].lines == (4,)
    other = load(db, text.replace(",7.3,", ",7.4,"), rehearse=True, also_conflicts=True)
    assert "withdrawn-before" not in warned(other)


def test_a_load_that_was_taken_back_is_done_again_without_a_warning(db):
    operation = load(db, curve(QUIET)).operation_id
    undo(str(db), stamp("campaign undo"), operation)
    again = load(db, curve(QUIET))
    assert again.added == 5
    assert "withdrawn-before" not in warned(again)


# Lantern 3 stands at 270.63125, -45.2083: 0.001 deg in declination are 3.6 arcsec.
@pytest.mark.parametrize(
    ("ra", "dec", "told"),
    [
        ("270.63125", "-45.2093", True),
        ("270.63125", "-45.2103", False),
        # 0.0018 deg of right ascension are 4.6 arcsec at this declination, 0.0025 deg are 6.3.
        ("270.63305", "-45.2083", True),
        ("270.63375", "-45.2083", False),
    ],
)
def test_a_new_system_at_the_place_of_a_known_one(db, ra, dec, told):
    found = warned(load(db, f"name,ra,dec\nQuill,{ra},{dec}\n"))
    assert ("same-place" in found) == told
    if told:
        assert found["same-place"].lines == (2,)
        assert '"Lantern 3" --alias "Quill"' in found["same-place"].text


@pytest.mark.parametrize("quoted", [False, True], ids=["plain", "quoted"])
def test_lines_of_comments_among_the_rows(db, quoted):
    head, *rows = curve(QUIET).splitlines()
    rows = [row.replace("Lantern 3", '"Lantern 3"') if quoted else row for row in rows]
    text = "\n".join(
        ["# a light curve", head, "# in the first season", *rows[:2], "#" + rows[2], *rows[3:], ""]
    )
    found = load(db, text)
    assert (found.rows_read, found.added) == (4, 4)
    assert warned(found)["commented"].lines == (6,)
    assert "commented" not in warned(load(db, curve(QUIET), rehearse=True))
    table = "system,onset\nKeel 9,2021-03-14±5 d\n#Lantern 3,2021-03-14±5 d\n"
    assert warned(load(db, table))["commented"].rows == 1


def test_rows_that_stand_twice(db):
    text = curve(QUIET)
    assert "repeated" not in warned(load(db, text, rehearse=True))
    found = warned(load(db, text + text.splitlines()[1] + "\n"))["repeated"]
    assert (found.rows, found.lines, found.more) == (1, (7,), False)
    assert len(kept(db)) == 5


# Rows 2 to 7: a pair that differs in value, and rows beside it that differ in something else as well.
@pytest.mark.parametrize(
    ("other", "told"),
    [
        ("Lantern 3,2461000.50000,K,7.4,0.02,Vega", True),
        ("Lantern 3,2461000.50000,K,>7.0,,Vega", False),
        ("Lantern 3,2461000.50000,H,7.4,0.02,Vega", False),
        ("Lantern 3,2461000.50000,K,7.4,0.02,AB", False),
        ("Lantern 3,2461000.50010,K,7.4,0.02,Vega", False),
        ("Keel 9,2461000.50000,K,7.4,0.02,Vega", False),
        ("Lantern 3,2461000.50000,K,7.3,0.05,Vega", False),
    ],
)
def test_rows_of_one_table_that_differ_in_value_alone(db, other, told):
    found = warned(load(db, curve(QUIET) + other + "\n", rehearse=True))
    assert ("differing-in-table" in found) is told
    if told:
        assert (found["differing-in-table"].rows, found["differing-in-table"].lines) == (2, (2, 7))


def test_velocities_of_two_stars_at_one_time_do_not_differ(db):
    rows = "Lantern 3,2461000.5,-40,2,A\nLantern 3,2461000.5,20,3,B\nLantern 3,2461000.5,-44,2,A\n"
    found = warned(load(db, "system,BJD_TDB,RV,e_RV,star\n" + rows, rehearse=True))
    assert found["differing-in-table"].lines == (2, 4)


def test_position_angles_of_one_time_differ(db):
    rows = "Lantern 3,2461000.5,12.1,0.2,143,1\nLantern 3,2461000.5,12.1,0.2,150,1\n"
    head = "system,BJD_TDB,rho (mas),e_rho,theta,e_theta\n"
    assert warned(load(db, head + rows, rehearse=True))["differing-in-table"].rows == 2
