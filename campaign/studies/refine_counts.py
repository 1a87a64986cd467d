"""Ways to count the cycles of dated episodes, weighed by the dates and by the quiet observations between."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from campaign.model.forecasts import Quantiles, UtcQuantiles
from campaign.model.measured import Measured
from campaign.model.refined import CycleCounting, MissedCycle, MissedVerdict
from campaign.model.systems import Solution
from campaign.physics.cyclecounts import CycleCount
from campaign.physics.intervals import PROBABILITIES
from campaign.physics.linearephemeris import fit_ephemeris
from campaign.physics.missedcycles import missed_log_chance
from campaign.physics.recurrence import RecurrencePrediction
from campaign.physics.timescales import utc_iso
from campaign.studies.refine_dates import ChosenDates
from campaign.studies.refine_quiet import QuietEvidence

# A count whose quiet observations are so much less probable than the best count's is excluded.
EXCLUDED_CHANCE = 0.01
# An excess where a count wants an episode speaks for it, but nobody confirmed it: no more than so much.
MOST_FOR_EXCESS = 20.0
_QUIET, _IN_PART, _EXCESS = 0.05, 0.5, 3.0
# A count against which so much was found (ln) is not looked at any further.
_HOPELESS = -30.0
# Beside those that are open, a count is listed only if the dates make it so probable, relative to the best.
_LISTED_SHARE = 1e-3
# An orbit decides between counts that the observations leave open, within so many sigma.
_AGREES_SIGMA = 3.0


@dataclass(frozen=True, slots=True, eq=False)
class WeighedCounts:
    """Counts with what is told of each, in one order; ``best`` is the place of the one to be taken."""

    counts: tuple[CycleCount, ...]
    listed: tuple[CycleCounting, ...]
    best: int
    note: str


def weigh_counts(
    dates: ChosenDates, counts: Sequence[CycleCount], quiet: QuietEvidence | None, orbit: Solution | None
) -> WeighedCounts:
    """Weigh the counts that fit the dates by what was observed between them.

    Parameters
    ----------
    dates : ChosenDates
        The dated events, days.
    counts : sequence of CycleCount
        As ``campaign.physics.cyclecounts`` ranks them.
    quiet : QuietEvidence or None
        What the light curve says of onsets between the dates.
    orbit : Solution or None
        Its period decides between counts that are left open, and excludes none.

    Returns
    -------
    WeighedCounts
        The most probable first; days and probabilities.

    Notes
    -----
    Accuracy: each cycle without a known episode counts by itself; a count is excluded only where the quiet
    observations are a hundred times less probable with it than with the best.

    Source: DEVELOPERS.md (refined solutions).
    """
    missed = [_missed(count, quiet) for count in counts]
    quiet_ln = [sum(min(one.ln, 0.0) for one in found) for found in missed]
    excess_ln = [min(sum(max(one.ln, 0.0) for one in found), np.log(MOST_FOR_EXCESS)) for found in missed]
    total = np.array(
        [c.log_evidence + q + e for c, q, e in zip(counts, quiet_ln, excess_ln, strict=True)], dtype=float
    )
    share = np.exp(total - total.max())
    share /= share.sum()
    most = max(q + e for q, e in zip(quiet_ln, excess_ln, strict=True))
    excluded = [q - most < np.log(EXCLUDED_CHANCE) for q in quiet_ln]
    fits = max(c.log_evidence for c, out in zip(counts, excluded, strict=True) if not out)
    order = [i for i, c in enumerate(counts) if c.log_evidence - fits > np.log(_LISTED_SHARE)]
    # What is open by its probability, the longest period first of equals; then the excluded, longest first.
    order.sort(
        key=lambda i: (
            excluded[i], 0.0 if excluded[i] else -round(float(total[i]), 3), int(counts[i].cycles[-1])
        )
    )  # fmt: skip
    listed = []
    for number, place in enumerate(order, start=1):
        count = counts[place]
        listed.append(
            _told(
                number, dates, count, missed[place], quiet_ln[place], float(share[place]), excluded[place],
                orbit,
            )
        )  # fmt: skip
    ordered = tuple(counts[place] for place in order)
    note = "" if quiet is None else f"quiet observations are held against {quiet.note}"
    if quiet is not None and quiet.profile is None:
        note = quiet.note
    return WeighedCounts(ordered, tuple(listed), _best(listed), note)


def _best(listed: Sequence[CycleCounting]) -> int:
    """The first; but where observations leave it open, the first that agrees with the orbit."""
    for one in listed:
        agrees = one.against_orbit_sigma is not None and abs(one.against_orbit_sigma) <= _AGREES_SIGMA
        if agrees and not one.excluded:
            return one.number - 1
    return 0


@dataclass(frozen=True, slots=True)
class _Between:
    """A cycle between the dates without a known episode, and ln of the chance of what was observed then."""

    cycle: int
    predicted: RecurrencePrediction
    ln: float


def _missed(count: CycleCount, quiet: QuietEvidence | None) -> list[_Between]:
    found: list[_Between] = []
    if quiet is None or quiet.profile is None:
        return found
    known = set(count.cycles.tolist())
    against = 0.0
    for cycle in range(int(count.cycles[0]) + 1, int(count.cycles[-1])):
        if cycle in known:
            continue
        predicted = count.line.mixture(count.line.column(cycle), with_scatter=True)
        ln = missed_log_chance(quiet.profile, predicted)
        found.append(_Between(cycle, predicted, ln))
        against += min(ln, 0.0)
        if against < _HOPELESS:
            break
    return found


def _told_missed(found: list[_Between], offset: int) -> tuple[MissedCycle, ...]:
    if not found:
        return ()
    quantiles = np.array([one.predicted.quantiles_d(PROBABILITIES) for one in found])
    iso = utc_iso(quantiles.ravel())
    told = []
    for place, (one, q) in enumerate(zip(found, quantiles, strict=True)):
        median, low68, high68, low95, high95 = (float(value) for value in q)
        dates = iso[5 * place : 5 * place + 5]
        told.append(
            MissedCycle(
                one.cycle + offset,
                Quantiles(median, one.predicted.sigma_d, low68, high68, low95, high95),
                UtcQuantiles(dates[0], dates[1], dates[2], dates[3], dates[4]),
                _verdict(one.ln),
                float(np.exp(min(one.ln, 50.0))),
            )
        )
    return tuple(told)


def _verdict(ln: float) -> MissedVerdict:
    if ln > np.log(_EXCESS):
        return "excess"
    if ln < np.log(_QUIET):
        return "quiet"
    return "in part" if ln < np.log(_IN_PART) else "not observed"


def _offset(dates: ChosenDates, count: CycleCount) -> int:
    """From this count to the system's numbers: those of the catalogue where they agree, else of the first."""
    pairs = [(s, int(c)) for s, c in zip(dates.stored, count.cycles, strict=True) if s is not None]
    return pairs[0][0] - pairs[0][1] if pairs else 0


