"""What would most likely explain that two determinations lie far apart."""

from __future__ import annotations

import math
from collections.abc import Sequence

from campaign.physics.shellnetwork import Tension

# From here on a tension asks for a reason.
HIGH_SIGMA = 2.0
_SMALL_RATIOS = ((2, 1), (3, 1), (3, 2), (1, 2), (1, 3), (2, 3))
_WIND = "wind"


def likely_reasons(
    tensions: Sequence[Tension],
    shells: int | None = None,
    verdict: str | None = None,
    feature: str | None = None,
) -> tuple[tuple[str, ...], ...]:
    """What would explain each high tension, likeliest first.

    Parameters
    ----------
    tensions : sequence of Tension
        Of the relations between the five quantities; sigma dimensionless.
    shells : int, optional
        Number of steps between shells that the spacing rests on (dimensionless): one step more or less
        is then looked for.
    verdict : str, optional
        What was found of acceleration: accelerated, constant, decelerated or undecided.
    feature : str, optional
        What was measured: limb, ring or plume.

    Returns
    -------
    tuple of tuple of str
        For each tension its reasons in words (no unit); empty below 2 sigma or where the sigma is not known.

    Notes
    -----
    Accuracy: a guide, no inference: each reason says what it rests on.

    Source: common practice, no source.

    Examples
    --------
    >>> doubled = Tension("period_yr", ("spacing_arcsec:given", "proper_motion_mas_yr:given"),
    ...     ("period_yr:orbit",), 12.0, 20.1, 10.0)
    >>> likely_reasons([doubled])[0][0]
    'wrong cycle count: the period from the shells is 2/1 of the other; every second shell may be missing'
    """
    return tuple(_reasons(each, tensions, shells, verdict, feature) for each in tensions)


def _reasons(
    one: Tension,
    tensions: Sequence[Tension],
    shells: int | None,
    verdict: str | None,
    feature: str | None,
) -> tuple[str, ...]:
    if one.sigma is None or abs(one.sigma) < HIGH_SIGMA:
        return ()
    uses = {key.split(":", 1)[0] for key in (*one.determined_from, *one.against)} - {one.quantity}
    reasons = []
    if not uses:
        return (f"two sources state the {_word(one.quantity)} differently: one of them is wrong or too sure",)
    count = _miscount(one, shells) if one.quantity == "period_yr" else None
    if count is not None:
        reasons.append(count)
    slow = _moves_too_slowly(one)
    with_distance = bool(uses & {"distance_pc", "speed_kms"}) or one.quantity != "period_yr"
    if slow and feature != "limb":
        reasons.append(
            "projection: a feature that is not in the plane of the sky shows only part of its motion"
            + ("" if feature is None else f" ({feature})")
        )
    if verdict == "accelerated":
        reasons.append("acceleration: the radii show it, and one speed for all shells does not hold")
    elif verdict != "constant" and (not slow or not with_distance):
        reasons.append(
            "acceleration: dust still pushed moves slower near the star than its spacing farther out says"
            if not with_distance
            else "acceleration: dust pushed by light may end up faster than the speed stated"
        )
    if any(key.split(":", 1)[-1] == _WIND for key in (*one.determined_from, *one.against)):
        reasons.append(
            "dust need not move at the terminal speed of a wind: it may lie between the two winds'"
        )
    if with_distance:
        agrees = any(
            each.sigma is not None
            and abs(each.sigma) < HIGH_SIGMA
            and each.quantity == "period_yr"
            and not any(key.startswith(("distance_pc", "speed_kms")) for key in each.determined_from)
            for each in tensions
        )
        reasons.append(
            "distance: the period without a distance agrees, so that distance or speed is off"
            if agrees
            else "distance: the speed follows from the motion only through it"
        )
    if count is None and one.quantity == "period_yr":
        reasons.append("wrong cycle count: a shell missing or counted twice changes the spacing")
    return tuple(reasons)


def _miscount(one: Tension, shells: int | None) -> str | None:
    """Whether the two periods are as two whole numbers, within their errors."""
    ratio = one.value / one.against_value
    error = abs(one.value - one.against_value) / (abs(one.sigma or math.inf) * one.against_value)
    for top, bottom in _SMALL_RATIOS:
        if abs(ratio - top / bottom) < HIGH_SIGMA * error:
            hint = (
                "every second shell may be missing"
                if (top, bottom) == (2, 1)
                else "shells may be missing in every step"
                if top > bottom
                else "shells may be counted that are none"
            )
            return f"wrong cycle count: the period from the shells is {top}/{bottom} of the other; {hint}"
    if shells is not None and shells > 1:
        for steps, hint in ((shells + 1, "one shell may be missing"), (shells - 1, "one may be none")):
            if abs(ratio - steps / shells) < 0.5 * HIGH_SIGMA * error:
                return f"wrong cycle count: with {steps} steps for {shells} the periods agree; {hint}"
    return None


def _moves_too_slowly(one: Tension) -> bool:
    """Whether the shells seem to move more slowly than the rest wants: the sign that projection has."""
    from_motion = any(key.startswith("proper_motion") for key in one.determined_from)
    higher = one.value > one.against_value
    if one.quantity == "speed_kms":
        return not higher
    if one.quantity == "distance_pc":
        return higher
    # A period from spacing and motion is free of a common projection; from spacing and speed it is too short.
    return not higher and not from_motion


def _word(quantity: str) -> str:
    return quantity.rsplit("_", 1)[0].replace("_", " ")
