"""When a temperature or a mass of dust means nothing, and when it means less than it seems to."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from campaign.model.dust import BandExcess, DustVerdict
from campaign.physics.dustfit import DustFit
from campaign.studies.dust_excess import SEEN_SIGMA, STAR_DOMINATED

# From here on grains shade each other, and from one on there is no surface left to add.
THICK, OPAQUE = 0.3, 1.0
# A fit this bad by chance is one in 370.
_IMPROBABLE = 0.0027
# Of the stars' light, taken up and given off again.
_MUCH_LIGHT = 0.5
# Bands were measured and none shows an excess.
NO_DUST = "star-dominated"


@dataclass(frozen=True, slots=True)
class Thickness:
    """Least radius of the dust and distance at which grains are as hot (au), and what follows.

    ``optical_depth`` is the square of their ratio, ``light_share`` the dust's light over that of the stars;
    None without a luminosity of the stars.
    """

    blackbody_radius_au: float
    grain_distance_au: float | None
    optical_depth: float | None
    light_share: float | None


def verdicts_of(
    excesses: Sequence[BandExcess],
    fit: DustFit | None,
    given: bool,
    thickness: Thickness | None,
    crossed: Sequence[str] = (),
) -> tuple[DustVerdict, ...]:
    """What is wrong with the numbers of one date, the worst first.

    Parameters
    ----------
    excesses : sequence of BandExcess
        All bands looked at, Jy.
    fit : DustFit or None
        Of temperature (K) and amount, if one was made.
    given : bool
        Whether the temperature comes from elsewhere.
    thickness : Thickness or None
        Sizes, au, if a mass was found.
    crossed : sequence of str
        Bands whose limit the dust breaks by more than 3 sigma.

    Returns
    -------
    tuple of DustVerdict
        Those that make the mass meaningless first.

    Notes
    -----
    Accuracy: thresholds are conventions: 3 sigma for an excess, a tenth of the stars' light, optical depths
    of 0.3 and 1.

    Source: project convention, common practice.
    """
    found = _too_little(excesses, fit, given)
    if not found:
        # Of a temperature that nothing bounds, sizes say nothing.
        found = _one_sided(excesses, fit, given) or _too_thick(thickness)
    found += [*_misfit(fit), *_weak(excesses)]
    if crossed:
        found.append(
            DustVerdict(
                "limit-crossed",
                f"the limit in {_list(crossed)} is crossed by more than 3 sigma: this dust is too bright or "
                "too faint there, and the temperature or the limit is wrong",
                False,
            )
        )
    return tuple(sorted(found, key=lambda verdict: not verdict.meaningless))


def chi2_probability(fit: DustFit) -> float | None:
    """Probability that noise alone makes a fit as bad.

    Parameters
    ----------
    fit : DustFit
        chi2 and degrees of freedom (dimensionless).

    Returns
    -------
    float or None
        Dimensionless; None without a degree of freedom.

    Notes
    -----
    Accuracy: that of scipy. Source: chi-square distribution (Pearson 1900).
    """
    if fit.degrees < 1:
        return None
    from scipy.special import chdtrc

    return float(chdtrc(fit.degrees, fit.chi2))


def _too_little(excesses: Sequence[BandExcess], fit: DustFit | None, given: bool) -> list[DustVerdict]:
    measured = [one for one in excesses if one.fitted and one.use == "measured"]
    seen = [one for one in measured if (one.excess_sigma or 0.0) >= SEEN_SIGMA]
    saturated = [one.band for one in excesses if one.use == "brighter than"]
    below = [one.band for one in excesses if (one.excess_sigma or 0.0) < -SEEN_SIGMA]
    found = []
    if below and not seen:
        found.append(
            DustVerdict(
                "negative-excess",
                f"fainter than the stars in {_list(below)}: no light of dust there; dust in front of the "
                "stars, or a level that is not theirs",
                True,
            )
        )
    if not seen and saturated:
        found.append(
            DustVerdict("saturated", f"saturated in {_list(saturated)}, and no other band shows dust", True)
        )
    elif not seen and measured:
        found.append(
            DustVerdict(
                NO_DUST,
                f"star-dominated: no excess of {SEEN_SIGMA:.0f} sigma in {_list([m.band for m in measured])}",
                True,
            )
        )
    elif not seen:
        found.append(DustVerdict("nothing-usable", "no band can be used; each says why", True))
    elif len(measured) < 2 and not given:
        found.append(
            DustVerdict(
                "one-band",
                f"one band only ({seen[0].band}): temperature and mass cannot be told apart; give "
                "--temperature",
                True,
            )
        )
        if saturated:
            found.append(DustVerdict("saturated", f"saturated in {_list(saturated)}", False))
    return found


def _one_sided(excesses: Sequence[BandExcess], fit: DustFit | None, given: bool) -> list[DustVerdict]:
    if fit is None or given or not fit.cut:
        return []
    seen = [one.band for one in excesses if one.fitted and (one.excess_sigma or 0.0) >= SEEN_SIGMA]
    if len(seen) < 2:
        return [
            DustVerdict(
                "one-band",
                f"dust is seen in one band only ({_list(seen)}) and the others do not bound its temperature: "
                "temperature and mass cannot be told apart; give --temperature",
                True,
            )
        ]
    end = "coolest and hottest" if " and " in fit.cut else "coolest" if fit.cut == "cool" else "hottest"
    return [
        DustVerdict(
            "temperature-unbounded",
            f"the fluxes do not bound the temperature: the {end} dust looked at (100 to 2500 K) fits as "
            "well; give --temperature, or add a band",
            True,
        )
    ]


def _too_thick(thickness: Thickness | None) -> list[DustVerdict]:
    if thickness is None:
        return []
    found = []
    depth, share = thickness.optical_depth, thickness.light_share
    if depth is None:
        found.append(
            DustVerdict(
                "thickness-unknown",
                "no luminosity of the stars: whether the dust is optically thin cannot be told",
                False,
            )
        )
    elif depth >= OPAQUE:
        found.append(
            DustVerdict(
                "optically-thick",
                "optically thick: a black disc of that temperature needs "
                f"{thickness.blackbody_radius_au:.3g} au, and grains so hot stand "
                f"{thickness.grain_distance_au:.3g} au from the stars; the flux "
                "tells an area, not a mass",
                True,
            )
        )
    elif depth >= THICK:
        found.append(
            DustVerdict(
                "not-thin",
                f"optical depth {depth:.2g}: grains shade each other, the mass is a lower limit",
                False,
            )
        )
    if share is not None and share > 1.0:
        found.append(
            DustVerdict(
                "more-light-than-the-stars",
                f"the dust would shine {share:.3g} times as bright as the stars that warm it: distance, "
                "luminosity, zero points or temperature are wrong",
                True,
            )
        )
    elif share is not None and share > _MUCH_LIGHT:
        found.append(
            DustVerdict(
                "much-light",
                f"the dust gives {100.0 * share:.0f} % of the stars' light: it shades itself from them, and "
                "grains behind are cooler and not seen; the mass is a lower limit",
                False,
            )
        )
    return found


def _misfit(fit: DustFit | None) -> list[DustVerdict]:
    if fit is None:
        return []
    if fit.degrees < 1:
        return _pulled(fit)
    probability = chi2_probability(fit)
    if probability is None or probability >= _IMPROBABLE:
        return []
    return [
        DustVerdict(
            "one-temperature-does-not-fit",
            f"no single temperature fits (chi2 {fit.chi2:.3g} for {fit.degrees} degrees of freedom): dust of "
            "several temperatures, another opacity, or a level or zero point that is off; the errors do not "
            "hold that",
            False,
        )
    ]


def _pulled(fit: DustFit) -> list[DustVerdict]:
    """Two bands alone fit exactly, unless a limit of a third or the range of temperatures forbids it."""
    if fit.cut or fit.chi2 <= SEEN_SIGMA**2:
        return []
    return [
        DustVerdict(
            "one-temperature-does-not-fit",
            f"the limits pull the dust off the two bands that were measured (chi2 {fit.chi2:.3g}, where they "
            "alone would fit exactly): dust of several temperatures, another opacity, or a level or limit "
            "that is off; the errors do not hold that",
            False,
        )
    ]


def _weak(excesses: Sequence[BandExcess]) -> list[DustVerdict]:
    weak = [
        one.band
        for one in excesses
        if one.fitted and one.dust_over_star is not None and (one.excess_sigma or 0.0) >= SEEN_SIGMA
        and one.dust_over_star < STAR_DOMINATED
    ]  # fmt: skip
    below = [one.band for one in excesses if (one.excess_sigma or 0.0) < -SEEN_SIGMA]
    found = []
    if weak:
        found.append(
            DustVerdict(
                "band-star-dominated",
                f"star-dominated in {_list(weak)}: the dust adds less than "
                f"{100.0 * STAR_DOMINATED:.0f} %, so that the stars' level decides",
                False,
            )
        )
    if below and any((one.excess_sigma or 0.0) >= SEEN_SIGMA for one in excesses):
        found.append(
            DustVerdict(
                "band-negative",
                f"fainter than the stars in {_list(below)}: left out; dust in front of the stars dims them",
                False,
            )
        )
    return found


def _list(names: Sequence[str]) -> str:
    return ", ".join(dict.fromkeys(names))
