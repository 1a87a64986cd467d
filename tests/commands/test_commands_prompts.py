"""``log`` without words on a terminal: it asks, asks again what it cannot read, and can be left."""

from __future__ import annotations

import io
from collections.abc import Callable
from typing import Any

import pytest

from campaign.commands import common

RunCampaign = Callable[..., Any]
Answer = Callable[..., None]


@pytest.fixture
def answers(monkeypatch: pytest.MonkeyPatch) -> Answer:
    """Somebody at the terminal who types these lines."""

    def typed(*lines: str) -> None:
        monkeypatch.setattr(common, "asks_questions", lambda: True)
        monkeypatch.setattr("sys.stdin", io.StringIO("".join(line + "\n" for line in lines)))

    return typed


@pytest.mark.parametrize(
    ("kind", "lines", "said"),
    [
        ("photometry", ("ln3", "2025-04-09", "", "K", "7.4±0.1"), "photometry K 7.40 ± 0.10 mag"),
        ("flux", ("ln3", "2025-04-09", "", "8.4 GHz", "12.3±0.4 mJy"), "8.4 GHz 0.01230 ± 0.00040 Jy"),
        ("flux", ("ln3", "2025-04-09", "", "N", "1.2±0.1 Jy"), "flux N 1.20 ± 0.10 Jy"),
        ("flux", ("ln3", "2025-04-09", "", "0.5..10 keV", "(4±1)e-12 erg/s/cm2"), "0.5..10 keV"),
        ("velocity", ("ln3", "2025-04-09", "", "b", "-12±3"), "velocity star B -12.0 ± 3.0 km/s"),
        ("line", ("ln3", "2025-04-09", "", "C III 5696", "-12.3±0.4 A"), "C III 5696 -12.30 ± 0.40 Å"),
        ("position", ("ln3", "2025-04-09", "", "12.3±0.1 mas", "45±1"), "12.30 ± 0.10 mas at 45.0"),
        ("shell", ("ln3", "2025-04-09", "", "1.3±0.1 arcsec"), "shell 1.30 ± 0.10 arcsec"),
        ("attempt", ("ln3", "2025-04-09", "", "wind"), "attempt wind"),
        ("remark", ("ln3", "", "brighter by eye"), "remark brighter by eye"),
    ],
)
def test_every_kind_can_be_logged_by_answering(
    kept: RunCampaign, answers: Answer, kind: str, lines: tuple[str, ...], said: str
) -> None:
    answers(*lines)
    ran = kept("log", kind)
    assert ran.status == 0, ran.err
    assert said in ran.out


def test_what_cannot_be_read_is_asked_for_again(kept: RunCampaign, answers: Answer) -> None:
    answers("ln3", "tonight", "2025-02-30", "2025-04-09", "", "K", "seven", "", "7.4±0.1")
    ran = kept("log", "photometry")
    assert ran.status == 0
    assert "K 7.40 ± 0.10 mag" in ran.out
    assert "2025-02 has the days 01 to 28" in ran.err
    assert ran.err.count("Magnitude (as 7.31±0.03):") == 3


def test_no_answer_to_when_means_now(kept: RunCampaign, answers: Answer, monkeypatch: Any) -> None:
    monkeypatch.setattr(common, "now_iso", lambda: "2031-04-07T03:12:10Z")
    answers("ln3", "", "", "cloud")
    assert "2031-04-07T03:12:10" in kept("log", "attempt").out


def test_leaving_in_the_middle_changes_nothing(
    kept: RunCampaign, answers: Answer, fingerprint: Callable[[], str]
) -> None:
    before = fingerprint()
    answers("ln3", "2025-04-09")
    ran = kept("log", "photometry")
    assert (ran.status, ran.out) == (9, "")
    assert "Nothing was done" in ran.err
    assert fingerprint() == before


def test_an_interrupt_at_a_question_is_an_interrupt(
    kept: RunCampaign, answers: Answer, monkeypatch: pytest.MonkeyPatch
) -> None:
    class Interrupted(io.StringIO):
        def readline(self, *_: Any) -> str:
            raise KeyboardInterrupt

    answers()
    monkeypatch.setattr("sys.stdin", Interrupted())
    assert kept("log", "photometry").status == 130


def test_a_remark_and_an_attempt_need_no_place_on_earth(kept: RunCampaign) -> None:
    assert kept("log", "remark", "ln3", "bright").err == ""
    assert kept("log", "attempt", "ln3", "--why", "cloud", "--at", "2025-04-07T03:12:10Z").err == ""
