"""Temperature, mass and light of the dust at one date, from what the bands show above the stars."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from campaign.model.dust import BandExcess, MeasuredDust, OtherOpacity
from campaign.model.propagated import Propagated
from campaign.physics.condensation import condensation_radius_au
from campaign.physics.constants import SOLAR_MASS_KG
from campaign.physics.draws import stratified_normals
from campaign.physics.dustfit import (
    HOTTEST_DUST_K,
    BandFluxes,
    DustFit,
    amount_at,
    draw_dust,
    fit_dust,
    flux_sensitivities,
    upper_amount,
)
from campaign.physics.dustmass import blackbody_radius_au, dust_flux_jy
from campaign.physics.opacity import OPACITIES, Opacity, dust_luminosity_lsun, opacity_cm2_g, reaches
from campaign.physics.photometry import FLUX_ERROR_PER_MAG, extinction_over_k
from campaign.physics.timescales import utc_iso
from campaign.studies.dust_colours import pair_colours
from campaign.studies.dust_excess import SEEN_SIGMA
from campaign.studies.dust_inputs import VEIL, DustInputs, with_keys
from campaign.studies.dust_verdicts import Thickness, chi2_probability, verdicts_of
from campaign.studies.propagation import DrawnTogether, Draws, Propagator, Uncertain

FloatArray = NDArray[np.float64]

FLUXES = "the fluxes"
_SIDES = {"measured": 0, "fainter than": 1, "brighter than": -1}
_GRAMS = 1000.0 * SOLAR_MASS_KG


@dataclass(frozen=True, slots=True, eq=False)
class Fitted:
    """What a fit of one date leaves for others: the bands, the best pair, and draws of the amount.

    ``veil_slope`` is d ln amount per mag of extinction in K, whose error the draws leave out.
    """

    bands: BandFluxes
    names: tuple[tuple[str, str], ...]
    common_sigma_jy: FloatArray
    temperature_k: float
    amount: float
    amount_draws: FloatArray
    veil_slope: float = 0.0
    is_fitted: bool = True


def measure(
    inputs: DustInputs, excesses: Sequence[BandExcess], at: float, draws: int, seed: int
) -> tuple[MeasuredDust, Fitted | None]:
    """The dust at one date.

    Parameters
    ----------
    inputs : DustInputs
        Distance (pc), error of the opacity, luminosity of the stars (Lsun), and, when it is not to be fitted,
        the temperature of the dust (K).
    excesses : sequence of BandExcess
        Light of the dust near the date, Jy.
    at : float
        The date, ``bmjd_tdb``.
    draws, seed : int
        Of the random draws (dimensionless).

    Returns
    -------
    (MeasuredDust, Fitted or None)
        K, Msun, g, Lsun; no mass where a verdict says that it would mean nothing. What was fitted, where a
        fit was possible.

    Notes
    -----
    Accuracy: one temperature, optically thin. Distance and opacity count with their errors; the amount and
    the temperature with the probability of both together.

    Source: see ``campaign.physics.dustfit`` and ``campaign.physics.dustmass``.
    """
    used = [one for one in excesses if one.fitted]
    bands = band_fluxes(used)
    seen = [one for one in used if one.excess_sigma is not None and one.excess_sigma >= SEEN_SIGMA]
    given = inputs.has("temperature_k")
    fit = None
    if seen and not given and sum(one.use == "measured" for one in used) > 1:
        fit = fit_dust(bands)
    has_amount = bool(seen) and (given or fit is not None)
    placed = inputs.has("distance_pc")
    results = _Results(inputs, bands, fit, draws, seed) if has_amount else None
    thickness = _thickness(inputs, bands, results) if results is not None and placed else None
    crossed = _crossed_limits(used, bands, results) if results is not None else ()
    verdicts = verdicts_of(excesses, fit, given, thickness, crossed)
    fatal = any(verdict.meaningless for verdict in verdicts)
    told = results if results is not None and not fatal else None
    weighed = told if placed else None
    if told is not None and not placed:
        inputs.notes.append("no distance: no mass, no luminosity; give --distance")
    keeps_temperature = told is not None or (
        results is not None and fit is not None and not fit.cut and len(seen) > 1
    )
    degrees = fit.degrees if fit is not None else None
    measured = MeasuredDust(
        bmjd_tdb=at,
        utc=utc_iso(np.array([at]))[0],
        bands=tuple(excesses),
        pairs=pair_colours(seen, inputs.values.get(VEIL), draws, seed),
        temperature_origin="given" if given else "fitted" if keeps_temperature else "none",
        temperature_k=results.temperature() if results is not None and keeps_temperature else None,
        mass_msun=weighed.mass() if weighed is not None else None,
        mass_upper_msun=_upper(inputs, bands) if not seen else None,
        mass_g=weighed.grams() if weighed is not None else None,
        luminosity_lsun=weighed.luminosity() if weighed is not None else None,
        chi2=fit.chi2 if fit is not None else None,
        degrees=degrees,
        chi2_probability=chi2_probability(fit) if fit is not None else None,
        blackbody_radius_au=None if thickness is None else thickness.blackbody_radius_au,
        grain_distance_au=None if thickness is None else thickness.grain_distance_au,
        optical_depth=None if thickness is None else thickness.optical_depth,
        other_opacities=(),
        verdicts=verdicts,
    )
    if weighed is None or told is None:
        return measured, None
    common = np.array([one.common_sigma_jy or 0.0 for one in used])
    names = tuple((one.band, one.photometric_system) for one in used)
    stated = told.nominal()
    return measured, Fitted(
        bands, names, common, stated[0], stated[1], told.amounts(), told.veil_slopes[0], fit is not None
    )


def band_fluxes(used: Sequence[BandExcess]) -> BandFluxes:
    """The fitted bands as columns.

    Parameters
    ----------
    used : sequence of BandExcess
        Bands with fluxes (Jy), wavelength (um) and opacity (cm^2/g).

    Returns
    -------
    BandFluxes
        Jy, um, cm^2/g.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    columns = np.array(
        [(one.wavelength_um, one.kappa_cm2_g, one.dust_jy, one.sigma_jy) for one in used], dtype=np.float64
    ).reshape(-1, 4)
    sides = np.array([_SIDES[one.use] for one in used], dtype=np.int8)
    return BandFluxes(columns[:, 0], columns[:, 1], columns[:, 2], columns[:, 3], sides)