def _told(
    number: int, dates: ChosenDates, count: CycleCount, missed: list[_Between],
    quiet_ln: float, share: float, excluded: bool, orbit: Solution | None,
) -> CycleCounting:  # fmt: skip
    offset = _offset(dates, count)
    mean, covariance = count.line.coefficients()
    sigma = float(np.sqrt(covariance[1, 1]))
    centres, errors = dates.events.moments()
    first = dates.kinds == 0
    owners = dates.owner[first]
    chi2, freedom = float("nan"), 0
    if np.unique(count.cycles[owners]).size > 1:
        plain = fit_ephemeris(count.cycles[owners].astype(float), centres[first], errors[first])
        chi2, freedom = plain.chi2, plain.degrees_of_freedom
    return CycleCounting(
        number=number,
        cycles=tuple(int(c) + offset for c in count.cycles),
        divisor=count.divisor,
        period_d=Measured(float(mean[1]), sigma, sigma),
        chi2=chi2,
        degrees_of_freedom=freedom,
        dates_share=float(np.exp(count.log_evidence)),
        quiet_chance=float(np.exp(quiet_ln)),
        probability=share,
        excluded=bool(excluded),
        missed=_told_missed(missed, offset),
        against_orbit_sigma=_against_orbit(float(mean[1]), sigma, orbit),
    )


def _against_orbit(period_d: float, sigma_d: float, orbit: Solution | None) -> float | None:
    if orbit is None or not isinstance(orbit.period_d, Measured) or orbit.period_d.sigma is None:
        return None
    return (period_d - orbit.period_d.value) / float(np.hypot(sigma_d, orbit.period_d.sigma))
