"""What is left for the dust in each band near a date, when the stars' own light is taken away."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.dust import BandExcess, BandUse, DustOverrides
from campaign.model.measured import Measured
from campaign.physics.opacity import Opacity, opacity_cm2_g, reaches
from campaign.physics.photometry import FLUX_ERROR_PER_MAG, extinction_over_k, mag_to_flux
from campaign.studies.dust_points import SATURATION_SHARPNESS, Level, Levels, LightPoints, Zero, zero_of

FloatArray = NDArray[np.float64]
Places = NDArray[np.int64]

# An excess is believed from here on, and a deficit is none of the dust's light.
SEEN_SIGMA = 3.0
# Below this share of the stars' light, their own flicker and the level decide.
STAR_DOMINATED = 0.1


@dataclass(frozen=True, slots=True)
class Sky:
    """All that is needed to see an excess: points, levels, zero points and opacity."""

    points: LightPoints
    levels: Levels
    overrides: DustOverrides
    opacity: Opacity


def excesses(sky: Sky, start: float, end: float) -> tuple[BandExcess, ...]:
    """The excess of every band of every photometric system that was looked at between two instants.

    Parameters
    ----------
    sky : Sky
        Points (mag), levels, zero points (Jy) and opacity (cm^2/g).
    start, end : float
        ``bmjd_tdb``.

    Returns
    -------
    tuple of BandExcess
        By wavelength; fluxes in Jy. A band without zero point, level or opacity says so and is not fitted.

    Notes
    -----
    Accuracy: fluxes are averaged, never magnitudes. The errors of the level and of the zero point are common
    to the points of a band and are counted once. A limit counts only where nothing was measured.

    Source: F = F0 10^(-0.4 m) (Pogson 1856, MNRAS 17, 12).
    """
    near = np.flatnonzero((sky.points.bmjd_tdb >= start) & (sky.points.bmjd_tdb <= end))
    groups: dict[tuple[str, str], list[int]] = {}
    for i in near.tolist():
        groups.setdefault((sky.points.band[i], sky.points.photometric_system[i]), []).append(i)
    found = [_excess(sky, band, system, np.array(places)) for (band, system), places in groups.items()]
    extinction = sky.overrides.extinction_k_mag
    if extinction is not None:
        found = [_unveiled(one, extinction) for one in found]
    return tuple(sorted(found, key=lambda one: (one.wavelength_um or np.inf, one.band)))


def _unveiled(one: BandExcess, extinction_k_mag: Measured) -> BandExcess:
    """The band as it would be without the interstellar dust.

    The error of the extinction moves all bands and dates together: it is counted where they meet, not here.
    """
    if one.wavelength_um is None or one.dust_jy is None:
        return one
    share = float(extinction_over_k(one.wavelength_um))
    factor = 10.0 ** (0.4 * share * extinction_k_mag.value)
    assert one.sigma_jy is not None
    assert one.common_sigma_jy is not None
    return replace(
        one,
        dust_jy=one.dust_jy * factor,
        sigma_jy=one.sigma_jy * factor,
        common_sigma_jy=one.common_sigma_jy * factor,
        star_jy=None if one.star_jy is None else one.star_jy * factor,
        observed_jy=None if one.observed_jy is None else one.observed_jy * factor,
    )


def _excess(sky: Sky, band: str, system: str, places: Places) -> BandExcess:
    points = sky.points
    measured = places[points.side[places] == 0]
    used = measured if measured.size else places
    zero = zero_of(band, system, sky.overrides)
    levels = {points.series[i]: sky.levels.of(points.series[i], band) for i in used.tolist()}
    reason = zero if isinstance(zero, str) else _no_level(levels)
    known = used[[not isinstance(levels[points.series[i]], str) for i in used.tolist()]]
    if isinstance(zero, str) or not known.size:
        return _left_out(points, band, system, used, zero, reason)
    if measured.size:
        return _measured(sky, band, system, known, zero, levels)
    return _limit(sky, band, system, known, zero, levels)


def _no_level(levels: dict[str, Level | str | None]) -> str:
    return next((level for level in levels.values() if isinstance(level, str)), "")


def _left_out(
    points: LightPoints, band: str, system: str, used: Places, zero: Zero | str, reason: str
) -> BandExcess:
    is_zero = isinstance(zero, Zero)
    observed = None
    if isinstance(zero, Zero) and not points.side[used].any():
        observed = float(np.mean(zero.flux_jy * 10.0 ** (-0.4 * points.mag[used])))
    return BandExcess(
        band, system, zero.name if isinstance(zero, Zero) else "", _use_of(points, used), int(used.size),
        _sources(points, used), float(points.bmjd_tdb[used].mean()),
        zero.wavelength_um if isinstance(zero, Zero) else None, observed if is_zero else None,
        None, None, None, None, None, None, None, False, reason,
    )  # fmt: skip


def _use_of(points: LightPoints, used: Places) -> BandUse:
    side = int(points.side[used[0]])
    return "measured" if side == 0 else "fainter than" if side > 0 else "brighter than"


def _sources(points: LightPoints, used: Places) -> tuple[str, ...]:
    return tuple(dict.fromkeys(points.source[i] for i in used.tolist()))


def _stars(
    points: LightPoints, used: Places, zero: Zero, levels: dict[str, Level | str | None]
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Flux of the stars at each point, its flicker, the error of its level (Jy), and the series' scatter."""
    columns = np.zeros((4, used.size))
    for place, i in enumerate(used.tolist()):
        level = levels[points.series[i]]
        if isinstance(level, Level):
            star = zero.flux_jy * 10.0 ** (-0.4 * level.mag)
            columns[:, place] = (
                star,
                FLUX_ERROR_PER_MAG * star * level.flicker_mag,
                FLUX_ERROR_PER_MAG * star * level.sigma_mag,
                level.scatter_mag,
            )
        else:
            columns[3, place] = np.nan
    return columns[0], columns[1], columns[2], columns[3]


