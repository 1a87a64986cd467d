"""Tables as people send them. Expectations: what the tables say to a reader (invented, written by hand), and
the words of the issue: nothing wrong goes in unnoticed, nothing is guessed silently."""

from __future__ import annotations

import io
import shutil

import pytest
from load_examples import begin, codes, kept, load

from campaign.errors import InputRefused, UsageRefused
from campaign.model.measured import Measured
from campaign.studies import load_rows


@pytest.fixture(scope="module")
def begun(tmp_path_factory):
    return begin(tmp_path_factory.mktemp("messy") / "campaign.db")


@pytest.fixture
def db(begun, tmp_path):
    return shutil.copy(begun, tmp_path / "campaign.db")


def test_a_table_of_nothing_but_bad_cells_ends_before_the_memory_does(db, monkeypatch):
    monkeypatch.setattr(load_rows, "MOST_BAD_CELLS", 1000)
    text = "system,HJD_UTC,band,mag,e_mag\n" + "Lantern 3,2461000.5,K,faint,0.02\n" * 1000
    assert load(db, text).bad_rows == 1000
    with pytest.raises(InputRefused) as refused:
        load(db, text + "Lantern 3,2461000.5,K,faint,0.02\n", skip_bad=True)
    assert (refused.value.code, refused.value.details["line"]) == ("rows-refused", 1002)
    assert kept(db) == []


SURVEY = (
    "# Northern sweep, data release 4\n"
    "HJD-2450000,mag,magerr,filter,camera,flag\n"
    "9001.51234,12.301,0.021,V,bd,0\n"
    "9008.50210,12.312,0.019,V,bd,1\n"
    "9015.12300,99.990,99.990,V,bd,1\n"
)


def test_a_light_curve_of_a_survey_with_its_mark_of_nothing_seen(db):
    said = {"constants": {"system": "Lamp C"}}
    refused = load(db, SURVEY, **said)
    assert (refused.is_refused, codes(refused)) == (True, [(5, "mag", "out-of-range")])
    loaded = load(db, SURVEY, **said, missing=("99.990",))
    assert (loaded.added, loaded.without_value, loaded.bad, loaded.is_refused) == (2, 1, (), False)
    assert loaded.understood.unused == ("flag",)
    first, second = kept(db)
    assert (first.moment.text, first.moment.place) == ("HJD_UTC 2459001.51234", "heliocentre")
    assert (first.value, first.band, first.instrument) == (Measured(12.301, 0.021, 0.021), "V", "bd")
    assert second.value == Measured(12.312, 0.019, 0.019)


@pytest.mark.parametrize("names", ["date,UT", "Date (UT),Time", "date,time (UTC)", "time_utc,date"])
def test_a_column_of_dates_and_one_of_clock_times_are_one_time(db, names):
    def row(day, time, rest):
        cells = [time, day] if names.startswith("time") else [day, time]
        return f"Keel 9,{cells[0]},{cells[1]},{rest}\n"

    text = (
        f"name,{names},band,mag\n" + row("2031-02-03", "05:06:07", "K,7.3") + row("2031-02-04", "", "K,7.3")
    )
    loaded = load(db, text, keep_mapping="two columns")
    assert (loaded.added, loaded.understood.unused) == (2, ())
    assert any(line.origin.startswith("columns ") for line in loaded.understood.lines)
    one, whole_day = kept(db)
    # MJD 62901 is 2031-02-03; the clock counts as 18367 s of the day.
    assert one.moment.text == "2031-02-03 05:06:07 UTC"
    assert whole_day.moment.minus_d == pytest.approx(12**-0.5)
    assert load(db, text.replace("2031-02", "2030-02"), mapping="two columns").added == 2
    bad = load(db, f"name,{names},band,mag\n" + row("2031-02-03", "25:06:07", "K,7.3"))
    assert [(line, code) for line, _, code in codes(bad)] == [(2, "instant-impossible")]


