"""The columns of exchanged tables, kind by kind: the contract between ``export`` and ``load``.

Units are written as virtual observatories write them. Every cell but a text may be unknown.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from campaign.model.systems import RULE_KINDS, SYSTEM_STATES

ExchangeKind = Literal["observations", "systems", "solutions", "episodes"]
EXCHANGE_KINDS: tuple[ExchangeKind, ...] = ("observations", "systems", "solutions", "episodes")
CellType = Literal["text", "word", "number", "whole", "truth"]
Cell = str | float | int | bool | None

# Raised when a column changes its meaning; new columns at the end do not raise it.
EXCHANGE_FORMAT = 1
AXIS = "MJD (TDB, solar-system barycentre)"
PROSE = 100_000
SCALES = ("utc", "tt", "tdb", "tai", "ut")
PLACES = ("observatory", "geocentre", "heliocentre", "barycentre")

# What the catalogue calls the unit of an observed value, and what exchanged tables call it.
UNIT_WORDS: dict[str, str] = {
    "mag": "mag",
    "jy": "Jy",
    "kms": "km/s",
    "angstrom": "Angstrom",
    "mas": "mas",
    "arcsec": "arcsec",
    "erg/s/cm2": "erg.s**-1.cm**-2",
}
UNITS_READ = {shown: own for own, shown in UNIT_WORDS.items()}


@dataclass(frozen=True, slots=True)
class ExchangeColumn:
    """One column: ``word`` is a text of a closed list in ASCII, ``text`` any other.

    ``is_prose`` marks text that may have several lines, ``longest`` is how many characters a text may
    have; ``on_axis`` marks an instant on the catalogue's axis.
    """

    name: str
    type: CellType
    text: str
    unit: str | None = None
    words: tuple[str, ...] = ()
    on_axis: bool = False
    is_prose: bool = False
    longest: int = 200

    @property
    def is_text(self) -> bool:
        return self.type in ("text", "word")


def _text(name: str, text: str, longest: int = 200) -> ExchangeColumn:
    return ExchangeColumn(name, "text", text, longest=longest)


def _prose(name: str, text: str) -> ExchangeColumn:
    return ExchangeColumn(name, "text", f"{text}; may have several lines", is_prose=True, longest=PROSE)


def _word(name: str, text: str, *words: str) -> ExchangeColumn:
    return ExchangeColumn(name, "word", f"{text}: {', '.join(words)}", words=words)


def _number(name: str, text: str, unit: str | None = None) -> ExchangeColumn:
    return ExchangeColumn(name, "number", text, unit)


def _whole(name: str, text: str) -> ExchangeColumn:
    return ExchangeColumn(name, "whole", text)


def _measured(name: str, text: str, unit: str | None = None) -> Iterator[ExchangeColumn]:
    """A value and the sizes of its two one-sigma errors; an empty error is unknown, 0 is exact."""
    yield _number(name, text, unit)
    yield _number(f"{name}_minus", "Size of its lower one-sigma error; empty: unknown", unit)
    yield _number(f"{name}_plus", "Size of its upper one-sigma error; empty: unknown", unit)


def _moment(prefix: str, what: str, axis: str, errors: str) -> Iterator[ExchangeColumn]:
    """An instant on the catalogue's axis, and as it was typed."""
    yield ExchangeColumn(axis, "number", f"{what}, {AXIS}", "d", on_axis=True)
    yield _number(f"{errors}_minus_d", "Size of its lower one-sigma error; empty: unknown", "d")
    yield _number(f"{errors}_plus_d", "Size of its upper one-sigma error; empty: unknown", "d")
    yield _text(f"{prefix}_text", f"{what}, as typed")
    yield _word(f"{prefix}_scale", "Time scale of the instant as typed", *SCALES)
    yield _word(f"{prefix}_place", "Place that the instant as typed refers to", *PLACES)


