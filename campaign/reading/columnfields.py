"""The fields that a table may fill, kind by kind, and the names by which tables call them.

Names are compared without case, spaces and punctuation: ``e_mag``, ``E_MAG`` and ``emag`` are one. The names
are those in use in published tables (common practice, no source).
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from campaign.model.loading import LoadKind

FieldType = Literal["number", "word", "instant", "position", "measured"]


@dataclass(frozen=True, slots=True)
class Field:
    """One field: ``unit`` is the family of its numbers, ``spoken`` what a person calls it."""

    name: str
    type: FieldType
    names: tuple[str, ...]
    spoken: str
    unit: str = ""
    is_required: bool = False


def key(name: str) -> str:
    """The form in which names of columns are compared."""
    return re.sub(r"[^\w']+|_", "", name.casefold())


def error_names(*bases: str) -> tuple[str, ...]:
    """How the error of something is called."""
    return tuple(
        form.format(base)
        for base in bases
        for form in (
            "e{}",
            "err{}",
            "error{}",
            "sig{}",
            "sigma{}",
            "unc{}",
            "{}err",
            "{}error",
            "{}sigma",
            "{}unc",
            "{}uncertainty",
            "{}e",
        )
    )


def _side_names(sides: tuple[str, ...], *bases: str) -> tuple[str, ...]:
    return tuple(
        form.format(base, side)
        for base in bases
        for side in sides
        for form in ("{0}{1}", "{0}err{1}", "{0}error{1}", "err{1}{0}", "e{0}{1}")
        if base or form not in ("{0}{1}", "e{0}{1}")
    )


def _value_fields(bases: tuple[str, ...], spoken: str, unit: str) -> tuple[Field, ...]:
    generic = ("err", "error", "sigma", "uncertainty", "unc", "errors", "stderr", "std", "sd")
    return (
        Field("value", "number", (*bases, "value"), spoken, unit, is_required=True),
        Field("error", "number", (*generic, *error_names(*bases, "value")), f"error of the {spoken}", unit),
        Field(
            "error_minus",
            "number",
            _side_names(("minus", "low", "lower", "down", "neg"), "", *bases, "value"),
            f"lower error of the {spoken}",
            unit,
        ),
        Field(
            "error_plus",
            "number",
            _side_names(("plus", "up", "upper", "high", "pos"), "", *bases, "value"),
            f"upper error of the {spoken}",
            unit,
        ),
    )


def _limit_fields(*bases: str) -> tuple[Field, ...]:
    names = (
        "limit",
        "limitflag",
        "limitside",
        "lim",
        *(f"l{base}" for base in bases),
        *(f"{base}limit" for base in bases),
    )
    return (
        Field("limit", "word", names, "mark of a limit, < or >"),
        Field("limit_sigma", "number", ("limitsigma", "nsigma", "limitlevel"), "level of limits, sigma"),
    )


_SYSTEM = Field(
    "system",
    "word",
    (
        "system",
        "systemname",
        "object",
        "objectname",
        "objectid",
        "obj",
        "target",
        "targetname",
        "starname",
        "name",
        "designation",
    ),
    "system",
    is_required=True,
)
_TIME = Field("time", "instant", (), "time", is_required=True)
_COMMON: tuple[Field, ...] = (
    _SYSTEM,
    _TIME,
    Field(
        "time_error",
        "number",
        error_names("time", "hjd", "bjd", "mjd", "jd", "date"),
        "error of the time",
        "d",
    ),
    Field("site", "word", ("site", "sitename", "observatory", "observatoryname", "location"), "site"),
    Field("observer", "word", ("observer", "observers", "observername"), "observer"),
    Field(
        "instrument",
        "word",
        ("instrument", "inst", "camera", "detector", "telescope", "tel", "spectrograph"),
        "instrument",
    ),
    Field(
        "source",
        "word",
        ("source", "reference", "references", "ref", "refs", "bibcode", "publication", "paper"),
        "source",
    ),
    Field("quality", "word", ("quality", "qual"), "quality: good, doubtful or bad"),
    Field("text", "word", ("text", "note", "notes", "remark", "remarks", "comment", "comments"), "note"),
)
_STAR = Field("star", "word", ("star", "component"), "star: A or B")
_SPECIES = ("species", "line", "spectralline", "ion", "lineid", "transition")

MAGNITUDE_NAMES = ("mag", "magnitude", "mags")
VELOCITY_NAMES = ("rv", "radialvelocity", "vrad", "velocity", "radvel", "vr", "vhelio", "hrv")
_RHO_NAMES = ("rho", "sep", "separation")
_THETA_NAMES = ("theta", "pa", "posangle", "positionangle", "angle")
_RADIUS_NAMES = ("radius", "shellradius", "rshell")
_WIDTH_NAMES = ("ew", "eqw", "equivalentwidth", "wlambda", "width", "eqwidth")
_FLUX_NAMES = ("flux", "fluxdensity", "fnu", "snu")
_BAND = Field(
    "band", "word", ("band", "filter", "filt", "passband", "filtername", "bandpass", "filterid"), "band"
)
_ANGLE = (
    Field("angle", "number", _THETA_NAMES, "position angle", "deg"),
    Field("angle_error", "number", error_names(*_THETA_NAMES), "error of the position angle", "deg"),
)

OBSERVATION_FIELDS: Mapping[LoadKind, tuple[Field, ...]] = {
    "photometry": (
        *_COMMON,
        *_value_fields(MAGNITUDE_NAMES, "magnitude", "mag"),
        *_limit_fields(*MAGNITUDE_NAMES),
        _BAND,
        Field(
            "photometric_system",
            "word",
            ("photometricsystem", "magsystem", "magsys", "photsys", "magnitudes", "photsystem"),
            "photometric system",
        ),
        Field(
            "comparison_star",
            "word",
            ("comparisonstar", "comparison", "compstar", "comp", "cname", "comparisons"),
            "comparison star",
        ),
    ),
    "velocity": (
        *_COMMON,
        *_value_fields(VELOCITY_NAMES, "radial velocity", "kms"),
        Field("star", "word", ("star", "component", "comp"), "star: A or B", is_required=True),
        Field("species", "word", _SPECIES, "line"),
    ),
    "position": (
        *_COMMON,
        *_value_fields(_RHO_NAMES, "separation", "mas"),
        Field("angle", "number", _THETA_NAMES, "position angle", "deg", is_required=True),
        _ANGLE[1],
        Field("correlation", "number", ("correlation", "corr", "rhotheta", "corrrhotheta"), "correlation"),
    ),
    "shell": (
        *_COMMON,
        *_value_fields(_RADIUS_NAMES, "radius", "arcsec"),
        *_ANGLE,
        Field("feature", "word", ("feature",), "feature"),
        Field("measured_at", "word", ("measuredat",), "edge or peak"),
        Field(
            "plate_scale_error", "number", ("platescaleerror", "scaleerror"), "plate-scale error", "fraction"
        ),
        Field("shell_index", "number", ("shellindex", "index", "shell"), "index of the shell"),
        _BAND,
    ),
    "line": (
        *_COMMON,
        *_value_fields(_WIDTH_NAMES, "equivalent width", "angstrom"),
        Field("species", "word", _SPECIES, "line", is_required=True),
        _STAR,
    ),
    "flux": (
        *_COMMON,
        *_value_fields(_FLUX_NAMES, "flux", "jy"),
        *_limit_fields(*_FLUX_NAMES),
        _BAND,
        Field("frequency", "number", ("frequency", "freq", "nu", "frequencyghz"), "frequency", "ghz"),
        Field(
            "energy_low",
            "number",
            ("energylow", "elow", "emin", "energymin", "energylowkev"),
            "lowest energy",
            "kev",
        ),
        Field(
            "energy_high",
            "number",
            ("energyhigh", "ehigh", "emax", "energymax", "energyhighkev"),
            "highest energy",
            "kev",
        ),
    ),
}


def _word(name: str, spoken: str, *names: str, is_required: bool = False) -> Field:
    return Field(name, "word", names, spoken, is_required=is_required)


def _measured(name: str, spoken: str, unit: str, *names: str, is_required: bool = False) -> tuple[Field, ...]:
    """A value whose cells may hold its error, and a column of the error alone."""
    errors = (*error_names(*(each for each in names if len(each) > 1)), *(f"e{each}" for each in names))
    return (
        Field(name, "measured", names, spoken, unit, is_required=is_required),
        Field(f"{name}_error", "number", errors, f"error of the {spoken}", unit),
    )


def _instant(name: str, spoken: str, *names: str) -> tuple[Field, ...]:
    return (
        Field(name, "instant", names, spoken),
        Field(f"{name}_error", "number", error_names(*names), f"error of the {spoken}", "d"),
    )


_SOURCE = _word(
    "source", "source", "source", "reference", "references", "ref", "refs", "bibcode", "publication", "paper"
)
_NOTE = _word("note", "note", "note", "notes", "remark", "remarks", "comment", "comments")
_RA_NAMES = ("ra", "raj2000", "rightascension", "alpha", "raicrs", "radeg")
_DEC_NAMES = ("dec", "de", "dej2000", "decj2000", "declination", "delta", "deicrs", "decdeg", "dedeg")

KNOWLEDGE_FIELDS: Mapping[LoadKind, tuple[Field, ...]] = {
    "systems": (
        _word("name", "name", *_SYSTEM.names, is_required=True),
        _word("aliases", "other names, divided by ;", "aliases", "alias", "othernames", "othername", "aka"),
        Field("ra", "position", _RA_NAMES, "right ascension", is_required=True),
        Field("dec", "position", _DEC_NAMES, "declination", is_required=True),
        *_measured("distance", "distance", "pc", "distance", "dist", "d"),
        *_measured("parallax", "parallax", "mas", "parallax", "plx"),
        _word("state", "episodic, persistent or candidate", "state", "status"),
        Field("priority", "number", ("priority",), "priority, 1 to 9"),
        _word("notes", "notes", *_NOTE.names),
        _word("spectral_type_a", "spectral type of star A", "spectraltypea", "spta", "sptypea"),
        _word("spectral_type_b", "spectral type of star B", "spectraltypeb", "sptb", "sptypeb"),
    ),
    "solutions": (
        _SYSTEM,
        _word("label", "label", "label", "solution", "solutionlabel"),
        *_measured("period", "period", "d", "period", "p", "porb", "orbitalperiod", is_required=True),
        *_instant("epoch", "epoch", "epoch", "t0", "tp", "tperi", "tperiastron"),
        _word("epoch_marks", "what the epoch marks", "epochmarks", "marks"),
        *_measured("eccentricity", "eccentricity", "", "eccentricity", "e", "ecc"),
        *_measured("omega", "omega", "deg", "omega", "argperi", "argumentofperiastron"),
        _word("omega_of", "star of omega, A or B", "omegaof", "omegastar"),
        *_measured("inclination", "inclination", "deg", "inclination", "i", "inc", "incl"),
        *_measured("node", "ascending node", "deg", "node", "bigomega", "ascendingnode"),
        *_measured("k_a", "K of star A", "kms", "ka", "k1"),
        *_measured("k_b", "K of star B", "kms", "kb", "k2"),
        *_measured("gamma", "systemic velocity", "kms", "gamma", "vgamma", "systemicvelocity"),
        *_measured("a_au", "semi-major axis in au", "au", "aau", "semimajoraxisau"),
        *_measured("a_arcsec", "semi-major axis on the sky", "arcsec", "aarcsec", "semimajoraxis"),
        _SOURCE,
        _NOTE,
    ),
    "episodes": (
        _SYSTEM,
        Field("cycle", "number", ("cycle", "cyclenumber"), "cycle"),
        *_instant("onset", "onset", "onset", "onsettime", "tonset", "start"),
        *_instant("maximum", "maximum", "maximum", "max", "tmax", "peak"),
        *_instant("end", "end", "end", "tend", "stop"),
        _word("band", "band", *_BAND.names),
        _word("method", "method", "method"),
        _word("state", "proposed, confirmed or rejected", "state", "status"),
        _SOURCE,
        _NOTE,
    ),
}

FIELDS: Mapping[LoadKind, tuple[Field, ...]] = {**OBSERVATION_FIELDS, **KNOWLEDGE_FIELDS}
# Constants that belong to no column.
TABLE_CONSTANTS = ("scale", "place", "decimal")


def field_named(kind: LoadKind, name: str) -> Field | None:
    """The field that a user or a table calls ``name``, or None."""
    wanted = key(name)
    for field in FIELDS[kind]:
        if wanted == key(field.name) or wanted in field.names:
            return field
    return None