@pytest.mark.parametrize("names", ["date,time", "date_utc,time_tt", "date,MJD", "date,time,UT"])
def test_two_times_that_are_not_one_are_asked_about(db, names):
    cells = ",".join(["2031-02-03", "05:06:07", "05:06:07"][: names.count(",") + 1])
    text = f"name,{names},band,mag\nKeel 9,{cells},K,7.3\n"
    if names == "date,time":
        # One time, but nobody says in which scale.
        assert [code for _, _, code in codes(load(db, text))] == ["scale-missing"]
        assert load(db, text, constants={"scale": "utc"}).added == 1
        return
    with pytest.raises(InputRefused) as refused:
        load(db, text)
    assert refused.value.code == "column-ambiguous"


def test_what_is_to_be_typed_about_columns_works(db):
    text = "name,BJD_TDB,mag,mag,band\nKeel 9,2459001.5,7.3,7.4,K\n"
    with pytest.raises(InputRefused) as refused:
        load(db, text)
    assert '--column "mag=3"' in refused.value.hint
    assert load(db, text, columns={"mag": "3"}).added == 1
    assert kept(db)[0].value.value == 7.3
    # One letter alone may be anything.
    text = "name;BJD_TDB;V;B-V\nKeel 9;2459001.5;7.3;0.1\n"
    with pytest.raises(InputRefused) as refused:
        load(db, text)
    assert '--as photometry --column "mag=V" --constant "band=V"' in refused.value.hint
    assert load(db, text, kind="photometry", columns={"mag": "V"}, constants={"band": "V"}).added == 1


def test_marks_of_limits_belong_to_their_bands(db):
    text = "name,BJD_TDB,l_Jmag,Jmag,e_Jmag,l_Kmag,Kmag,e_Kmag\nKeel 9,2459001.5,>,12.1,,,7.3,0.02\n"
    loaded = load(db, text)
    assert (loaded.added, loaded.understood.unused) == (2, ())
    found = {each.band: each for each in kept(db)}
    assert (found["J"].value, found["J"].limit_side) == (Measured(12.1), "above")
    assert (found["K"].value, found["K"].limit_side) == (Measured(7.3, 0.02, 0.02), None)


def test_a_row_whose_value_is_empty_is_bad_although_another_word_means_unknown(db):
    text = "system,BJD_TDB,band,mag\nKeel 9,2459001.5,K,\nKeel 9,2459002.5,K,--\nKeel 9,2459003.5,K,7.3\n"
    loaded = load(db, text, missing=("--",), skip_bad=True)
    assert codes(loaded) == [(2, "mag", "value-missing")]
    assert (loaded.added, loaded.without_value) == (1, 1)


def test_a_wide_row_is_left_out_only_when_all_its_values_are_unknown(db):
    text = "system,BJD_TDB,J,K\nKeel 9,2459001.5,-99,7.3\nKeel 9,2459002.5,-99,-99\n"
    loaded = load(db, text, missing=("-99",))
    assert (loaded.added, loaded.without_value) == (1, 1)
    assert [each.band for each in kept(db)] == ["K"]


def test_a_spreadsheet_with_merged_words_over_its_names_limits_and_empty_rows(db):
    text = (
        '"","K","","J","","",""\r\n'
        '"Object / Date","mag","err","mag","err","site","remarks"\r\n'
        '"2021-03-14T08:12Z","7.31","0.02",">12.1","","Cold Mesa","thin cloud"\r\n'
        '"","","","","","",""\r\n'
        '"2021-03-15T08:20Z","<6.0","","8.91","0.03","Cold Mesa",""\r\n'
        ",,,,\r\n"
    )
    loaded = load(db, text, columns={"time": "Object / Date"}, constants={"system": "Keel 9"})
    assert (loaded.rows_read, loaded.added, loaded.bad) == (2, 4, ())
    found = {(each.band, each.moment.text[8:10]): each for each in kept(db)}
    assert found["K", "14"].value == Measured(7.31, 0.02, 0.02)
    assert (found["J", "14"].value.value, found["J", "14"].limit_side) == (12.1, "above")
    assert (found["K", "15"].value.value, found["K", "15"].limit_side) == (6.0, "below")
    assert {each.text for each in kept(db)} == {"thin cloud", ""}
    assert {each.site for each in kept(db)} == {"Cold Mesa"}


COMMAS = "Star name;MJD (UTC);K mag;error;site\nKeel 9;61234,5;7,31;0,02;Cold Mesa\n"


