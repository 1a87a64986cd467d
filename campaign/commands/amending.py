"""Which options correct an observation of which kind; each is read as ``campaign log`` reads it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from campaign.commands.parsing import limited, measured, one_of, plain, shell_index
from campaign.errors import InputRefused, UsageRefused
from campaign.model.observations import Observation

Given = Mapping[str, str]
Fields = dict[str, Any]
Reader = Callable[[str, Observation, Given], Fields]

_EXACT = {"limit_side": None, "limit_sigma": None}


def fields_given(observation: Observation, given: Given) -> Fields:
    """Fields of the corrected observation from the options given.

    Raises
    ------
    UsageRefused
        For an option that does not belong to this kind of observation.
    InputRefused
        For a value that cannot be read.
    """
    apart = _NOT_OF_KIND.get(observation.kind, frozenset())
    readers = {flag: r for flag, r in (_SHARED | _OF_KIND[observation.kind]).items() if flag not in apart}
    strange = [flag for flag in given if flag not in readers]
    if strange:
        flags = ", ".join(sorted(readers))
        raise UsageRefused(
            f"{strange[0]} does not belong to observation {observation.id}, which is of kind "
            f"{observation.kind}.",
            why=f"What can be corrected of it: --at, --site, {flags}.",
            hint=f"See it with: campaign history {observation.id}.",
            details={"option": strange[0], "kind": observation.kind},
        )
    fields: Fields = {}
    for flag, text in given.items():
        fields |= readers[flag](text, observation, given)
    return fields


def _text_of(field: str, flag: str, longest: int) -> Reader:
    """A text field; empty text takes it away."""

    def read(text: str, observation: Observation, given: Given) -> Fields:
        return {field: plain(text, flag, longest) if text.strip() else None}

    return read


def _prose(text: str, observation: Observation, given: Given) -> Fields:
    return {"text": (plain(text, "--note", 2000) or "") if text.strip() else ""}


def _needed_prose(text: str, observation: Observation, given: Given) -> Fields:
    if not text.strip():
        raise InputRefused(
            f"The {observation.kind} would say nothing.",
            why="Its text is all that it has.",
            hint=f'To take it out of use: campaign withdraw {observation.id} --why "...".',
            code="text-missing",
        )
    return _prose(text, observation, given)


def _quality(text: str, observation: Observation, given: Given) -> Fields:
    return {"quality": one_of(text, ("good", "doubtful", "bad"), "--quality")}


def _bounded(flag: str, unit: str, **domain: Any) -> Reader:
    """A value or a limit."""

    def read(text: str, observation: Observation, given: Given) -> Fields:
        own = "erg/s/cm2" if unit == "jy" and _in_energy(observation, given) else unit
        return _EXACT | limited(text, own, flag, given.get("--limit-sigma"), **domain)

    return read


def _in_energy(observation: Observation, given: Given) -> bool:
    return "--energy" in given or observation.energy_low_kev is not None


def _sigma(text: str, observation: Observation, given: Given) -> Fields:
    """The level of a limit that stays what it is; with a new value, that value's own."""
    from campaign.reading.numbers import read_number

    if "--mag" in given or "--value" in given:
        return {}
    if observation.limit_side is None:
        raise InputRefused(
            f"Observation {observation.id} is no limit.",
            why="Only a limit holds at a level.",
            hint='Make it one with, for example, --mag ">12.1" --limit-sigma 5.',
            code="limit-missing",
        )
    level = read_number(text, "--limit-sigma")
    if not level > 0.0:
        raise InputRefused(
            f"The level {text} of a limit is not above zero.",
            why="It says at how many sigma the limit holds.",
            hint="For example --limit-sigma 3.",
            code="limit-refused",
        )
    return {"limit_sigma": level}


def _value(flag: str, unit: str, **domain: Any) -> Reader:
    def read(text: str, observation: Observation, given: Given) -> Fields:
        return {"value": measured(text, unit, flag, **domain), "unit": unit}

    return read


