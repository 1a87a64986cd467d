"""Measured radii of shells: what can be, and which errors they share."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class RadiusErrors:
    """Errors of measured radii, one entry a radius.

    ``sigma_arcsec`` is each radius's own error. ``plate_scale_error`` is relative and common to all radii
    of one ``scale_group`` (an image, an instrument). Where ``is_edge``, the outer edge was measured, which
    lies ``edge_offset_arcsec`` outside the peak; the error of that offset is common to all edges.
    """

    sigma_arcsec: FloatArray
    plate_scale_error: FloatArray
    scale_group: IntArray
    is_edge: BoolArray
    edge_offset_arcsec: float = 0.0
    edge_offset_sigma_arcsec: float = 0.0

    @property
    def known(self) -> bool:
        """Whether every radius has an error of its own."""
        return not bool(np.isnan(self.sigma_arcsec).any())

    def peaks(self, radius_arcsec: FloatArray) -> FloatArray:
        """The radii, arcsec, with the offset taken from the edges."""
        return radius_arcsec - np.where(self.is_edge, self.edge_offset_arcsec, 0.0)

    def common_covariance(self, model_arcsec: FloatArray) -> FloatArray:
        """Covariance, arcsec squared, from what radii share, for radii as the model has them.

        The scale multiplies the true radius, so the model's enters: with the measured ones, radii that
        happen to be small would seem the better known.
        """
        same = self.scale_group[:, None] == self.scale_group[None, :]
        scaled = self.plate_scale_error * model_arcsec
        edges = self.is_edge.astype(np.float64) * self.edge_offset_sigma_arcsec
        covariance: FloatArray = np.where(same, np.outer(scaled, scaled), 0.0) + np.outer(edges, edges)
        return covariance

    def only(self, chosen: BoolArray) -> RadiusErrors:
        """The errors of some of the radii."""
        return RadiusErrors(
            self.sigma_arcsec[chosen],
            self.plate_scale_error[chosen],
            self.scale_group[chosen],
            self.is_edge[chosen],
            self.edge_offset_arcsec,
            self.edge_offset_sigma_arcsec,
        )


def radius_errors(
    sigma_arcsec: ArrayLike,
    plate_scale_error: ArrayLike = 0.0,
    scale_group: ArrayLike | None = None,
    is_edge: ArrayLike | None = None,
    edge_offset_arcsec: float = 0.0,
    edge_offset_sigma_arcsec: float = 0.0,
) -> RadiusErrors:
    """Errors of measured radii, filled up to one entry a radius.

    Parameters
    ----------
    sigma_arcsec : array_like, shape (n,)
        One-sigma error of each radius, arcsec, > 0; NaN where it is unknown.
    plate_scale_error : array_like, scalar or shape (n,)
        Relative error of the plate scale (dimensionless), in [0, 1).
    scale_group : array_like of int, shape (n,), optional
        Radii with equal numbers share one plate scale; all share one when not given.
    is_edge : array_like of bool, shape (n,), optional
        Whether the outer edge was measured, not the peak; none when not given.
    edge_offset_arcsec, edge_offset_sigma_arcsec : float
        How far the edge lies outside the peak, and its error, arcsec.

    Returns
    -------
    RadiusErrors
        Arrays of one length; arcsec, the plate scale dimensionless.

    Raises
    ------
    InputRefused
        For an error that is zero, negative or infinite, or a plate scale not known to 100 %.

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> errors = radius_errors([0.03, 0.03], plate_scale_error=0.01)
    >>> float(errors.common_covariance(np.array([1.0, 2.0]))[0, 1].round(6))
    0.0002
    """
    sigma = np.atleast_1d(np.asarray(sigma_arcsec, dtype=np.float64))
    scale = np.broadcast_to(np.asarray(plate_scale_error, dtype=np.float64), sigma.shape).copy()
    group = np.zeros(sigma.shape, np.int64) if scale_group is None else np.asarray(scale_group, np.int64)
    edge = np.zeros(sigma.shape, np.bool_) if is_edge is None else np.asarray(is_edge, np.bool_)
    if bool((sigma <= 0.0).any() or np.isinf(sigma).any()):
        raise InputRefused(
            "The error of a radius is not above zero.",
            why="Every measured radius has an error, and the fit weighs by it.",
            hint='Give a radius such as "1.20±0.05 arcsec".',
            code="radius-error-refused",
        )
    if not bool(((scale >= 0.0) & (scale < 1.0)).all()):
        raise InputRefused(
            "The error of the plate scale is not between 0 and 1.",
            why="It is the relative error of arcsec a pixel, common to all radii of one image.",
            hint="Give 0.01 for one per cent.",
            code="plate-scale-error-refused",
        )
    return RadiusErrors(sigma, scale, group, edge, edge_offset_arcsec, edge_offset_sigma_arcsec)


def check_radii(
    radius_arcsec: ArrayLike, index: ArrayLike | None = None, spacing_arcsec: float | None = None
) -> None:
    """Refuse radii of one image that cannot be.

    Parameters
    ----------
    radius_arcsec : array_like, shape (n,)
        Measured radii, arcsec.
    index : array_like, shape (n,), optional
        Index of each shell (dimensionless): 1 is the youngest visible, so radii grow with it.
    spacing_arcsec : float, optional
        A stated spacing, arcsec.

    Returns
    -------
    None
        No unit.

    Raises
    ------
    InputRefused
        For a radius that is not positive and finite, an index below 1, radii whose order contradicts their
        indices, or a spacing beyond the outermost radius of several.

    Notes
    -----
    Accuracy: exact.

    Source: older shells are larger; common practice, no source.

    Examples
    --------
    >>> check_radii([0.83, 2.27, 3.75], [1, 2, 3])
    """
    radius = np.atleast_1d(np.asarray(radius_arcsec, dtype=np.float64))
    wrong = radius[~(np.isfinite(radius) & (radius > 0.0))]
    if wrong.size:
        raise InputRefused(
            f"A radius of {wrong[0]:g} arcsec cannot be.",
            why="The radius of a shell is a positive, finite angle.",
            hint='Give a radius such as "1.20±0.05 arcsec".',
            code="radius-refused",
            details={"radius_arcsec": float(wrong[0])},
        )
    if index is not None:
        _check_order(radius, np.atleast_1d(np.asarray(index, dtype=np.float64)))
    if spacing_arcsec is not None and radius.size > 1 and spacing_arcsec > radius.max():
        raise InputRefused(
            f"A spacing of {spacing_arcsec:g} arcsec is larger than the outermost radius, "
            f"{radius.max():g} arcsec.",
            why="Of several shells, all but the youngest are at least one spacing out.",
            hint="Check the unit of the spacing and of the radii.",
            code="spacing-refused",
            details={"spacing_arcsec": spacing_arcsec, "outermost_arcsec": float(radius.max())},
        )


def _check_order(radius: FloatArray, index: FloatArray) -> None:
    if bool((index < 1.0).any()):
        raise InputRefused(
            f"A shell cannot have the index {index.min():g}.",
            why="The youngest visible shell has index 1, the next 2, and so on.",
            hint="Count from 1, outwards.",
            code="shell-index-refused",
            details={"index": float(index.min())},
        )
    order = np.lexsort((radius, index))
    for inner, outer in pairwise(order):
        if index[outer] > index[inner] and radius[outer] <= radius[inner]:
            raise InputRefused(
                f"Shell {index[outer]:g} at {radius[outer]:g} arcsec is not outside shell {index[inner]:g} "
                f"at {radius[inner]:g} arcsec.",
                why="Index 1 is the youngest shell, and older ones are larger.",
                hint="Number the shells from the inside out, or leave the indices away.",
                code="shell-order-refused",
                details={"index": float(index[outer]), "radius_arcsec": float(radius[outer])},
            )


def mixed_edges_and_peaks(errors: RadiusErrors) -> bool:
    """Whether edges stand beside peaks with no offset stated between them.

    Parameters
    ----------
    errors : RadiusErrors
        Of the radii, arcsec.

    Returns
    -------
    bool
        Dimensionless.

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> mixed_edges_and_peaks(radius_errors([0.1, 0.1], is_edge=[True, False]))
    True
    """
    stated = errors.edge_offset_arcsec != 0.0 or errors.edge_offset_sigma_arcsec != 0.0
    return bool(errors.is_edge.any() and not errors.is_edge.all() and not stated)