def _observations() -> Iterator[ExchangeColumn]:
    yield _text("uid", "Identifier of the observation, the same in every catalogue", 36)
    yield _text("system", "Primary name of the system")
    yield _word(
        "kind", "What was observed",
        "photometry", "flux", "velocity", "line", "position", "shell", "attempt", "remark",
    )  # fmt: skip
    yield from _moment("time", "Time of the observation", "bmjd_tdb", "time")
    yield _number("value", "What was measured, in the unit of its row; of a limit the bound")
    yield _number("value_minus", "Size of its lower one-sigma error, in the unit of its row; empty: unknown")
    yield _number("value_plus", "Size of its upper one-sigma error, in the unit of its row; empty: unknown")
    yield _text("unit", f"Unit of the value: {', '.join(UNIT_WORDS.values())}", 20)
    yield _word("limit_side", "For a limit, where the true value lies of the bound", "above", "below")
    yield _number("limit_sigma", "For a limit, how many sigma it was taken at")
    yield _text("band", "Photometric band", 50)
    yield _text("photometric_system", "Photometric system of the magnitude; empty: not stated", 50)
    yield _number("frequency_ghz", "Frequency of a radio flux", "GHz")
    yield _number("energy_low_kev", "Lower end of an X-ray band", "keV")
    yield _number("energy_high_kev", "Upper end of an X-ray band", "keV")
    yield _text("star", "Star that a velocity or line belongs to", 20)
    yield _text("species", "Species of a line", 50)
    yield from _measured("position_angle_deg", "Position angle, from North through East", "deg")
    yield _number("correlation", "Correlation of separation and position angle")
    yield _text("feature", "Feature of a shell", 100)
    yield _word("measured_at", "Where the radius of a shell was measured", "edge", "peak")
    yield _number("plate_scale_error", "Relative one-sigma error of the plate scale")
    yield _whole("shell_index", "Index of a shell; the youngest visible has 1")
    yield from _site()
    yield _text("observer", "Who observed")
    yield _text("instrument", "With what")
    yield _text("comparison_star", "Comparison star")
    yield _text("source", "Where it was published, or who gave it", 500)
    yield _word("quality", "Quality", "good", "doubtful", "bad")
    yield _prose("text", "Remark")


def _site() -> Iterator[ExchangeColumn]:
    yield _text("site", "Name of the site")
    yield _word("site_kind", "What the site is", "ground", "space")
    yield _number("site_latitude_deg", "Geodetic latitude of the site", "deg")
    yield _number("site_longitude_deg_east", "Longitude of the site, positive to the East", "deg")
    yield _number("site_height_m", "Height of the site", "m")
    yield _number("site_horizon_deg", "Lowest altitude usable at the site", "deg")
    yield _number("site_elongation_min_deg", "Smallest solar elongation of a space platform", "deg")
    yield _number("site_elongation_max_deg", "Largest solar elongation of a space platform", "deg")
    yield _text("site_time_zone", "Time zone of the site", 100)


# Only where what is out of use is exported too.
OBSERVATIONS_OUT_OF_USE = (
    _word("out_of_use", "Why the row is out of use, if it is", "superseded", "withdrawn"),
    _text("superseded_by", "Identifier of the observation that took its place", 36),
    _text("withdrawn_why", "Why it was withdrawn", 500),
)
EPISODES_OUT_OF_USE = (_word("out_of_use", "Why the row is out of use, if it is", "withdrawn"),)

STAR_UNITS = {
    "mass_msun": ("Mass", "solMass"),
    "luminosity_lsun": ("Luminosity", "solLum"),
    "temperature_k": ("Effective temperature", "K"),
    "radius_rsun": ("Radius", "solRad"),
    "mass_loss_msun_yr": ("Mass-loss rate", "solMass/yr"),
    "wind_speed_kms": ("Terminal speed of the wind", "km/s"),
}
RULE_STAGES = ("onset", "maximum", "end")
RULE_SIZES = {
    "critical_separation_au": ("Dust is made while the separation is at most this", "au"),
    "condensation_distance_au": ("Way of the dust from collision to condensation", "au"),
    "flow_speed_kms": ("Speed of the flow on this way", "km/s"),
    "maximum_lag_d": ("Maximum after periastron", "d"),
}


def _systems() -> Iterator[ExchangeColumn]:
    yield _text("name", "Primary name of the system")
    yield _text("aliases", "Other names, as a JSON list", PROSE)
    yield _number("ra_deg", "Right ascension, ICRS at the epoch of the position", "deg")
    yield _number("dec_deg", "Declination, ICRS at the epoch of the position", "deg")
    yield _number("position_epoch_jyr", "Epoch of the position, Julian year", "yr")
    yield _number("pm_ra_cosdec_mas_yr", "Proper motion in right ascension times cos(declination)", "mas/yr")
    yield _number("pm_dec_mas_yr", "Proper motion in declination", "mas/yr")
    yield from _measured("distance_pc", "Distance", "pc")
    yield from _measured("parallax_mas", "Parallax", "mas")
    yield _word("state", "State", *SYSTEM_STATES)
    yield _whole("priority", "Priority, 1 to 9")
    yield _prose("notes", "Notes")
    yield ExchangeColumn(
        "cycle_anchor_bmjd_tdb", "number", f"Where cycle 0 is counted from, {AXIS}", "d", on_axis=True
    )
    yield _number("cycle_anchor_period_d", "Period that counts the cycles", "d")
    for star in ("a", "b"):
        yield _text(f"star_{star}_spectral_type", f"Spectral type of star {star.upper()}", 100)
        for quantity, (what, unit) in STAR_UNITS.items():
            yield from _measured(f"star_{star}_{quantity}", f"{what} of star {star.upper()}", unit)
    yield _word("rule_kind", "Kind of the dust rule in force, if any", *RULE_KINDS)
    for stage in RULE_STAGES:
        yield from _measured(f"rule_{stage}_phase", f"{stage.capitalize()} after periastron, in periods")
    for stage in RULE_STAGES:
        yield from _measured(f"rule_{stage}_d", f"{stage.capitalize()} after periastron", "d")
    for size, (what, unit) in RULE_SIZES.items():
        yield from _measured(f"rule_{size}", what, unit)
    for stage in RULE_STAGES:
        yield _number(f"rule_scatter_{stage}_d", f"Scatter of the {stage} from cycle to cycle", "d")
    yield _prose("rule_note", "Note of the dust rule")


