"""What an image can show: a field of view, a resolution or inner working angle, an outermost radius."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.physics.shellexpectation import ShellsInView, shells_in_view

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Limits:
    """Limits of an image in arcsec: the full width of the field, the smallest and the largest radius told."""

    field_arcsec: float | None
    resolution_arcsec: float | None
    outer_radius_arcsec: float | None

    @property
    def any(self) -> bool:
        """Whether anything limits the view."""
        return (self.field_arcsec, self.resolution_arcsec, self.outer_radius_arcsec) != (None, None, None)

    @property
    def outermost_arcsec(self) -> float | None:
        """The largest radius that is seen; half of the field, since the stars stand in its middle."""
        ends = [
            end
            for end in (
                None if self.field_arcsec is None else 0.5 * self.field_arcsec,
                self.outer_radius_arcsec,
            )
            if end is not None
        ]
        return min(ends) if ends else None

    def show(self, radius_arcsec: Sequence[float]) -> ShellsInView:
        """Which of the shells of these radii are seen, and how many are not."""
        return shells_in_view(
            radius_arcsec,
            field_arcsec=self.field_arcsec,
            resolution_arcsec=self.resolution_arcsec,
            outer_radius_arcsec=self.outer_radius_arcsec,
        )

    def holds_each(self, radius_arcsec: FloatArray) -> BoolArray:
        """Whether shells of drawn radii are seen; NaN, a shell not launched, is never seen."""
        low = 0.0 if self.resolution_arcsec is None else self.resolution_arcsec
        high = np.inf if self.outermost_arcsec is None else self.outermost_arcsec
        with np.errstate(invalid="ignore"):
            inside: BoolArray = (radius_arcsec >= low) & (radius_arcsec <= high)
        return inside

    def in_words(self) -> tuple[str, ...]:
        """What the limits are taken to mean."""
        said = []
        if self.field_arcsec is not None:
            said.append("the stars stand in the middle of the field: a shell fits in to half of its width")
        if self.resolution_arcsec is not None:
            said.append("a shell is resolvable once its radius exceeds the resolution")
        return tuple(said)
