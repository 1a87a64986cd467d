"""Temperature and amount of optically thin dust from its fluxes in several bands, limits respected."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.dustmass import dust_flux_jy
from campaign.physics.planck import log_planck_slope

FloatArray = NDArray[np.float64]
SideArray = NDArray[np.int8]

# Dust is looked for between these temperatures; carbon does not stay solid much above the second.
COOLEST_DUST_K, HOTTEST_DUST_K = 100.0, 2500.0
_COARSE, _FINE = 240, 161
# Natural logarithms below the peak at which the probability is dropped, and half the span of amplitudes.
_WORTH_COUNTING, _HALF_SPAN, _AMPLITUDES = 18.0, 6.0, 49
# The range of temperatures, not the data, ends the answer where the density at an end is above this share of
# the peak, or where this much probability lies in the outermost twentieth of the range.
_CUT_SHARE, _CUT_PROBABILITY, _OUTERMOST = 0.05, 0.005, 0.05


@dataclass(frozen=True, slots=True, eq=False)
class BandFluxes:
    """Fluxes of the dust alone, one entry a band, with the opacity at their wavelengths.

    ``side`` is 0 for a measurement, +1 for 'less than ``flux_jy``', -1 for 'more than ``flux_jy``'; of a
    limit ``sigma_jy`` is the noise it was set with. A measured flux may be negative.
    """

    wavelength_um: FloatArray
    kappa_cm2_g: FloatArray
    flux_jy: FloatArray
    sigma_jy: FloatArray
    side: SideArray

    @property
    def measured(self) -> NDArray[np.bool_]:
        return np.asarray(self.side == 0)


@dataclass(frozen=True, slots=True, eq=False)
class DustFit:
    """Probability of temperature and amount on a grid, and the best pair.

    ``amount`` is the mass over the square of the distance, Msun/pc^2, shape (temperatures, amounts), and
    ``weight`` the probability of each pair, in total 1. ``chi2`` counts measured bands at the best pair.
    ``cut`` says which end of the range of temperatures, if any, bounds the answer in place of the data.
    """

    temperature_k: FloatArray
    amount: FloatArray
    weight: FloatArray
    best_temperature_k: float
    best_amount: float
    chi2: float
    degrees: int
    cut: str = ""


def fit_dust(bands: BandFluxes) -> DustFit:
    """Fit one temperature and one amount of dust to all bands.

    Parameters
    ----------
    bands : BandFluxes
        Fluxes of the dust (Jy), one independent error a band; opacities in cm^2 per gram of dust.

    Returns
    -------
    DustFit
        Temperature in K, amount in Msun/pc^2.

    Raises
    ------
    InputRefused
        If no band was measured, or an error is not positive.

    Notes
    -----
    Likelihood: normal for a measured flux, Phi((limit - model)/sigma) for a limit (Tobin 1958, Econometrica
    26, 24), so that a limit is never taken for a measurement at the limit. Prior: even in ln T between 100
    and 2500 K, and even in the signal that the amount makes (the conditional Jeffreys prior), which leaves
    the profile likelihood of T unchanged. The grid is refined until it spans what is probable.

    Accuracy: means and quantiles 1 % of the errors.

    Source: F = (M/D^2) kappa B(T); Bayes' theorem on a grid.

    Examples
    --------
    >>> wave, kappa = np.array([2.159, 3.3526, 4.6028]), np.array([8615.8, 4282.7, 2733.6])
    >>> flux = dust_flux_jy(1e-8, wave, 2000.0, 900.0, kappa)
    >>> fit = fit_dust(BandFluxes(wave, kappa, flux, 0.03 * flux, np.zeros(3, dtype=np.int8)))
    >>> round(fit.best_temperature_k), f"{fit.best_amount * 2000.0**2:.2e}"
    (900, '1.00e-08')
    """
    _check(bands)
    temperatures = np.geomspace(COOLEST_DUST_K, HOTTEST_DUST_K, _COARSE)
    logs, amount = _given_temperature(bands, temperatures)
    height = _row_heights(logs)
    cut = _cut(height)
    for _ in range(2):
        temperatures = _narrowed(temperatures, height)
        logs, amount = _given_temperature(bands, temperatures)
        height = _row_heights(logs)
    weight = np.exp(logs - logs.max())
    return _finish(bands, temperatures, amount, weight / weight.sum(), cut)


def draw_dust(fit: DustFit, first: FloatArray, second: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Draws of temperature and amount from a fit.

    Parameters
    ----------
    fit : DustFit
        Its temperatures in K, amounts in Msun/pc^2.
    first, second : ndarray, shape (draws,)
        Uniform deviates in (0, 1) (dimensionless): of the temperature, and of the amount given it.

    Returns
    -------
    tuple of ndarray
        Temperature, K, and amount, Msun/pc^2; each of shape (draws,).

    Notes
    -----
    Accuracy: straight lines between the nodes of the grid, about 1 % of the errors.

    Source: inverse-transform sampling (Devroye 1986, ch. II).

    Examples
    --------
    >>> one = np.array([1, 1, 1], dtype=float)
    >>> share = np.array([[0.2, 0.6, 0.2]])
    >>> fit = DustFit(900.0 * one[:1], np.array([[1.0, 2.0, 3.0]]), share, 900.0, 2.0, 0.0, 0)
    >>> [round(float(x[0]), 6) for x in draw_dust(fit, np.array([0.3]), np.array([0.5]))]
    [900.0, 2.0]
    """
    rows = fit.weight.sum(axis=1)
    place = _positions(rows, first)
    log_t = np.interp(place, np.arange(rows.size), np.log(fit.temperature_k))
    lower = np.minimum(np.floor(place).astype(np.int64), rows.size - 1)
    upper = np.minimum(lower + 1, rows.size - 1)
    share = place - lower
    amounts = np.zeros((2, first.size))
    tables = _row_tables(fit)
    for which, row in enumerate((lower, upper)):
        amounts[which] = _amount_at(fit, tables, row, second)
    # Between two temperatures the amount changes as a power: straight in the logarithms.
    with np.errstate(divide="ignore"):
        logs = np.log(np.maximum(amounts, 1e-300))
    return np.exp(log_t), np.exp((1.0 - share) * logs[0] + share * logs[1])


