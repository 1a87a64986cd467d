"""Where the shells of past and coming episodes are at a date, which of them are seen, how warm they are."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

import numpy as np
from numpy.typing import NDArray

from campaign.errors import Conflict, InputRefused
from campaign.model.instants import TypedInstant
from campaign.model.shellquestion import ExpectQuestion
from campaign.model.shells import ComingShell, ExpectedShell, ExpectedView, ResolvableDate, ShellExpectation
from campaign.physics.grains import grain_temperature_k, peak_wavelength_um
from campaign.physics.timescales import utc_iso
from campaign.studies.instants import axis_instant
from campaign.studies.shell_images import YEAR_D
from campaign.studies.shell_relations import none_if_nan
from campaign.studies.shell_subject import ShellSubject, today_of
from campaign.studies.shell_tracks import ShellTrack, ShellTracks, tracks_of
from campaign.studies.shell_views import Limits

FloatArray = NDArray[np.float64]

# Past episodes that are told when no field and no outer radius says how many matter.
_BACK = 10
# Episodes that fit between the stars and the outermost radius, at the most.
_MOST_BACK = 1000
# No more coming episodes than this.
_MOST_COMING = 20
# An episode that will not be launched by the date with more than this probability is of the past.
_LAUNCHED = 0.005
# Of drawn radii, for their standard deviation.
_CENTRAL = (0.001, 0.999)
# Small amorphous carbon, as far as its temperature goes.
_GRAIN_RADIUS_UM, _EMISSIVITY_INDEX = 0.1, 1.0


def ask(
    subject: ShellSubject,
    *,
    now: datetime,
    as_of: TypedInstant | None,
    on: TypedInstant | None,
    until: TypedInstant | None,
    field_arcsec: float | None,
    resolution_arcsec: float | None,
    outer_radius_arcsec: float | None,
    **others: Any,
) -> tuple[ExpectQuestion, ShellSubject]:
    """Put the question: at which date, seen how.

    Parameters
    ----------
    subject : ShellSubject
        Its own date stands in for the clock, if it has one.
    now : datetime
        The clock, aware.
    as_of, on, until : TypedInstant or None
        As typed.
    field_arcsec, resolution_arcsec, outer_radius_arcsec : float or None
        Limits of the image, arcsec.
    **others
        Further fields of ``ExpectQuestion``.

    Returns
    -------
    (ExpectQuestion, ShellSubject)
        For ``expect_shells``; instants ``bmjd_tdb``.

    Raises
    ------
    InputRefused
        When the second date is not after the first, or nothing could be in view.

    Notes
    -----
    Accuracy: see ``campaign.studies.instants.axis_instant``. Source: project convention.
    """
    today = today_of(subject, now, as_of)
    first = today if on is None else axis_instant(on)
    last = None if until is None else axis_instant(until)
    if last is not None and not last > first:
        raise InputRefused(
            "The second date is not after the first.",
            why="--until is not later than --on (or than now, when --on is not given).",
            hint="For example --on 2030-01-01 --until 2035-01-01.",
            code="span-refused",
        )
    limits = Limits(field_arcsec, resolution_arcsec, outer_radius_arcsec)
    outermost = limits.outermost_arcsec
    if outermost is not None and resolution_arcsec is not None and resolution_arcsec >= outermost:
        raise InputRefused(
            f"Nothing can be in view: the resolution, {resolution_arcsec:g} arcsec, reaches the edge.",
            why=f"The stars stand in the middle, and the view ends {outermost:g} arcsec from them.",
            hint="Check the units, for example --field 28arcsec --resolution 0.1arcsec.",
            code="view-refused",
        )
    question = ExpectQuestion(
        on_bmjd_tdb=first,
        until_bmjd_tdb=last,
        as_of_bmjd_tdb=today,
        field_arcsec=field_arcsec,
        resolution_arcsec=resolution_arcsec,
        outer_radius_arcsec=outer_radius_arcsec,
        **others,
    )
    return question, subject


def expect_shells(question: ExpectQuestion, subject: ShellSubject) -> ShellExpectation:
    """Say where shells will be.

    Parameters
    ----------
    question : ExpectQuestion
        Dates ``bmjd_tdb``, limits in arcsec, and what is stated of the motion.
    subject : ShellSubject
        The system with its logged shells.

    Returns
    -------
    ShellExpectation
        Radii in arcsec, motions in mas/yr, temperatures in kelvin, wavelengths in um.

    Raises
    ------
    Conflict
        When nothing dates the system's episodes, or nothing says how fast its shells move.

    Notes
    -----
    Accuracy: draws of launches and motions; a shell that was measured goes on from its fit.

    Source: r = mu (t - launch), launch the middle of the production window (DEVELOPERS.md, Shells).
    """
    tracks = tracks_of(subject, question)
    limits = Limits(question.field_arcsec, question.resolution_arcsec, question.outer_radius_arcsec)
    dates = [question.on_bmjd_tdb]
    if question.until_bmjd_tdb is not None:
        dates.append(question.until_bmjd_tdb)
    heat = _Heat.of(subject, tracks)
    past = _past(tracks, question.on_bmjd_tdb, limits, question.back)
    coming = _coming(tracks, question.on_bmjd_tdb, dates[-1], past)
    launched = list(past.values())
    views = tuple(_view([*coming, *launched], date, limits, heat) for date in dates)
    if not past and not coming:
        raise Conflict(
            f"No episode of {subject.record.system.name} can be dated near that date.",
            why="Its phase is lost there, or its period is only a limit.",
            hint="Choose a date nearer to the observed episodes, or add a solution: campaign solution add.",
            code="no-ephemeris",
        )
    return ShellExpectation(
        system=subject.record.system.name,
        as_of_utc=utc_iso([question.as_of_bmjd_tdb])[0] or "",
        views=views,
        resolvable=tuple(_resolvable([*coming, *launched[:1]], question)),
        quantities=tracks.quantities,
        coming=tuple(_comer(track) for track in coming[::-1]),
        field_arcsec=question.field_arcsec,
        resolution_arcsec=question.resolution_arcsec,
        outer_radius_arcsec=question.outer_radius_arcsec,
        assumptions=(*tracks.assumptions, *limits.in_words(), *heat.assumptions),
        warnings=(*tracks.warnings, *_blurred(tracks, question)),
    )


# ------------------------------------------------------------------------------------------- which episodes


def _past(tracks: ShellTracks, at: float, limits: Limits, back: int | None) -> dict[int, ShellTrack]:
    """Episodes that may be launched by a date, the youngest first, as far out as anybody looks."""
    found: dict[int, ShellTrack] = {}
    cycle = tracks.newest(at)
    if cycle is None:
        return found
    outermost = limits.outermost_arcsec
    most = back if back is not None else (_MOST_BACK if outermost is not None else _BACK)
    while len(found) < most and (track := tracks.track(cycle)) is not None:
        if track.launched_share(at) > _LAUNCHED:
            found[cycle] = track
            if back is None and outermost is not None and track.median_radius(at) > outermost:
                break
        cycle -= 1
    return found


def _coming(tracks: ShellTracks, at: float, until: float, past: Mapping[int, ShellTrack]) -> list[ShellTrack]:
    """Episodes to be launched up to a date, or the next one, the latest first."""
    newest = tracks.newest(at)
    found: list[ShellTrack] = []
    if newest is None:
        return found
    for cycle in range(newest + 1, newest + _MOST_COMING):
        track = tracks.track(cycle)
        if track is None or (track.launch_d > until and found):
            break
        if cycle not in past:
            found.append(track)
        if track.launch_d > until:
            break
    return found[::-1]


# ------------------------------------------------------------------------------------------- at one date


def _view(tracks: Iterable[ShellTrack], at: float, limits: Limits, heat: _Heat) -> ExpectedView:
    launched = [track for track in tracks if track.launched_share(at) > _LAUNCHED]
    # One that is more likely still to come has a place in the table, and none among those in view.
    there = [track.launched_share(at) >= 0.5 for track in launched]
    shown = limits.show(
        [t.median_radius(at) for t, is_there in zip(launched, there, strict=True) if is_there]
    )
    each_seen = iter(shown.in_view.tolist())
    seen = [(is_there and next(each_seen)) if limits.any else None for is_there in there]
    shells = [_shell(track, at, limits, heat, in_view) for track, in_view in zip(launched, seen, strict=True)]
    return ExpectedView(
        bmjd_tdb=at,
        utc=utc_iso([at])[0],
        shells=tuple(shells),
        in_view=int(shown.in_view.sum()),
        beyond_field=shown.beyond_outer,
        within_limit=shown.within_inner,
    )


def _shell(track: ShellTrack, at: float, limits: Limits, heat: _Heat, in_view: bool | None) -> ExpectedShell:
    drawn = track.radius_draws(at)
    launched = drawn[np.isfinite(drawn)]
    known = not track.missing
    radius = track.median_radius(at)
    bounds = np.quantile(launched, [0.16, 0.84]) if known else (np.nan, np.nan)
    temperature, peak = heat.at(radius)
    return ExpectedShell(
        cycle=track.cycle,
        launched_bmjd_tdb=track.launch_d,
        launched_sigma_d=track.launch_sigma_d,
        launched_utc=utc_iso([track.launch_d])[0],
        age_yr=(at - track.launch_d) / YEAR_D,
        radius_arcsec=radius,
        radius_sigma_arcsec=_spread(launched) if known else None,
        radius_lo68_arcsec=none_if_nan(float(bounds[0])),
        radius_hi68_arcsec=none_if_nan(float(bounds[1])),
        proper_motion_mas_yr=track.motion_mas_yr,
        proper_motion_sigma_mas_yr=none_if_nan(track.motion_sigma_mas_yr),
        probability=track.launched_share(at) if known else None,
        radius_au=heat.radius_au(radius),
        in_view=in_view,
        view_probability=float(np.mean(limits.holds_each(drawn))) if known and limits.any else None,
        grain_temperature_k=temperature,
        peak_wavelength_um=peak,
    )


def _spread(drawn: FloatArray) -> float:
    """Standard deviation without the outermost draws: one over a poor distance has tails without end."""
    return float(np.std(np.clip(drawn, *np.quantile(drawn, _CENTRAL))))


def _resolvable(tracks: Sequence[ShellTrack], question: ExpectQuestion) -> list[ResolvableDate]:
    limit = question.resolution_arcsec
    if limit is None:
        return []
    found = []
    for track in tracks:
        dates = track.reaches(limit)
        inside = dates[np.isfinite(dates)]
        if not inside.size:
            continue
        median = float(np.median(inside))
        sigma = None if track.missing else float(np.std(inside))
        found.append(ResolvableDate(track.cycle, limit, median, sigma, utc_iso([median])[0]))
    return sorted(found, key=lambda each: each.bmjd_tdb)


def _comer(track: ShellTrack) -> ComingShell:
    return ComingShell(track.cycle, track.launch_d, track.launch_sigma_d, utc_iso([track.launch_d])[0])


def _blurred(tracks: ShellTracks, question: ExpectQuestion) -> tuple[str, ...]:
    spacing = next((q.value for q in tracks.quantities if q.name == "spacing_arcsec"), None)
    if question.resolution_arcsec is None or spacing is None or spacing > question.resolution_arcsec:
        return ()
    return (f"neighbouring shells are {spacing:.3g} arcsec apart, closer than the resolution: they blend",)


# ------------------------------------------------------------------------------------------- warmth


@dataclass(frozen=True, slots=True)
class _Heat:
    """Starlight and distance, for the temperature of grains; nothing where one is not known."""

    luminosity_lsun: float | None
    distance_pc: float | None
    assumptions: tuple[str, ...] = ()

    @classmethod
    def of(cls, subject: ShellSubject, tracks: ShellTracks) -> _Heat:
        system = subject.record.system
        known = [
            (star.star, star.luminosity_lsun.value)
            for star in (system.star_a, system.star_b)
            if star.luminosity_lsun is not None
        ]
        distance = next((q.value for q in tracks.quantities if q.name == "distance_pc"), None)
        if not known or distance is None:
            return cls(None, distance)
        said = [
            "grain temperature of small carbon (radius 0.1 um, emissivity falling as 1/wavelength) in the "
            "light of "
            + ("both stars" if len(known) == 2 else f"star {known[0][0]} alone")
            + "; the peak is that of the flux per unit wavelength"
        ]
        return cls(sum(value for _, value in known), distance, tuple(said))

    def radius_au(self, radius_arcsec: float) -> float | None:
        return None if self.distance_pc is None else radius_arcsec * self.distance_pc

    def at(self, radius_arcsec: float) -> tuple[float | None, float | None]:
        radius_au = self.radius_au(radius_arcsec)
        if self.luminosity_lsun is None or radius_au is None or radius_au <= 0.0:
            return None, None
        kelvin = float(
            grain_temperature_k(self.luminosity_lsun, radius_au, _EMISSIVITY_INDEX, _GRAIN_RADIUS_UM)
        )
        return kelvin, float(peak_wavelength_um(kelvin, _EMISSIVITY_INDEX))
