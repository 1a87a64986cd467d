"""What ``log`` did: the instant as understood, the entries, and what the catalogue now knows."""

from __future__ import annotations

from campaign.model.measured import Limit
from campaign.model.observations import Observation
from campaign.model.shown import Logged
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.values import number

_UNITS = {"kms": "km/s", "jy": "Jy", "angstrom": "Å", "erg/s/cm2": "erg/s/cm2"}


def render_logged(screen: Screen, logged: Logged) -> None:
    """Echo one ``log``."""
    for entry in logged.entries:
        said = "already logged" if entry.already_logged else "logged"
        screen.wrapped(f"{said} as {entry.id}: {logged.system}, {_observed(entry.observation)}", hang=2)
    place = f" at {logged.site}" if logged.site else ""
    screen.wrapped(f"instant: {logged.understood}{place}", hang=2)
    screen.wrapped(f"kept as: {logged.moment_text}", hang=2)
    for line in logged.knowledge:
        screen.wrapped(line, hang=2)


def _observed(observation: Observation) -> str:
    value = observation.value
    unit = _UNITS.get(observation.unit or "", observation.unit or "")
    if value is not None and observation.limit_side is not None:
        told = number(Limit(value.value, observation.limit_side), unit)
    else:
        told = number(value, unit)
    if observation.kind == "position" and observation.position_angle_deg is not None:
        told += f" at {number(observation.position_angle_deg, 'deg')}"
    about = [
        observation.band or "",
        f"{observation.frequency_ghz:g} GHz" if observation.frequency_ghz is not None else "",
        f"{observation.energy_low_kev:g}..{observation.energy_high_kev:g} keV"
        if observation.energy_low_kev is not None
        else "",
        f"star {observation.star}" if observation.star else "",
        observation.species or "",
        observation.feature or "",
    ]
    parts = [observation.kind, *[part for part in about if part], told or observation.text]
    return " ".join(part for part in parts if part)


def logged_json(logged: Logged, as_of: str) -> str:
    """Document ``log``."""
    data = {
        "system": logged.system,
        "site": logged.site,
        "understood": logged.understood,
        "moment": plain(logged.moment),
        "entries": [
            {
                "id": e.id,
                "already_logged": e.already_logged,
                "kind": e.observation.kind,
                "band": e.observation.band,
                "value": plain(e.observation.value),
                "unit": e.observation.unit,
                "limit_side": e.observation.limit_side,
            }
            for e in logged.entries
        ],
        "knowledge": list(logged.knowledge),
        "suspected": logged.suspected,
        "suspicion": plain(logged.suspicion),
    }
    return document("log", data, as_of=as_of, warnings=logged.warnings)
