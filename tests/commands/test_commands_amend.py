"""``campaign amend`` and ``campaign withdraw``: what was wrong is put right, and what was there stays."""

from __future__ import annotations

import pytest


def shown(campaign, number):
    """One observation, in use or not."""
    found = campaign("observations", "--withdrawn", "--limit", "0", "--json").document["data"]["observations"]
    return next(each for each in found if each["id"] == number)


# ------------------------------------------------------------------ amend


@pytest.mark.parametrize(
    ("number", "words", "field", "expected"),
    [
        (1, ("--mag", "7.35±0.02"), "value", {"value": 7.35, "minus": 0.02, "plus": 0.02}),
        (1, ("--mag", "7.35 +0.04 -0.02"), "value", {"value": 7.35, "minus": 0.02, "plus": 0.04}),
        (1, ("--mag", "7.35"), "value", {"value": 7.35, "minus": None, "plus": None}),
        (1, ("--mag", ">11"), "limit_side", "above"),
        (1, ("--mag", "<5", "--limit-sigma", "5"), "limit_sigma", 5.0),
        (4, ("--mag", "12.0±0.3"), "limit_side", None),
        (4, ("--limit-sigma", "5"), "limit_sigma", 5.0),
        (1, ("--band", "Ks"), "band", "Ks"),
        (1, ("--magnitudes", "Harrow HK"), "photometric_system", "Harrow HK"),
        (1, ("--comparison", "HR 1"), "comparison_star", "HR 1"),
        (1, ("--source", "Night book 4"), "source", "Night book 4"),
        (1, ("--source", ""), "source", None),
        (1, ("--site", "harrow pass"), "site", "Harrow Pass"),
        (1, ("--site", ""), "site", None),
        (1, ("--quality", "Doubtful"), "quality", "doubtful"),
        (1, ("--instrument", "12 cm"), "instrument", "12 cm"),
        (2, ("--note", ""), "text", ""),
        (2, ("--note", "cirrus, then clear"), "text", "cirrus, then clear"),
        (5, ("--value", "2.5±0.2 mJy"), "value", {"value": 2.5e-3, "minus": 2e-4, "plus": 2e-4}),
        (5, ("--frequency", "4.8 GHz"), "frequency_ghz", 4.8),
        (6, ("--velocity", "-44±3 km/s"), "value", {"value": -44.0, "minus": 3.0, "plus": 3.0}),
        (6, ("--star", "b"), "star", "B"),
        (6, ("--species", "He II 5412"), "species", "He II 5412"),
        (7, ("--width", "-1.3±0.1 nm"), "value", {"value": -13.0, "minus": 1.0, "plus": 1.0}),
        (8, ("--separation", "0.012±0.001 arcsec"), "value", {"value": 12.0, "minus": 1.0, "plus": 1.0}),
        (8, ("--angle", "144±1"), "position_angle_deg", {"value": 144.0, "minus": 1.0, "plus": 1.0}),
        (8, ("--correlation", "-0.4"), "correlation", -0.4),
        (9, ("--radius", "1.3±0.1"), "value", {"value": 1.3, "minus": 0.1, "plus": 0.1}),
        (9, ("--index", "2"), "shell_index", 2),
        (9, ("--feature", "limb", "--measured-at", "edge"), "measured_at", "edge"),
        (9, ("--plate-scale-error", "0.5 %"), "plate_scale_error", 0.005),
        (10, ("--why", "wind"), "text", "wind"),
        (11, ("--note", "the finder shows two"), "text", "the finder shows two"),
    ],
)  # fmt: skip
def test_each_field_is_put_right_and_the_rest_stays(watched, number, words, field, expected):
    before = shown(watched, number)
    ran = watched("amend", str(number), *words, "--json")
    assert ran.status == 0, ran.err
    data = ran.document["data"]
    assert (data["replaces"], data["id"], data["changed"], data["written"]) == (number, 13, True, True)
    after = shown(watched, 13)
    found = after[field]
    if isinstance(expected, dict) and isinstance(found, dict):
        assert found == {k: None if v is None else pytest.approx(v, rel=1e-12) for k, v in expected.items()}
    else:
        assert found == expected
    own = {"id", "uid", "entered_at", "operation", "value", "limit_side", "limit_sigma", "unit", field}
    moved = {"bmjd_tdb", "utc", "site"} if "--site" in words else set()
    also = {"measured_at": {"feature"}}.get(field, set())
    rest = before.keys() - own - moved - also
    assert {name: after[name] for name in rest} == {name: before[name] for name in rest}
    old = shown(watched, number)
    assert (old["in_use"], old["superseded_by"]) == (False, 13)
    assert {k: old[k] for k in before if k not in ("in_use", "superseded_by", "superseded_at")} == {
        k: before[k] for k in before if k not in ("in_use", "superseded_by", "superseded_at")
    }


