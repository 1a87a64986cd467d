"""Dated and expected shells as JSON documents for programs."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from campaign.model.shells import (
    SHELL_QUANTITIES,
    DatedShell,
    ShellDatingResult,
    ShellExpectation,
    ShellQuantity,
    ShellTension,
)
from campaign.output.documents import document, plain


def dating_json(result: ShellDatingResult) -> str:
    """The whole document ``campaign/shells-date/1``."""
    return document("shells-date", dating_data(result), as_of=result.as_of_utc, warnings=result.warnings)


def dating_data(result: ShellDatingResult) -> dict[str, Any]:
    """What stands under ``data``: five quantities by name, null where one does not follow, and the rest."""
    return {
        "system": result.system,
        **_quantities(result.quantities),
        "shells": [_shell(shell) for shell in result.shells],
        "tensions": [_tension(tension) for tension in result.tensions],
        "span_yr": result.span_yr,
        "span_sigma_yr": result.span_sigma_yr,
        "phase_of_youngest": result.phase_of_youngest,
        "phase_of_youngest_sigma": result.phase_of_youngest_sigma,
        "chi2": result.chi2,
        "degrees_of_freedom": result.degrees_of_freedom,
        "error_scale": result.error_scale,
        "assignments": plain(result.assignments),
        "motions": plain(result.motions),
        "acceleration": plain(result.acceleration),
        "foreseen": plain(result.foreseen),
        "not_told": list(result.not_told),
        "assumptions": list(result.assumptions),
    }


def expectation_json(result: ShellExpectation) -> str:
    """The whole document ``campaign/shells-expect/1``."""
    data = {
        "system": result.system,
        "field_arcsec": result.field_arcsec,
        "resolution_arcsec": result.resolution_arcsec,
        "outer_radius_arcsec": result.outer_radius_arcsec,
        **_quantities(result.quantities),
        "views": plain(result.views),
        "resolvable": plain(result.resolvable),
        "coming": plain(result.coming),
        "assumptions": list(result.assumptions),
    }
    return document("shells-expect", data, as_of=result.as_of_utc, warnings=result.warnings)


def _quantities(quantities: Sequence[ShellQuantity]) -> dict[str, Any]:
    known = {each.name: each for each in quantities}
    return {name: _quantity(known.get(name)) for name in SHELL_QUANTITIES}


def _quantity(quantity: ShellQuantity | None) -> dict[str, Any] | None:
    if quantity is None:
        return None
    found = plain(quantity)
    assert isinstance(found, dict)
    del found["name"]
    return found


def _shell(shell: DatedShell) -> dict[str, Any]:
    found = plain(shell)
    assert isinstance(found, dict)
    return found


def _tension(tension: ShellTension) -> dict[str, Any]:
    """``from`` is no name that a field can have."""
    found = plain(tension)
    assert isinstance(found, dict)
    return {("from" if name == "determined_from" else name): value for name, value in found.items()}
