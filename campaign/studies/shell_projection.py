"""How the measured feature projects on the sky, and what that does to speeds and to launch dates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shellquestion import ShellQuestion
from campaign.model.shells import SHELL_FEATURES, DatedShell, ShellFeature, ShellQuantity, ShellTension
from campaign.model.systems import Solution
from campaign.physics.constants import SPEED_OF_LIGHT_KMS
from campaign.physics.shellprojection import (
    Projection,
    apparent_speed_kms,
    light_delay_yr,
    light_time_matters,
    project_limb,
    project_plume,
    project_ring,
)
from campaign.physics.shelltension import HIGH_SIGMA
from campaign.physics.shellvalues import Sided
from campaign.physics.timescales import utc_iso
from campaign.studies.shell_images import YEAR_D, RadiusGroup
from campaign.studies.shell_relations import Stated

SPEED = "speed_kms"


@dataclass(frozen=True, slots=True)
class Seen:
    """How one group of radii is seen. ``side_known``: whether its way points towards the observer or away."""

    feature: ShellFeature
    projection: Projection
    statement: str
    side_known: bool = True


def seen_as(group: RadiusGroup, question: ShellQuestion, record: SystemRecord | None) -> Seen:
    """The projection of a group of radii: as asked, else as logged, else that of the limb.

    Parameters
    ----------
    group : RadiusGroup
        Radii of one feature in one direction; position angles deg.
    question : ShellQuestion
        Feature and inclination (deg), where somebody stated them.
    record : SystemRecord or None
        For inclination and node of the adopted orbit, deg.

    Returns
    -------
    Seen
        Factor of seen to true radius (dimensionless), and the assumption in words.

    Notes
    -----
    Accuracy: see ``campaign.physics.shellprojection``.

    Source: DEVELOPERS.md (Shells); geometry of a sphere, a tilted circle and a direction in its plane.
    """
    feature, assumed = _feature(group, question)
    solution = _orbit(record)
    inclination = question.inclination_deg or (None if solution is None else solution.inclination_deg)
    if feature == "limb":
        limb = project_limb()
        return Seen("limb", limb, limb.statement + assumed)
    if inclination is None:
        what = "along the long axis of a ring" if feature == "ring" else "of a plume in the plane of the sky"
        said = f"the inclination is not known: radii are taken as those {what}, the true ones"
        return Seen(feature, project_limb(), said)
    tilt = Sided(inclination.value, inclination.minus, inclination.plus)
    if tilt.sigma != tilt.sigma:
        tilt = Sided(inclination.value, 0.0, 0.0)
        assumed += "; the inclination has no error, which is not in the speeds"
    angle = _from_node_deg(group, solution)
    if feature == "ring":
        ring = project_ring(tilt, angle)
        return Seen("ring", ring, ring.statement + assumed, side_known=angle is None)
    around = None if angle is None else _around_deg(angle, tilt.value)
    plume = project_plume(tilt, around)
    return Seen("plume", plume, plume.statement + assumed, side_known=around is not None)


def _feature(group: RadiusGroup, question: ShellQuestion) -> tuple[ShellFeature, str]:
    if question.feature is not None:
        return question.feature, ""
    logged = (group.radii[0].feature or "").casefold()
    for word in SHELL_FEATURES:
        if word in logged:
            return word, ""
    said = f"; '{group.radii[0].feature}' is taken for one" if logged else ""
    return "limb", said


def _orbit(record: SystemRecord | None) -> Solution | None:
    """The adopted solution of largest weight."""
    adopted = [] if record is None else [s for s in record.solutions if s.adopted]
    return max(adopted, key=lambda s: 1.0 if s.weight is None else s.weight) if adopted else None


def _from_node_deg(group: RadiusGroup, solution: Solution | None) -> float | None:
    angles = [r.position_angle_deg.value for r in group.radii if r.position_angle_deg is not None]
    if not angles or solution is None or solution.node_deg is None:
        return None
    away = np.radians(np.array(angles) - solution.node_deg.value)
    return float(np.degrees(np.arctan2(np.sin(away).mean(), np.cos(away).mean())))


def _around_deg(from_node_deg: float, inclination_deg: float) -> float | None:
    """Angle in the plane of the orbit that is seen at an angle on the sky; None seen edge-on."""
    angle, cosine = np.radians(from_node_deg), np.cos(np.radians(inclination_deg))
    if abs(cosine) < 1e-6:
        return None
    return float(np.degrees(np.arctan2(np.sin(angle) / cosine, np.cos(angle))))


# ------------------------------------------------------------------------------------------- speeds


def as_seen(stated: Stated, seen: Seen) -> Stated:
    """Speeds as they show on the sky; radii, spacings and motions are seen ones from the start.

    Parameters
    ----------
    stated : Stated
        With true speeds, km/s.
    seen : Seen
        The projection.

    Returns
    -------
    Stated
        With seen speeds, km/s; the error of the factor is added to theirs.

    Notes
    -----
    Accuracy: first order. Source: v_seen = factor v, over 1 - (v/c) sin(psi) where the way is known to
    point out of the sky by psi.
    """
    factor, blur = seen.projection.factor, _blur(seen)
    if factor == 1.0 and blur == 0.0:
        return stated
    inputs = []
    for each in stated.inputs:
        if each.quantity == SPEED:
            value = _seen_kms(each.value, seen)
            minus, plus = (
                None if size is None else float(np.hypot(size * value / each.value, value * blur))
                for size in (each.minus, each.plus)
            )
            each = replace(each, value=value, minus=minus, plus=plus)  # noqa: PLW2901
        inputs.append(each)
    return replace(stated, inputs=tuple(inputs))


def true_quantities(
    quantities: Sequence[ShellQuantity], seen: Seen, stated_speed: Measured | None
) -> tuple[ShellQuantity, ...]:
    """Quantities with the true speed in place of the seen one.

    Parameters
    ----------
    quantities : sequence of ShellQuantity
        With the seen speed, km/s.
    seen : Seen
        The projection.
    stated_speed : Measured or None
        The true speed as it was stated, km/s.

    Returns
    -------
    tuple of ShellQuantity
        In the same units.

    Notes
    -----
    Accuracy: first order. Source: v = v_seen/factor.
    """
    factor, blur = seen.projection.factor, _blur(seen)
    if factor == 1.0 and blur == 0.0:
        return tuple(quantities)
    return tuple(_true_speed(each, seen, stated_speed) if each.name == SPEED else each for each in quantities)


def _true_speed(quantity: ShellQuantity, seen: Seen, stated: Measured | None) -> ShellQuantity:
    value = _true_kms(quantity.value, seen)
    factor, blur = quantity.value / value, _blur(seen)
    if quantity.sigma is None:
        return replace(quantity, value=value)
    sigma = quantity.sigma / factor
    if quantity.origin == "given" and stated is not None and stated.sigma is not None:
        wide = stated.sigma / sigma if sigma > 0.0 else 1.0
        value, sigma = stated.value, stated.sigma
    else:
        known, sigma = sigma, float(np.hypot(sigma, value * blur))
        wide = sigma / known if known > 0.0 else 1.0

    def bound(edge: float | None) -> float | None:
        return None if edge is None else value + wide * (edge / factor - value)

    return replace(
        quantity, value=value, sigma=sigma, lo68=bound(quantity.lo68), hi68=bound(quantity.hi68),
        lo95=bound(quantity.lo95), hi95=bound(quantity.hi95),
    )  # fmt: skip


def true_tensions(tensions: Sequence[ShellTension], seen: Seen) -> list[ShellTension]:
    """Tensions with true speeds.

    Parameters
    ----------
    tensions : sequence of ShellTension
        With seen speeds, km/s.
    seen : Seen
        The projection.

    Returns
    -------
    list of ShellTension
        The same sigmas (dimensionless).

    Notes
    -----
    Accuracy: both sides are seen alike. Source: v = v_seen/factor.
    """
    return [
        replace(
            each,
            value=_true_kms(each.value, seen),
            against_value=_true_kms(each.against_value, seen),
            reasons=(*_taken_otherwise(each, seen), *each.reasons),
        )
        if each.quantity == SPEED
        else each
        for each in tensions
    ]


def _taken_otherwise(tension: ShellTension, seen: Seen) -> tuple[str, ...]:
    """Whether too high a speed comes from taking the radii for a feature that shows only part of it."""
    factor = seen.projection.factor
    if tension.sigma is None or tension.sigma < HIGH_SIGMA or factor >= 1.0:
        return ()
    return (
        f"projection: as the limb of a shell, not as a {seen.feature}, the same radii give {factor:.2f} of "
        "that speed",
    )


def _out_of_sky_deg(seen: Seen) -> float:
    """How far the way points out of the sky, deg; 0 where its side is not known."""
    angle = seen.projection.out_of_sky_deg
    return angle if seen.feature == "plume" and seen.side_known and not np.isnan(angle) else 0.0


def _seen_kms(speed_kms: float, seen: Seen) -> float:
    angle = _out_of_sky_deg(seen)
    return float(apparent_speed_kms(speed_kms, angle)) if angle else speed_kms * seen.projection.factor


def _true_kms(seen_kms: float, seen: Seen) -> float:
    """The inverse of ``_seen_kms``."""
    sine = np.sin(np.radians(_out_of_sky_deg(seen)))
    return float(seen_kms / (seen.projection.factor + seen_kms / SPEED_OF_LIGHT_KMS * sine))


def _blur(seen: Seen) -> float:
    sigma = seen.projection.factor_sigma
    return 0.0 if np.isnan(sigma) else sigma / seen.projection.factor


# ------------------------------------------------------------------------------------------- light


def with_light_time(
    shells: Sequence[DatedShell], seen: Seen, distance_pc: float | None
) -> tuple[list[DatedShell], tuple[str, ...]]:
    """Launches with the light's way across the shell, where it matters and its sense is known.

    Parameters
    ----------
    shells : sequence of DatedShell
        Launches ``bmjd_tdb``, radii arcsec.
    seen : Seen
        The projection.
    distance_pc : float or None
        Distance, pc; without it nobody knows how large the shells are.

    Returns
    -------
    (list of DatedShell, tuple of str)
        The shells, and what is to be said.

    Notes
    -----
    Accuracy: exact for the nominal distance and direction. It matters above 0.3 sigma of the age.

    Source: a nearer feature is seen at a later stage: launch = image + depth/c - age.
    """
    if seen.feature == "limb" or distance_pc is None or not shells:
        return list(shells), ()
    angle = seen.projection.out_of_sky_deg
    radius_au = np.array([s.radius_arcsec * distance_pc / seen.projection.factor for s in shells])
    delays = light_delay_yr(radius_au, 90.0 if np.isnan(angle) else angle)
    sigmas = np.array([np.nan if s.age_sigma_yr is None else s.age_sigma_yr for s in shells])
    if not light_time_matters(delays, sigmas).any():
        return list(shells), ("light travel across the shells moves no launch by more than 0.3 sigma",)
    largest = float(np.max(np.abs(delays)))
    if not seen.side_known:
        said = f"light travel across the shells may move launches by up to {largest:.2g} yr either way"
        return list(shells), (said,)
    moved = [
        shell
        if shell.launched_bmjd_tdb is None
        else replace(shell, launched_bmjd_tdb=shell.launched_bmjd_tdb + float(delay) * YEAR_D)
        for shell, delay in zip(shells, delays, strict=True)
    ]
    texts = utc_iso([np.nan if s.launched_bmjd_tdb is None else s.launched_bmjd_tdb for s in moved])
    dated = [replace(shell, launched_utc=text) for shell, text in zip(moved, texts, strict=True)]
    return dated, (f"launches are corrected for light travel across the shells, up to {largest:.2g} yr",)