def amount_at(bands: BandFluxes, temperature_k: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Best amount of dust of given temperatures, and its error from the measured fluxes.

    Parameters
    ----------
    bands : BandFluxes
        Fluxes in Jy; limits are left out.
    temperature_k : array_like
        Temperatures, K, > 0.

    Returns
    -------
    tuple of ndarray
        Amount and its one-sigma error, Msun/pc^2, one for each temperature.

    Notes
    -----
    Accuracy: exact; with the temperature given the amount is linear in the fluxes.

    Source: weighted least squares.

    Examples
    --------
    >>> one = np.ones(1)
    >>> bands = BandFluxes(2.159 * one, 8615.8 * one, 2.0 * one, 0.1 * one, np.zeros(1, dtype=np.int8))
    >>> amount, error = amount_at(bands, [900.0])
    >>> round(float(error[0] / amount[0]), 6)
    0.05
    """
    temperatures = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
    shape = _shapes(bands, temperatures)
    weight = shape * bands.measured / bands.sigma_jy**2
    precision = np.maximum((weight * shape).sum(axis=1), 1e-300)
    return (weight * bands.flux_jy).sum(axis=1) / precision, 1.0 / np.sqrt(precision)


def flux_sensitivities(bands: BandFluxes, temperature_k: float, amount: float) -> FloatArray:
    """How ln amount and ln temperature of a fit move with each measured flux.

    Parameters
    ----------
    bands : BandFluxes
        Fluxes in Jy.
    temperature_k : float
        Best temperature, K.
    amount : float
        Best amount, Msun/pc^2.

    Returns
    -------
    ndarray, shape (2, bands)
        d ln amount/d flux and d ln T/d flux, per Jy; zero for limits.

    Notes
    -----
    Accuracy: to first order in the errors. One measured band moves the amount alone.

    Source: normal equations of weighted least squares.

    Examples
    --------
    >>> one = np.ones(1)
    >>> bands = BandFluxes(2.159 * one, 8615.8 * one, 2.0 * one, 0.1 * one, np.zeros(1, dtype=np.int8))
    >>> flux_sensitivities(bands, 900.0, 1.0).shape
    (2, 1)
    """
    found = np.zeros((2, bands.flux_jy.size))
    chosen = bands.measured
    wave = bands.wavelength_um[chosen]
    model = dust_flux_jy(amount, wave, 1.0, temperature_k, bands.kappa_cm2_g[chosen])
    columns = np.stack([model, model * log_planck_slope(wave, temperature_k)])
    weighted = columns / bands.sigma_jy[chosen] ** 2
    used = 2 if wave.size > 1 else 1
    normal = weighted[:used] @ columns[:used].T
    found[:used, chosen] = np.linalg.pinv(normal, hermitian=True) @ weighted[:used]
    return found


def upper_amount(
    bands: BandFluxes, temperature_k: ArrayLike, probability: float = 0.9986501019683699
) -> FloatArray:
    """Amount of dust of a temperature that the bands allow, when none shows any.

    Parameters
    ----------
    bands : BandFluxes
        Fluxes in Jy.
    temperature_k : array_like
        Temperatures, K, > 0.
    probability : float
        Probability (dimensionless) that the amount is smaller; that of 3 sigma by default.

    Returns
    -------
    ndarray
        Upper limit, Msun/pc^2, at each temperature.

    Notes
    -----
    Accuracy: 1 %.

    Source: posterior with an even prior on amounts above zero.

    Examples
    --------
    >>> one = np.ones(1)
    >>> bands = BandFluxes(2.159 * one, 8615.8 * one, 0.0 * one, 0.1 * one, np.zeros(1, dtype=np.int8))
    >>> bool(dust_flux_jy(upper_amount(bands, [900.0])[0], 2.159, 1.0, 900.0, 8615.8) < 0.33)
    True
    """
    temperatures = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
    shape = _shapes(bands, temperatures)
    noise = 1.0 / np.sqrt((shape**2 / bands.sigma_jy**2).sum(axis=1))
    start = np.clip((shape * bands.flux_jy / bands.sigma_jy**2).sum(axis=1) * noise**2, 0.0, None)
    amount = np.linspace(0.0, 1.0, 801) * (start + 8.0 * noise)[:, None]
    logs = _log_likelihood(bands, shape, amount)
    density = np.exp(logs - logs.max(axis=1, keepdims=True))
    total = np.cumsum(density, axis=1)
    total /= total[:, -1:]
    return np.asarray([np.interp(probability, t, a) for t, a in zip(total, amount, strict=True)])


def _check(bands: BandFluxes) -> None:
    if not bool(bands.measured.any()):
        raise InputRefused(
            "Limits alone give neither a temperature nor a mass.",
            why="No band was measured.",
            hint="Add a band in which the dust was seen.",
            code="dust-not-measured",
        )
    if not bool((bands.sigma_jy > 0.0).all()):
        raise InputRefused(
            "A flux without a positive error cannot be weighted.",
            why="The fit weights each band by its error.",
            hint="Give an error with every flux.",
            code="error-refused",
        )


def _shapes(bands: BandFluxes, temperatures: FloatArray) -> FloatArray:
    """Flux of one unit of amount, shape (temperatures, bands)."""
    return dust_flux_jy(1.0, bands.wavelength_um, 1.0, temperatures[:, None], bands.kappa_cm2_g)


def _given_temperature(bands: BandFluxes, temperatures: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Log probability (up to a constant) and amounts, shape (temperatures, amounts).

    Amounts are even in the signal-to-noise ratio that they make in the measured bands, which is the prior.
    """
    shape = _shapes(bands, temperatures)
    best, noise = amount_at(bands, temperatures)
    middle = best / noise
    low = np.maximum(middle - _HALF_SPAN, 0.0)
    high = np.maximum(middle, 0.0) + _HALF_SPAN
    # Cells centred on the nodes; where zero cuts the span they are narrower.
    steps = (np.arange(_AMPLITUDES) + 0.5) / _AMPLITUDES
    width = high - low
    amount = (low[:, None] + steps * width[:, None]) * noise[:, None]
    return _log_likelihood(bands, shape, amount) + np.log(width)[:, None], amount


def _log_likelihood(bands: BandFluxes, shape: FloatArray, amount: FloatArray) -> FloatArray:
    logs = np.zeros(amount.shape)
    for i in range(bands.flux_jy.size):
        off = (bands.flux_jy[i] - amount * shape[:, i, None]) / bands.sigma_jy[i]
        if bands.side[i] == 0:
            logs -= 0.5 * off**2
        else:
            from scipy.special import log_ndtr

            logs += log_ndtr(float(bands.side[i]) * off)
    return logs


def _row_heights(logs: FloatArray) -> FloatArray:
    top = logs.max(axis=1)
    return np.asarray(top + np.log(np.exp(logs - top[:, None]).sum(axis=1)))


def _narrowed(temperatures: FloatArray, height: FloatArray) -> FloatArray:
    probable = np.flatnonzero(height > height.max() - _WORTH_COUNTING)
    first, last = max(int(probable[0]) - 1, 0), min(int(probable[-1]) + 1, temperatures.size - 1)
    return np.geomspace(temperatures[first], temperatures[last], _FINE)


def _cut(height: FloatArray) -> str:
    share = np.exp(height - height.max())
    probability = np.cumsum(share) / share.sum()
    outermost = round(_OUTERMOST * height.size)
    ends = (
        ("cool", share[0], probability[outermost - 1]),
        ("hot", share[-1], 1.0 - probability[-outermost - 1]),
    )
    return " and ".join(word for word, at, beyond in ends if at > _CUT_SHARE or beyond > _CUT_PROBABILITY)


def _finish(
    bands: BandFluxes, temperatures: FloatArray, amount: FloatArray, weight: FloatArray, cut: str
) -> DustFit:
    row = int(weight.sum(axis=1).argmax())
    best_t = float(temperatures[row])
    best = float(amount[row] @ weight[row] / weight[row].sum())
    chosen = bands.measured
    model = dust_flux_jy(best, bands.wavelength_um, 1.0, best_t, bands.kappa_cm2_g)
    chi2 = float((((bands.flux_jy - model) / bands.sigma_jy)[chosen] ** 2).sum())
    return DustFit(temperatures, amount, weight, best_t, best, chi2, int(chosen.sum()) - 2, cut)


def _positions(weight: FloatArray, uniform: FloatArray) -> FloatArray:
    """Places between nodes at which a cumulative weight, straight inside cells, has given values."""
    edges = np.concatenate([[0.0], np.cumsum(weight)])
    place = np.interp(uniform * edges[-1], edges, np.arange(edges.size) - 0.5)
    return np.asarray(np.clip(place, 0.0, weight.size - 1.0))


def _row_tables(fit: DustFit) -> FloatArray:
    """Cumulative weights of each row, from 0 to 1, at the edges of its cells."""
    total = np.cumsum(fit.weight, axis=1)
    whole = np.maximum(total[:, -1:], 1e-300)
    return np.concatenate([np.zeros((total.shape[0], 1)), total / whole], axis=1)


def _amount_at(fit: DustFit, tables: FloatArray, row: NDArray[np.int64], uniform: FloatArray) -> FloatArray:
    """Amount at a cumulative probability of given rows; cells of a row are equally wide."""
    found = np.zeros(uniform.size)
    for number in np.unique(row):
        mine = row == number
        place = np.interp(uniform[mine], tables[number], np.arange(tables.shape[1]) - 0.5)
        nodes = fit.amount[number]
        found[mine] = np.interp(np.clip(place, 0.0, nodes.size - 1.0), np.arange(nodes.size), nodes)
    return found
