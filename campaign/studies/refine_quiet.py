"""The quiet observations of a system as evidence on its period: what an episode would have shown."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.arrays import PhotometryArrays
from campaign.model.records import SystemRecord
from campaign.physics.brightspans import JudgedCurve, find_bright_spans
from campaign.physics.draws import stratified_normals
from campaign.physics.lightcolumns import LightColumns
from campaign.physics.missedcycles import QuietProfile, quiet_profile
from campaign.physics.quietchance import ExpectedEpisodes
from campaign.studies.find_points import NumberedCurve, numbered_curve
from campaign.studies.judging import confirmed_spans

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

_DRAWS = 32
_SEED = 11
# How much episodes of one system differ: one sigma of the logarithm; common practice, no source.
_RISES_DIFFER, _DECLINES_DIFFER, _AMPLITUDES_DIFFER = 0.5, 0.5, 0.5
_USUAL_RISE_D, _USUAL_DECLINE_D = 100.0, 150.0
# A band in which the system's own episodes stand out by less is not looked at.
_LEAST_AMPLITUDE = 0.08
_FEWEST_POINTS = 2
# Where no episode of the system has photometry: amplitudes of other dust makers in K and beyond, in units of
# the stars' flux, and how they differ; common practice, no source.
_OTHERS_AMPLITUDE, _OTHERS_DIFFER = 0.6, 0.8
_RED_BANDS = frozenset({"K", "KS", "L", "L'", "M", "N", "Q", "W1", "W2", "W3", "W4", "I1", "I2"})


@dataclass(frozen=True, slots=True, eq=False)
class QuietEvidence:
    """What the light curve says of an onset at each date, where it speaks at all; ``note`` says what it rests
    on or why there is none."""

    profile: QuietProfile | None
    note: str


def quiet_evidence(
    record: SystemRecord, arrays: PhotometryArrays | None, as_of: float, start: float, stop: float
) -> QuietEvidence:
    """Judge every date between two by what the light curve shows.

    Parameters
    ----------
    record : SystemRecord
        The system; its confirmed episodes say how long and bright an episode is, and are left out themselves.
    arrays : PhotometryArrays or None
        Light curve, mag and ``bmjd_tdb``.
    as_of, start, stop : float
        Nothing observed later; first and last date of an onset, ``bmjd_tdb``.

    Returns
    -------
    QuietEvidence
        Days; no profile where too little was observed.

    Notes
    -----
    Accuracy: 32 joint draws of rise, decline and amplitude; see ``campaign.physics.quietchance``.

    Source: DEVELOPERS.md (refined solutions).
    """
    if arrays is None or not arrays.bmjd_tdb.size:
        return QuietEvidence(None, "no photometry: nothing decides between the ways to count")
    try:
        numbered = numbered_curve(record.system.name, arrays, None, as_of)
    except InputRefused:
        return QuietEvidence(None, "too little photometry to decide between the ways to count")
    columns = numbered.columns
    dusty = _inside(columns.bmjd_tdb, record)
    curve = find_bright_spans(columns, dusty if _levels_remain(columns, dusty) else None)
    bands, amplitudes, differ = _amplitudes(numbered, curve, record)
    if not bands:
        return QuietEvidence(
            None, "no band in which dust would have been seen: nothing decides between counts"
        )
    known = replace(curve, ln_excess=np.where(dusty, np.nan, curve.ln_excess))
    rise, decline = _lengths(record)
    normals = stratified_normals(["rise", "decline", "amplitude"], _DRAWS, _SEED)
    expected = ExpectedEpisodes(
        rise * np.exp(_RISES_DIFFER * normals["rise"]),
        decline * np.exp(_DECLINES_DIFFER * normals["decline"]),
        np.array(amplitudes)[None, :] * np.exp(differ * normals["amplitude"])[:, None],
        np.zeros((_DRAWS, len(bands))),
    )
    profile = quiet_profile(known, bands, expected, start, stop)
    spoken = ", ".join(f"{a:.2g} in {numbered.bands[b]}" for b, a in zip(bands, amplitudes, strict=True))
    whose = "of its own" if differ == _AMPLITUDES_DIFFER else "as usual elsewhere"
    return QuietEvidence(
        profile,
        f"an episode {whose}: rise about {rise:.0f} d, dust over stars about {spoken}, each within a factor "
        f"of {np.exp(differ):.1f}",
    )


def _inside(times: FloatArray, record: SystemRecord) -> BoolArray:
    inside = np.zeros(times.size, dtype=bool)
    for start, end, _ in confirmed_spans(record):
        inside |= (times >= start) & (times <= end)
    return inside


def _levels_remain(columns: LightColumns, dusty: BoolArray) -> bool:
    """Whether every band keeps quiet measurements when known dust is left out."""
    bands = int(columns.group_band.max()) + 1
    left = np.bincount(columns.band[columns.measured & ~dusty], minlength=bands)
    return bool(dusty.any() and (left >= 10).all())


def _amplitudes(
    numbered: NumberedCurve, curve: JudgedCurve, record: SystemRecord
) -> tuple[list[int], list[float], float]:
    """Bands in which dust shows, by how much in the system's own episodes, and how uncertain that is."""
    columns = curve.columns
    found: dict[int, list[float]] = {}
    for start, end, _ in confirmed_spans(record):
        for band in range(len(numbered.bands)):
            mine = (columns.band == band) & columns.measured & np.isfinite(curve.ln_excess)
            mine &= (columns.bmjd_tdb >= start) & (columns.bmjd_tdb <= end)
            if int(mine.sum()) >= _FEWEST_POINTS:
                # The second brightest: one wild point is no amplitude.
                found.setdefault(band, []).append(float(np.sort(np.expm1(curve.ln_excess[mine]))[-2]))
    own = {b: float(np.median(a)) for b, a in found.items() if np.median(a) >= _LEAST_AMPLITUDE}
    if own:
        return sorted(own), [own[b] for b in sorted(own)], _AMPLITUDES_DIFFER
    red = [b for b, name in enumerate(numbered.bands) if name.strip().upper() in _RED_BANDS]
    return red, [_OTHERS_AMPLITUDE] * len(red), _OTHERS_DIFFER


def _lengths(record: SystemRecord) -> tuple[float, float]:
    """Length of the rise and e-folding time of the decline, days, by the dates of the system's episodes."""
    rises, ends = [], []
    for episode in record.episodes:
        if episode.state != "confirmed" or episode.maximum is None:
            continue
        top = episode.maximum.moment.bmjd_tdb
        if episode.onset is not None and top > episode.onset.moment.bmjd_tdb:
            rises.append(top - episode.onset.moment.bmjd_tdb)
        if episode.end is not None and episode.end.moment.bmjd_tdb > top:
            ends.append(episode.end.moment.bmjd_tdb - top)
    rise = float(np.median(rises)) if rises else _USUAL_RISE_D
    decline = max(float(np.median(ends)), 60.0) if ends else _USUAL_DECLINE_D
    return rise, decline
