"""Start-up as a ratio to what cannot be avoided, both measured in this run."""

import subprocess
import sys
import time
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


def quickest_s(*words, times=9):
    """The least wall time of a process, which is the time without the neighbours."""
    best = float("inf")
    for _ in range(times):
        start = time.perf_counter()
        subprocess.run([sys.executable, *words], cwd=ROOT, stdout=subprocess.DEVNULL, check=True)
        best = min(best, time.perf_counter() - start)
    return best


@pytest.mark.slow
@pytest.mark.parametrize("words", [("--help",), ("--version",)])
def test_help_costs_at_most_two_and_a_half_times_the_import_of_typer(words):
    # Budget: campaign --help <= 2.5 x python -c "import typer".
    typer_s = quickest_s("-c", "import typer")
    help_s = quickest_s("-m", "campaign", *words)
    assert help_s / typer_s <= 2.5, f"{help_s:.3f} s against {typer_s:.3f} s"
