"""Simulated images of nested shells: photons of each shell's ridge, gathered and averaged; all invented."""

from __future__ import annotations

import numpy as np

from campaign.physics.shellmotion import MOTION, SPACING
from campaign.physics.shellrelations import ShellInput, solve_shell_relations

RIDGE_WIDTH = 0.25  # spread of a shell's light about its radius, in spacings


class Image:
    """Radii as an observer would measure them in one image of a sky that expands evenly.

    ``launches_yr`` are of all shells, youngest last. A shell's radius is the mean of its photons, whose
    number follows from the error asked for; its error is the ridge's width over the root of the number.
    """

    def __init__(self, rng, at_yr, launches_yr, motion, spacing, relative_error, scale_error=0.0):
        width = RIDGE_WIDTH * spacing
        wanted = (RIDGE_WIDTH / relative_error) ** 2
        radius = motion * (at_yr - np.asarray(launches_yr))
        visible = radius > 0.05 * spacing
        number = np.maximum(rng.poisson(wanted * rng.uniform(0.7, 1.5, radius.size)), 3)
        photons = [rng.normal(true, width, n).mean() for true, n in zip(radius, number, strict=True)]
        order = np.argsort(radius)
        keep = order[visible[order]]
        scale = 1.0 + scale_error * rng.standard_normal()
        self.radius = scale * np.array(photons)[keep]
        self.sigma = (width / np.sqrt(number))[keep]
        self.cycle = keep
        self.truth = at_yr - np.asarray(launches_yr)[keep]
        self.at_yr = at_yr


def share_z(held, share):
    """Deviation of a count of True from its nominal share, in standard deviations."""
    held = np.asarray(held)
    return (held.sum() - share * held.size) / np.sqrt(held.size * share * (1.0 - share))


def period_of(motion, draws=20_000):
    """Period of a fit of several images with its bounds, by the relation of spacing and motion."""
    fit = motion.fit
    inputs = []
    for quantity, name, factor in (
        ("spacing_arcsec", SPACING, 1.0),
        ("proper_motion_mas_yr", MOTION, 1000.0),
    ):
        sigma = factor * fit.sigma(name)
        inputs.append(ShellInput(quantity, factor * fit.value(name), sigma, sigma))
    shared = fit.covariance[fit.names.index(SPACING), fit.names.index(MOTION)]
    correlation = shared / (fit.sigma(SPACING) * fit.sigma(MOTION))
    pair = (inputs[0].quantity, inputs[1].quantity)
    return solve_shell_relations(inputs, {pair: correlation}, draws).get("period_yr").spread
