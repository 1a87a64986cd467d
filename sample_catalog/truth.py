"""The truth behind the sample: elements, every episode, star levels, offsets between sources.

``truth.json`` beside this file is the truth of the default seed. To write it again after a change of
the systems, call ``write_truth`` from a Python session that has loaded the package, for example::

    from campaign.studies.sample import sample_package
    sample_package().write_truth("sample_catalog/truth.json")
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from .instants import DAYS_PER_YEAR, SAMPLE_AS_OF, year_to_bmjd
from .spec import DustSpec, SystemSpec
from .stations import SERIES
from .systems import SYSTEMS

DEFAULT_SEED = 7

_GM_SUN_KM3_S2 = 1.3271244e11
_AU_KM = 149_597_870.7
_DAY_S = 86_400.0
_FIRST_YR, _LAST_YR = 1985.0, 2048.0
_FIRST_SHELL_YR = 1950.0


@dataclass(frozen=True, slots=True)
class TrueElements:
    """True orbit and stars. ``periastron_bmjd_tdb`` is that of cycle 0; omega is of star B."""

    period_d: float
    periastron_bmjd_tdb: float
    eccentricity: float
    omega_b_deg: float
    inclination_deg: float
    node_deg: float
    gamma_kms: float
    mass_a_msun: float
    mass_b_msun: float
    a_au: float
    a_arcsec: float
    k_a_kms: float
    k_b_kms: float
    distance_pc: float


@dataclass(frozen=True, slots=True)
class TrueCycle:
    """What truly happens in one cycle; the three stages are None when it passes without dust."""

    cycle: int
    periastron_bmjd_tdb: float
    onset_bmjd_tdb: float | None
    maximum_bmjd_tdb: float | None
    end_bmjd_tdb: float | None


@dataclass(frozen=True, slots=True)
class SystemTruth:
    """Everything true of one system, and why it is in the sample."""

    system_id: int
    name: str
    story: str
    cases: tuple[str, ...]
    elements: TrueElements
    critical_separation_au: float | None
    cycles: tuple[TrueCycle, ...]
    star_mag: Mapping[str, float]
    rise: str
    contrast_k: float
    decay_k_d: float
    dust_speed_kms: float | None

    def cycle(self, number: int) -> TrueCycle:
        """The cycle of this number."""
        return self.cycles[number - self.cycles[0].cycle]


@dataclass(frozen=True, slots=True)
class CampaignTruth:
    """The truth of every system and the offset of each source in each band, in mag."""

    seed: int
    systems: tuple[SystemTruth, ...]
    source_offsets_mag: Mapping[str, Mapping[str, float]]

    def of(self, name: str) -> SystemTruth:
        """The truth of the system of this name."""
        return next(truth for truth in self.systems if truth.name == name)


def draw_truth(seed: int) -> CampaignTruth:
    """Draw the truth of all systems; the dates that the cases need do not depend on the seed."""
    offsets = np.random.default_rng([seed, 99]).normal(0.0, 0.03, (len(SERIES), 5))
    return CampaignTruth(
        seed,
        tuple(_draw_system(seed, index, spec) for index, spec in enumerate(SYSTEMS)),
        {
            series.source: {band: float(offsets[row, "JHKLM".index(band)]) for band in series.bands}
            for row, series in enumerate(SERIES)
        },
    )


def _draw_system(seed: int, index: int, spec: SystemSpec) -> SystemTruth:
    rng = np.random.default_rng([seed, index, 0])
    elements, stretch = _draw_elements(rng, spec)
    critical = spec.dust.critical_separation_au * stretch or None
    jk, hk, kl, km = spec.colours
    k = spec.k_mag + 0.05 * float(rng.normal())
    return SystemTruth(
        system_id=index + 1,
        name=spec.name,
        story=spec.story,
        cases=spec.cases,
        elements=elements,
        critical_separation_au=critical,
        cycles=_draw_cycles(rng, spec, elements, critical),
        star_mag={"J": k + jk, "H": k + hk, "K": k, "L": k - kl, "M": k - km},
        rise=spec.dust.rise,
        contrast_k=spec.dust.contrast_k if spec.dust.kind != "none" else 0.0,
        decay_k_d=spec.dust.decay_k_d,
        dust_speed_kms=spec.dust_speed_kms or None,
    )


def _draw_elements(rng: np.random.Generator, spec: SystemSpec) -> tuple[TrueElements, float]:
    """Jitter the described elements; also by what factor the orbit came out larger than described."""
    z = np.clip(rng.normal(size=7), -2.0, 2.0).tolist()
    mass_a, mass_b = spec.star_a.mass_msun * (1.0 + 0.03 * z[0]), spec.star_b.mass_msun * (1.0 + 0.03 * z[1])
    period_d = spec.period_yr * DAYS_PER_YEAR * (1.0 + 0.0015 * z[2])
    omega_b_deg = (spec.omega_b_deg + 6.0 * z[3]) % 360.0
    inclination_deg = spec.inclination_deg + 2.0 * z[4]
    a_au = _semi_major_axis_au(period_d, mass_a + mass_b)
    described = _semi_major_axis_au(
        spec.period_yr * DAYS_PER_YEAR, spec.star_a.mass_msun + spec.star_b.mass_msun
    )
    swing_kms = (
        2.0 * math.pi * a_au * _AU_KM * math.sin(math.radians(inclination_deg))
        / (period_d * _DAY_S * math.sqrt(1.0 - spec.eccentricity**2))
    )  # fmt: skip
    elements = TrueElements(
        period_d=period_d,
        periastron_bmjd_tdb=spec.reference_bmjd_tdb - spec.reference_cycle * period_d,
        eccentricity=spec.eccentricity,
        omega_b_deg=omega_b_deg,
        inclination_deg=inclination_deg,
        node_deg=(spec.node_deg + 4.0 * z[5]) % 360.0,
        gamma_kms=spec.gamma_kms + 2.0 * z[6],
        mass_a_msun=mass_a,
        mass_b_msun=mass_b,
        a_au=a_au,
        a_arcsec=a_au / spec.distance_pc,
        k_a_kms=swing_kms * mass_b / (mass_a + mass_b),
        k_b_kms=swing_kms * mass_a / (mass_a + mass_b),
        distance_pc=spec.distance_pc,
    )
    return elements, a_au / described


def _semi_major_axis_au(period_d: float, mass_msun: float) -> float:
    """Kepler's third law."""
    return float(np.cbrt(_GM_SUN_KM3_S2 * mass_msun * (period_d * _DAY_S / (2.0 * math.pi)) ** 2) / _AU_KM)


