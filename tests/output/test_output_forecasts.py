"""Kept forecasts and their scores fit any window, say what is missing, and let no text steer the terminal."""

from __future__ import annotations

import io
import json
import math
from dataclasses import replace
from datetime import UTC, datetime

import pytest
from rich.cells import cell_len

from campaign.model.forecasts import EventForecast, Quantiles
from campaign.model.verification import (
    ForecastInputs,
    ForecastScores,
    Keeping,
    KeepingList,
    KeptForecast,
    ListedKeeping,
    Outcome,
    ScoredForecast,
    ScoreGroup,
    Unscored,
)
from campaign.output.console import Screen
from campaign.output.forecasts_kept import kept_json, render_kept, render_scores, scores_json

AT = datetime(2031, 4, 7, 3, 12, 10, tzinfo=UTC)
KEEPING = Keeping(1, "spring", 62_963.0, 62_963.0, 64_789.0, AT, AT, 20_000, 1, "0.1.0")
EVENT = EventForecast(
    "Lantern 3", "onset", 4, "orbit", "orbit 2029", "lag",
    Quantiles(63_500.0, 10.0, 63_490.0, 63_510.0, 63_480.0, 63_520.0), None, "expected", 0.53, 0.5,
)  # fmt: skip
KEPT = KeptForecast(1, 1, 1, EVENT, tuple(63_450.0 + n for n in range(101)), 63_480.0, 5.0, ForecastInputs())
OUTCOME = Outcome(9, 4, 63_512.0, 4.0, 6.0, decided_at=AT)
SCORED = ScoredForecast(
    1, "spring", "Lantern 3", "onset", 4, "orbit 2029", "lag", 549.0, 63_500.0, 63_490.0, 63_510.0,
    63_480.0, 63_520.0, OUTCOME, "2032-10-07T12:00:00Z", 12.0, 7.4, 4.1, 0.88, 26.0, 0.53,
)  # fmt: skip
GROUP = ScoreGroup(
    "onset", 365.25, 1095.75, 1, 1, 7.4, 4.1, 12.0, 1, 7.4, 26.0, 0.72, 0.0, None, None, 1.0, None, None,
    0.88, 0.0, None, None, "too few",
)  # fmt: skip
SCORES = ForecastScores("2033-01-01T00:00:00Z", (SCORED,), (), (GROUP,), 3, 2, 6, 10)


def shown(render, what, width=None):
    stream = io.StringIO()
    render(Screen(stream, is_terminal=width is not None, width=width), what)
    return stream.getvalue()


def listed(*keepings):
    return KeepingList(tuple(ListedKeeping(one, "2031-04-07T00:00:00Z", 61, 14, 31) for one in keepings))


@pytest.mark.parametrize("width", [20, 40, 60, 80, 120, 160])
def test_every_line_fits_the_window(width):
    chosen = KeepingList(listed(KEEPING).keepings, (KEPT,), KEEPING)
    span = replace(SCORED, outcome=replace(OUTCOME, first_bmjd_tdb=63_500.0, last_bmjd_tdb=63_531.0))
    left = Unscored(1, "spring", "Lantern 3", "end", 4, "contains-outcome", "it knew", ("entries",))
    scores = replace(SCORES, scored=(SCORED, span), unscored=(left,))
    for render, what in ((render_kept, listed(KEEPING)), (render_kept, chosen), (render_scores, scores)):
        text = shown(render, what, width)
        assert max(cell_len(line) for line in text.splitlines()) <= width
        assert "Lantern" in text or render is render_kept


def test_columns_that_do_not_fit_are_told():
    text = shown(render_scores, SCORES, 80)
    assert "Left out at 80 columns" in text and "log score" in text
    assert "Left out" not in shown(render_scores, SCORES, 160)