def test_an_instant_is_read_again_for_the_system_and_the_site(watched):
    before = shown(watched, 1)
    watched("amend", "1", "--at", "2021-04-08T03:12:10Z")
    after = shown(watched, 13)
    # One day later the light time to the barycentre differs by seconds: the Earth moves 30 km/s at most, so
    # that a day is 8.7 s of light travel at most. Common practice, no source.
    assert after["bmjd_tdb"] - before["bmjd_tdb"] == pytest.approx(1.0, abs=10.0 / 86_400.0)
    assert after["as_typed"]["text"] == "2021-04-08T03:12:10Z"
    assert after["site"] == "Cold Mesa"


def test_a_night_belongs_to_its_site_also_when_the_site_was_wrong(watched):
    before = shown(watched, 10)
    watched("amend", "10", "--site", "Harrow Pass")
    after = shown(watched, 13)
    # Local midnight at 74.9 E comes 144.9 degrees of turning before that at 70.0 W.
    assert before["bmjd_tdb"] - after["bmjd_tdb"] == pytest.approx(144.9 / 360.0, abs=0.001)
    assert after["as_typed"] == before["as_typed"]


def test_it_says_what_was_and_what_is(watched):
    ran = watched("amend", "1", "--mag", "7.35±0.02", "--note", "second reading")
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.splitlines() == [
        "amended observation 1 of Lantern 3, now 13",
        "  value: 7.310 ± 0.030 mag → 7.350 ± 0.020 mag",
        "  note: none → second reading",
        "number 1 is kept: campaign history 13",
    ]


def test_a_difference_beyond_the_shown_digits_is_shown_in_full(watched):
    ran = watched("amend", "1", "--mag", "7.3100001±0.03")
    assert "7.31 +0.03 −0.03 → 7.3100001 +0.03 −0.03" in ran.out


def test_what_reads_so_already_is_left_alone(watched, fingerprint):
    before = fingerprint()
    ran = watched("amend", "1", "--mag", "7.31±0.03", "--site", "COLD MESA", "--source", "Night book 3")
    assert (ran.status, fingerprint()) == (0, before)
    assert ran.out == "observation 1 of Lantern 3 reads so already; nothing was changed\n"
    document = watched("amend", "1", "--mag", "7.31±0.03", "--json").document
    assert (document["data"]["changed"], document["data"]["written"], document["data"]["fields"]) == (
        False,
        False,
        [],
    )


def test_a_rehearsal_writes_nothing_and_says_the_same(watched, fingerprint):
    before = fingerprint()
    ran = watched("amend", "1", "--mag", "7.35±0.02", "--dry-run")
    assert (ran.status, fingerprint()) == (0, before)
    assert ran.out.splitlines() == [
        "would amend observation 1 of Lantern 3",
        "  value: 7.310 ± 0.030 mag → 7.350 ± 0.020 mag",
    ]
    data = watched("amend", "1", "--mag", "7.35±0.02", "--dry-run", "--json").document["data"]
    assert (data["id"], data["written"], fingerprint()) == (None, False, before)


def test_quiet_says_nothing(watched):
    ran = watched("amend", "1", "--mag", "7.35±0.02", "--quiet")
    assert (ran.status, ran.out, ran.err) == (0, "", "")
    assert shown(watched, 13)["value"]["value"] == 7.35


def test_the_last_version_can_be_put_right_again_and_not_the_first(watched):
    watched("amend", "1", "--mag", "7.35±0.02")
    watched("amend", "13", "--mag", "7.36±0.02")
    ran = watched("amend", "1", "--mag", "7.4")
    assert ran.status == 5
    assert "Number 13 took its place" in ran.err and "campaign history 1" in ran.err


REFUSED = [
    (("99",), ("--mag", "7"), 4, "observation-not-found", "campaign observations"),
    (("0",), ("--mag", "7"), 3, "number-refused", "12"),
    (("one",), ("--mag", "7"), 3, "number-refused", "12"),
    (("1",), (), 2, None, "--mag"),
    (("1",), ("--velocity", "5"), 2, None, "--mag"),
    (("11",), ("--quality", "bad"), 2, None, "--note"),
    (("1",), ("--mag", "nan"), 3, None, "7.31"),
    (("1",), ("--mag", "1e400"), 3, None, "--mag"),
    (("1",), ("--mag", "99"), 3, None, "40"),
    (("1",), ("--mag", "7.3 Jy"), 3, None, "mag"),
    (("1",), ("--mag", "7..8"), 3, "value-unreadable", "range"),
    (("1",), ("--mag", ""), 3, None, "--mag"),
    (("1",), ("--limit-sigma", "5"), 3, "limit-missing", "--mag"),
    (("4",), ("--limit-sigma", "0"), 3, "limit-refused", "--limit-sigma 3"),
    (("1",), ("--at", "2021-02-30"), 3, None, "--at"),
    (("1",), ("--site", "Nowhere"), 4, "site-not-found", "campaign site"),
    (("1",), ("--quality", "so-so"), 3, "choice-refused", "good, doubtful, bad"),
    (("1",), ("--note", "a\x1b[2Jb"), 3, None, "--note"),
    (("1",), ("--note", "x" * 2001), 3, None, "2000"),
    (("1",), ("--source", "x" * 401), 3, None, "400"),
    (("6",), ("--star", "C"), 3, "choice-refused", "A, B"),
    (("6",), ("--velocity", "1e6"), 3, None, "--velocity"),
    (("8",), ("--correlation", "1"), 3, None, "--correlation"),
    (("8",), ("--angle", ""), 3, None, "--angle"),
    (("9",), ("--radius", "0"), 3, None, "--radius"),
    (("9",), ("--index", "0"), 3, "index-refused", "1"),
    (("5",), ("--energy", "0.5..10 keV"), 2, None, "erg/s/cm2"),
    (("5",), ("--energy", "5 keV"), 3, "energy-refused", "0.5..10 keV"),
    (("10",), ("--why", " "), 3, "text-missing", "campaign withdraw 10"),
    (("11",), ("--note", ""), 3, "text-missing", "campaign withdraw 11"),
]


