"""Observations of every kind, as logged."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from campaign.model.instants import Moment
from campaign.model.measured import Measured

ObservationKind = Literal["photometry", "flux", "velocity", "line", "position", "shell", "attempt", "remark"]
OBSERVATION_KINDS: tuple[ObservationKind, ...] = (
    "photometry", "flux", "velocity", "line", "position", "shell", "attempt", "remark",
)  # fmt: skip
# What a limit says of the value in its own unit: a magnitude limit "above" is too faint to see,
# "below" is brighter than the limit (saturated).
LimitSide = Literal["above", "below"]
Quality = Literal["good", "doubtful", "bad"]


@dataclass(frozen=True, slots=True)
class Observation:
    """One observation. ``value`` is in ``unit``; for a limit it is the bound with no error.

    ``photometry``: mag. ``flux``: jy. ``velocity``: kms of ``star``. ``line``: equivalent width in
    angstrom, negative in emission. ``position``: separation in mas, with ``position_angle_deg``.
    ``shell``: radius in arcsec. ``attempt`` and ``remark`` carry ``text`` only.
    """

    id: int
    uid: str
    system_id: int
    kind: ObservationKind
    moment: Moment
    value: Measured | None = None
    unit: str | None = None
    limit_side: LimitSide | None = None
    limit_sigma: float | None = None
    band: str | None = None
    photometric_system: str | None = None
    frequency_ghz: float | None = None
    energy_low_kev: float | None = None
    energy_high_kev: float | None = None
    star: str | None = None
    species: str | None = None
    position_angle_deg: Measured | None = None
    correlation: float | None = None
    feature: str | None = None
    measured_at: Literal["edge", "peak"] | None = None
    plate_scale_error: float | None = None
    shell_index: int | None = None
    site_id: int | None = None
    site: str | None = None
    observer: str | None = None
    instrument: str | None = None
    comparison_star: str | None = None
    source: str | None = None
    quality: Quality = "good"
    text: str = ""
