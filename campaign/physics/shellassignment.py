"""Which shell is which: posterior over patterns of indices, with a stated price for every missing shell."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.shellpatterns import candidate_patterns, pattern_meaning, pattern_parts
from campaign.physics.shellradii import RadiusErrors, check_radii
from campaign.physics.shellvalues import Sided

FloatArray = NDArray[np.float64]

# Prior odds of one shell that is not seen although it is there, and of two that are seen as one.
MISSING_PRIOR = 0.1
BLEND_PRIOR = 0.05
# A blend stands near the middle of its two shells: standard deviation in spacings.
_BLEND_WIDTH = 0.15
_MOST_INSIDE = 12
_SURE = 0.95


@dataclass(frozen=True, slots=True)
class Assignment:
    """One way to count: ``indices`` in the order of the radii given, the innermost 1; halves are blends.

    ``youngest_phase`` is the age of the innermost in periods. ``inside_missing`` younger shells are not
    seen inside it, most probably, with probability ``inside_probability``.
    """

    indices: tuple[float, ...]
    probability: float
    missing: tuple[int, ...]
    blended: tuple[tuple[int, int], ...]
    meaning: str
    spacing_arcsec: float
    youngest_phase: float
    chi2: float
    inside_missing: int
    inside_probability: float


@dataclass(frozen=True, slots=True)
class AssignmentResult:
    """The best way to count, the next ones, and what the radii cannot tell."""

    best: Assignment
    alternatives: tuple[Assignment, ...]
    stated_probability: float | None
    not_told: tuple[str, ...]


def assign_indices(
    radius_arcsec: ArrayLike,
    errors: RadiusErrors,
    missing_prior: float = MISSING_PRIOR,
    blend_prior: float = BLEND_PRIOR,
    spacing_arcsec: Sided | None = None,
    youngest_phase: Sided | None = None,
    inner_limit_arcsec: float = 0.0,
    stated: ArrayLike | None = None,
    keep: int = 4,
) -> AssignmentResult:
    """Assign indices to the shells of one image.

    Parameters
    ----------
    radius_arcsec : array_like, shape (n,)
        One radius a shell, arcsec, in any order.
    errors : RadiusErrors
        Their errors, arcsec, all known.
    missing_prior, blend_prior : float
        Prior odds (dimensionless, in (0, 1)) for each missing shell and each blend. Without a price for
        missing shells a finer spacing would always fit better.
    spacing_arcsec : Sided, optional
        Spacing known from elsewhere (speed, distance and period; motion and period), arcsec.
    youngest_phase : Sided, optional
        Age of the newest shell in periods by the ephemeris (dimensionless).
    inner_limit_arcsec : float
        Radius, arcsec, inside which no shell could have been seen: none is missing there.
    stated : array_like, shape (n,), optional
        Indices as somebody gave them (dimensionless); their probability is told.
    keep : int
        Number of alternatives (dimensionless).

    Returns
    -------
    AssignmentResult
        Probabilities are of patterns, whatever the number of unseen shells inside the innermost; spacings in
        arcsec.

    Raises
    ------
    InputRefused
        If a radius cannot be, an error is unknown, two radii are equal, or a prior is not between 0 and 1.

    Notes
    -----
    The posterior of a pattern is its price times the likelihood with spacing (flat in its logarithm, or as
    stated) and phase integrated out. Accuracy: Gaussian integrals; a few per cent of a probability.

    Source: Bayes' theorem; Jeffreys 1961, Theory of Probability, section 3.1 (scale prior).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> radius = np.array([0.4, 1.4, 2.4, 4.4, 5.4, 6.4])
    >>> result = assign_indices(radius, radius_errors(0.03 + 0 * radius))
    >>> result.best.meaning, result.best.indices
    ('shell 4 missing', (1.0, 2.0, 3.0, 5.0, 6.0, 7.0))
    """
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    check_radii(radius)
    # What has no error cannot be weighed, and says nothing here.
    spacing_arcsec = spacing_arcsec if spacing_arcsec is not None and spacing_arcsec.known else None
    youngest_phase = youngest_phase if youngest_phase is not None and youngest_phase.known else None
    _refuse(errors, radius, missing_prior, blend_prior)
    order = np.argsort(radius)
    back = np.argsort(order)
    peaks = errors.peaks(radius)[order]
    sigma = errors.sigma_arcsec[order]
    scale = float(errors.plate_scale_error.max())
    given = None if stated is None else np.asarray(stated, dtype=np.float64)[order]
    patterns = candidate_patterns(peaks, given)
    judged = _Judged(patterns, peaks, sigma, scale)
    inside = judged.inside(youngest_phase, spacing_arcsec, missing_prior, inner_limit_arcsec)
    log_weight = judged.log_evidence + np.log(np.maximum(inside.sum(axis=1), 1e-300)) + judged.log_spacing
    parts = [pattern_parts(pattern) for pattern in patterns]
    counts = np.array([(len(missing), len(blended)) for missing, blended in parts])
    log_weight = log_weight + counts @ np.log([missing_prior, blend_prior])
    weight = np.exp(log_weight - log_weight.max())
    probability = weight / weight.sum()
    first = np.argsort(-probability, kind="stable")[: keep + 1]
    found = [
        Assignment(
            indices=tuple(float(index) for index in patterns[row][back]),
            probability=float(probability[row]),
            missing=parts[row][0],
            blended=parts[row][1],
            meaning=pattern_meaning(*parts[row]),
            spacing_arcsec=float(judged.spacing[row]),
            youngest_phase=float(judged.phase[row]),
            chi2=float(judged.chi2[row]),
            inside_missing=int(inside[row].argmax()),
            inside_probability=float(inside[row].max() / max(inside[row].sum(), 1e-300)),
        )
        for row in first
    ]
    stated_probability = None
    if given is not None:
        shifted = given - np.floor(given[0]) + 1.0
        stated_probability = float(probability[(patterns == shifted).all(axis=1)].sum())
    return AssignmentResult(
        best=found[0],
        alternatives=tuple(found[1:]),
        stated_probability=stated_probability,
        not_told=_not_told(found[0], radius.size, spacing_arcsec, youngest_phase),
    )


class _Judged:
    """Every pattern fitted at once: R = s (j - 1 + f), with its integrated likelihood."""

    def __init__(self, patterns: FloatArray, radius: FloatArray, sigma: FloatArray, scale: float) -> None:
        turns = patterns - 1.0
        own = np.broadcast_to(sigma, patterns.shape)
        widened = np.where(patterns % 1.0 > 0.0, _BLEND_WIDTH, 0.0)
        self._fit(turns, radius, own)
        wide = np.hypot(own, widened * self.spacing[:, None])
        self._fit(turns, radius, wide)
        # Common scale: adds its square times the products of the values.
        self.var_spacing = self.cov[0] + (scale * self.spacing) ** 2
        self.sigma_phase = np.sqrt(
            np.maximum(self.cov[2] - 2.0 * self.phase * self.cov[1] + self.phase**2 * self.cov[0], 1e-300)
        ) / np.abs(self.spacing)
        normalising = np.log(own / wide).sum(axis=1)
        area = 0.5 * np.log(np.maximum(self.cov[0] * self.cov[2] - self.cov[1] ** 2, 1e-300))
        positive = np.where(self.spacing > 0.0, 0.0, -1e6)
        self.log_evidence = -0.5 * self.chi2 + normalising + area - np.log(np.abs(self.spacing)) + positive
        self.log_spacing = -np.log(np.abs(self.spacing))

    def _fit(self, turns: FloatArray, radius: FloatArray, sigma: FloatArray) -> None:
        weight = sigma**-2.0
        s0, s1, s2 = weight.sum(axis=1), (weight * turns).sum(axis=1), (weight * turns**2).sum(axis=1)
        y0, y1 = (weight * radius).sum(axis=1), (weight * turns * radius).sum(axis=1)
        determinant = s0 * s2 - s1**2
        if turns.shape[1] == 1:  # one shell: its spacing is its radius, for want of anything else
            self.spacing, intercept = np.abs(radius[:1]), radius[:1]
            self.cov = (sigma[:, 0] ** 2, np.zeros(1), sigma[:, 0] ** 2)
            self.phase, self.chi2 = np.ones(1), np.zeros(1)
            return
        self.spacing = (s0 * y1 - s1 * y0) / determinant
        intercept = (s2 * y0 - s1 * y1) / determinant
        self.cov = (s0 / determinant, -s1 / determinant, s2 / determinant)
        self.phase = intercept / self.spacing
        residual = radius - self.spacing[:, None] * turns - intercept[:, None]
        self.chi2 = (weight * residual**2).sum(axis=1)

    def inside(
        self,
        youngest: Sided | None,
        spacing: Sided | None,
        missing_prior: float,
        inner_limit_arcsec: float,
    ) -> FloatArray:
        """Weight of each number of unseen shells inside the innermost, one column a number."""
        from scipy.special import ndtr

        if spacing is not None:
            variance = self.var_spacing + spacing.sigma**2
            self.log_spacing = -0.5 * (self.spacing - spacing.value) ** 2 / variance - 0.5 * np.log(variance)
        numbers = np.arange(_MOST_INSIDE + 1.0)
        phase, sigma = self.phase[:, None], self.sigma_phase[:, None]
        price = missing_prior ** self._could_be_seen(numbers, inner_limit_arcsec)
        if youngest is not None:
            wide = np.hypot(sigma, youngest.sigma)
            apart = (phase - numbers - youngest.value) / wide
            return np.asarray(price * np.exp(-0.5 * apart**2) / wide)
        share = ndtr((numbers + 1.0 - phase) / sigma) - ndtr((numbers - phase) / sigma)
        return np.asarray(price * share)

    def _could_be_seen(self, numbers: FloatArray, inner_limit_arcsec: float) -> FloatArray:
        """How many of the shells inside the innermost lie outside the inner limit."""
        limit = inner_limit_arcsec / np.abs(self.spacing)[:, None]
        # Where the innermost stands if that many are inside it, as near as may be to where it was measured.
        phase = np.clip(self.phase[:, None], numbers, numbers + 1.0 - 1e-9)
        return np.asarray(np.clip(np.floor(phase - limit), 0.0, numbers))


def _not_told(best: Assignment, count: int, spacing: Sided | None, youngest: Sided | None) -> tuple[str, ...]:
    notes = []
    if count == 1:
        notes.append("One shell has no pattern: its index cannot be told.")
    elif count == 2 and spacing is None:
        notes.append(
            "Two shells fit any number of missing ones between them; only the price of missing shells speaks "
            "against it. A period with a motion, or a third shell, would tell."
        )
    elif spacing is None:
        notes.append(
            "A finer spacing with shells missing in every step would fit as well; only the price of missing "
            "shells, not the radii, speaks against it. A period with a motion or a speed would tell."
        )
    if youngest is None:
        if best.inside_probability < _SURE:
            notes.append(
                "Whether a younger shell is missing inside the innermost cannot be told from the intercept; "
                "an ephemeris or a speed would tell."
            )
        elif best.inside_missing > 0:
            notes.append(
                f"The intercept puts {best.inside_missing} younger shell"
                f"{'s' if best.inside_missing > 1 else ''} inside the innermost that nobody saw; an "
                "ephemeris or a speed would confirm it."
            )
        else:
            notes.append(
                "That no younger shell is missing inside the innermost rests on the intercept alone, for a "
                "constant speed; no ephemeris confirms it."
            )
    elif best.inside_probability < _SURE:
        notes.append("The ephemeris does not tell whether a younger shell is missing inside the innermost.")
    notes.append("Whether older shells are missing outside the outermost cannot be told from the radii.")
    return tuple(notes)


def _refuse(errors: RadiusErrors, radius: FloatArray, missing_prior: float, blend_prior: float) -> None:
    if not errors.known:
        raise InputRefused(
            "Shells cannot be counted without the errors of their radii.",
            why="Whether a gap is one step or two depends on the errors.",
            hint='Give each radius with its error, such as "1.20±0.05 arcsec".',
            code="error-unknown",
        )
    if np.unique(radius).size < radius.size:
        raise InputRefused(
            "Two shells of one image have the same radius.",
            why="Each radius is counted as a shell of its own.",
            hint="Give one radius a shell, or the indices.",
            code="shell-order-refused",
        )
    for prior in (missing_prior, blend_prior):
        if not 0.0 < prior < 1.0:
            raise InputRefused(
                f"A prior of {prior:g} for a missing or blended shell is not between 0 and 1.",
                why="Without a price for missing shells the finest spacing always fits best.",
                hint="Give a prior such as 0.1.",
                code="prior-refused",
            )