def test_commas_in_numbers_are_decimal_points_when_that_is_said_and_refused_before(db):
    refused = load(db, COMMAS)
    assert {cell.column for cell in refused.bad} == {"MJD (UTC)", "K mag", "error"}
    loaded = load(db, COMMAS, constants={"decimal": "comma"})
    assert loaded.added == 1
    assert "a comma in a number is its decimal point" in loaded.understood.notes
    (found,) = kept(db)
    assert (found.moment.text, found.value) == ("MJD_UTC 61234.5", Measured(7.31, 0.02, 0.02))
    with pytest.raises(UsageRefused):
        load(db, COMMAS, constants={"decimal": "dash"})


def test_a_thousands_mark_is_not_taken_for_a_decimal_comma(db):
    loaded = load(db, COMMAS.replace("61234,5", "61.234,5"), constants={"decimal": "comma"})
    assert [column for _, column, _ in codes(loaded)] == ["MJD (UTC)"]


def test_decimal_commas_of_solutions_are_kept_with_a_mapping(db):
    text = 'system;P;e_P;epoch;e;omega;omega_of;source\nKeel 9;{},5;0,3;"2024-05-01±2 d";0,71;143;A;x, y\n'
    said = {"kind": "solutions", "constants": {"decimal": "comma"}}
    assert load(db, text.format(3127), **said, keep_mapping="commas").added == 1
    assert load(db, text.format(3128), mapping="commas").added == 1


def test_one_column_of_errors_beside_two_bands_is_asked_about(db):
    text = "system,BJD_TDB,J,K,err\nKeel 9,2459001.5,8.9,7.3,0.02\n"
    with pytest.raises(InputRefused) as refused:
        load(db, text)
    assert refused.value.code == "column-ambiguous"
    assert '--column "error=err"' in refused.value.hint
    assert load(db, text, columns={"error": "err"}).added == 2
    assert {each.value.minus for each in kept(db)} == {0.02}
    # Beside one band there is nothing to ask.
    assert load(db, "system,BJD_TDB,K mag,err\nKeel 9,2459002.5,7.3,0.02\n").added == 1
    assert kept(db)[-1].value == Measured(7.3, 0.02, 0.02)


def test_velocities_of_two_stars_between_tabs_with_gaps_and_the_minus_of_typesetters(db):
    text = (
        "BJD_TDB\tRV_A (km/s)\te_RV_A\tRV_B (km/s)\te_RV_B\n"
        "2459123.55121\t\u221245.2\t3.1\t61.0\t5.0\n"
        "2459150.51311\t-42.1\t3.0\t\t\n"
    )
    assert load(db, text, constants={"system": "Keel 9"}).added == 3
    assert sorted((each.star, each.value.value) for each in kept(db)) == [
        ("A", -45.2), ("A", -42.1), ("B", 61.0),
    ]  # fmt: skip


@pytest.mark.parametrize("unit", ["km / s", "km/s", "km s^-1", "km.s**-1", "km s-1"])
def test_units_are_known_as_people_and_libraries_write_them(db, unit):
    text = f"name,BJD_TDB,RV ({unit}),e_RV,star\nKeel 9,2459001.5,-45.2,3,A\n"
    assert load(db, text).added == 1
    assert kept(db)[0].value == Measured(-45.2, 3.0, 3.0)


@pytest.mark.parametrize("form", ["ecsv", "votable"])
def test_units_of_a_table_of_astropy_are_known(db, form):
    from astropy import units
    from astropy.io.votable import from_table, writeto
    from astropy.table import QTable

    table = QTable({"name": ["Keel 9", "Keel 9"], "BJD": [2459001.5, 2459002.5] * units.day})
    table["RV"] = [-45_200.0, 12_000.0] * units.m / units.s
    table["star"] = ["A", "B"]
    data = io.BytesIO()
    if form == "ecsv":
        text = io.StringIO()
        table.write(text, format="ascii.ecsv")
        data.write(text.getvalue().encode())
    else:
        writeto(from_table(table), data)
    assert load(db, data.getvalue()).added == 2
    assert {(each.star, each.value.value) for each in kept(db)} == {("A", -45.2), ("B", 12.0)}
    fluxes = QTable({"name": ["Keel 9"], "BJD": [2459001.5]})
    fluxes["flux"] = [4e-12] * units.erg / units.s / units.cm**2
    fluxes["energy_low"], fluxes["energy_high"] = [500.0] * units.eV, [10.0] * units.keV
    text = io.StringIO()
    fluxes.write(text, format="ascii.ecsv")
    assert load(db, text.getvalue()).added == 1
    (found,) = [each for each in kept(db) if each.kind == "flux"]
    assert (found.value.value, found.energy_low_kev, found.energy_high_kev) == (4e-12, 0.5, 10.0)


