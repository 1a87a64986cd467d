"""Find the episodes of a system in its light curve, date them, and say what they rest on."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from campaign.catalogue import observations, records, sites, store, systems
from campaign.errors import InputRefused
from campaign.model.arrays import PhotometryArrays
from campaign.model.curves import Curve, CurvePoint, PointState
from campaign.model.found import EpisodesFound, FoundEpisode, FoundLevel, KnownEpisode
from campaign.model.instants import TypedInstant
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import Episode
from campaign.physics.brightspans import JudgedCurve, find_bright_spans
from campaign.physics.episodedating import date_episodes
from campaign.physics.timescales import utc_iso
from campaign.studies.find_dates import found_episode
from campaign.studies.find_notes import ASSUMPTIONS, curve_warnings, episode_notes, no_episode_note
from campaign.studies.find_points import NumberedCurve, numbered_curve
from campaign.studies.instants import axis_instant
from campaign.studies.judging import confirmed_spans

# Dates of a known episode that lie within this of a found one are of the same burst.
_SAME_BURST_D = 60.0
# A band's level needs so many points outside known episodes, or these are not left out.
_ENOUGH_OUTSIDE = 10
# An excess of so many sigma is drawn as one.
_EXCESS_SIGMA = 3.0


def find_episodes(
    db: str, system_name: str, bands: tuple[str, ...] | None = None, as_of: TypedInstant | None = None
) -> EpisodesFound:
    """Find and date the episodes in a system's light curve.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    system_name : str
        Name or alias.
    bands : tuple of str, optional
        Only these bands, as they are written; all of them when not given.
    as_of : TypedInstant, optional
        Nothing observed after it is looked at.

    Returns
    -------
    EpisodesFound
        ``bmjd_tdb``, days, magnitudes and units of the stars' flux.

    Raises
    ------
    NotFound, InputRefused
        Unknown system; a band without points; too few measurements, or limits only.

    Notes
    -----
    Accuracy: see :func:`find_in`.

    Source: DEVELOPERS.md (how an episode is dated).
    """
    until = None if as_of is None else axis_instant(as_of)
    with store.reading(db) as connection:
        system = systems.find_system(connection, system_name)
        (record,) = records.load_records(connection, [system.id], include_retired=True)
        arrays = observations.photometry_arrays(connection, [system.id], as_of_bmjd_tdb=until).get(system.id)
        names = {site.id: site.name for site in sites.list_sites(connection)}
    if arrays is None:
        raise InputRefused(
            f"{system.name} has no photometry" + (" before that date." if as_of is not None else "."),
            why="Episodes are found in magnitudes.",
            hint=f'Log some: campaign log photometry "{system.name}" K=7.31±0.03 --at 2031-04-07',
            code="too-few-points",
            details={"measured": 0},
        )
    return find_in(record, arrays, bands, until, names)


def find_in(
    record: SystemRecord,
    arrays: PhotometryArrays,
    bands: tuple[str, ...] | None = None,
    as_of: float | None = None,
    site_names: dict[int, str] | None = None,
) -> EpisodesFound:
    """Find and date the episodes in a light curve that is at hand.

    Parameters
    ----------
    record : SystemRecord
        The system and what is known of it; its confirmed episodes are left out of the stars' level.
    arrays : PhotometryArrays
        Light curve, mag and ``bmjd_tdb``.
    bands : tuple of str, optional
        Only these bands.
    as_of : float, optional
        Nothing later, ``bmjd_tdb``.
    site_names : dict, optional
        Names of sites by their number.

    Returns
    -------
    EpisodesFound
        ``bmjd_tdb``, days, magnitudes and units of the stars' flux.

    Raises
    ------
    InputRefused
        A band without points; too few measurements, or limits only.

    Notes
    -----
    Accuracy: onset intervals are true to within what simulated campaigns of a few thousand episodes can tell,
    where points lie on the rise, and not too narrow where none do
    (tests/studies/test_studies_find_calibration.py).

    Source: DEVELOPERS.md (how an episode is dated).
    """
    numbered = numbered_curve(record.system.name, arrays, bands, as_of)
    curve = find_bright_spans(numbered.columns, _known_dust(record, numbered))
    episodes = []
    for number, dated in enumerate(date_episodes(curve), start=1):
        episode = found_episode(number, dated, curve, numbered.bands)
        episodes.append(
            replace(
                episode,
                known=_known(record.episodes, episode),
                notes=episode_notes(episode, dated.onset_at_bound),
            )
        )
    columns = numbered.columns
    return EpisodesFound(
        system=record.system.name,
        bands=numbered.bands,
        measured=int(columns.measured.sum()),
        limits=int((~columns.measured).sum()),
        left_out=numbered.left_out,
        first_bmjd_tdb=float(columns.bmjd_tdb[0]),
        last_bmjd_tdb=float(columns.bmjd_tdb[-1]),
        as_of_utc=None if as_of is None else utc_iso(np.array([as_of]))[0],
        episodes=tuple(episodes),
        levels=_levels(numbered, curve, site_names or {}),
        curves=_curves(record.system.name, numbered, curve),
        assumptions=ASSUMPTIONS,
        warnings=curve_warnings(record, numbered, curve),
        quiet_note=None if episodes else no_episode_note(curve, numbered.bands),
    )


def _known_dust(record: SystemRecord, numbered: NumberedCurve) -> NDArray[np.bool_] | None:
    """Points within confirmed episodes, where every band keeps enough others for its level."""
    columns = numbered.columns
    inside = np.zeros(columns.mag.size, dtype=bool)
    for start, end, _ in confirmed_spans(record):
        inside |= (columns.bmjd_tdb >= start) & (columns.bmjd_tdb <= end)
    left = np.bincount(columns.band[columns.measured & ~inside], minlength=len(numbered.bands))
    return inside if inside.any() and bool((left >= _ENOUGH_OUTSIDE).all()) else None


def _known(known: tuple[Episode, ...], found: FoundEpisode) -> KnownEpisode | None:
    """The episode of the catalogue that this one is; a confirmed one before a proposed one."""
    earliest = (
        found.first_bright_bmjd_tdb
        if found.onset is None
        else found.onset.bmjd_tdb.lo68 or found.first_bright_bmjd_tdb
    )
    best: tuple[int, float, KnownEpisode] | None = None
    for episode in known:
        dates = [d.moment.bmjd_tdb for d in (episode.onset, episode.maximum, episode.end) if d is not None]
        inside = [date for date in dates if earliest - _SAME_BURST_D <= date <= found.last_bright_bmjd_tdb]
        if not inside:
            continue
        rank = ("confirmed", "proposed", "rejected").index(episode.state)
        entry = (rank, abs(inside[0] - found.first_bright_bmjd_tdb), KnownEpisode(episode.id, episode.state))
        if best is None or entry[:2] < best[:2]:
            best = entry
    return None if best is None else best[2]


def _levels(
    numbered: NumberedCurve, curve: JudgedCurve, site_names: dict[int, str]
) -> tuple[FoundLevel, ...]:
    found = []
    levels = curve.levels
    for number, (band, photometric_system, source, site) in enumerate(numbered.groups):
        level, sigma = float(levels.level_mag[number]), float(levels.sigma_mag[number])
        known = np.isfinite(level) and levels.base_sigma[number] == 0.0
        found.append(
            FoundLevel(
                band=band,
                source=source,
                photometric_system=numbered.spelt[photometric_system],
                site=site_names.get(site, "" if site < 0 else f"site {site}"),
                level_mag=Measured(level, sigma, sigma) if known else None,
                scatter_mag=float(levels.jitter_mag[number]),
                red_noise_mag=float(levels.red_mag[number]),
                points=int(levels.points[number]),
            )
        )
    return tuple(found)


def _curves(system: str, numbered: NumberedCurve, curve: JudgedCurve) -> tuple[Curve, ...]:
    """The light curve of each band as it is drawn: what is quiet, in excess, or without a level."""
    columns = curve.columns
    sigma = curve.ln_excess / curve.sigma_ln
    found = []
    for place, band in enumerate(numbered.bands):
        mine = columns.band == place
        rows = zip(
            columns.bmjd_tdb[mine].tolist(), columns.mag[mine].tolist(), columns.error_mag[mine].tolist(),
            columns.limit_side[mine].tolist(), sigma[mine].tolist(), strict=True,
        )  # fmt: skip
        points = tuple(
            CurvePoint(at, mag, *_sizes(error), _state(side, z)) for at, mag, error, side, z in rows
        )
        found.append(Curve(system, "photometry", band, "mag", True, points))
    return tuple(found)


def _sizes(error: float) -> tuple[float | None, float | None]:
    return (None, None) if math.isnan(error) else (error, error)


def _state(side: int, sigma: float) -> PointState:
    if side:
        return "above" if side > 0 else "below"
    if math.isnan(sigma):
        return "level unknown"
    return "excess" if sigma >= _EXCESS_SIGMA else "quiet"
