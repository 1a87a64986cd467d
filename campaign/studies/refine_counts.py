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
from campaign.physics.timescales import utc_iso
from campaign.studies.refine_dates import ChosenDates
from campaign.studies.refine_quiet import QuietEvidence

# A count whose quiet observations are so much less probable than the best count's is excluded.
EXCLUDED_CHANCE = 0.01
# An excess where a count wants an episode speaks for it, but nobody confirmed it: no more than so much.
MOST_FOR_EXCESS = 20.0
_QUIET, _IN_PART, _EXCESS = 0.05, 0.5, 3.0
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
    missed = [_missed(dates, count, quiet) for count in counts]
    quiet_ln = [sum(min(ln, 0.0) for _, ln in found) for found in missed]
    excess_ln = [
        min(sum(max(ln, 0.0) for _, ln in found), float(np.log(MOST_FOR_EXCESS))) for found in missed
    ]
    total = np.array(
        [c.log_evidence + q + e for c, q, e in zip(counts, quiet_ln, excess_ln, strict=True)], dtype=float
    )
    order = sorted(range(len(counts)), key=lambda i: (-round(float(total[i]), 3), int(counts[i].cycles[-1])))
    share = np.exp(total - total.max())
    share /= share.sum()
    most = max(q + e for q, e in zip(quiet_ln, excess_ln, strict=True))
    listed = []
    for number, place in enumerate(order, start=1):
        count = counts[place]
        listed.append(
            _told(
                number, dates, count, missed[place], quiet_ln[place], float(share[place]),
                quiet_ln[place] - most < np.log(EXCLUDED_CHANCE), orbit,
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


def _missed(
    dates: ChosenDates, count: CycleCount, quiet: QuietEvidence | None
) -> list[tuple[MissedCycle, float]]:
    """Cycles between the dates without a known episode, with ln of the chance of what was observed."""
    found: list[tuple[MissedCycle, float]] = []
    if quiet is None or quiet.profile is None:
        return found
    known = set(count.cycles.tolist())
    offset = _offset(dates, count)
    for cycle in range(int(count.cycles[0]) + 1, int(count.cycles[-1])):
        if cycle in known:
            continue
        predicted = count.line.mixture(count.line.column(cycle), with_scatter=True)
        ln = missed_log_chance(quiet.profile, predicted)
        q = predicted.quantiles_d(PROBABILITIES)
        iso = utc_iso(q)
        median, low68, high68, low95, high95 = (float(value) for value in q)
        found.append(
            (
                MissedCycle(
                    cycle + offset,
                    Quantiles(median, predicted.sigma_d, low68, high68, low95, high95),
                    UtcQuantiles(iso[0], iso[1], iso[2], iso[3], iso[4]),
                    _verdict(ln),
                    float(np.exp(min(ln, 50.0))),
                ),
                ln,
            )
        )
    return found


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
    number: int, dates: ChosenDates, count: CycleCount, missed: list[tuple[MissedCycle, float]],
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
        missed=tuple(cycle for cycle, _ in missed),
        against_orbit_sigma=_against_orbit(float(mean[1]), sigma, orbit),
    )


def _against_orbit(period_d: float, sigma_d: float, orbit: Solution | None) -> float | None:
    if orbit is None or not isinstance(orbit.period_d, Measured) or orbit.period_d.sigma is None:
        return None
    return (period_d - orbit.period_d.value) / float(np.hypot(sigma_d, orbit.period_d.sigma))
