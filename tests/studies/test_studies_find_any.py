"""Whatever a light curve holds, finding episodes ends, refuses with reasons, or gives intervals in order.

Light curves are drawn from a seed: any span, cadence, noise, limits, errors unknown or absurd, equal dates.
"""

from __future__ import annotations

import io
import json

import numpy as np
import pytest
from find_examples import burst, record

from campaign.errors import InputRefused
from campaign.model.arrays import PhotometryArrays
from campaign.output.console import Screen
from campaign.output.episodes import found_json, render_found
from campaign.studies.find_episodes import find_in


def any_curve(rng: np.random.Generator) -> PhotometryArrays:
    count, span = int(rng.integers(1, 110)), float(10 ** rng.uniform(-1.0, 4.5))
    times = np.sort(50_000.0 + rng.uniform(0.0, span, count))
    if rng.random() < 0.5:
        times = np.round(times / 10.0) * 10.0
    mag = rng.normal(7.0, 10 ** rng.uniform(-3.0, 0.7), count)
    for _ in range(int(rng.integers(0, 3))):
        onset, rise_d = 50_000.0 + rng.uniform(0.0, span), 10 ** rng.uniform(0.0, 3.0)
        mag -= 2.5 * np.log10(1.0 + burst(times, onset, rise_d, 10 ** rng.uniform(-1.0, 3.0)))
    error = np.where(rng.random(count) < rng.choice([0.0, 0.3, 1.0]), np.nan, 10 ** rng.uniform(-4, 0, count))
    side = np.where(rng.random(count) < rng.choice([0.0, 0.2, 0.8]), rng.choice([-1, 1], count), 0)
    return PhotometryArrays(
        np.arange(count), times, 10 ** rng.uniform(-5, 2, count), np.full(count, np.nan), mag, error, error,
        side.astype(np.int8), np.where(side != 0, rng.choice([3.0, 5.0], count), np.nan),
        np.array(["K", "L"])[rng.integers(0, 2, count)], np.array(["a", "b"])[rng.integers(0, 2, count)],
        rng.integers(-1, 2, count), np.where(rng.random(count) < 0.1, "doubtful", "good"),
        np.array(["", "One"])[rng.integers(0, 2, count)],
    )  # fmt: skip


def in_order(dates) -> bool:
    ends = [dates.lo95, dates.lo68, dates.median, dates.hi68, dates.hi95]
    return bool(np.isfinite([*ends, dates.sigma_d]).all() and (np.diff(ends) >= -1e-6).all())


def check(seed: int) -> bool:
    """Whether the curve of a seed could be looked at; everything shown of it is checked."""
    rng = np.random.default_rng([seed, 31])
    try:
        found = find_in(record(), any_curve(rng))
    except InputRefused as refused:
        assert refused.code in {"too-few-points", "only-limits"}
        return False
    for episode in found.episodes:
        dates = [episode.onset, episode.end, episode.half, *(one.date for one in episode.maxima)]
        assert all(in_order(date.bmjd_tdb) for date in dates if date is not None)
        assert all(one.excess.value >= 0.0 for one in episode.maxima)
        assert (episode.onset is None) == (episode.rise == "before the curve")
    json.loads(found_json(found, "2027-01-01T00:00:00Z"))
    shown = io.StringIO()
    screen = Screen(stream=shown, is_terminal=True, width=80, colour=False, unicode=True)
    render_found(screen, found, drawn=1, levels=True)
    assert "nan" not in shown.getvalue().lower()
    assert max(map(len, shown.getvalue().splitlines())) <= 80
    return True


def test_any_light_curve_is_dated_or_refused():
    assert sum(check(seed) for seed in range(12)) > 5


@pytest.mark.slow
def test_any_of_many_light_curves_is_dated_or_refused():
    assert sum(check(seed) for seed in range(100, 400)) > 200