def _measured(
    sky: Sky, band: str, system: str, used: Places, zero: Zero, levels: dict[str, Level | str | None]
) -> BandExcess:
    points = sky.points
    star, flicker, level_error, scatter = _stars(points, used, zero, levels)
    own = points.error_mag[used]
    unknown = np.isnan(own)
    # Where neither the point nor its series tells an error, a generous one stands in.
    error = np.where(unknown, np.where(np.isnan(scatter), 0.1, scatter), own)
    flux = mag_to_flux(points.mag[used], error, zero.flux_jy)
    noise = np.hypot(flux.sigma_jy, flicker)
    noise = np.maximum(noise, 1e-12 * flux.flux_jy)
    weight = noise**-2.0
    weight /= weight.sum()
    dust = flux.flux_jy - star
    mean = float(weight @ dust)
    statistical = float(1.0 / np.sqrt((noise**-2.0).sum()))
    reasons = []
    if used.size > 1:
        excess_scatter = float(((dust - mean) ** 2 / noise**2).sum() / (used.size - 1))
        if excess_scatter > 1.0 + 3.0 * np.sqrt(2.0 / (used.size - 1)):
            statistical *= float(np.sqrt(excess_scatter))
            reasons.append("its points differ by more than their errors: counted in the error")
    if unknown.any():
        reasons.append("an unknown error: the scatter of the series stands in")
    common_level = _common(points, used, weight * level_error)
    common = float(np.hypot(common_level, zero.relative_error * mean))
    sigma = float(np.hypot(statistical, common))
    significance = mean / float(np.hypot(statistical, common_level))
    stars = float(weight @ star)
    fitted, why = _fit_for_use(sky.opacity, zero, significance, stars, mean)
    return BandExcess(
        band, system, zero.name, "measured", int(used.size), _sources(points, used),
        float(weight @ points.bmjd_tdb[used]), zero.wavelength_um, float(weight @ flux.flux_jy), stars, mean,
        sigma, common, significance, mean / stars if stars > 0.0 else None,
        _kappa(sky.opacity, zero), fitted, "; ".join([*why, *reasons]), _assumed(zero),
    )  # fmt: skip


def _fit_for_use(
    opacity: Opacity, zero: Zero, significance: float, stars: float, dust: float
) -> tuple[bool, list[str]]:
    if not reaches(opacity, zero.wavelength_um):
        return False, [f"the opacities of {opacity.name} do not reach {zero.wavelength_um:g} um"]
    if significance < -SEEN_SIGMA:
        return False, [f"{-significance:.1f} sigma below the stars' level: no light of dust"]
    if significance < SEEN_SIGMA:
        return True, ["no excess"]
    if stars > 0.0 and dust < STAR_DOMINATED * stars:
        return True, [f"star-dominated: the dust adds {100.0 * dust / stars:.0f} %"]
    return True, []


def _common(points: LightPoints, used: Places, weighted: FloatArray) -> float:
    """Error of the levels: common within a series, independent between series."""
    sums: dict[str, float] = {}
    for value, i in zip(weighted.tolist(), used.tolist(), strict=True):
        sums[points.series[i]] = sums.get(points.series[i], 0.0) + value
    return float(np.sqrt(sum(value**2 for value in sums.values())))


def _assumed(zero: Zero) -> float | None:
    return zero.relative_error if zero.assumed_error else None


def _kappa(opacity: Opacity, zero: Zero) -> float | None:
    if not reaches(opacity, zero.wavelength_um):
        return None
    return float(opacity_cm2_g(opacity, zero.wavelength_um))


def _limit(
    sky: Sky, band: str, system: str, used: Places, zero: Zero, levels: dict[str, Level | str | None]
) -> BandExcess:
    """The tightest limit of a band in which nothing was measured."""
    points = sky.points
    faint = used[points.side[used] > 0]
    chosen = faint if faint.size else used
    bound = zero.flux_jy * 10.0 ** (-0.4 * points.mag[chosen])
    best = int(np.argmin(bound) if faint.size else np.argmax(bound))
    one = chosen[best : best + 1]
    star, flicker, level_error, _ = (float(x[0]) for x in _stars(points, one, zero, levels))
    total, n_sigma = float(bound[best]), float(points.limit_sigma[one[0]])
    n_sigma = n_sigma if np.isfinite(n_sigma) and n_sigma > 0.0 else SEEN_SIGMA
    own = total / n_sigma if faint.size else SATURATION_SHARPNESS * total
    sigma = float(np.sqrt(own**2 + flicker**2 + level_error**2 + (zero.relative_error * total) ** 2))
    left = total - star
    reason, fitted = "", reaches(sky.opacity, zero.wavelength_um)
    if not fitted:
        reason = f"the opacities of {sky.opacity.name} do not reach {zero.wavelength_um:g} um"
    elif not faint.size:
        reason = "saturated: brighter than the detector stands"
        if left <= 0.0:
            fitted, reason = False, "saturated by the stars themselves: it says nothing of the dust"
    elif left < -SEEN_SIGMA * sigma:
        fitted, reason = False, "the limit lies below the stars' level: no light of dust"
    return BandExcess(
        band, system, zero.name, _use_of(points, one), int(used.size), _sources(points, one),
        float(points.bmjd_tdb[one[0]]), zero.wavelength_um, total, star, left, sigma,
        float(np.hypot(level_error, zero.relative_error * total)), None, None,
        _kappa(sky.opacity, zero), fitted, reason, _assumed(zero),
    )  # fmt: skip