ELEMENT_UNITS = {
    "eccentricity": ("Eccentricity", None),
    "omega_deg": ("Argument of periastron, of the star in omega_of", "deg"),
    "inclination_deg": ("Inclination", "deg"),
    "node_deg": ("Position angle of the ascending node", "deg"),
    "k_a_kms": ("Semi-amplitude of the velocity of star A", "km/s"),
    "k_b_kms": ("Semi-amplitude of the velocity of star B", "km/s"),
    "gamma_kms": ("Velocity of the system", "km/s"),
    "a_au": ("Semi-major axis", "au"),
    "a_arcsec": ("Semi-major axis on the sky", "arcsec"),
}


def _solutions() -> Iterator[ExchangeColumn]:
    yield _text("system", "Primary name of the system")
    yield _text("label", "Label of the solution", 100)
    yield _word("period_kind", "What the period is", "measured", "above", "below", "range")
    yield from _measured("period_d", "Period; its bound where it is a limit; the lower end of a range", "d")
    yield _number("period_high_d", "Upper end of a range of periods", "d")
    yield _number("period_limit_sigma", "For a limit, how many sigma it was taken at")
    yield from _moment("epoch", "Epoch", "epoch_bmjd_tdb", "epoch")
    yield _word(
        "epoch_marks", "What the epoch marks", "periastron", "A in front", "B in front", "onset", "maximum"
    )
    for element, (what, unit) in ELEMENT_UNITS.items():
        yield from _measured(element, what, unit)
        if element == "omega_deg":
            yield _word("omega_of", "Star that the argument of periastron belongs to", "A", "B")
    yield _text("covariance", "Covariance of elements, as JSON: names, and the matrix in their units", PROSE)
    yield _text("source", "Where it was published, or who gave it", 500)
    yield ExchangeColumn(
        "data_until_bmjd_tdb", "number", f"Until when its data reach, {AXIS}", "d", on_axis=True
    )
    yield ExchangeColumn("adopted", "truth", "Whether the forecast rests on it")
    yield _number("weight", "Its weight among several adopted; empty: adopted alone, or not adopted")
    yield _whole("epoch_cycle", "The system's cycle of the epoch")
    yield _whole("published_cycle_offset", "Published count of cycles minus the system's")
    yield _prose("note", "Note")


def _episodes() -> Iterator[ExchangeColumn]:
    yield _text("system", "Primary name of the system")
    yield _whole("cycle", "The system's cycle")
    yield _word("state", "State", "proposed", "confirmed", "rejected")
    for stage in RULE_STAGES:
        what = f"{stage.capitalize()} of dust production"
        yield from _moment(stage, what, f"{stage}_bmjd_tdb", stage)
        yield _text(f"{stage}_band", f"Band that the {stage} was dated in; empty: production itself", 50)
        yield _text(f"{stage}_method", f"How the {stage} was dated")
    yield _text("source", "Where it was published, or who gave it", 500)
    yield _prose("note", "Note")


EXCHANGE_COLUMNS: dict[ExchangeKind, tuple[ExchangeColumn, ...]] = {
    "observations": tuple(_observations()),
    "systems": tuple(_systems()),
    "solutions": tuple(_solutions()),
    "episodes": tuple(_episodes()),
}
OUT_OF_USE_COLUMNS: dict[ExchangeKind, tuple[ExchangeColumn, ...]] = {
    "observations": OBSERVATIONS_OUT_OF_USE,
    "systems": (),
    "solutions": (),
    "episodes": EPISODES_OUT_OF_USE,
}
# A table whose columns hold all of these is one of ours.
SIGNATURES: dict[ExchangeKind, frozenset[str]] = {
    "observations": frozenset({"uid", "system", "kind", "bmjd_tdb", "time_text", "time_scale", "time_place"}),
    "systems": frozenset({"name", "ra_deg", "dec_deg", "position_epoch_jyr", "state"}),
    "solutions": frozenset({"system", "label", "period_kind", "epoch_bmjd_tdb", "epoch_marks"}),
    "episodes": frozenset({"system", "cycle", "state", "onset_bmjd_tdb", "onset_text"}),
}


def exchange_columns(kind: ExchangeKind, *, also_out_of_use: bool = False) -> tuple[ExchangeColumn, ...]:
    """Columns of a kind of table, in their order."""
    return EXCHANGE_COLUMNS[kind] + (OUT_OF_USE_COLUMNS[kind] if also_out_of_use else ())
