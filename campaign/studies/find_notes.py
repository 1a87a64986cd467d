"""What an observer should know of found episodes: what cannot be told, what was assumed, what to look at."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import pairwise

import numpy as np

from campaign.model.bands import BandUse
from campaign.model.found import FoundEpisode
from campaign.model.records import SystemRecord
from campaign.physics.brightspans import JudgedCurve
from campaign.physics.timescales import utc_iso
from campaign.studies.bands import band_warnings, mixed_bands
from campaign.studies.find_points import NumberedCurve

ASSUMPTIONS = (
    "onset: a broken line in flux, the rise linear, faster or saturating, the same onset in all bands",
    "levels: one for each band, photometric system, source and site; those of a band differ by some 0.1 mag",
    "end: production declines linearly to 0.4 to 1 of the maximum, then dust decays exponentially; end and "
    "half-decay are of the band of the maximum",
    "dates are of the barycentre; intervals are equal-tailed",
)
# Chi-square so far above its degrees of freedom is no noise.
_BAD_FIT_SIGMA = 4.0


def episode_notes(episode: FoundEpisode, at_bound: bool) -> tuple[str, ...]:
    """What cannot be told of one episode, and what makes it doubtful.

    Parameters
    ----------
    episode : FoundEpisode
        As dated; ``bmjd_tdb``, days.
    at_bound : bool
        Whether an onset earlier than was allowed is possible.

    Returns
    -------
    tuple of str
        One phrase each.

    Notes
    -----
    Accuracy: dates to the day. Source: project convention.
    """
    notes = []
    if episode.rise == "before the curve":
        notes.append(
            "onset not covered: the curve begins inside the episode, which was bright on "
            f"{_day(episode.first_bright_bmjd_tdb)}"
        )
    elif episode.rise == "not covered" and episode.last_quiet_bmjd_tdb is not None:
        nights = "no night" if episode.rise_nights == 0 else "one night"
        notes.append(
            f"rise not covered ({nights} on it, quiet {_day(episode.last_quiet_bmjd_tdb)}, bright "
            f"{_day(episode.first_bright_bmjd_tdb)}): the onset is a bracket"
        )
    if at_bound:
        notes.append("an earlier onset than the interval shows is possible: nothing before bounds it")
    if episode.maxima and not all(maximum.reached for maximum in episode.maxima):
        notes.append("maximum not reached by the last points: what is given is the brightest so far")
    if episode.half is None:
        notes.append("decline not covered: neither the end of production nor the half-decay can be dated")
    elif episode.end is not None and not episode.end.told:
        notes.append(
            "end of production not told apart from the decay after it: its interval is what was allowed"
        )
    if episode.dof > 0 and episode.chi2 > episode.dof + _BAD_FIT_SIGMA * np.sqrt(2.0 * episode.dof):
        notes.append(
            f"no shape describes the rise well (chi2 {episode.chi2:.0f} of {episode.dof}): errors are widened"
        )
    if episode.kind == "brief":
        notes.append("brief and faint beside the others: perhaps no episode of dust")
    return tuple(notes)


def curve_warnings(record: SystemRecord, numbered: NumberedCurve, curve: JudgedCurve) -> tuple[str, ...]:
    """What is odd about a light curve or about what is known of its episodes.

    Parameters
    ----------
    record : SystemRecord
        The system with its episodes.
    numbered : NumberedCurve
        The light curve in numbers; mag, days.
    curve : JudgedCurve
        The same, judged.

    Returns
    -------
    tuple of str
        One sentence each.

    Notes
    -----
    Accuracy: counts are exact. Source: project convention.
    """
    columns = numbered.columns
    told = []
    if numbered.left_out:
        told.append(f"Left out as doubtful or bad: {_magnitudes(numbered.left_out)}.")
    if numbered.twice:
        told.append(f"Entered twice, to the instant, and counted once: {_magnitudes(numbered.twice)}.")
    several = _several_at_once(curve)
    if several:
        told.append(
            f"At the instant of another one of the same band and source: {_magnitudes(several)}; all count."
        )
    for place, band in enumerate(numbered.bands):
        mine = columns.band == place
        if not columns.measured[mine].any():
            told.append(f"Band {band} has limits only: they bound the onset, and no level is known.")
        elif np.isnan(curve.ln_excess[mine]).all():
            told.append(f"Band {band} has no level: no quiet point of it is known, and it was left out.")
    told += _mixtures(record.system.name, numbered)
    told += overlap_warnings(record)
    return tuple(told)


def overlap_warnings(record: SystemRecord) -> tuple[str, ...]:
    """Confirmed episodes that lie over each other.

    Parameters
    ----------
    record : SystemRecord
        The system; ``bmjd_tdb``.

    Returns
    -------
    tuple of str
        One sentence a pair.

    Notes
    -----
    Accuracy: dates as they stand, without their errors. Source: project convention.
    """
    spans = []
    for episode in record.episodes:
        dates = [d.moment.bmjd_tdb for d in (episode.onset, episode.maximum, episode.end) if d is not None]
        if episode.state == "confirmed" and dates:
            spans.append((min(dates), max(dates), episode.id))
    return tuple(
        f"Confirmed episodes {first[2]} and {second[2]} overlap: from {_day(second[0])} both are under way; "
        "one burst dated twice?"
        for first, second in pairwise(sorted(spans))
        if second[0] < first[1]
    )


def _several_at_once(curve: JudgedCurve) -> int:
    columns = curve.columns
    order = np.lexsort((columns.bmjd_tdb, columns.group))
    same = (np.diff(columns.bmjd_tdb[order]) == 0.0) & (np.diff(columns.group[order]) == 0)
    return int(same.sum())


def _mixtures(system: str, numbered: NumberedCurve) -> list[str]:
    """Bands of several photometric systems, in one sentence where they are several of the same."""
    mixed = mixed_bands(_uses(system, numbered))
    if len(mixed) < 2:
        return list(band_warnings(mixed))
    names = sorted({name for one in mixed for name in one.photometric_systems})
    unknown = sum(one.unknown_points for one in mixed)
    told = (
        f"Bands {', '.join(one.band for one in mixed)} hold several photometric systems ({', '.join(names)})"
    )
    told += f", and {_magnitudes(unknown)} of none that is stated" if unknown else ""
    return [f"{told}: each has a level of its own, none is averaged with another."]


def _magnitudes(count: int) -> str:
    return f"{count} magnitude{'' if count == 1 else 's'}"


def _uses(system: str, numbered: NumberedCurve) -> Iterable[BandUse]:
    counts = np.bincount(numbered.columns.group, minlength=len(numbered.groups))
    for (band, key, _, _), points in zip(numbered.groups, counts.tolist(), strict=True):
        yield BandUse(system, band, numbered.spelt[key] or None, points)


def _day(bmjd_tdb: float) -> str:
    iso = utc_iso(np.array([bmjd_tdb]))[0]
    return iso[:10] if iso else f"MJD {bmjd_tdb:.0f}"


def no_episode_note(curve: JudgedCurve, bands: Sequence[str]) -> str:
    """What a quiet light curve says, in one sentence.

    Parameters
    ----------
    curve : JudgedCurve
        Without any span of excess.
    bands : sequence of str
        Names of the bands by number.

    Returns
    -------
    str
        With the scatter of the best band in mag.

    Notes
    -----
    Accuracy: scatter to 0.001 mag. Source: project convention.
    """
    usable = curve.columns.measured & np.isfinite(curve.ln_excess)
    if not usable.any():
        return "No level is known, so that nothing can be called an excess."
    scatter = {
        name: float(np.std(curve.ln_excess[usable & (curve.columns.band == place)])) * 1.0857
        for place, name in enumerate(bands)
        if (usable & (curve.columns.band == place)).sum() > 1
    }
    if not scatter:
        return "Too few points have a level for an episode to be seen."
    best = min(scatter, key=lambda name: scatter[name])
    return f"No episode: {best} keeps to its level within {scatter[best]:.3f} mag (one sigma)."