class _Results:
    """Temperature, mass and light with their errors, from a fit or at a given temperature."""

    def __init__(
        self, inputs: DustInputs, bands: BandFluxes, fit: DustFit | None, draws: int, seed: int
    ) -> None:
        self._inputs, self._bands, self._fit = inputs, bands, fit
        self._light = _LightPerMass(inputs)
        values: dict[str, Uncertain] = {
            key: inputs.values[key]
            for key in ("distance_pc", "opacity_factor", "temperature_k", VEIL)
            if key in inputs.values
        }
        if fit is None:
            normals = stratified_normals(["fluxes"], draws, seed)["fluxes"]
            together = DrawnTogether(FLUXES, {"signal": normals}, {"signal": 0.0})
        else:
            generator = np.random.default_rng([seed, 47])
            first, second = ((generator.permutation(draws) + generator.random(draws)) / draws for _ in "ab")
            t, amount = draw_dust(fit, first, second)
            together = DrawnTogether(
                FLUXES,
                {"temperature_k": t, "amount": amount},
                {"temperature_k": fit.best_temperature_k, "amount": fit.best_amount},
            )
        self._propagate = Propagator(values, draws, seed, together)
        self._veil = values.get(VEIL)
        self._keys: tuple[str, ...] = ("temperature_k", "signal" if fit is None else "amount")
        self.veil_slopes = (0.0, 0.0)
        if self._veil is not None:
            self._keys += (VEIL,)
            self.veil_slopes = _veil_slopes(bands, *self.nominal(), fit is not None)

    def _unveiled(self, d: Draws, which: int) -> FloatArray | float:
        """Factor by which another extinction moves the amount (0) or the temperature (1)."""
        if self._veil is None:
            return 1.0
        return np.exp(self.veil_slopes[which] * (d[VEIL] - self._veil.nominal))

    def _temperature(self, d: Draws) -> FloatArray:
        return np.asarray(d["temperature_k"] * self._unveiled(d, 1))

    def _amount(self, d: Draws) -> FloatArray:
        return np.asarray(self._amount_by_fluxes(d) * self._unveiled(d, 0))

    def _amount_by_fluxes(self, d: Draws) -> FloatArray:
        if self._fit is not None:
            return d["amount"]
        t = d["temperature_k"]
        amount, noise = amount_at(self._bands, t)
        # An amount below nothing is not: the few draws there count as next to nothing.
        return np.maximum(amount + noise * d["signal"], 1e-3 * noise)

    def _mass(self, d: Draws) -> FloatArray:
        return np.asarray(self._amount(d) * d["distance_pc"] ** 2 / d["opacity_factor"])

    def nominal(self) -> tuple[float, float]:
        """Temperature and amount as stated or best."""
        if self._fit is not None:
            return self._fit.best_temperature_k, self._fit.best_amount
        t = self._inputs.values["temperature_k"].nominal
        return t, float(amount_at(self._bands, t)[0][0])

    def amounts(self) -> FloatArray:
        """Draws of the amount, by temperature and fluxes alone."""
        return self._amount_by_fluxes(self._propagate.all)

    def temperature(self) -> Propagated:
        veiled = self._veil is not None and self._fit is not None
        keys = with_keys(self._inputs, ("temperature_k", VEIL) if veiled else ("temperature_k",))
        return self._propagate(self._temperature, keys)

    def mass(self) -> Propagated:
        keys = with_keys(self._inputs, (*self._keys, "distance_pc", "opacity_factor"))
        return self._propagate(self._mass, keys)

    def grams(self) -> Propagated:
        return self._propagate(
            lambda d: self._mass(d) * _GRAMS, (*self._keys, "distance_pc", "opacity_factor")
        )

    def luminosity(self) -> Propagated:
        # The opacity cancels: what is absorbed less is more mass for the same light.
        def light(d: Draws) -> FloatArray:
            return np.asarray(self._amount(d) * d["distance_pc"] ** 2 * self._light(self._temperature(d)))

        return self._propagate(light, (*self._keys, "distance_pc"))