@pytest.mark.parametrize(("number", "words", "status", "code", "said"), REFUSED)
def test_what_cannot_be_so_is_refused_and_nothing_changes(
    watched, fingerprint, number, words, status, code, said
):
    before = fingerprint()
    ran = watched("amend", *number, *words)
    assert (ran.status, ran.out) == (status, ""), ran.err
    assert len(ran.err.splitlines()) == 3
    assert said in ran.err
    assert "\x1b" not in ran.err
    error = watched("amend", *number, *words, "--json").error
    assert code in (None, error["code"])
    assert fingerprint() == before


def test_a_correction_to_what_another_says_already_is_refused(watched, fingerprint):
    watched("log", "photometry", "Lantern 3", "K=7.20±0.03", "--at", "2021-04-07T03:12:10Z", "--site",
            "Cold Mesa", "--source", "Night book 3", "--quiet")  # fmt: skip
    before = fingerprint()
    ran = watched("amend", "13", "--mag", "7.31±0.03")
    assert (ran.status, fingerprint()) == (5, before)
    assert "It is number 1." in ran.err and "campaign withdraw 13" in ran.err


# ------------------------------------------------------------------ withdraw


def test_several_go_out_of_use_in_one_step_with_the_reason(watched):
    ran = watched("withdraw", "1", "4", "1", "--why", "wrong star in the aperture")
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.splitlines() == [
        "withdrew 1: Lantern 3, photometry K 7.310 ± 0.030 mag, 2021-04-07",
        "withdrew 4: Lantern 3, photometry K > 12.1 mag, 2022-04-07",
        "reason kept: wrong star in the aperture; take it back with: campaign undo",
    ]
    assert shown(watched, 4)["withdrawn_why"] == "wrong star in the aperture"
    assert not shown(watched, 1)["in_use"]
    assert shown(watched, 2)["in_use"]
    watched("undo", "--yes")
    assert shown(watched, 1)["in_use"] and shown(watched, 4)["in_use"]
    assert shown(watched, 1)["withdrawn_why"] is None


def test_a_rehearsed_withdrawal_writes_nothing(watched, fingerprint):
    before = fingerprint()
    ran = watched("withdraw", "1", "--why", "cloud", "--dry-run")
    assert ran.out == "would withdraw 1: Lantern 3, photometry K 7.310 ± 0.030 mag, 2021-04-07\n"
    data = watched("withdraw", "1", "--why", "cloud", "--dry-run", "--json").document["data"]
    assert (data["written"], data["why"], [each["id"] for each in data["observations"]]) == (
        False,
        "cloud",
        [1],
    )
    assert fingerprint() == before


@pytest.mark.parametrize(
    ("words", "status", "code", "said"),
    [
        (("1", "99", "--why", "x"), 4, "observation-not-found", "99"),
        (("1", "x", "--why", "x"), 3, "number-refused", "12"),
        (("1",), 2, None, "--why"),
        (("--why", "x"), 2, None, "N"),
        (("1", "--why", " "), 3, "reason-missing", "wrong star"),
        (("1", "--why", "a\x07b"), 3, None, "--why"),
        (("1", "--why", "x" * 501), 3, None, "500"),
    ],
)
def test_a_withdrawal_that_cannot_be_leaves_all_as_it_was(watched, fingerprint, words, status, code, said):
    before = fingerprint()
    ran = watched("withdraw", *words)
    assert (ran.status, ran.out) == (status, ""), ran.err
    assert len(ran.err.splitlines()) == 3
    assert said in ran.err
    error = watched("withdraw", *words, "--json").error
    assert code in (None, error["code"])
    assert fingerprint() == before


def test_what_is_out_of_use_is_not_withdrawn_again(watched):
    watched("withdraw", "1", "--why", "cloud")
    ran = watched("withdraw", "1", "--why", "cloud")
    assert ran.status == 5
    assert "withdrawn before" in ran.err and "campaign history 1" in ran.err
    assert watched("amend", "1", "--mag", "7").status == 5
