"""Least squares for radii of shells: full covariance, shared errors told apart, never rescaled unasked."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.shellradii import RadiusErrors

FloatArray = NDArray[np.float64]
_ROUNDS = 3  # the common errors follow the model's radii, which settle at once


@dataclass(frozen=True, slots=True, eq=False)
class ShellFit:
    """A fit that is linear in its parameters: values, covariance, and how well it holds.

    ``covariance`` comes from the stated errors. ``common_covariance`` is that part of it that stems from
    errors which radii share, and from stated periods and motions. ``residual_sigma`` is measured minus
    fitted in errors of each radius. ``error_scale`` is None unless the errors were scaled. All covariances
    are NaN where an error is unknown; the fit was then unweighted.
    """

    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    common_covariance: FloatArray
    fitted_arcsec: FloatArray
    residual_sigma: FloatArray
    chi2: float
    degrees_of_freedom: int
    error_scale: float | None = None

    def value(self, name: str) -> float:
        """Value of one parameter."""
        return float(self.values[self.names.index(name)])

    def sigma(self, name: str) -> float:
        """Standard deviation of one parameter."""
        place = self.names.index(name)
        return float(np.sqrt(self.covariance[place, place]))

    def combination(self, rows: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Linear combinations of the parameters, one a row: values and their covariance."""
        return rows @ self.values, rows @ self.covariance @ rows.T


@dataclass(frozen=True, slots=True, eq=False)
class Stated:
    """Knowledge from elsewhere as further equations: ``rows @ parameters = values ± sigmas``."""

    rows: FloatArray
    values: FloatArray
    sigmas: FloatArray


def least_squares(
    names: tuple[str, ...],
    design: FloatArray,
    radius_arcsec: FloatArray,
    errors: RadiusErrors,
    stated: Stated | None = None,
) -> ShellFit:
    """Fit radii that are linear in the parameters.

    Parameters
    ----------
    names : tuple of str, length p
        Names of the parameters, each with its unit (arcsec, arcsec/yr).
    design : ndarray, shape (n, p)
        Derivative of each radius by each parameter.
    radius_arcsec : ndarray, shape (n,)
        Measured radii, arcsec; edges are moved to their peaks.
    errors : RadiusErrors
        Their errors, arcsec.
    stated : Stated, optional
        Equations from elsewhere, each with its own error.

    Returns
    -------
    ShellFit
        Values in the units of ``names``; covariances in their products; chi2 dimensionless.

    Raises
    ------
    InputRefused
        If the radii do not fix all parameters.

    Notes
    -----
    Accuracy: rounding, by orthogonal decomposition. The covariance is (X^T W X)^-1 of the errors as stated.

    Source: Aitken 1935, Proc. R. Soc. Edinburgh 55, 42 (generalised least squares).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> errors = radius_errors([1.0, 1.0])
    >>> fit = least_squares(("mean_arcsec",), np.ones((2, 1)), np.array([1.0, 3.0]), errors)
    >>> fit.value("mean_arcsec").__round__(9), round(fit.sigma("mean_arcsec") ** 2, 9)
    (2.0, 0.5)
    """
    radii = errors.peaks(radius_arcsec)
    count = radii.size
    rows, data = design, radii
    extra = np.zeros(0)
    if stated is not None:
        rows = np.vstack([design, stated.rows])
        data = np.concatenate([radii, stated.values])
        extra = stated.sigmas**2
    own = np.ones(count) if not errors.known else errors.sigma_arcsec**2
    common = np.zeros((data.size, data.size))
    common[count:, count:] = np.diag(extra)
    random = np.diag(np.concatenate([own, np.zeros(extra.size)]))
    values, gain, whitened = _solve(rows, data, random + common, names)
    if errors.known and (errors.plate_scale_error.any() or errors.edge_offset_sigma_arcsec > 0.0):
        for _ in range(_ROUNDS):
            common[:count, :count] = errors.common_covariance(design @ values)
            values, gain, whitened = _solve(rows, data, random + common, names)
    fitted = design @ values
    covariance = gain @ (random + common) @ gain.T
    shared = gain @ common @ gain.T
    residual = (radii - fitted) / np.sqrt(own)
    chi2 = float(whitened @ whitened)
    if not errors.known:
        covariance, shared, residual = covariance * np.nan, shared * np.nan, residual * np.nan
        chi2 = float("nan")
    return ShellFit(names, values, covariance, shared, fitted, residual, chi2, int(data.size - len(names)))


def _solve(
    rows: FloatArray, data: FloatArray, covariance: FloatArray, names: tuple[str, ...]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Values, the linear map from data to them, and the residuals in uncorrelated units."""
    root = np.linalg.cholesky(covariance)
    whitening = np.linalg.inv(root)
    q, r = np.linalg.qr(whitening @ rows)
    diagonal = np.abs(np.diag(r))
    if rows.shape[0] < rows.shape[1] or diagonal.min() <= 1e-11 * np.linalg.norm(r):
        raise InputRefused(
            "The radii do not fix " + " and ".join(name.rsplit("_arcsec", 1)[0] for name in names) + ".",
            why="There are fewer independent radii than quantities to find.",
            hint="Add a shell, an epoch, a period, or a proper motion.",
            code="shells-too-few",
            details={"wanted": list(names)},
        )
    gain = np.linalg.solve(r, q.T) @ whitening
    values = gain @ data
    return values, gain, whitening @ (data - rows @ values)


def with_scaled_errors(fit: ShellFit) -> ShellFit:
    """The same fit with the radii's own errors scaled so that chi2 equals its degrees of freedom.

    Only for errors that are known up to a common factor: it hides whatever else makes chi2 large or small.
    What radii share, and what was stated, keeps its error.

    Parameters
    ----------
    fit : ShellFit
        With errors as stated; arcsec.

    Returns
    -------
    ShellFit
        ``error_scale`` (dimensionless) is the factor on the radii's errors; values are unchanged.

    Raises
    ------
    InputRefused
        Without degrees of freedom or with unknown errors: nothing says then how large errors are.

    Notes
    -----
    Accuracy: the factor itself is uncertain by 1/sqrt(2 dof).

    Source: Bevington & Robinson 2003, section 6.4 (memory).

    Examples
    --------
    >>> from campaign.physics.shellradii import radius_errors
    >>> errors = radius_errors([1.0, 1.0])
    >>> fit = least_squares(("mean_arcsec",), np.ones((2, 1)), np.array([1.0, 3.0]), errors)
    >>> with_scaled_errors(fit).error_scale.__round__(6)
    1.414214
    """
    if fit.degrees_of_freedom < 1 or not np.isfinite(fit.chi2) or fit.chi2 == 0.0:
        raise InputRefused(
            "The errors cannot be scaled.",
            why="There are no more radii than quantities found, so nothing says how large the errors are.",
            hint="Leave the errors as they are stated, or add radii.",
            code="nothing-to-scale-by",
        )
    factor = float(np.sqrt(fit.chi2 / fit.degrees_of_freedom))
    own = fit.covariance - fit.common_covariance
    return replace(
        fit,
        covariance=own * factor**2 + fit.common_covariance,
        residual_sigma=fit.residual_sigma / factor,
        error_scale=factor * (fit.error_scale or 1.0),
        chi2=float(fit.degrees_of_freedom),
    )