@lru_cache(maxsize=8)
def _light_of(opacity: Opacity) -> tuple[FloatArray, FloatArray]:
    """Logarithms of the temperature and of the light of one Msun in Lsun, tabulated once an opacity."""
    logs = np.linspace(np.log(20.0), np.log(HOTTEST_DUST_K), 400)
    return logs, np.log(dust_luminosity_lsun(1.0, np.exp(logs), opacity))


class _LightPerMass:
    """Lsun of one Msun of dust against temperature."""

    def __init__(self, inputs: DustInputs) -> None:
        self._log_t, self._log_l = _light_of(inputs.opacity)

    def __call__(self, temperature_k: FloatArray) -> FloatArray:
        return np.exp(np.interp(np.log(temperature_k), self._log_t, self._log_l))


def _thickness(inputs: DustInputs, bands: BandFluxes, results: _Results) -> Thickness:
    """Least size of the dust against where grains of its temperature are, nominal."""
    t, amount = results.nominal()
    distance = inputs.values["distance_pc"].nominal
    model = dust_flux_jy(amount, bands.wavelength_um, 1.0, t, bands.kappa_cm2_g)
    radius = float(np.max(blackbody_radius_au(model, bands.wavelength_um, 1.0, t))) * distance
    light = sum(inputs.values[key].nominal for key in inputs.light_keys())
    mass = amount * distance**2
    dust_light = float(np.ravel(dust_luminosity_lsun(mass, np.array([t]), inputs.opacity))[0])
    if not light > 0.0:
        return Thickness(radius, None, None, None)
    inputs.used.update((*inputs.light_keys(), "emissivity_index", "grain_radius_um"))
    grains = float(
        condensation_radius_au(
            light, t, inputs.values["emissivity_index"].nominal, inputs.values["grain_radius_um"].nominal
        )
    )
    return Thickness(radius, grains, (radius / grains) ** 2, dust_light / light)