def _draw_cycles(
    rng: np.random.Generator, spec: SystemSpec, elements: TrueElements, critical_au: float | None
) -> tuple[TrueCycle, ...]:
    first_yr = _FIRST_SHELL_YR if spec.shell_epochs_yr else _FIRST_YR
    start, period = elements.periastron_bmjd_tdb, elements.period_d
    first = math.ceil((year_to_bmjd(first_yr) - start) / period)
    last = max(math.floor((year_to_bmjd(_LAST_YR) - start) / period), 1)
    scatter = np.clip(rng.normal(size=(last - first + 1, 4)), -2.5, 2.5).tolist()
    return tuple(
        _make_cycle(spec.dust, elements, critical_au, number, scatter[number - first])
        for number in range(first, last + 1)
    )


def _make_cycle(
    dust: DustSpec, elements: TrueElements, critical_au: float | None, number: int, z: list[float]
) -> TrueCycle:
    periastron = elements.periastron_bmjd_tdb + number * elements.period_d
    offsets = _offsets_d(dust, elements, critical_au, z[3])
    if offsets is None:
        return TrueCycle(number, periastron, None, None, None)
    shift = dust.onset_shift_d.get(number, z[0] * dust.scatter_onset_d)
    onset = periastron + offsets[0] + shift
    maximum = max(periastron + offsets[1] + z[1] * dust.scatter_maximum_d, onset + 4.0)
    end = max(periastron + offsets[2] + z[2] * dust.scatter_end_d, maximum + 4.0)
    return TrueCycle(number, periastron, onset, maximum, end)


def _offsets_d(
    dust: DustSpec, elements: TrueElements, critical_au: float | None, z: float
) -> tuple[float, float, float] | None:
    if dust.kind == "none":
        return None
    if critical_au is None:
        unit = elements.period_d if dust.kind == "phase" else 1.0
        return dust.onset * unit, dust.maximum * unit, dust.end * unit
    half = _half_window_d(elements, critical_au + z * dust.critical_scatter_au)
    if half is None:
        return None
    delay = dust.condensation_distance_au * _AU_KM / dust.flow_speed_kms / _DAY_S
    return delay - half, delay, delay + half


def _half_window_d(elements: TrueElements, critical_au: float) -> float | None:
    """Time from periastron until the separation passes a critical one; None when it never gets so small."""
    cosine = (1.0 - critical_au / elements.a_au) / elements.eccentricity
    if cosine >= 1.0:
        return None
    anomaly = math.acos(max(cosine, -1.0))
    return elements.period_d / (2.0 * math.pi) * (anomaly - elements.eccentricity * math.sin(anomaly))


def truth_document(truth: CampaignTruth) -> dict[str, Any]:
    """The truth as plain lists, dictionaries and numbers, as it stands in ``truth.json``."""
    systems = []
    for one in truth.systems:
        plain = asdict(one)
        plain["cases"] = list(one.cases)
        # One short row a cycle: cycle, periastron, onset, maximum, end.
        plain["cycles"] = [
            [c.cycle, c.periastron_bmjd_tdb, c.onset_bmjd_tdb, c.maximum_bmjd_tdb, c.end_bmjd_tdb]
            for c in one.cycles
        ]
        systems.append(plain)
    return {
        "note": "Invented. Times are MJD (TDB, barycentre); a row of cycles is cycle, periastron, onset, "
        "maximum, end of dust production; omega is of star B.",
        "as_of": SAMPLE_AS_OF,
        "seed": truth.seed,
        "source_offsets_mag": {source: dict(bands) for source, bands in truth.source_offsets_mag.items()},
        "systems": systems,
    }


def write_truth(path: str | Path, seed: int = DEFAULT_SEED) -> None:
    """Write the truth of a seed as JSON; with the default seed and the right path, ``truth.json`` again."""
    text = json.dumps(truth_document(draw_truth(seed)), indent=1)
    # Rows of numbers on one line each keep the file small and a change readable.
    Path(path).write_text(_short_rows(text) + "\n", encoding="utf-8")


def _short_rows(text: str) -> str:
    lines: list[str] = []
    inside = False
    for line in text.splitlines():
        bare = line.strip()
        if inside:
            lines[-1] += bare + (" " if bare.endswith(",") else "")
            inside = not bare.startswith("]")
        else:
            lines.append(line)
            inside = bare == "["
    return "\n".join(lines)
