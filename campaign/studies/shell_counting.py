"""Which shell is which: indices inside each image, and one count of launches through all images."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.model.measured import Measured
from campaign.model.shells import ShellAssignment
from campaign.physics.shellassignment import MISSING_PRIOR, Assignment, assign_indices
from campaign.physics.shellradii import mixed_edges_and_peaks
from campaign.physics.shellspacing import age_in_periods, fit_spacing
from campaign.physics.shellturns import LaunchCount, launches_between
from campaign.physics.shellvalues import Sided
from campaign.physics.timescales import utc_iso
from campaign.studies.shell_ephemeris import ShellEphemeris
from campaign.studies.shell_images import RadiusGroup, bmjd_of

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# A stated index stands unless the radii give it less than this probability.
_STATED_STANDS = 0.01
# A count of turns less likely than this is warned of, and so many of the others are named, above a share.
_SURE, _NAMED, _LEAST_NAMED = 0.95, 3, 0.005
# Of a period or a phase whose error nobody knows, as far as counting turns goes.
_ROUGH = 0.1
# How the note on finer spacings begins, which says nothing where a motion and a period are known.
_FINER = "A finer spacing"
# How well one image says how far apart the shells of another are: it may itself have missed one.
_WIDE_SPACING = 0.1


@dataclass(frozen=True, slots=True)
class _CountedImage:
    """The shells of one image, the youngest visible being 1.

    ``youngest_phase`` and ``youngest_sigma`` are its age in periods and the error of that, NaN where unknown.
    """

    index: FloatArray
    youngest_phase: float
    youngest_sigma: float
    spacing_arcsec: float
    assignments: tuple[ShellAssignment, ...] = ()
    not_told: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Counted:
    """Index of each radius of a group, 1 for the youngest visible of its image, and the launch it is of.

    ``cycle`` grows with the launch and is counted from the youngest shell of all images, which has 0.
    """

    index: FloatArray
    cycle: IntArray
    assignments: tuple[ShellAssignment, ...] = ()
    not_told: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


def count_shells(
    group: RadiusGroup,
    missing_prior: float | None,
    spacing: Sided | None,
    period: Measured | None,
    ephemeris: ShellEphemeris | None,
) -> Counted:
    """Number the shells of every image, and tell which of different images are the same.

    Parameters
    ----------
    group : RadiusGroup
        Radii, arcsec, in one image or several.
    missing_prior : float or None
        Prior probability that a shell went unseen (dimensionless).
    spacing : Sided or None
        What else says how far apart shells are, arcsec.
    period : Measured or None
        Julian years.
    ephemeris : ShellEphemeris or None
        Says how far the youngest shell should have come.

    Returns
    -------
    Counted
        Indices and cycles (dimensionless).

    Notes
    -----
    Accuracy: see ``campaign.physics.shellassignment``.

    Source: Bayes' rule over the ways to count, with a stated prior cost of each missing shell.
    """
    index = np.zeros(group.radius_arcsec.size)
    phases, spacings = [Sided(0.0)] * group.images, np.zeros(group.images)
    assignments: list[ShellAssignment] = []
    not_told: dict[str, None] = {}
    warnings: list[str] = []
    order = sorted(range(group.images), key=lambda e: (-group.of_image(e).size, e))
    for number in order:
        places = group.of_image(number)
        instant = bmjd_of(float(group.time_yr[places[0]])) if group.dated else None
        phase = None if ephemeris is None or instant is None else ephemeris.phase_of_youngest(instant)
        counted = _count_image(group, places, missing_prior, spacing, phase)
        index[places] = counted.index
        phases[number] = _phase(counted)
        spacings[number] = counted.spacing_arcsec
        assignments += counted.assignments
        not_told.update(dict.fromkeys(counted.not_told))
        warnings += counted.warnings
        if spacing is None and places.size > 2:
            # The image with most shells says how far apart they are in the others.
            size = _WIDE_SPACING * counted.spacing_arcsec
            spacing = Sided(counted.spacing_arcsec, size, size)
    if group.images > 1 and period is not None:
        # A motion through several images times a known period is a spacing of its own.
        not_told = {note: None for note in not_told if not note.startswith(_FINER)}
    single = bool((np.bincount(group.image) == 1).all()) and spacing is None
    if single:
        # No image shows how far apart shells are: one radius in each is taken as one shell growing.
        not_told["the one radius of each image is taken as that of the same shell"] = None
    width = 0.0 if single else float(np.median(spacings[spacings > 0.0]))
    if mixed_edges_and_peaks(group.errors):
        warnings.append("edges stand beside peaks, and no offset between them is stated: --edge-offset")
    turns, doubts = _turns(group, phases, width, period)
    warnings += doubts
    youngest = np.concatenate([[0], np.cumsum(turns)])[group.image]
    cycle = (youngest - np.floor(index) + 1).astype(np.int64)
    return Counted(
        index,
        cycle - int(cycle.max()),
        _by_date(assignments),
        tuple(not_told),
        tuple(dict.fromkeys(warnings)),
    )


def _by_date(assignments: Sequence[ShellAssignment]) -> tuple[ShellAssignment, ...]:
    """Image by image, and in each of them the likeliest first, as they are."""
    return tuple(sorted(assignments, key=lambda each: each.image_bmjd_tdb or 0.0))


def _count_image(
    group: RadiusGroup,
    places: IntArray,
    missing_prior: float | None,
    spacing: Sided | None,
    phase: Sided | None,
) -> _CountedImage:
    stated = [group.radii[i].index for i in places]
    radius = group.errors.peaks(group.radius_arcsec)[places]
    in_order = np.array([place + 1.0 if j is None else float(j) for place, j in enumerate(stated)])
    if places.size == 1 or not group.errors.known:
        said = (
            ()
            if places.size == 1
            else ("an error of a radius is not known: shells are counted as they stand",)
        )
        width = _rough_spacing(radius, in_order, spacing)
        blur = float(group.errors.sigma_arcsec[places[0]]) / width
        return _CountedImage(
            in_order, float(radius[0] / width - in_order[0] + 1.0), blur, width, not_told=said
        )
    chosen = np.zeros(group.radius_arcsec.size, dtype=bool)
    chosen[places] = True
    found = assign_indices(
        radius,
        group.errors.only(chosen),
        MISSING_PRIOR if missing_prior is None else missing_prior,
        spacing_arcsec=spacing,
        youngest_phase=phase,
    )
    ways = (found.best, *found.alternatives)
    best, warnings = _that_stands(ways, stated, _where(group, places))
    shift = float(_shift(best.indices, stated))
    index = np.array(best.indices) - shift
    youngest = age_in_periods(
        fit_spacing(index, group.radius_arcsec[places], group.errors.only(chosen)), [1.0]
    )
    return _CountedImage(
        index,
        float(youngest.value[0]),  # of index 1, whether it was seen or not
        float(youngest.sigma[0]),
        best.spacing_arcsec,
        tuple(_assignment(way, group.radii[places[0]].bmjd_tdb) for way in ways),
        found.not_told,
        warnings,
    )


def _shift(indices: Sequence[float], stated: Sequence[int | None]) -> int:
    """What to take from counted indices to get the stated ones, where somebody began elsewhere than at 1."""
    for found, given in zip(indices, stated, strict=True):
        if given is not None and _agrees(indices, stated):
            return round(found - given)
    return 0


def _rough_spacing(radius: FloatArray, index: FloatArray, spacing: Sided | None) -> float:
    if np.ptp(index) > 0.0:
        return float(np.ptp(radius) / np.ptp(index))
    return float(radius[0]) if spacing is None else spacing.value


def _that_stands(
    ways: Sequence[Assignment], stated: Sequence[int | None], where: str
) -> tuple[Assignment, tuple[str, ...]]:
    """The likeliest way that agrees with stated indices, unless the radii all but rule that out."""
    if all(index is None for index in stated):
        return ways[0], ()
    agreeing = [way for way in ways if _agrees(way.indices, stated)]
    chance = sum(way.probability for way in agreeing)
    if agreeing and chance >= _STATED_STANDS:
        if agreeing[0] is not ways[0]:
            said = (
                f"{where}: the stated indices have a probability of {chance:.0%}; likelier: {ways[0].meaning}"
            )
            return agreeing[0], (said,)
        return agreeing[0], ()
    said = f"{where}: the stated indices do not fit the radii (probability below {max(chance, 0.01):.0%}); "
    return ways[0], (f"{said}counted instead: {ways[0].meaning}",)


def _agrees(indices: Sequence[float], stated: Sequence[int | None]) -> bool:
    """Whether the steps from shell to shell are those of the stated indices, where they are stated."""
    steps = {found - given for found, given in zip(indices, stated, strict=True) if given is not None}
    return len(steps) == 1


def _where(group: RadiusGroup, places: IntArray) -> str:
    if not group.dated:
        return "the image"
    return f"image of {(utc_iso([bmjd_of(float(group.time_yr[places[0]]))])[0] or '')[:10]}"


def _assignment(way: Assignment, image_bmjd_tdb: float | None) -> ShellAssignment:
    return ShellAssignment(
        indices=tuple(float(index) for index in way.indices),
        probability=way.probability,
        missing=way.missing,
        blended=way.blended,
        meaning=way.meaning,
        spacing_arcsec=way.spacing_arcsec,
        phase_of_youngest=way.youngest_phase,
        image_bmjd_tdb=image_bmjd_tdb,
    )


# ---------------------------------------------------------------------------------- through several images


def _phase(counted: _CountedImage) -> Sided:
    size = None if np.isnan(counted.youngest_sigma) else counted.youngest_sigma
    return Sided(counted.youngest_phase, size, size)


def _turns(
    group: RadiusGroup, phases: Sequence[Sided], spacing_arcsec: float, period: Measured | None
) -> tuple[list[int], list[str]]:
    """How many new shells the visible youngest of each image is after that of the image before."""
    one_each = bool((np.bincount(group.image) == 1).all()) and spacing_arcsec <= 0.0
    if group.images == 1 or not group.dated or one_each:
        return [0] * (group.images - 1), []
    instants = np.array([group.time_yr[group.of_image(number)[0]] for number in range(group.images)])
    if not all(phase.known for phase in phases):
        return _nearest_turns(instants, phases, period), []
    ways = launches_between(
        instants, [phase.value for phase in phases], [phase.sigma for phase in phases], _usable(period)
    )
    doubts = [] if ways[0].probability >= _SURE else [_doubt(ways, period)]
    return [int(step) for step in np.diff(ways[0].launches)], doubts


def _usable(period: Measured | None) -> Sided | None:
    """A period as the counting of turns takes it; one without an error is taken at its word, to a tenth."""
    if period is None:
        return None
    if not period.error_known:
        return Sided(period.value, _ROUGH * period.value, _ROUGH * period.value)
    return Sided(period.value, period.minus, period.plus)


def _nearest_turns(instants: FloatArray, phases: Sequence[Sided], period: Measured | None) -> list[int]:
    """Counted by the values alone, where their errors are not known."""
    if period is None:
        return [0] * (len(phases) - 1)
    turned = np.diff(instants) / period.value - np.diff([phase.value for phase in phases])
    return [round(float(value)) for value in turned]


def _doubt(ways: Sequence[LaunchCount], period: Measured | None) -> str:
    """What else the images allow, the likeliest first."""
    others = [
        f"{way.period_yr:.3g} yr ({way.probability:.0%})"
        for way in ways[1 : 1 + _NAMED]
        if way.probability >= _LEAST_NAMED
    ]
    best, asked = ways[0], "a better period" if period is not None else "a period"
    return (
        "how many shells were launched between the images is not certain: with "
        f"{best.launches[-1]} the period is {best.period_yr:.3g} yr ({best.probability:.0%}), but it may be "
        f"{' or '.join(others) or 'another'}; {asked}, a motion or another image would tell"
    )