@pytest.mark.parametrize("column", ["S (mJy)", "S [mJy]", "S_mJy"])
def test_the_unit_in_the_name_of_a_column_that_was_pointed_at_counts(db, column):
    text = f"name,BJD_TDB,{column},err\nKeel 9,2459001.5,4,0.5\n"
    said = {"kind": "flux", "columns": {"flux": column}, "constants": {"frequency": "8.4 GHz"}}
    loaded = load(db, text, **said)
    assert {line.meaning for line in loaded.understood.lines if "flux" in line.field} == {"in mJy"}
    assert kept(db)[0].value == Measured(4e-3, 5e-4, 5e-4)
    # A unit that is none of the field is refused, unless another one is said.
    with pytest.raises(InputRefused) as refused:
        load(db, text.replace("mJy", "mag"), **said | {"columns": {"flux": "S (mag)"}})
    assert refused.value.code in ("unit-not-accepted", "column-missing")


@pytest.mark.parametrize(
    ("column", "value"), [("flux_mJy", 4e-3), ("flux_MJy", 4e6), ("FLUX_MJY", 4e-3), ("flux_Jy", 4.0)]
)
def test_the_case_of_a_unit_counts_where_it_is_one(db, column, value):
    text = f"name,BJD_TDB,{column}\nKeel 9,2459001.5,4\n"
    load(db, text, constants={"frequency": "8.4 GHz"})
    assert kept(db)[0].value.value == pytest.approx(value, rel=1e-15)


def test_errors_without_a_unit_have_that_of_their_value_and_say_so(db):
    text = "name,BJD_TDB,RV [m/s],e_RV,star\nKeel 9,2459001.5,-45200,3100,A\n"
    lines = {line.field: line.meaning for line in load(db, text).understood.lines}
    assert lines["error of the radial velocity"] == "in m/s"
    assert kept(db)[0].value == Measured(-45.2, 3.1, 3.1)


def test_a_column_of_stars_names_systems_where_nothing_else_does(db):
    assert load(db, "Star,BJD_TDB,K,e_K\nKeel 9,2459001.5,7.3,0.1\n").added == 1
    assert load(db, "Star,label,P,T0\nKeel 9,one,900±2,BJD 2457001±3\n", kind="solutions").added == 1
    loaded = load(db, "object,star,BJD_TDB,K,e_K\nKeel 9,x,2459002.5,7.3,0.1\n")
    assert (loaded.added, loaded.understood.unused) == (1, ("star",))
    with pytest.raises(InputRefused):
        load(db, "star,BJD_TDB,RV\nA,2459001.5,12\n")


def test_radii_of_shells_at_fixed_places_with_units_below_the_names(db):
    text = (
        "object     date        radius   e_radius  PA    feature  measured_at  index  filter\n"
        "           (UT)        (arcsec) (arcsec)  (deg)\n"
        "---------- ----------  -------  --------  ----- -------- ------------ -----  ------\n"
        "Keel 9     2016-08-04  0.62     0.03      120   limb     edge         1      N\n"
        "Keel 9     2016-08-04  1.83     0.05            limb     edge         2      N\n"
    )
    loaded = load(db, text)
    assert loaded.added == 2
    # The light time between site and geocentre is nothing beside a whole day.
    assert not loaded.warnings
    assert [(each.value.value, each.shell_index, each.band) for each in kept(db)] == [
        (0.62, 1, "N"), (1.83, 2, "N"),
    ]  # fmt: skip
    assert [each.position_angle_deg for each in kept(db)] == [Measured(120.0), None]
