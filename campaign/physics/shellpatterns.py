"""Ways to count measured shells: which of them may be missing between, and which are two in one."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# Spacings tried, from a third of the smallest step between radii to the whole span.
_SPACINGS = 300
_FINEST = 3.0
_SHIFTS = (-0.3, -0.15, 0.0, 0.15, 0.3)
# Most shells that a pattern may lack: more than that and the spacing says nothing any more.
_MOST_MISSING_SHARE = 1.0


def candidate_patterns(radius_arcsec: FloatArray, stated: FloatArray | None = None) -> FloatArray:
    """Patterns of indices that could explain radii: whole numbers, or one half for two shells in one.

    Parameters
    ----------
    radius_arcsec : ndarray, shape (n,)
        Radii, arcsec, ascending.
    stated : ndarray, shape (n,), optional
        A pattern (dimensionless) to be among them.

    Returns
    -------
    ndarray, shape (m, n)
        Indices (dimensionless), ascending from 1 (from 1.5 where the first is a blend), no two rows alike.

    Notes
    -----
    For every spacing of a fine grid the nearest whole pattern is taken, at several shifts; then, of each, the
    variants with one index too many or too few between two shells, and with one shell halfway between two.
    Accuracy: patterns that put a radius more than half a spacing from its place are left out; they count
    for nothing unless the errors are as large as the spacing.

    Source: project convention.

    Examples
    --------
    >>> rows = candidate_patterns(np.array([0.5, 1.5, 3.5]))
    >>> bool((rows == [1.0, 2.0, 4.0]).all(axis=1).any())
    True
    """
    way = radius_arcsec - radius_arcsec[0]
    count = way.size
    if count == 1:
        return np.ones((1, 1))
    steps = np.maximum(np.diff(radius_arcsec), 1e-6 * radius_arcsec[-1])
    largest = 1.0 + (1.0 + _MOST_MISSING_SHARE) * (count - 1) + 3.0
    finest = max(float(steps.min()) / _FINEST, float(way[-1]) / largest)
    spacings = np.geomspace(finest, 1.5 * max(way[-1], finest), _SPACINGS)
    turns = way[None, :] / spacings[:, None]
    whole = np.vstack([np.round(turns + shift) for shift in _SHIFTS])
    whole = np.vstack([whole - whole[:, :1] + 1.0, np.arange(1.0, count + 1.0)[None, :]])
    if stated is not None:
        whole = np.vstack([whole, stated[None, :] - np.floor(stated[0]) + 1.0])
    whole = _growing(_unlike(whole), 1.0)
    whole = whole[whole[:, -1] <= largest]
    moved = [_growing(changed, 1.0) for changed in _shifted(whole)]
    return _unlike(np.vstack([whole, *moved, *_blended(whole)]))


def pattern_parts(pattern: FloatArray) -> tuple[tuple[int, ...], tuple[tuple[int, int], ...]]:
    """Which indices a pattern leaves out, and which stand blended in one radius.

    Parameters
    ----------
    pattern : ndarray, shape (n,)
        Indices (dimensionless), ascending; halves are blends.

    Returns
    -------
    tuple
        Missing indices, and pairs of blended ones (dimensionless).

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> pattern_parts(np.array([1.0, 2.5, 5.0]))
    ((4,), ((2, 3),))
    """
    halves = pattern % 1.0 > 0.0
    pairs = tuple((int(np.floor(index)), int(np.ceil(index))) for index in pattern[halves])
    seen = {int(index) for index in pattern[~halves]}.union(*pairs) if pairs else {int(i) for i in pattern}
    missing = tuple(index for index in range(1, max(seen) + 1) if index not in seen)
    return missing, pairs


def pattern_meaning(missing: tuple[int, ...], blended: tuple[tuple[int, int], ...]) -> str:
    """What a pattern would mean, in words.

    Parameters
    ----------
    missing : tuple of int
        Missing indices (dimensionless).
    blended : tuple of pairs of int
        Blended indices (dimensionless).

    Returns
    -------
    str
        One phrase; dimensionless.

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> pattern_meaning((4,), ())
    'shell 4 missing'
    """
    parts = []
    if missing:
        names = [str(index) for index in missing]
        listed = names[0] if len(names) == 1 else ", ".join(names[:-1]) + " and " + names[-1]
        parts.append(f"shell{'s' if len(names) > 1 else ''} {listed} missing")
    parts.extend(f"shells {one} and {other} blended" for one, other in blended)
    return ", ".join(parts) if parts else "no shell missing between them"


def _unlike(patterns: FloatArray) -> FloatArray:
    """Each row once. Weights that are no fractions of each other tell rows apart in one number."""
    weights = np.sqrt(np.arange(2.0, patterns.shape[1] + 2.0)) * np.pi
    _, first = np.unique(np.round(patterns @ weights, 6), return_index=True)
    return patterns[first]


def _growing(patterns: FloatArray, step: float) -> FloatArray:
    return patterns[(np.diff(patterns, axis=1) >= step).all(axis=1)]


def _shifted(patterns: FloatArray) -> list[FloatArray]:
    """All shells from one outwards moved by one index."""
    found = []
    for place in range(1, patterns.shape[1]):
        for move in (-1.0, 1.0):
            changed = patterns.copy()
            changed[:, place:] += move
            found.append(changed)
    return found


def _blended(patterns: FloatArray) -> list[FloatArray]:
    """One shell halfway between two indices, which nobody else may then have."""
    found = []
    for place in range(patterns.shape[1]):
        for move in (-0.5, 0.5):
            changed = patterns.copy()
            changed[:, place] += move
            if place == 0 and move < 0.0:
                changed += 1.0  # a blend of the first two begins at 1.5
            before = changed[:, place] - changed[:, place - 1] if place else np.full(len(changed), 2.0)
            after = (
                changed[:, place + 1] - changed[:, place]
                if place + 1 < patterns.shape[1]
                else np.full(len(changed), 2.0)
            )
            found.append(changed[(before >= 1.5) & (after >= 1.5)])
    return found