def _crossed_limits(used: Sequence[BandExcess], bands: BandFluxes, results: _Results) -> tuple[str, ...]:
    """Bands whose limit the best dust breaks by more than 3 sigma."""
    t, amount = results.nominal()
    model = dust_flux_jy(amount, bands.wavelength_um, 1.0, t, bands.kappa_cm2_g)
    within = bands.side * (bands.flux_jy - model) / bands.sigma_jy
    return tuple(one.band for one, margin in zip(used, within, strict=True) if margin < -SEEN_SIGMA)


def _veil_slopes(bands: BandFluxes, t: float, amount: float, fitted: bool) -> tuple[float, float]:
    """d ln amount and d ln T per mag of extinction in K, to first order."""
    per_mag = bands.flux_jy * FLUX_ERROR_PER_MAG * extinction_over_k(bands.wavelength_um)
    if fitted:
        slopes = flux_sensitivities(bands, t, amount) @ per_mag
        return float(slopes[0]), float(slopes[1])
    shape = dust_flux_jy(1.0, bands.wavelength_um, 1.0, t, bands.kappa_cm2_g)
    weight = shape * bands.measured / bands.sigma_jy**2
    return float(weight @ per_mag / (weight @ shape) / max(amount, 1e-300)), 0.0


def _upper(inputs: DustInputs, bands: BandFluxes) -> float | None:
    """Mass below which the dust lies at 3 sigma when none is seen, at the stated temperature and distance."""
    if not inputs.has("temperature_k", "distance_pc") or not bands.flux_jy.size:
        return None
    t = inputs.values["temperature_k"].nominal
    return float(upper_amount(bands, t)[0]) * inputs.values["distance_pc"].nominal ** 2


def with_other_opacities(inputs: DustInputs, dust: MeasuredDust, opacity: Opacity) -> MeasuredDust:
    """The dust of one date with the best temperature and mass by each other published opacity beside it.

    Parameters
    ----------
    inputs : DustInputs
        Distance, pc.
    dust : MeasuredDust
        Fitted, Msun and K; anything else comes back as it is.
    opacity : Opacity
        The one that was used, cm^2 per gram of dust.

    Returns
    -------
    MeasuredDust
        With ``other_opacities``, Msun and K.

    Notes
    -----
    Accuracy: best values without errors, to show how much the choice matters. Source: see
    ``campaign.physics.opacity``.
    """
    if dust.mass_msun is None or dust.temperature_origin != "fitted":
        return dust
    used = [one for one in dust.bands if one.fitted]
    square = inputs.values["distance_pc"].nominal ** 2
    found = []
    for table in OPACITIES:
        kept = [one for one in used if reaches(table, one.wavelength_um or 0.0)]
        if table.name == opacity.name or sum(one.use == "measured" for one in kept) < 2:
            continue
        bands = band_fluxes(kept)
        kappa = opacity_cm2_g(table, bands.wavelength_um)
        fit = fit_dust(BandFluxes(bands.wavelength_um, kappa, bands.flux_jy, bands.sigma_jy, bands.side))
        if fit.cut:
            found.append(OtherOpacity(table.name, None, None, fit.chi2))
        else:
            found.append(OtherOpacity(table.name, fit.best_temperature_k, fit.best_amount * square, fit.chi2))
    return replace(dust, other_opacities=tuple(found))
