"""Catalogue, log and forecaster for binaries that make dust in bursts."""

__version__ = "0.1.0"
