"""Tables of others, loaded. Expectations: what ``log`` makes of the same texts one by one, which has tests of
its own, and the words of the issue (all or nothing, conflicts, warnings)."""

from __future__ import annotations

import shutil
from dataclasses import replace
from datetime import date, datetime

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from load_examples import begin, codes, kept, load
from studies_examples import stamp

from campaign.catalogue import episodes, observations, solutions, store, systems
from campaign.errors import Conflict, InputRefused, NotFound, UsageRefused
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.studies.log import log_observations

THREE = (
    "system,HJD_UTC,band,mag,e_mag,photometric_system\n"
    "Lantern 3,2461234.5123,K,7.31,0.03,2MASS\n"
    "Lantern 3,2461235.5123,K,7.32,0.03,2MASS\n"
    "Keel 9,2461236.5123,J,8.90,0.02,2MASS\n"
)


@pytest.fixture(scope="module")
def begun(tmp_path_factory):
    return begin(tmp_path_factory.mktemp("load") / "campaign.db")


@pytest.fixture
def db(begun, tmp_path):
    return shutil.copy(begun, tmp_path / "campaign.db")


# --------------------------------------------------------------------- the same as one by one

decimals = st.integers(0, 9999).map(lambda n: f"{n:04d}")
magnitudes = st.decimals(-1, 20, places=3).map(str)
errors = st.decimals(0, 1, places=3).map(str)
times = st.one_of(
    st.tuples(st.integers(2_437_000, 2_469_000), decimals).map(lambda t: ("JD_UTC", f"{t[0]}.{t[1]}")),
    st.tuples(st.integers(2_437_000, 2_469_000), decimals).map(lambda t: ("HJD_UTC", f"{t[0]}.{t[1]}")),
    st.tuples(st.integers(2_437_000, 2_469_000), decimals).map(lambda t: ("HJD_TT", f"{t[0]}.{t[1]}")),
    st.tuples(st.integers(37_000, 69_000), decimals).map(lambda t: ("BMJD_TDB", f"{t[0]}.{t[1]}")),
    st.datetimes(datetime(1973, 1, 1), datetime(2030, 1, 1)).map(
        lambda d: ("date", d.strftime("%Y-%m-%dT%H:%M:%SZ"))
    ),
    st.dates(date(1973, 1, 1), date(2030, 1, 1)).map(lambda d: ("date", d.isoformat())),
)
one_row = st.fixed_dictionaries(
    {
        "system": st.sampled_from(["Lantern 3", "lamp c", "Keel 9"]),
        "time": times,
        "band": st.sampled_from(["K", "J", "L'", "[3.6]"]),
        "mag": magnitudes,
        "error": st.one_of(st.just(""), errors),
        "site": st.sampled_from(["", "Cold Mesa", "High Kite"]),
        "note": st.sampled_from(["", "cloud", "=1+1", "[red]x[/red]", "Ås ± µ"]),
    }
)


