"""The composition of a wind as people write it."""

import pytest

from campaign.errors import InputRefused
from campaign.model.compositions import MIXES
from campaign.physics.postshock import ELEMENTS
from campaign.reading.compositions import SYMBOLS, read_composition


@pytest.mark.parametrize("text", ["WC", "wc", " WC ", "Wc"])
def test_a_mix_is_known_by_its_name_whatever_its_case(text):
    assert read_composition(text) is MIXES["WC"]


@pytest.mark.parametrize(
    "text",
    ["He=0.5 C=0.4 O=0.1", "He=0.5, C=0.4, O=0.1", "he=0.5;c=0.4;o=0.1", "He = 0.5 C = 0.4 O = 0.1",
     "He=50% C=40% O=10%", "He=.5 C=.4 O=.1"],
)  # fmt: skip
def test_mass_fractions_are_pairs(text):
    read = read_composition(text)
    assert [(symbol, value.value) for symbol, value in read.mass_fractions] == [
        ("He", pytest.approx(0.5)), ("C", pytest.approx(0.4)), ("O", pytest.approx(0.1)),
    ]  # fmt: skip
    assert all(value.minus is None for _, value in read.mass_fractions)


def test_fractions_may_have_errors():
    (_, helium), (_, carbon) = read_composition("He=0.6±0.1 C=0.4 +0.2 -0.1").mass_fractions
    assert (helium.minus, helium.plus, carbon.minus, carbon.plus) == (0.1, 0.1, 0.1, 0.2)


def test_every_mix_is_of_known_elements_and_whole():
    for mix in MIXES.values():
        assert sum(value.value for _, value in mix.mass_fractions) == pytest.approx(1.0)
        assert {symbol for symbol, _ in mix.mass_fractions} <= set(SYMBOLS)
        assert mix.source
    assert set(SYMBOLS) == set(ELEMENTS)


@pytest.mark.parametrize(
    "text",
    ["", "XX", "He", "He=", "=0.5", "He=0.5", "He=0.5 C=0.2", "He=0.9 He=0.1", "Xx=1", "He=-0.5 C=1.5",
     "He=nan C=1", "He=1 junk", "He=1\x1b[31m", "He=0.5 C 0.5", "He=2"],
)  # fmt: skip
def test_what_is_no_composition_is_refused_with_a_form_that_is_accepted(text):
    with pytest.raises(InputRefused) as refused:
        read_composition(text, "--composition-b")
    assert refused.value.why
    assert "\x1b" not in refused.value.message
