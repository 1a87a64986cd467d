"""Speed of writing instants as UTC text."""

from __future__ import annotations

import time

import numpy as np
import pytest

from campaign.physics.timescales import utc_iso


@pytest.mark.slow
def test_three_hundred_thousand_instants_are_written_within_a_second():
    instants = np.random.default_rng(20310407).uniform(40000.0, 90000.0, 300_000)
    best = np.inf
    for _ in range(3):
        begin = time.perf_counter()
        texts = utc_iso(instants)
        best = min(best, time.perf_counter() - begin)
    print(f"\n300,000 instants as UTC text: {best:.2f} s")
    assert best < 1.0
    assert None not in texts