@settings(max_examples=12, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(drawn=st.lists(one_row, min_size=1, max_size=5))
def test_a_loaded_row_is_the_row_that_log_makes_of_it(drawn, begun, tmp_path):
    # One file for each way of counting time, as a table has one.
    many = shutil.copy(begun, tmp_path / "many.db")
    single = shutil.copy(begun, tmp_path / "single.db")
    for name in dict.fromkeys(row["time"][0] for row in drawn):
        rows = [row for row in drawn if row["time"][0] == name]
        lines = [f"system,{name},band,mag,e_mag,site,note"] + [
            f'{row["system"]},{row["time"][1]},"{row["band"]}",{row["mag"]},{row["error"]},{row["site"]},{row["note"]}'
            for row in rows
        ]
        loaded = load(many, "\n".join(lines) + "\n", also_conflicts=True)
        assert not loaded.bad
        for row in rows:
            at = row["time"][1] if name == "date" else f"{name} {row['time'][1]}"
            sigma = float(row["error"]) if row["error"] else None
            draft = Observation(
                0, "", 0, "photometry", Moment(0.0), value=Measured(float(row["mag"]), sigma, sigma),
                unit="mag", band=row["band"], text=row["note"],
            )  # fmt: skip
            log_observations(str(single), stamp(), row["system"], [draft], at, row["site"] or None)
    bare = [replace(each, id=0, uid="", observer=None) for each in kept(many)]
    assert sorted(bare, key=repr) == sorted(
        (replace(each, id=0, uid="", observer=None) for each in kept(single)), key=repr
    )


def test_the_same_file_again_adds_nothing(db):
    assert load(db, THREE).added == 3
    before = kept(db)
    again = load(db, THREE)
    assert (again.added, again.already_known, again.operation_id) == (0, 3, None)
    assert kept(db) == before


def test_what_was_logged_is_known_when_it_is_loaded(db):
    draft = Observation(
        0, "", 0, "photometry", Moment(0.0), value=Measured(7.31, 0.03, 0.03), unit="mag", band="K"
    )
    log_observations(str(db), stamp(), "Lantern 3", [draft], "HJD_UTC 2461234.5123", None)
    loaded = load(db, THREE)
    assert (loaded.added, loaded.already_known) == (2, 1)


def test_a_dry_run_counts_and_leaves_the_catalogue_as_it_is(db):
    before = db.read_bytes()
    loaded = load(db, THREE, rehearse=True, keep_mapping="mine")
    assert (loaded.added, loaded.rehearsed, loaded.kept_mapping) == (3, True, None)
    assert db.read_bytes() == before


# --------------------------------------------------------------------- all or nothing

BAD = (
    "system,HJD_UTC,band,mag,e_mag\n"
    "Lantern 3,2461234.5,K,7.3,0.02\n"
    "Nobody,2461235.5,K,7.3,0.02\n"
    "Lantern 3,,K,1e400,0.02\n"
    "Lantern 3,2461236.5,K,\u22127.3,-0.02\n"
    "Lantern 3,2461237.5,K\n"
    "Lantern 3,2461238.5,,7.3,0.02\n"
    "Lantern 3,2461239.5,K,,0.02\n"
)


def test_one_bad_row_keeps_all_rows_out(db):
    before = db.read_bytes()
    loaded = load(db, BAD)
    assert loaded.is_refused
    assert (loaded.rows_read, loaded.bad_rows, loaded.added) == (7, 6, 0)
    assert codes(loaded) == [
        (3, "system", "system-not-found"),
        (4, "HJD_UTC", "time-missing"),
        (4, "mag", "value-unreadable"),
        (5, "e_mag", "error-negative"),
        (6, None, "row-too-short"),
        (7, "band", "band-missing"),
        (8, "mag", "value-missing"),
    ]
    assert loaded.bad[0].text == "Nobody"
    assert db.read_bytes() == before


def test_good_rows_go_in_when_that_is_asked(db):
    loaded = load(db, BAD, skip_bad=True)
    assert (loaded.added, loaded.bad_rows, loaded.is_refused) == (1, 6, False)
    assert [each.value.value for each in kept(db)] == [7.3]


def test_rejected_rows_keep_their_cells_as_they_stood(db):
    rejected = load(db, BAD).rejected
    assert [row.cells[0] for row in rejected] == ["Nobody"] + ["Lantern 3"] * 5
    assert rejected[2].cells[3] == "\u22127.3"


def test_a_wide_row_with_one_bad_cell_is_bad_as_a_whole(db):
    loaded = load(db, "system,BJD_TDB,J,e_J,K,e_K\nKeel 9,2461234.5,8.9,0.1,x,0.1\n", skip_bad=True)
    assert codes(loaded) == [(2, "K", "value-unreadable")]
    assert not kept(db)


def test_cells_of_a_word_for_unknown_are_unknown_only_when_it_is_said(db):
    text = "system,BJD_TDB,band,mag,e_mag\nKeel 9,2461234.5,K,7.3,99.99\nKeel 9,2461235.5,K,7.3,--\n"
    assert codes(load(db, text)) == [(3, "e_mag", "number-unreadable")]
    assert load(db, text, missing=("99.99", "--")).added == 2
    assert [each.value.minus for each in kept(db)] == [None, None]


# --------------------------------------------------------------------- every kind


def test_a_column_for_each_band_is_an_observation_for_each(db):
    text = (
        "name  BJD_TDB    J     e_J   K     e_K\n"
        "Keel9 2461234.5  8.91  0.03  7.31  0.02\n"
        "Keel9 2461235.5  8.92  0.03  >5.0  0\n"
    )
    assert load(db, text).added == 4
    found = {(each.band, each.moment.text): each for each in kept(db)}
    assert found["J", "BJD_TDB 2461234.5"].value == Measured(8.91, 0.03, 0.03)
    limit = found["K", "BJD_TDB 2461235.5"]
    assert (limit.value, limit.limit_side, limit.limit_sigma) == (Measured(5.0), "above", 3.0)


def test_velocities_of_a_star(db):
    text = "name,MJD,RV [m/s],e_RV,line\nKeel 9,61234.5,-45200,3100,C III\n"
    assert load(db, text, constants={"scale": "utc", "star": "a", "site": "Cold Mesa"}).added == 1
    (found,) = kept(db)
    assert (found.kind, found.unit, found.star, found.species) == ("velocity", "kms", "A", "C III")
    assert found.value.value == pytest.approx(-45.2)
    assert found.value.minus == pytest.approx(3.1)
    assert (found.moment.place, found.site) == ("observatory", "Cold Mesa")


def test_velocities_of_both_stars_beside_each_other(db):
    text = "name,BJD_TDB,RV_A,e_RV_A,RV_B,e_RV_B\nKeel 9,2461234.5,-45,3,60,4\n"
    assert load(db, text).added == 2
    assert {(each.star, each.value.value) for each in kept(db)} == {("A", -45.0), ("B", 60.0)}


def test_positions_with_their_errors(db):
    text = "name,BJD_TDB,rho [arcsec],e_rho,theta,e_theta,corr\nKeel 9,2461234.5,0.0121,0.0003,143,2,-0.3\n"
    assert load(db, text).added == 1
    (found,) = kept(db)
    assert found.value.value == pytest.approx(12.1)
    assert found.value.minus == pytest.approx(0.3)
    assert found.position_angle_deg == Measured(143.0, 2.0, 2.0)
    assert found.correlation == -0.3


def test_radii_of_shells(db):
    text = (
        "name,date,radius,e_radius,feature,measured_at,index,band\nKeel 9,2031-02-03,1.2,0.05,limb,edge,2,N\n"
    )
    assert load(db, text, kind="shell").added == 1
    (found,) = kept(db)
    assert (found.unit, found.feature, found.measured_at, found.shell_index) == ("arcsec", "limb", "edge", 2)
    assert found.moment.minus_d == pytest.approx(1 / np.sqrt(12))


def test_widths_of_lines(db):
    assert load(db, "name,BJD_TDB,EW,line\nKeel 9,2461234.5,-12.4±0.5,C III 5696\n").added == 1
    (found,) = kept(db)
    assert (found.value, found.species) == (Measured(-12.4, 0.5, 0.5), "C III 5696")


def test_fluxes_in_a_band_and_in_a_range_of_energy(db):
    text = "name,BJD_TDB,flux,e_flux,band,l_flux\nKeel 9,2461234.5,2.3,0.2,N,\nKeel 9,2461235.5,1.5,,N,<\n"
    assert load(db, text, columns={"flux": "flux as mJy"}).added == 2
    measured, limit = kept(db)
    assert (measured.unit, measured.value.value) == ("jy", pytest.approx(2.3e-3))
    assert (limit.limit_side, limit.value.minus) == ("below", None)
    text = "name,BJD_TDB,flux,energy_low,energy_high\nKeel 9,2461236.5,4.1e-12,0.5,10\n"
    assert load(db, text).added == 1
    assert kept(db)[-1].unit == "erg/s/cm2"


def test_systems_solutions_and_episodes(db):
    text = (
        "name,ra,dec,distance,e_distance,aliases,spt_a\nQuill,18:02:31.5,-45:12:30,2.1 kpc,200,Pen;Reed,WC7\n"
    )
    assert load(db, text).added == 1
    assert load(db, text).already_known == 1
    text = (
        "system,label,P,e_P,T0_is,e,omega,omega_of,source\n"
        "Pen,A 2030,3127.5,0.3,BJD 2461234.2±0.5,0.71±0.02,143±2,A,Orrery & Quill 2030\n"
    )
    assert load(db, text, kind="solutions", columns={"epoch": "T0_is"}).added == 1
    again = load(db, text, kind="solutions", columns={"epoch": "T0_is"})
    assert (again.added, again.already_known) == (0, 1)
    text = "system,onset,e_onset,end,source\nQuill,2021-03-14,5,2021-07-01±10 d,Night book\n"
    assert load(db, text).added == 1
    assert load(db, text).already_known == 1
    with store.reading(db) as connection:
        system = systems.find_system(connection, "reed")
        (solution,) = solutions.solutions_of(connection, system.id)
        (episode,) = episodes.episodes_of(connection, system.id)
    assert system.distance_pc.value == pytest.approx(2100.0)
    assert system.distance_pc.minus == pytest.approx(200.0)
    assert system.star_a.spectral_type == "WC7"
    assert (solution.period_d, solution.epoch.minus_d) == (Measured(3127.5, 0.3, 0.3), 0.5)
    assert (episode.onset.moment.minus_d, episode.state) == (5.0, "confirmed")


def test_a_row_of_systems_that_contradicts_what_is_known_is_refused(db):
    loaded = load(db, "name,ra,dec\nLantern 3,10.0,20.0\nQuill,11.0,21.0\n")
    assert codes(loaded) == [(2, None, "known-otherwise")]
    with store.reading(db) as connection, pytest.raises(NotFound):
        systems.find_system(connection, "Quill")


# --------------------------------------------------------------------- conflicts, warnings


def test_another_value_at_the_same_place_is_a_conflict_until_it_is_wanted(db):
    load(db, THREE)
    other = THREE.replace("7.31", "7.51")
    loaded = load(db, other)
    assert (loaded.is_refused, loaded.added) == (True, 0)
    (conflict,) = loaded.conflicts
    assert (conflict.line, conflict.system, conflict.value, conflict.known_value) == (
        2,
        "Lantern 3",
        7.51,
        7.31,
    )
    assert load(db, other, also_conflicts=True).added == 1
    assert len(kept(db)) == 4


@pytest.mark.parametrize(
    "changed",
    [
        THREE.replace("2461234.5123,K,7.31", "2461234.5133,K,7.51"),
        THREE.replace("K,7.31", "H,7.51"),
        THREE.replace("7.31,0.03,2MASS", "7.51,0.03,Johnson"),
        THREE.replace("Lantern 3,2461234", "Keel 9,2461234").replace("7.31", "7.51"),
    ],
    ids=["time", "band", "photometric system", "system"],
)
def test_what_differs_in_more_than_the_value_is_no_conflict(db, changed):
    load(db, THREE)
    assert not load(db, changed).conflicts


def warned(loaded):
    return {warning.code: warning for warning in loaded.warnings}


def curve(values, *, start=2461000.5, step=1.0):
    rows = [f"Lantern 3,{start + step * n:.4f},K,{value},0.02,Vega" for n, value in enumerate(values)]
    return "system,BJD_TDB,band,mag,e_mag,photometric_system\n" + "\n".join(rows) + "\n"


def test_a_magnitude_far_from_its_neighbours_is_told(db):
    loaded = load(db, curve([7.30, 7.31, 7.29, 3.71, 7.30, 7.32]))
    assert warned(loaded)["outlier"].lines == (5,)


def test_a_burst_is_no_outlier(db):
    loaded = load(db, curve([7.30, 7.31, 7.29, 6.5, 6.1, 5.9, 5.9, 6.0, 6.1]))
    assert "outlier" not in warned(loaded)


def test_neighbours_that_are_known_already_count(db):
    load(db, curve([7.30, 7.31, 7.29]))
    assert warned(load(db, curve([3.71], start=2461001.0)))["outlier"].rows == 1


def test_a_date_in_the_future_is_told(db):
    # The clock of the tests stands at 2031-04-07.
    loaded = load(db, curve([7.3, 7.3], start=2463000.0))
    assert warned(loaded)["future"].rows == 2


def test_a_time_at_which_the_sun_was_up_is_told(db):
    # At 70.75 W local noon is near 16:43 UTC and midnight near 04:43 UTC.
    text = "system,date,band,mag,e_mag,site\nLantern 3,2030-06-01T{}:43:00Z,K,7.3,0.02,Cold Mesa\n"
    assert "daylight" in warned(load(db, text.format("16"), rehearse=True))
    assert "daylight" not in warned(load(db, text.format("04"), rehearse=True))


def test_a_band_whose_system_is_unknown_and_systems_that_mix_are_told(db):
    loaded = load(db, THREE.replace(",photometric_system", "").replace(",2MASS", ""), rehearse=True)
    assert "photometric-system-unknown" in warned(loaded)
    load(db, THREE)
    mixed = warned(load(db, THREE.replace("2MASS", "Johnson").replace(".5123", ".6")))
    assert "Johnson" in mixed["photometric-systems-mixed"].text
    assert "2MASS" in mixed["photometric-systems-mixed"].text


@pytest.mark.parametrize(("error", "odd"), [("0", True), ("3.0", True), ("0.00001", True), ("0.02", False)])
def test_an_implausible_error_is_told(db, error, odd):
    loaded = load(db, THREE.replace("0.03", error), rehearse=True)
    assert ("implausible-error" in warned(loaded)) == odd


def test_a_system_under_another_alias_is_told(db):
    loaded = load(db, THREE.replace("Keel 9", "LAMP  C"))
    assert "'Lantern 3'" in warned(loaded)["alias"].text


def test_heliocentric_times_that_are_declared_as_observed_show_by_the_season(db):
    # The same points twice: once as HJD, once as if HJD were a clock at the Earth. Up to 8.3 min differ.
    days = [2461000.5 + 30.4 * n for n in range(12)]
    rows = [f"Lantern 3,{day:.5f},K,{7.3 + 0.001 * n:.3f},0.02" for n, day in enumerate(days)]
    load(db, "system,HJD_UTC,band,mag,e_mag\n" + "\n".join(rows) + "\n")
    loaded = load(db, "system,JD_UTC,band,mag,e_mag\n" + "\n".join(rows) + "\n", rehearse=True)
    assert warned(loaded)["light-time-seasonal"].rows == 12
    assert "heliocentric already" in warned(loaded)["light-time-seasonal"].text
    shifted = [row.replace(f"{day:.5f}", f"{day + 0.003:.5f}") for row, day in zip(rows, days, strict=True)]
    other = load(db, "system,HJD_UTC,band,mag,e_mag\n" + "\n".join(shifted) + "\n", rehearse=True)
    assert "light-time-seasonal" not in warned(other)


def test_a_row_that_stands_twice_goes_in_once(db):
    loaded = load(db, THREE + THREE.splitlines()[1] + "\n")
    assert (loaded.added, loaded.repeated) == (3, 1)
    assert warned(loaded)["repeated"].lines == (5,)


# --------------------------------------------------------------------- mappings


def test_a_kept_mapping_reads_the_next_table_alike(db):
    text = "who;t;m;s\nKeel 9;1234.5;7310;20\n"
    said = {
        "kind": "photometry",
        "columns": {"system": "who", "time": "t as HJD_UTC-2460000", "mag": "m as mmag", "e_mag": "s"},
        "constants": {"band": "K"},
    }
    assert load(db, text, **said, keep_mapping="Survey").kept_mapping == "Survey"
    assert load(db, text.replace("1234", "1235"), mapping="survey").added == 1
    first, second = kept(db)
    assert first.value == second.value
    assert first.value.value == pytest.approx(7.31)
    assert first.value.minus == pytest.approx(0.02)
    assert second.moment.text == "HJD_UTC 2461235.5"
    with pytest.raises(NotFound) as missing:
        load(db, text, mapping="surveys of old")
    assert missing.value.code == "mapping-not-found"
    with pytest.raises(Conflict):
        load(db, text.replace("1234", "1236"), **said | {"constants": {"band": "J"}}, keep_mapping="SURVEY")
    assert len(kept(db)) == 2


@pytest.mark.parametrize(
    ("text", "said", "code"),
    [
        ("name,MJD,mag,band\nKeel 9,61234.5,7,K\n", {}, "scale-missing"),
        ("name,HJD,JD,mag,band\nKeel 9,1,2,7,K\n", {}, "column-ambiguous"),
        ("name,time,mag,band\nKeel 9,61234.5,7,K\n", {"skip_bad": False}, None),
        ("x,y\n1,2\n", {}, "kind-unclear"),
        ("name,HJD,mag\nKeel 9,2461234.5,7\n", {}, "column-missing"),
        ("name,BJD_TDB,mag,band\nKeel 9,2461234.5,7,K\n", {"columns": {"mag": "none"}}, "column-missing"),
        ("name,BJD_TDB,mag [Jy],band\nKeel 9,2461234.5,7,K\n", {}, "unit-not-accepted"),
        (
            "name,BJD_TDB,mag,band\nKeel 9,2461234.5,7,K\n",
            {"constants": {"site": "Nowhere"}},
            "site-not-found",
        ),
    ],
)
def test_what_is_not_clear_is_refused_with_a_way_out(db, text, said, code):
    if code is None:
        assert codes(load(db, text, **said)) == [(2, "time", "time-unclear")]
        return
    with pytest.raises(NotFound if code.endswith("-not-found") else InputRefused) as refused:
        load(db, text, **said)
    assert refused.value.code == code
    assert refused.value.hint


def test_fields_that_are_not_known_are_refused(db):
    with pytest.raises(UsageRefused) as refused:
        load(db, THREE, columns={"colour": "mag"})
    assert refused.value.code == "field-unknown"
    with pytest.raises(UsageRefused):
        load(db, THREE, constants={"scale": "tcb"})


# --------------------------------------------------------------------- one operation, undone


def test_a_load_is_one_operation_that_undo_takes_back_whole(db):
    from campaign.studies.undo import undo

    loaded = load(db, THREE)
    undo(str(db), stamp("campaign undo"), loaded.operation_id)
    assert not kept(db)
    assert load(db, THREE).added == 3


def test_a_row_of_an_export_that_was_changed_by_hand_is_not_passed_over(db, tmp_path):
    from campaign.output.exchange import table_text
    from campaign.studies.export import Asked, outgoing_table

    load(db, THREE)
    with outgoing_table(str(db), Asked("observations")) as table:
        text = "".join(table_text(table, "csv"))
    assert load(db, text).already_known == 3
    loaded = load(db, text.replace(",7.31,", ",7.41,"))
    assert [code for _, _, code in codes(loaded)] == ["known-otherwise"]
    with pytest.raises(UsageRefused):
        load(db, text, constants={"band": "K"})


# --------------------------------------------------------------------- hostile bytes


def test_sites_are_looked_up_and_observations_read_by_others_too(db):
    load(db, THREE, constants={"site": "cold mesa", "source": "Night book 12"})
    with store.reading(db) as connection:
        arrays = observations.photometry_arrays(connection)
    assert sorted(len(each.mag) for each in arrays.values()) == [1, 2]
    assert {each.source for each in kept(db)} == {"Night book 12"}


HOSTILE = [
    "\x00", "\x1b[31m", "\u202e", "\ufeff", "nan", "1e400", "\u2212", "[/b]", "'", '"', ",", "\n", "\r",
    "=1+1", "x" * 1000, "\x9b", "é", "\u2028", ";", "\t", "#",
]  # fmt: skip


@settings(max_examples=30, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_any_change_of_bytes_loads_all_or_nothing_and_says_where(data, begun, tmp_path):
    path = shutil.copy(begun, tmp_path / "hostile.db")
    raw = bytearray(THREE.encode())
    for _ in range(data.draw(st.integers(1, 3))):
        at = data.draw(st.integers(0, len(raw)))
        how = data.draw(st.sampled_from(["insert", "replace", "cut", "byte"]))
        text = data.draw(st.sampled_from(HOSTILE)).encode()
        if how == "insert":
            raw[at:at] = text
        elif how == "replace":
            raw[at : at + len(text)] = text
        elif how == "cut":
            del raw[at : at + data.draw(st.integers(1, 20))]
        else:
            raw[at : at + 1] = bytes([data.draw(st.integers(0, 255))])
    try:
        loaded = load(path, bytes(raw))
    except (InputRefused, UsageRefused) as refused:
        assert refused.message
        assert not kept(path)
        return
    if loaded.bad:
        assert loaded.is_refused
        assert not kept(path)
        assert all(cell.line >= 1 and cell.why and cell.code for cell in loaded.bad)
    else:
        assert len(kept(path)) == loaded.added == loaded.values_read - loaded.repeated


def test_a_table_without_rows_is_refused(db):
    with pytest.raises(InputRefused) as refused:
        load(db, "system,BJD_TDB,band,mag\n# nothing yet\n")
    assert refused.value.code == "table-empty"


@settings(max_examples=30, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.binary(max_size=400), skip=st.booleans())
def test_random_bytes_are_refused_or_loaded_without_surprise(data, skip, begun, tmp_path):
    path = shutil.copy(begun, tmp_path / "random.db")
    header = b"system,BJD_TDB,band,mag\n"
    try:
        loaded = load(path, header + data, skip_bad=skip)
    except InputRefused:
        assert not kept(path)
    else:
        assert len(kept(path)) == loaded.added
