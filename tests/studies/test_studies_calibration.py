"""Intervals hold the truth as often as they say, for each dust rule; so does the probability of no episode.

Nominal shares (equal-tailed 68 % and 95 %); |z| < 3 against them.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from calibration_cases import Case, forecast, learned_case, orbit_case, separation_case

CASES = 4_000
DRAWS = 4_000


def share_z(held: int, total: int, share: float) -> float:
    """Deviation of a binomial count from its nominal share, in standard deviations."""
    return (held - share * total) / math.sqrt(total * share * (1.0 - share))


def check_intervals(cases: list[Case]) -> None:
    dated = forecast(cases, "onset", DRAWS)
    assert len(dated) == len(cases)
    held68 = held95 = total = 0
    for case, found in zip(cases, dated, strict=True):
        if case.truth is None or found.quantiles is None or np.isnan(found.quantiles[0]):
            continue
        total += 1
        _, low68, high68, low95, high95 = found.quantiles
        held68 += low68 <= case.truth <= high68
        held95 += low95 <= case.truth <= high95
    z68, z95 = share_z(held68, total, 0.68), share_z(held95, total, 0.95)
    print(
        f"n {total}: 68 % held {held68 / total:.4f} (z {z68:+.2f}), "
        f"95 % held {held95 / total:.4f} (z {z95:+.2f})"
    )
    assert abs(z68) < 3.0
    assert abs(z95) < 3.0


RULES: dict[str, Callable[[np.random.Generator, int], Case]] = {
    "phase": lambda rng, i: orbit_case(rng, i, "phase", False, 0.0),
    "phase with scatter": lambda rng, i: orbit_case(rng, i, "phase", False, 25.0),
    "phase with asymmetric errors": lambda rng, i: orbit_case(rng, i, "phase", True, 0.0),
    "lag": lambda rng, i: orbit_case(rng, i, "lag", False, 0.0),
    "lag with scatter": lambda rng, i: orbit_case(rng, i, "lag", False, 25.0),
    "lag with asymmetric errors": lambda rng, i: orbit_case(rng, i, "lag", True, 10.0),
    "separation, wide window": lambda rng, i: separation_case(rng, i, 1.5, 2.0),
    "learned, one onset and an orbit": lambda rng, i: learned_case(rng, i, 1, None, True),
    "learned, two onsets": lambda rng, i: learned_case(rng, i, 2, None, False),
    "learned, two onsets and an orbit": lambda rng, i: learned_case(rng, i, 2, None, True),
    "learned, four onsets": lambda rng, i: learned_case(rng, i, 4, 30.0, False),
    "learned, eight onsets": lambda rng, i: learned_case(rng, i, 8, 30.0, False),
    "learned, four onsets and an orbit": lambda rng, i: learned_case(rng, i, 4, 30.0, True),
}


@pytest.mark.parametrize("name", RULES)
def test_intervals_of_onset_hold_the_truth(name: str) -> None:
    rng = np.random.default_rng([20261201, *name.encode()])
    check_intervals([RULES[name](rng, i) for i in range(CASES)])


@pytest.fixture(scope="module")
def grazing() -> list[Case]:
    """Critical separation near the periastron distance: the ratio runs from well below 1 to well above."""
    rng = np.random.default_rng(20261202)
    return [separation_case(rng, i, 0.7, 1.5) for i in range(CASES)]


def test_intervals_hold_the_truth_where_an_episode_is_in_doubt(grazing: list[Case]) -> None:
    check_intervals(grazing)


def test_probability_of_an_episode_is_its_frequency(grazing: list[Case]) -> None:
    dated = forecast(grazing, "onset", DRAWS)
    probability = np.array([d.probability for d in dated], dtype=float)
    happens = np.array([case.truth is not None for case in grazing])
    for low, high in ((0.02, 0.3), (0.3, 0.7), (0.7, 0.98), (0.02, 0.98)):
        chosen = (probability >= low) & (probability <= high)
        p = probability[chosen]
        z = (happens[chosen].sum() - p.sum()) / math.sqrt(np.sum(p * (1.0 - p)))
        print(
            f"{low} to {high}: {chosen.sum()} systems, mean {p.mean():.3f}, "
            f"seen {happens[chosen].mean():.3f}, z {z:+.2f}"
        )
        assert chosen.sum() > 100
        assert abs(z) < 3.0


def test_monte_carlo_and_analytic_sigma_of_periastron_agree() -> None:
    """Within 2 %, at 2,000 draws, for twenty invented systems and cycles."""
    from campaign.studies.forecast import periastron_sigma_d
    from campaign.studies.rows import build_row
    from campaign.studies.sampling import Sampler

    rng = np.random.default_rng(3)
    cases = [orbit_case(rng, i, "lag", False, 0.0) for i in range(20)]
    rows = [build_row(case.record, case.record.solutions[0]) for case in cases]
    index = np.arange(len(rows))
    cycles = np.array([case.cycle for case in cases])
    for draws in (2_000, 20_000):
        sampler = Sampler(rows, draws, 1)
        drawn = sampler.event_times("periastron", index, cycles).std(axis=1)
        for case, sigma in zip(cases, drawn, strict=True):
            solution = case.record.solutions[0]
            by_hand = math.hypot(solution.epoch.plus_d, case.cycle * solution.period_d.plus)  # type: ignore[union-attr, arg-type]
            assert sigma == pytest.approx(by_hand, rel=0.02)
        assert periastron_sigma_d(sampler, index, cycles) == pytest.approx(drawn, rel=0.02)
