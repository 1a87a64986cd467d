"""How fast the shells of a system grow on the sky, from the best that is known of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shells import ShellQuantityName
from campaign.physics.constants import KMS_PER_AU_YR
from campaign.physics.draws import stratified_normals, two_piece_within
from campaign.studies.rows import distance_of

FloatArray = NDArray[np.float64]

FLOW = "flow speed of the dust rule"
WIND = "terminal wind of star A, which dust need not share"


@dataclass(frozen=True, slots=True)
class Expansion:
    """Motion of a shell's radius on the sky, mas/yr.

    ``missing`` names the errors that nobody knows; they count as zero in ``draws_mas_yr``, which then give no
    interval.
    """

    value_mas_yr: float
    draws_mas_yr: FloatArray
    origin: str
    missing: tuple[str, ...] = ()

    @property
    def sigma_mas_yr(self) -> float | None:
        """Standard deviation; None where an error is unknown."""
        return None if self.missing else float(np.std(self.draws_mas_yr))


def expansion_of(
    record: SystemRecord,
    stated: Mapping[ShellQuantityName, Measured],
    measured: tuple[Measured, str] | None,
    draws: int,
    seed: int,
) -> Expansion | None:
    """The motion of a system's shells from what is stated, measured, or known of its flow.

    Parameters
    ----------
    record : SystemRecord
        For distance, dust rule and winds.
    stated : mapping
        Typed motion (mas/yr), speed (km/s) or distance (pc): these come first.
    measured : (Measured, str) or None
        Motion fitted to logged radii, mas/yr, and what it is from.
    draws, seed : int
        Of the random draws (dimensionless).

    Returns
    -------
    Expansion or None
        None where nothing gives a motion: no logged shells that tell it, and no speed or no distance.

    Notes
    -----
    In this order: the motion typed; a speed typed, with the distance; the motion of logged shells; the flow
    speed of the dust rule; the terminal wind of star A.
    Accuracy: draws of two-piece normals, with the deviates that the forecast uses for the same quantities.

    Source: mu = v / (4.740470464 D).
    """
    motion = stated.get("proper_motion_mas_yr")
    if motion is not None:
        return _direct(motion, "motion stated", draws, seed)
    distance, own = stated.get("distance_pc"), "distance stated"
    if distance is None:
        distance, own = distance_of(record), "distance in the catalogue"
    speed = stated.get("speed_kms")
    if speed is not None:
        return _quotient(speed, "speed_kms", "speed stated", distance, own, draws, seed)
    if measured is not None:
        return _direct(measured[0], measured[1], draws, seed)
    rule = record.rule
    if rule is not None and rule.flow_speed_kms is not None:
        found = _quotient(rule.flow_speed_kms, "flow_speed_kms", FLOW, distance, own, draws, seed)
        if found is not None:
            return found
    wind = record.system.star_a.wind_speed_kms
    return None if wind is None else _quotient(wind, "wind_speed_kms", WIND, distance, own, draws, seed)


def _direct(motion: Measured, origin: str, draws: int, seed: int) -> Expansion:
    drawn = _drawn("proper_motion_mas_yr", motion, draws, seed)
    return Expansion(motion.value, drawn, origin, () if motion.error_known else ("motion of the shells",))


def _quotient(
    speed: Measured, name: str, origin: str, distance: Measured | None, own: str, draws: int, seed: int
) -> Expansion | None:
    if distance is None:
        return None
    scale = 1000.0 / KMS_PER_AU_YR
    drawn = scale * _drawn(name, speed, draws, seed) / _drawn("distance_pc", distance, draws, seed)
    missing = [word for word, each in (("speed", speed), ("distance", distance)) if not each.error_known]
    value = scale * speed.value / distance.value
    return Expansion(value, drawn, f"{origin}, and the {own}", tuple(missing))


def _drawn(name: str, value: Measured, draws: int, seed: int) -> FloatArray:
    drawn: FloatArray = two_piece_within(
        np.array([[value.value]]),
        np.array([[value.minus or 0.0]]),
        np.array([[value.plus or 0.0]]),
        _normals(name, draws, seed)[None, :],
        low=float(np.finfo(np.float64).tiny),
    )[0]
    return drawn


@lru_cache(maxsize=16)
def _normals(name: str, draws: int, seed: int) -> FloatArray:
    return stratified_normals([name], draws, seed)[name]
