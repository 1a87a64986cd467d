"""The mass of dust through an episode, and how fast it is made."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from campaign.model.dust import MeasuredDust, ProductionRate
from campaign.physics.constants import JULIAN_YEAR_D
from campaign.physics.draws import stratified_normals
from campaign.physics.dustfit import amount_at, flux_sensitivities
from campaign.physics.dustmass import dust_flux_jy
from campaign.studies.dust_inputs import VEIL, DustInputs
from campaign.studies.dust_measured import FLUXES, Fitted
from campaign.studies.dust_verdicts import NO_DUST
from campaign.studies.propagation import DrawnTogether, Draws, Propagator, Uncertain

FloatArray = NDArray[np.float64]

MOST_EPOCHS = 400


def epochs_of(bmjd_tdb: FloatArray, within_d: float) -> list[tuple[float, float]]:
    """Spans in which observations count as one date.

    Parameters
    ----------
    bmjd_tdb : ndarray
        Times of all points, ``bmjd_tdb``, in order.
    within_d : float
        Half of the longest span, days.

    Returns
    -------
    list of (float, float)
        First and last instant of each date, ``bmjd_tdb``.

    Notes
    -----
    Accuracy: exact. Each span begins with the first point that is left, so that every point counts once.

    Source: project convention.
    """
    found: list[tuple[float, float]] = []
    for time in bmjd_tdb.tolist():
        if found and time - found[-1][0] <= 2.0 * within_d:
            found[-1] = (found[-1][0], time)
        else:
            found.append((time, time))
    return found


def production_rates(
    inputs: DustInputs,
    epochs: Sequence[tuple[MeasuredDust, Fitted | None]],
    draws: int,
    seed: int,
) -> tuple[ProductionRate, ...]:
    """Change of the mass from each date with a mass to the next, but not past a date that shows no dust.

    Parameters
    ----------
    inputs : DustInputs
        Distance (pc) and error of the opacity, which all dates share.
    epochs : sequence of (MeasuredDust, Fitted or None)
        In order of time.
    draws, seed : int
        Of the random draws (dimensionless).

    Returns
    -------
    tuple of ProductionRate
        Msun/yr; negative where dust is destroyed, or cools out of the bands.

    Notes
    -----
    Accuracy: errors of levels and zero points are common to all dates and do not make rates of their own:
    the amounts are drawn together with the correlations that these errors give them, to first order.

    Source: difference of two masses over their time; Gaussian copula (Nelsen 2006, An Introduction to
    Copulas).
    """
    usable = [(measured, fitted) for measured, fitted in epochs if fitted is not None and measured.mass_msun]
    if len(usable) < 2:
        return ()
    without = [m.bmjd_tdb for m, _ in epochs if any(v.code == NO_DUST for v in m.verdicts)]
    fits = [fitted for _, fitted in usable]
    given = not all(fit.is_fitted for fit in fits)
    drawn = _normals_together(fits, draws, seed)
    shared = ("distance_pc", "opacity_factor", *(("temperature_k",) if given else ()))
    shared += (VEIL,) if VEIL in inputs.values else ()
    values: dict[str, Uncertain] = {key: inputs.values[key] for key in shared}
    found = []
    for i, ((one, _), (other, _)) in enumerate(pairwise(usable)):
        if any(one.bmjd_tdb < clear < other.bmjd_tdb for clear in without):
            continue
        span_yr = (other.bmjd_tdb - one.bmjd_tdb) / JULIAN_YEAR_D
        pair = (fits[i], fits[i + 1])
        veils = tuple(_Veil(fit.veil_slope, inputs.values.get(VEIL)) for fit in pair)
        if given:
            # One temperature for all dates: its error is theirs in common.
            quantity: _Rate | _RateAtGiven = _RateAtGiven(span_yr, *pair, *veils)
            draws_of, nominal = {"first": drawn[i], "second": drawn[i + 1]}, (0.0, 0.0)
        else:
            quantity = _Rate(span_yr, *veils)
            draws_of = {
                "first": _as_fitted(pair[0], drawn[i]), "second": _as_fitted(pair[1], drawn[i + 1]),
            }  # fmt: skip
            nominal = (pair[0].amount, pair[1].amount)
        together = DrawnTogether(FLUXES, draws_of, dict(zip(("first", "second"), nominal, strict=True)))
        propagate = Propagator(values, draws, seed, together)
        rate = propagate(quantity, ("first", "second", *shared))
        found.append(ProductionRate(one.bmjd_tdb, other.bmjd_tdb, one.utc, other.utc, rate))
    return tuple(found)


class _Veil:
    """Factor by which another extinction, the same at all dates, moves the amount of one date."""

    def __init__(self, slope: float, extinction: Uncertain | None) -> None:
        self._slope, self._extinction = slope, extinction

    def __call__(self, d: Draws) -> FloatArray | float:
        if self._extinction is None:
            return 1.0
        return np.exp(self._slope * (d[VEIL] - self._extinction.nominal))


class _Rate:
    """Difference of two masses over a span."""

    def __init__(self, span_yr: float, first_veil: _Veil, second_veil: _Veil) -> None:
        self._span_yr, self._veils = span_yr, (first_veil, second_veil)

    def __call__(self, d: Draws) -> FloatArray:
        square = d["distance_pc"] ** 2 / d["opacity_factor"]
        first, second = (d[key] * veil(d) for key, veil in zip(("first", "second"), self._veils, strict=True))
        return np.asarray((second - first) * square / self._span_yr)


class _RateAtGiven:
    """The same at a temperature that was given, from the noise of the fluxes of both dates."""

    def __init__(
        self, span_yr: float, first: Fitted, second: Fitted, first_veil: _Veil, second_veil: _Veil
    ) -> None:
        self._span_yr = span_yr
        self._dates = ((first, first_veil, "first"), (second, second_veil, "second"))

    def __call__(self, d: Draws) -> FloatArray:
        square = d["distance_pc"] ** 2 / d["opacity_factor"]
        amounts = []
        for fit, veil, key in self._dates:
            best, noise = amount_at(fit.bands, d["temperature_k"])
            amounts.append(np.maximum(best + noise * d[key], 0.0) * veil(d))
        return np.asarray((amounts[1] - amounts[0]) * square / self._span_yr)


def _normals_together(fits: Sequence[Fitted], draws: int, seed: int) -> FloatArray:
    """Standard normal deviates of all dates, correlated by the errors that the dates share."""
    # Rounding can make the least eigenvalue of a correlation matrix negative.
    values, vectors = np.linalg.eigh(_correlation(fits))
    root = vectors * np.sqrt(np.clip(values, 0.0, None))
    names = [f"date {i}" for i in range(len(fits))]
    normals = stratified_normals(names, draws, seed)
    return np.asarray(root @ np.stack([normals[name] for name in names]))


def _as_fitted(fit: Fitted, normals: FloatArray) -> FloatArray:
    """Amounts distributed as the fit says, in the order of normal deviates."""
    order = np.argsort(np.argsort(normals))
    ordered = np.sort(fit.amount_draws)
    # Another number of draws than the fit's is met by interpolation.
    places = (np.arange(ordered.size) + 0.5) / ordered.size
    return np.interp((order + 0.5) / normals.size, places, ordered)


def _correlation(fits: Sequence[Fitted]) -> FloatArray:
    slopes, variances = [], []
    for fit in fits:
        slope = _slopes(fit)
        slopes.append(slope)
        variances.append(float((slope**2 * fit.bands.sigma_jy**2).sum()))
    count = len(fits)
    correlation = np.eye(count)
    for i in range(count):
        for j in range(i):
            shared = 0.0
            for place, name in enumerate(fits[i].names):
                if name in fits[j].names:
                    other = fits[j].names.index(name)
                    shared += float(
                        slopes[i][place] * fits[i].common_sigma_jy[place]
                        * slopes[j][other] * fits[j].common_sigma_jy[other]
                    )  # fmt: skip
            scale = np.sqrt(variances[i] * variances[j])
            if scale > 0.0:
                correlation[i, j] = correlation[j, i] = float(np.clip(shared / scale, -0.999, 0.999))
    return correlation


def _slopes(fit: Fitted) -> FloatArray:
    """How the logarithm of the amount moves with each flux, per Jy."""
    if fit.is_fitted:
        return np.asarray(flux_sensitivities(fit.bands, fit.temperature_k, fit.amount)[0])
    bands = fit.bands
    shape = dust_flux_jy(1.0, bands.wavelength_um, 1.0, fit.temperature_k, bands.kappa_cm2_g)
    weight = shape * bands.measured / bands.sigma_jy**2
    return np.asarray(weight / (weight @ shape) / max(fit.amount, 1e-300))
