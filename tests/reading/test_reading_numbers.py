"""Numbers and names as typed. Forms and refusals: common practice, no source, unless said otherwise."""

from __future__ import annotations

import math
import unicodedata

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from campaign.errors import InputRefused
from campaign.reading.numbers import check_plain_text, name_key, quoted, read_number

ACCEPTED = {
    "0": 0.0,
    "12.5": 12.5,
    "-12.5": -12.5,
    "\u221212.5": -12.5,
    "+3": 3.0,
    ".5": 0.5,
    "5.": 5.0,
    "1e-3": 1e-3,
    "1E+3": 1e3,
    " 7.31 ": 7.31,
    "2461234.56789": 2461234.56789,
    "-0": -0.0,
}
REFUSED = {
    "": "there is none",
    "   ": "there is none",
    "nan": "finite",
    "NaN": "finite",
    "inf": "finite",
    "-Infinity": "finite",
    "1e400": "finite",
    "1e99999999999999999999": "finite",
    "1e-400": "finite",
    "1_000": "underscores",
    "３": "digits 0 to 9",
    "١٢": "digits 0 to 9",
    "½": "digits 0 to 9",
    "3,5": "comma",
    "3,127.5": "comma",
    "1 000": "number is expected",
    "0x10": "number is expected",
    "1e": "number is expected",
    "--1": "number is expected",
    "1.2.3": "number is expected",
    "12\x00": "control character",
    "12\t": "control character",
    "\u200e12": "invisible formatting",
    "1\n2": "control character",
    "9" * 500: "at most 200",
}


@pytest.mark.parametrize(("text", "number"), ACCEPTED.items())
def test_a_plain_number_is_read_as_it_stands(text, number):
    read = read_number(text, "--x")
    assert read == number
    assert math.copysign(1.0, read) == math.copysign(1.0, number)


@pytest.mark.parametrize(("text", "reason"), REFUSED.items(), ids=[quoted(text) for text in REFUSED])
def test_anything_else_is_refused_with_the_reason_and_an_accepted_form(text, reason):
    with pytest.raises(InputRefused) as refused:
        read_number(text, "--x")
    assert reason in refused.value.why
    assert refused.value.message.startswith("--x")
    accepted = refused.value.details["accepted_form"]
    assert accepted in refused.value.hint
    read_number(accepted, "--x")


def test_a_decimal_comma_is_answered_with_the_same_number_and_a_point():
    with pytest.raises(InputRefused) as refused:
        read_number("3,5")
    assert refused.value.details["accepted_form"] == "3.5"


@given(st.floats(allow_nan=False, allow_infinity=False))
@example(5e-324)
@example(1.7976931348623157e308)
def test_every_finite_float_survives_being_written_and_read(number):
    assert read_number(repr(number)) == number
    assert read_number(repr(number).replace("-", "\u2212")) == number


@given(st.text(max_size=40) | st.from_regex(r"[0-9.eE+\-_,\u2212 naif]{1,12}", fullmatch=True))
def test_no_text_raises_anything_but_a_refusal_or_gives_anything_but_a_finite_number(text):
    try:
        assert math.isfinite(read_number(text))
    except InputRefused as refused:
        assert refused.message and refused.why and refused.hint
        read_number(refused.details["accepted_form"])


@pytest.mark.parametrize(
    ("typed", "kept"),
    [
        ("Lantern 3", "Lantern 3"),
        ("  Lantern   3 ", "Lantern 3"),
        ("Lantern\u00a03", "Lantern 3"),
        ("[red]Lantern[/red]", "[red]Lantern[/red]"),
        ("Étoile ρ", "Étoile ρ"),
        ("灯台 3", "灯台 3"),
    ],
)
def test_a_name_keeps_its_characters_and_loses_only_spare_spaces(typed, kept):
    assert check_plain_text(typed, "name") == kept


@pytest.mark.parametrize(
    "typed",
    [
        "", " ", "a\x1b[31mred", "a\x00b", "a\tb", "a\nb", "a\x9bb", "a\u202eb", "a\u200bb", "a\u2028b",
        "a\u2029b", "a\ud800b", "x" * 121, "\ufeffa", "\x1b",
    ],
)  # fmt: skip
def test_a_name_with_invisible_characters_or_of_no_or_too_great_length_is_refused(typed):
    with pytest.raises(InputRefused) as refused:
        check_plain_text(typed, "name")
    assert refused.value.why and refused.value.hint
    assert refused.value.message.isprintable() and refused.value.hint.isprintable()
    assert refused.value.why.isprintable()
    check_plain_text(refused.value.details["accepted_form"], "name")


@given(st.text(max_size=200), st.integers(min_value=1, max_value=130))
def test_a_kept_name_is_printable_trimmed_short_enough_and_stable(typed, max_length):
    try:
        kept = check_plain_text(typed, "name", max_length)
    except InputRefused as refused:
        kept = refused.details["accepted_form"]
    assert 0 < len(kept) <= max_length
    assert kept == kept.strip()
    assert not {unicodedata.category(c) for c in kept} & {"Cc", "Cf", "Cs", "Zl", "Zp"}
    assert check_plain_text(kept, "name", max_length) == kept


@pytest.mark.parametrize("other", ["lantern 3", "LANTERN3", "Lan tern 3", "Ｌantern ３", " lantern\u00a03"])
def test_names_that_differ_in_case_spaces_or_width_share_a_key(other):
    assert name_key(other) == name_key("Lantern 3")


def test_names_that_differ_in_a_letter_or_digit_have_different_keys():
    keys = {name_key(name) for name in ("Lantern 3", "Lantern 4", "Lanterns 3", "Lantern -3", "Lantern 33")}
    assert len(keys) == 5


def test_the_sharp_s_and_composed_letters_fold_to_one_key():
    # Unicode Standard, section 3.13 (caseless matching): ß folds to ss.
    assert name_key("Straße") == name_key("STRASSE")
    assert name_key("E\u0301toile") == name_key("\u00e9TOILE")


@given(st.text(max_size=30))
def test_the_key_of_a_key_is_itself_and_holds_no_space(text):
    key = name_key(text)
    assert name_key(key) == key
    assert not any(c.isspace() for c in key)
