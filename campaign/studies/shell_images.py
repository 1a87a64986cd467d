"""Measured radii put in order: by feature and direction, image by image, with the errors that they share."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.shellquestion import ShellQuestion, ShellRadius
from campaign.physics.shellradii import RadiusErrors, check_radii, radius_errors

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

YEAR_D = 365.25
_J2000_BMJD = 51_544.5
# Radii whose position angles lie nearer together than this are of one direction.
_SAME_DIRECTION_DEG = 20.0


@dataclass(frozen=True, slots=True)
class RadiusGroup:
    """Radii of one feature in one direction, image by image and inside each image from the inside out.

    ``image`` numbers the images in order of time; ``time_yr`` is the Julian year of each radius, 0 where
    nobody said when. ``radius_arcsec`` is as measured.
    """

    label: str
    radii: tuple[ShellRadius, ...]
    image: IntArray
    time_yr: FloatArray
    radius_arcsec: FloatArray
    errors: RadiusErrors
    dated: bool

    @property
    def images(self) -> int:
        """How many images there are."""
        return int(self.image.max()) + 1

    def of_image(self, number: int) -> IntArray:
        """Places of one image's radii."""
        return np.flatnonzero(self.image == number)


def years_of(bmjd_tdb: float) -> float:
    """Julian year of an instant.

    Parameters
    ----------
    bmjd_tdb : float
        MJD (TDB, barycentre), days.

    Returns
    -------
    float
        Julian year, yr.

    Notes
    -----
    Accuracy: rounding, 1e-13 yr. Source: J2000.0 = MJD 51544.5; 365.25 d a year.
    """
    return 2000.0 + (bmjd_tdb - _J2000_BMJD) / YEAR_D


def bmjd_of(year: float) -> float:
    """Instant of a Julian year.

    Parameters
    ----------
    year : float
        Julian year, yr.

    Returns
    -------
    float
        MJD (TDB, barycentre), days.

    Notes
    -----
    Accuracy: rounding. Source: J2000.0 = MJD 51544.5; 365.25 d a year.
    """
    return _J2000_BMJD + (year - 2000.0) * YEAR_D


def grouped(radii: Sequence[ShellRadius], question: ShellQuestion) -> list[RadiusGroup]:
    """Radii by feature and direction, the group with most radii first.

    Parameters
    ----------
    radii : sequence of ShellRadius
        Measured radii, arcsec.
    question : ShellQuestion
        For the offset of edges, arcsec, and a stated spacing.

    Returns
    -------
    list of RadiusGroup
        Never empty groups.

    Raises
    ------
    InputRefused
        For radii of one image whose order contradicts their indices, an index given twice, an edge offset
        not below a radius, or a stated spacing larger than the outermost radius.

    Notes
    -----
    Accuracy: nothing is computed. Radii of one feature and of position angles within 20 deg are of one
    group; without an angle they are of the group of that feature without one.

    Source: project convention.
    """
    by_group: dict[tuple[str, int], list[ShellRadius]] = {}
    for (feature, direction), radius in _directions(radii):
        by_group.setdefault((feature, direction), []).append(radius)
    several = len(by_group) > 1
    groups = [_group(members, several, question) for members in by_group.values()]
    spacing = question.stated.get("spacing_arcsec")
    for group in groups:
        for number in range(group.images):
            _check_image(group, group.of_image(number))
    if spacing is not None and radii:
        # Three sigma of grace, as everywhere: a spacing may exceed the outermost radius by its error.
        outermost = max(r.radius_arcsec.value + 3.0 * (r.radius_arcsec.plus or 0.0) for r in radii)
        least = spacing.value - 3.0 * (spacing.minus or 0.0)
        if least > outermost:
            check_radii([r.radius_arcsec.value for r in radii], spacing_arcsec=spacing.value)
            _refuse_spacing(spacing.value, max(r.radius_arcsec.value for r in radii))
    return sorted(groups, key=lambda g: (-len(g.radii), g.label))