def test_names_cannot_steer_the_terminal():
    evil = "a\x1b[31mb\u202ec"
    texts = [
        shown(render_kept, listed(replace(KEEPING, label=evil))),
        shown(render_kept, KeepingList((), (replace(KEPT, event=replace(EVENT, system=evil)),), KEEPING)),
        shown(render_scores, replace(SCORES, scored=(replace(SCORED, system=evil, keeping_label=evil),))),
        shown(
            render_scores,
            replace(SCORES, scored=(), unscored=(Unscored(1, evil, evil, "end", 4, "no-interval", evil),)),
        ),
        kept_json(listed(replace(KEEPING, label=evil)), "2031-04-07T00:00:00Z"),
    ]
    for text in texts:
        assert "\x1b" not in text and "\u202e" not in text


def test_too_few_outcomes_are_said_to_be_too_few():
    text = shown(render_scores, SCORES)
    assert "too few to judge (1)" in text and "fewer than 10 independent ones" in text
    enough = replace(SCORES, groups=(replace(GROUP, outcomes=40, verdict="too narrow"),))
    text = shown(render_scores, enough)
    assert "intervals too narrow" in text and "too few" not in text.lower()


def test_an_outcome_is_told_with_what_is_known_of_it():
    assert "2032-10-07 −4.0/+6.0 d" in shown(render_scores, SCORES)
    month = replace(OUTCOME, first_bmjd_tdb=63_506.0, last_bmjd_tdb=63_537.0)
    assert "2032-10-01 … 2032-10-31" in shown(
        render_scores, replace(SCORES, scored=(replace(SCORED, outcome=month),))
    )
    unknown = replace(OUTCOME, minus_d=None, plus_d=None)
    assert "error unknown" in shown(
        render_scores, replace(SCORES, scored=(replace(SCORED, outcome=unknown),))
    )


def test_others_are_counted_and_reasons_told_once():
    lines = [
        Unscored(0, None, "Lantern 3", "onset", 2, "nothing-known", "nothing was known", (), lead)
        for lead in (90.0, 365.25)
    ]
    text = shown(render_scores, replace(SCORES, unscored=tuple(lines)))
    assert "Lantern 3, onset 2, 90 d and 1 yr before: nothing was known" in text
    assert "3 wait for a confirmed outcome and 2 are of events that no episode dates" in text


@pytest.mark.parametrize(
    ("scores", "advice"),
    [
        (replace(SCORES, scored=(), groups=(), kept=0, waiting=0, undatable=0), "campaign forecast keep"),
        (replace(SCORES, scored=(), groups=()), "campaign episodes confirm N"),
        (replace(SCORES, scored=(), groups=(), system="Lantern 3",
                 unscored=(Unscored(0, None, "Lantern 3", "onset", 1, "nothing-known", "x"),)),
         'campaign forecast rehearse "Lantern 3" --entered-any-time'),
    ],
)  # fmt: skip
def test_empty_results_say_what_to_do_next(scores, advice):
    assert advice in shown(render_scores, scores)
    assert advice in " ".join(shown(render_scores, scores, 60).split()).replace("- ", "-")


def test_documents_hold_units_ends_of_times_and_no_infinity():
    excluded = replace(SCORED, log_score=math.inf)
    told = json.loads(scores_json(replace(SCORES, scored=(excluded,))))
    assert told["schema"] == "campaign/forecast-score/1" and told["as_of"] == "2033-01-01T00:00:00Z"
    (one,) = told["data"]["scored"]
    assert one["log_score"] is None and one["outcome"]["decided_at"] == "2031-04-07T03:12:10Z"
    (group,) = told["data"]["groups"]
    assert group["calibration"] == "too-few" and group["lead_high_d"] == 1095.75
    assert "system" not in told["data"]
    rehearsed = json.loads(scores_json(replace(SCORES, system="Lantern 3", leads_d=(365.25,))))
    assert rehearsed["schema"] == "campaign/forecast-rehearse/1"
    assert rehearsed["data"]["leads_d"] == [365.25]
    listing = json.loads(kept_json(KeepingList(listed(KEEPING).keepings, (KEPT,), KEEPING), "x"))["data"]
    assert listing["keepings"][0]["kept_at"] == "2031-04-07T03:12:10Z"
    (kept,) = listing["forecasts"]
    assert kept["quantiles_bmjd_tdb"] == list(KEPT.quantiles_bmjd_tdb)
    assert kept["quantile_shares"][50] == 0.5
