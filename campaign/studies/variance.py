"""Which input makes how much of a date's error: one quantity varied at a time, and what is left over."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from copy import copy
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import VarianceTerm
from campaign.model.systems import DustRule
from campaign.studies.rows import SPOKEN, ForecastRow
from campaign.studies.sampling import Sampler

FloatArray = NDArray[np.float64]
Draw = Callable[[Sampler], FloatArray]

# Terms smaller than this share of the whole are not worth a line.
_SMALL = 0.02
_DRAWS = 20_000
# Smaller than this, days, is the rounding of the arithmetic.
_ROUNDING_D = 1e-7


def only(row: ForecastRow, kept: Iterable[str]) -> ForecastRow:
    """The row with only the named errors left, and no scatter unless ``scatter`` is named.

    Parameters
    ----------
    row : ForecastRow
        One system with one solution; values in the units of their names.
    kept : iterable of str
        Names of ``row.values`` that keep their errors.

    Returns
    -------
    ForecastRow
        A copy; every other error is zero.

    Notes
    -----
    Accuracy: no value is changed. Source: project convention.
    """
    names = set(kept)
    one = copy(row)
    one.values = {
        name: (v, m if name in names else 0.0, p if name in names else 0.0)
        for name, (v, m, p) in row.values.items()
    }
    if row.rule is not None:
        one.rule = DustRule(
            id=0,
            system_id=row.rule.system_id,
            kind=row.rule.kind,
            scatter_onset_d=row.rule.scatter_onset_d if "scatter" in names else 0.0,
            scatter_maximum_d=row.rule.scatter_maximum_d if "scatter" in names else 0.0,
            scatter_end_d=row.rule.scatter_end_d if "scatter" in names else 0.0,
        )
    return one


def nominal(row: ForecastRow, draw: Draw, seed: int) -> float:
    """What is drawn when nothing has an error.

    Parameters
    ----------
    row : ForecastRow
        One system with one solution.
    draw : callable
        From a sampler of this row to draws, days.
    seed : int
        Of the draws, which all come out alike.

    Returns
    -------
    float
        Days, on the axis of ``draw``.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return float(np.median(draw(Sampler([only(row, ())], 3, seed))))


def terms_of(
    row: ForecastRow,
    draw: Draw,
    needed: Sequence[str],
    seed: int,
    *,
    scatter_d: float = 0.0,
    notes: dict[str, str] | None = None,
    extra: Sequence[VarianceTerm] = (),
) -> tuple[VarianceTerm, ...]:
    """Terms of the variance of a drawn date or span.

    Parameters
    ----------
    row : ForecastRow
        One system with one solution.
    draw : callable
        From a sampler of this row to draws, days.
    needed : sequence of str
        Names of the quantities that matter.
    seed : int
        Of the draws.
    scatter_d : float
        Cycle-to-cycle scatter, days.
    notes : dict of str to str, optional
        A word on some of the quantities.
    extra : sequence of VarianceTerm
        Terms known otherwise; those that ``draw`` knows nothing of are independent of it.

    Returns
    -------
    tuple of VarianceTerm
        Sizes in days; NaN where an error is unknown. The squares, with their signs, sum to the variance
        but for 2 %; what is left over is a term of its own.

    Notes
    -----
    Accuracy: 20,000 stratified draws a term.

    Source: propagation of errors, one quantity at a time.
    """
    terms: list[VarianceTerm] = []
    # Correlated deviates would let one quantity move another: alone, each is drawn without them.
    solution = row.solution
    alone = row
    if solution is not None and solution.covariance is not None:
        alone = copy(row)
        alone.solution = replace(solution, covariance=None)
    for name in needed:
        _, minus, plus = row.values[name]
        if minus is None or plus is None:
            terms.append(VarianceTerm(SPOKEN[name], float("nan"), "error unknown"))
            continue
        size = _spread(draw(Sampler([only(alone, (name,))], _DRAWS, seed)))
        if size > _ROUNDING_D:
            terms.append(VarianceTerm(SPOKEN[name], size, (notes or {}).get(name, "")))
    if scatter_d > 0.0:
        terms.append(VarianceTerm("cycle-to-cycle scatter", scatter_d, ""))
    terms.extend(extra)
    if any(np.isnan(term.size_d) for term in terms):
        return tuple(terms)
    return with_remainder(terms, _spread(draw(Sampler([row], _DRAWS, seed))) ** 2)


def _spread(times: FloatArray) -> float:
    return float(np.nanstd(times)) if not np.all(np.isnan(times)) else 0.0


def with_remainder(terms: Sequence[VarianceTerm], variance: float) -> tuple[VarianceTerm, ...]:
    """The terms that are worth a line, and one for what they leave of the variance.

    Parameters
    ----------
    terms : sequence of VarianceTerm
        Sizes in days, negative where they take from the variance.
    variance : float
        Of the whole, days squared.

    Returns
    -------
    tuple of VarianceTerm
        Squares, with their signs, sum to the variance within 2 %.

    Notes
    -----
    Accuracy: terms below 0.2 % of the whole error are left out. Source: project convention.
    """
    kept = [term for term in terms if abs(term.size_d) > 0.1 * _SMALL * np.sqrt(variance)]
    rest = variance - sum(float(np.copysign(term.size_d**2, term.size_d)) for term in kept)
    if abs(rest) > _SMALL * max(variance, 1e-12):
        size = float(np.copysign(np.sqrt(abs(rest)), rest))
        kept.append(VarianceTerm("together rather than one by one", size, "non-linear or correlated"))
    return tuple(kept)
