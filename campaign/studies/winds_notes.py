"""What is said beside the numbers of a wind collision: assumptions, what is missing, and warnings."""

from __future__ import annotations

import numpy as np

from campaign.model.records import SystemRecord
from campaign.physics.openingforms import ALL_SHOCKED_BELOW, SHOCK_FLARE_DEG
from campaign.studies.winds_cooling import laws_of
from campaign.studies.winds_draws import DEFAULT_BETA, STARS, Propagation
from campaign.studies.winds_inputs import BETA, FLARE, RATIO, WindInputs, nominal_ratio_b_over_a

# From this share of the draws on, a swap of the roles is worth a word.
_WORTH_SAYING = 0.005

INDICATOR = (
    "chi is an indicator only, good to a factor of a few, for gas of solar abundances: published dust makers "
    "have it above 1 at every phase, and no forecast depends on it"
)


def assumptions(
    record: SystemRecord,
    inputs: WindInputs,
    of: Propagation,
    dated: Propagation | None,
    skew_deg: tuple[float | None, float | None],
) -> list[str]:
    """What the numbers take for granted, and what cannot be told for want of what.

    Parameters
    ----------
    record : SystemRecord
        As the catalogue has it.
    inputs : WindInputs
        What went in.
    of, dated : Propagation
        Draws of the numbers and of the table.
    skew_deg : (float, float)
        Turn of the cone at periastron and apastron, deg; None where it is not known.

    Returns
    -------
    list of str
        One sentence each, with units.

    Notes
    -----
    Accuracy: not applicable. Source: named in each.
    """
    lines = list(inputs.notes)
    adopted = sum(1 for each in record.solutions if each.adopted)
    if adopted > 1 and inputs.solution is not None:
        lines.append(
            f"'{inputs.solution.label}' is one of {adopted} adopted solutions; others with --solution"
        )
    turn = ""
    if skew_deg[0] is not None and skew_deg[1] is not None:
        turn = (
            f": the orbital motion turns it by {skew_deg[0]:.2g} deg at periastron and {skew_deg[1]:.2g} deg "
            "at apastron near its apex, and winds it up farther out"
        )
    lines.append(f"spherical winds at terminal speed set the contact surface; the cone is straight{turn}")
    lines.extend(_missing(inputs))
    if any("beta" in laws_of(inputs, star) for star in STARS):
        beta = inputs.values[BETA].value if BETA in inputs.values else DEFAULT_BETA
        lines.append(
            f"velocity law v = v_inf (1 - R/r)^{beta:g} for the speed before the shock"
            + ("" if BETA in inputs.values else "; another exponent with --beta")
        )
    if FLARE not in inputs.values:
        lines.append(
            f"the rim is the shocked gas that flares {SHOCK_FLARE_DEG:g} deg beyond the contact surface "
            "(Pittard & Dawson 2018, abstract)"
        )
    if inputs.size and inputs.row is not None and inputs.row.a_source not in (None, "given"):
        lines.append(f"semi-major axis from: {inputs.row.a_source}")
    if dated is not None and dated.draws < of.draws:
        lines.append(f"so long a table is drawn {dated.draws} times instead of {of.draws}")
    if inputs.size and any(laws_of(inputs, star) for star in STARS):
        lines.append(INDICATOR)
    return lines


def _missing(inputs: WindInputs) -> list[str]:
    """What cannot be told, and what would give it."""
    name = inputs.record.system.name
    if inputs.row is None:
        return [
            "no solution is adopted: no cooling, no line of sight and no dates; name one with --solution, or "
            f'add one: campaign solution add "{name}" --period ... --epoch ... --adopt'
        ]
    lines = []
    if not inputs.has("eccentricity"):
        lines.append("no eccentricity: nothing through the orbit; give --eccentricity")
    elif not inputs.size:
        lines.append('the size of the orbit is not known: no cooling; give --a "16±1 au"')
    if not inputs.has("inclination_deg", "omega_b_deg"):
        lines.append(
            "no inclination or no omega: no line of sight; give --inclination, --omega and --omega-of"
        )
    if not inputs.has_dates:
        lines.append("periastron cannot be dated: no table; give --period and --epoch")
    for star in STARS:
        low = star.lower()
        lacking = [
            word
            for key, word in (("mass_loss_msun_yr", "mass-loss"), ("wind_speed_kms", "wind-speed"))
            if not inputs.has(f"{key}_{low}")
        ]
        if lacking:
            options = " and ".join(f"--{word}-{low}" for word in lacking)
            lines.append(f"no cooling of the wind of star {star}: give {options}")
        elif not inputs.has(f"radius_rsun_{low}"):
            lines.append(f"no velocity law for star {star}: give --radius-{low}")
    return lines


def warnings(inputs: WindInputs, of: Propagation, swap: float | None) -> list[str]:
    """What a reader must know before using the numbers.

    Parameters
    ----------
    inputs : WindInputs
        What went in.
    of : Propagation
        Draws of winds and orbit.
    swap : float or None
        Share of the draws with the roles the other way round (dimensionless).

    Returns
    -------
    list of str
        One sentence each.

    Notes
    -----
    Accuracy: shares of the draws. Source: named in each.
    """
    lines = []
    if inputs.weaker == "A":
        ratio = nominal_ratio_b_over_a(inputs)
        lines.append(
            f"star B has the stronger wind: the momentum ratio of B over A is {ratio:.4g}, above 1. The "
            "roles are swapped, and the ratio told is that of A over B"
        )
    if swap is not None and swap >= _WORTH_SAYING:
        lines.append(
            f"within the errors star {inputs.weaker} may have the stronger wind after all: in "
            f"{_percent(swap)} of the draws the roles are the other way round"
        )
    eta = float(of.nominal.eta[0])
    if eta < ALL_SHOCKED_BELOW:
        lines.append(
            f"below a momentum ratio of {ALL_SHOCKED_BELOW:g} all of the weaker wind is shocked, and fits "
            "overestimate the angle (Pittard & Dawson 2018, abstract)"
        )
    lines.extend(_collapses(inputs, of))
    if RATIO in inputs.values and all(f"wind_speed_kms_{s}" in inputs.values for s in "ab"):
        lines.append("--momentum-ratio stands in for the one that follows from mass loss and wind speed")
    return lines


def _collapses(inputs: WindInputs, of: Propagation) -> list[str]:
    """Stars that the contact surface would lie inside of at periastron."""
    if not inputs.size or not inputs.has("eccentricity"):
        return []
    lines = []
    for star in STARS:
        if not inputs.has(f"radius_rsun_{star.lower()}"):
            continue
        near = of.all.a_au * (1.0 - of.all.input("eccentricity")) * of.all.contact_share(star)
        share = float(np.mean(near < of.all.radius_au(star)))
        if share >= _WORTH_SAYING:
            other = "B" if star == "A" else "A"
            lines.append(
                f"at periastron the winds balance inside star {star} in {_percent(share)} of the draws: "
                f"the wind of star {other} then reaches its surface, and nothing told here holds"
            )
    return lines


def _percent(share: float) -> str:
    """Two digits, and no power of ten."""
    return f"{100 * share:.2g} %" if share < 0.095 else f"{100 * share:.0f} %"