def _directions(radii: Sequence[ShellRadius]) -> Iterator[tuple[tuple[str, int], ShellRadius]]:
    """Each radius with its feature and the number of its direction."""
    centres: dict[str, list[float]] = {}
    for radius in radii:
        feature = (radius.feature or "").casefold()
        if radius.position_angle_deg is None:
            yield (feature, -1), radius
            continue
        angle = radius.position_angle_deg.value % 360.0
        known = centres.setdefault(feature, [])
        apart = [abs((angle - centre + 180.0) % 360.0 - 180.0) for centre in known]
        if apart and min(apart) <= _SAME_DIRECTION_DEG:
            yield (feature, int(np.argmin(apart))), radius
        else:
            known.append(angle)
            yield (feature, len(known) - 1), radius


def _group(members: Sequence[ShellRadius], several: bool, question: ShellQuestion) -> RadiusGroup:
    ordered = sorted(members, key=lambda r: (r.bmjd_tdb or 0.0, r.image, r.radius_arcsec.value))
    keys = [(r.bmjd_tdb, r.image) for r in ordered]
    numbers = {key: place for place, key in enumerate(dict.fromkeys(keys))}
    offset = question.edge_offset_arcsec
    errors = radius_errors(
        [np.nan if r.radius_arcsec.sigma is None else r.radius_arcsec.sigma for r in ordered],
        [r.plate_scale_error or 0.0 for r in ordered],
        [numbers[key] for key in keys],
        [r.measured_at == "edge" for r in ordered],
        0.0 if offset is None else offset.value,
        0.0 if offset is None or offset.sigma is None else offset.sigma,
    )
    dated = all(r.bmjd_tdb is not None for r in ordered)
    return RadiusGroup(
        label=_label(ordered, several),
        radii=tuple(ordered),
        image=np.array([numbers[key] for key in keys], dtype=np.int64),
        time_yr=np.array(
            [years_of(r.bmjd_tdb) if dated and r.bmjd_tdb is not None else 0.0 for r in ordered]
        ),
        radius_arcsec=np.array([r.radius_arcsec.value for r in ordered]),
        errors=errors,
        dated=dated,
    )


def _label(members: Sequence[ShellRadius], several: bool) -> str:
    feature = members[0].feature or ""
    angles = [r.position_angle_deg.value for r in members if r.position_angle_deg is not None]
    if not several or not angles:
        return feature
    radians = np.radians(angles)
    mean = np.degrees(np.arctan2(np.sin(radians).mean(), np.cos(radians).mean())) % 360.0
    return f"{feature} PA {mean:.0f}".strip()


def _check_image(group: RadiusGroup, places: IntArray) -> None:
    stated = [(group.radii[i].index, group.radius_arcsec[i]) for i in places]
    indexed = [(index, radius) for index, radius in stated if index is not None]
    check_radii(group.radius_arcsec[places])
    peaks = group.errors.peaks(group.radius_arcsec)[places]
    if peaks.min() <= 0.0:
        _refuse_offset(group.errors.edge_offset_arcsec, float(group.radius_arcsec[places][peaks.argmin()]))
    if not indexed:
        return
    indices = [index for index, _ in indexed]
    for index in indices:
        if indices.count(index) > 1:
            raise InputRefused(
                f"Shell {index} has several radii in one image.",
                why="In one direction of one image a shell has one radius.",
                hint="Give each radius its own index, its own position angle or feature, or leave them out.",
                code="index-repeated",
                details={"index": index},
            )
    check_radii([radius for _, radius in indexed], indices)


def _refuse_offset(offset_arcsec: float, radius_arcsec: float) -> None:
    raise InputRefused(
        f"An edge offset of {offset_arcsec:g} arcsec leaves nothing of an edge at {radius_arcsec:g} arcsec.",
        why="It is how much larger the edge of a shell is than its peak, and the peak is outside the stars.",
        hint='Check its unit, for example --edge-offset "0.05±0.02 arcsec"; or say --measured-at peak.',
        code="edge-offset-refused",
        details={"edge_offset_arcsec": offset_arcsec, "radius_arcsec": radius_arcsec},
    )


def _refuse_spacing(spacing_arcsec: float, outermost_arcsec: float) -> None:
    raise InputRefused(
        f"A spacing of {spacing_arcsec:g} arcsec is larger than the outermost radius, "
        f"{outermost_arcsec:g} arcsec.",
        why="A spacing is seen between two shells, and the outer of them is at least that far out.",
        hint="Check the unit of the spacing and of the radius; or leave the spacing out and give --period.",
        code="spacing-refused",
        details={"spacing_arcsec": spacing_arcsec, "outermost_arcsec": outermost_arcsec},
    )