def _angle(text: str, observation: Observation, given: Given) -> Fields:
    if not text.strip() and observation.kind == "shell":
        return {"position_angle_deg": None}
    return {"position_angle_deg": measured(text, "deg", "--angle", low=-360.0, high=360.0)}


def _number(field: str, flag: str, unit: str, **domain: Any) -> Reader:
    """A number kept without an error; empty text takes it away."""

    def read(text: str, observation: Observation, given: Given) -> Fields:
        value = measured(text, unit, flag, **domain) if text.strip() else None
        return {field: None if value is None else value.value}

    return read


def _energy(text: str, observation: Observation, given: Given) -> Fields:
    from campaign.model.measured import Range
    from campaign.reading.values import read_measured_or_bound

    span = read_measured_or_bound(text, "kev", "--energy", low=0.0, low_open=True)
    if not isinstance(span, Range):
        raise InputRefused(
            f"The energy range '{text}' is not a range.",
            why="An X-ray flux belongs to a range of energies.",
            hint='For example --energy "0.5..10 keV".',
            code="energy-refused",
        )
    if observation.energy_low_kev is None and "--value" not in given:
        raise UsageRefused(
            "The flux needs to be given again together with an energy range.",
            why="It was kept in Jy; over a range of energies a flux is in erg/s/cm2.",
            hint='Add for example --value "(4.1±0.3)e-12 erg/s/cm2".',
        )
    return {"energy_low_kev": span.low, "energy_high_kev": span.high}


def _star(text: str, observation: Observation, given: Given) -> Fields:
    if not text.strip() and observation.kind == "line":
        return {"star": None}
    return {"star": one_of(text, ("A", "B"), "--star")}


def _measured_at(text: str, observation: Observation, given: Given) -> Fields:
    return {"measured_at": one_of(text, ("edge", "peak"), "--measured-at") if text.strip() else None}


def _index(text: str, observation: Observation, given: Given) -> Fields:
    return {"shell_index": shell_index(text) if text.strip() else None}


_BAND = _text_of("band", "--band", 24)
_SHARED: dict[str, Reader] = {
    "--instrument": _text_of("instrument", "--instrument", 120),
    "--source": _text_of("source", "--source", 400),
    "--quality": _quality,
    "--note": _prose,
}
_OF_KIND: dict[str, dict[str, Reader]] = {
    "photometry": {
        "--mag": _bounded("--mag", "mag", low=-30.0, high=40.0),
        "--limit-sigma": _sigma,
        "--band": _BAND,
        "--magnitudes": _text_of("photometric_system", "--magnitudes", 40),
        "--comparison": _text_of("comparison_star", "--comparison", 120),
    },
    "flux": {
        "--value": _bounded("--value", "jy"),
        "--limit-sigma": _sigma,
        "--band": _BAND,
        "--frequency": _number("frequency_ghz", "--frequency", "ghz", low=0.0, low_open=True),
        "--energy": _energy,
    },
    "velocity": {
        "--velocity": _value("--velocity", "kms", low=-1e5, high=1e5),
        "--star": _star,
        "--species": _text_of("species", "--species", 60),
    },
    "line": {
        "--width": _value("--width", "angstrom"),
        "--star": _star,
        "--species": _text_of("species", "--species", 60),
    },
    "position": {
        "--separation": _value("--separation", "mas", low=0.0),
        "--angle": _angle,
        "--correlation": _number(
            "correlation", "--correlation", "", low=-1.0, high=1.0, low_open=True, high_open=True
        ),
    },
    "shell": {
        "--radius": _value("--radius", "arcsec", low=0.0, low_open=True),
        "--angle": _angle,
        "--feature": _text_of("feature", "--feature", 60),
        "--measured-at": _measured_at,
        "--plate-scale-error": _number(
            "plate_scale_error", "--plate-scale-error", "fraction", low=0.0, high=1.0
        ),
        "--index": _index,
        "--band": _BAND,
    },
    "attempt": {"--why": _needed_prose, "--band": _BAND, "--note": _needed_prose},
    "remark": {"--note": _needed_prose},
}
_NOT_OF_KIND = {"attempt": frozenset({"--quality"}), "remark": frozenset({"--quality", "--instrument"})}
