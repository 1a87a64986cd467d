"""Temperatures of dust from pairs of bands."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from campaign.model.dust import BandExcess, PairColour
from campaign.model.measured import Measured
from campaign.physics.draws import stratified_normals
from campaign.physics.dustmass import colour_temperature_k
from campaign.physics.photometry import extinction_over_k
from campaign.studies.dust_inputs import VEIL
from campaign.studies.propagation import Uncertain, summarised

FloatArray = NDArray[np.float64]

_PAIR_DRAWS = 2000


def pair_colours(
    seen: Sequence[BandExcess], veil: Uncertain | None, draws: int, seed: int
) -> tuple[PairColour, ...]:
    """Colour temperatures of all pairs of bands that show dust, from shorter to longer waves.

    Parameters
    ----------
    seen : sequence of BandExcess
        Fluxes in Jy, wavelengths in um, opacities in cm^2 per gram of dust.
    veil : Uncertain or None
        Interstellar extinction in K, mag; its error moves both bands of a pair together.
    draws, seed : int
        Of the random draws (dimensionless).

    Returns
    -------
    tuple of PairColour
        Temperatures in K; none of bands nearer than 5 % in wavelength.

    Notes
    -----
    Accuracy: one temperature, optically thin; errors from at most 2000 draws.

    Source: see ``campaign.physics.dustmass``.
    """
    count = min(draws, _PAIR_DRAWS)
    reddening = np.zeros(count)
    if veil is not None and isinstance(veil.value, Measured):
        reddening = (veil.value.sigma or 0.0) * stratified_normals([VEIL], count, seed)[VEIL]
    found = []
    for first, second in combinations(seen, 2):
        assert first.wavelength_um is not None
        assert second.wavelength_um is not None
        if second.wavelength_um < 1.05 * first.wavelength_um:
            continue
        stated = np.array([_ratio(first, second)])
        assert first.kappa_cm2_g is not None
        assert second.kappa_cm2_g is not None
        pair = (first.wavelength_um, second.wavelength_um, first.kappa_cm2_g / second.kappa_cm2_g)
        value = float(colour_temperature_k(stated, *pair)[0])
        name = f"{band_name(first, seen)}/{band_name(second, seen)}"
        normals = stratified_normals([f"{name} one", f"{name} two"], count, seed)
        ratios = _drawn(first, normals[f"{name} one"]) / _drawn(second, normals[f"{name} two"])
        share = extinction_over_k([first.wavelength_um, second.wavelength_um])
        ratios = ratios * 10.0 ** (0.4 * float(share[0] - share[1]) * reddening)
        t = summarised(colour_temperature_k(ratios, *pair), value if np.isfinite(value) else None)
        reason = "" if np.isfinite(value) else "bluer than any temperature: not dust of this opacity"
        names = band_name(first, seen), band_name(second, seen)
        found.append(PairColour(*names, t if np.isfinite(value) else None, reason))
    return tuple(found)


def band_name(one: BandExcess, among: Sequence[BandExcess]) -> str:
    """The band, with its photometric system where two systems of that band stand side by side.

    Parameters
    ----------
    one : BandExcess
        The band.
    among : sequence of BandExcess
        All of them (no unit).

    Returns
    -------
    str
        For people.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    if sum(other.band == one.band for other in among) < 2:
        return one.band
    return f"{one.band} ({one.photometric_system or 'no system'})"


def _ratio(first: BandExcess, second: BandExcess) -> float:
    assert first.dust_jy is not None
    assert second.dust_jy is not None
    return first.dust_jy / second.dust_jy


def _drawn(one: BandExcess, normals: FloatArray) -> FloatArray:
    assert one.dust_jy is not None
    assert one.sigma_jy is not None
    return np.asarray(one.dust_jy + one.sigma_jy * normals)
