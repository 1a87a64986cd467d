"""What the dust of a system is computed from: the catalogue, what the user says, and what is assumed."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field, replace

from campaign.errors import Conflict, InputRefused
from campaign.model.dust import DustInput, DustOpacity, DustOrigin, DustOverrides
from campaign.model.measured import Measured, Range
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution
from campaign.physics.condensation import condensation_radius_au
from campaign.physics.opacity import DEFAULT_OPACITY, Opacity, opacity_named, power_law_opacity
from campaign.studies.propagation import Uncertain
from campaign.studies.rows import distance_of

_ANY = float("inf")
# Key of the interstellar extinction, which moves all bands and dates together.
VEIL = "extinction_k_mag"
# Name, unit and domain of every input, by key.
INPUTS: dict[str, tuple[str, str, float, float]] = {
    "luminosity_lsun": ("luminosity", "Lsun", 1e-3, _ANY),
    "luminosity_a_lsun": ("luminosity of star A", "Lsun", 1e-3, _ANY),
    "luminosity_b_lsun": ("luminosity of star B", "Lsun", 1e-3, _ANY),
    "star_temperature_k": ("temperature of the brighter star", "K", 1e3, 1e6),
    "mass_msun": ("mass", "Msun", 1e-2, _ANY),
    "mass_a_msun": ("mass of star A", "Msun", 1e-2, _ANY),
    "mass_b_msun": ("mass of star B", "Msun", 1e-2, _ANY),
    "mass_loss_a_msun_yr": ("mass loss of star A", "Msun/yr", 1e-13, _ANY),
    "mass_loss_b_msun_yr": ("mass loss of star B", "Msun/yr", 1e-13, _ANY),
    "wind_speed_a_kms": ("wind speed of star A", "km/s", 1.0, 299_792.458),
    "wind_speed_b_kms": ("wind speed of star B", "km/s", 1.0, 299_792.458),
    "separation_au": ("separation", "au", 1e-6, _ANY),
    "condensation_k": ("condensation temperature", "K", 50.0, 2500.0),
    "emissivity_index": ("emissivity index", "", 0.0, 4.0),
    "grain_radius_um": ("grain radius", "um", 1e-4, 1e3),
    "grain_density_g_cm3": ("grain density", "g/cm3", 0.05, 30.0),
    "flow_speed_kms": ("flow speed", "km/s", 1.0, 299_792.458),
    "launch_speed_kms": ("launch speed", "km/s", 0.0, 299_792.458),
    "kappa_pr_cm2_g": ("opacity for radiation pressure", "cm2/g", 1e-6, _ANY),
    "dust_share": ("share of dust in the mass", "", 1e-8, 1.0),
    "distance_pc": ("distance", "pc", 1e-3, _ANY),
    "temperature_k": ("temperature of the dust", "K", 20.0, 2500.0),
    "opacity_factor": ("opacity", "", 1e-6, _ANY),
    VEIL: ("interstellar extinction in K", "mag", 0.0, _ANY),
}
# Known only to within a factor: normal in the logarithm.
_BY_FACTOR = frozenset({"grain_radius_um", "dust_share", "opacity_factor", "kappa_pr_cm2_g"})
_CONDENSATION = Range(1000.0, 1800.0)
_DEFAULT_ERROR = 0.3


@dataclass(slots=True)
class DustInputs:
    """Inputs by key with where each comes from; ``used`` collects those that a result rests on."""

    record: SystemRecord
    values: dict[str, Uncertain]
    told: dict[str, DustInput]
    opacity: Opacity
    notes: list[str] = field(default_factory=list)
    used: set[str] = field(default_factory=set)
    # Critical separation for a dust rule, if there is one.
    critical_separation_au: Measured | Range | None = None
    # Whether the catalogue gives the size of the orbit, without which such a rule dates nothing.
    size_known: bool = False

    def has(self, *keys: str) -> bool:
        return all(key in self.values for key in keys)

    def used_inputs(self) -> tuple[DustInput, ...]:
        """The inputs that some result rests on, in the order of the table."""
        return tuple(self.told[key] for key in INPUTS if key in self.used and key in self.told)

    def light_keys(self) -> tuple[str, ...]:
        """What the stars' light follows from."""
        return self._whole_or_stars("luminosity", "lsun")

    def mass_keys(self) -> tuple[str, ...]:
        """What the stars' mass follows from."""
        return self._whole_or_stars("mass", "msun")

    def _whole_or_stars(self, what: str, unit: str) -> tuple[str, ...]:
        if f"{what}_{unit}" in self.values:
            return (f"{what}_{unit}",)
        return tuple(f"{what}_{star}_{unit}" for star in "ab" if f"{what}_{star}_{unit}" in self.values)

    def put(self, key: str, value: Measured | Range | None, origin: DustOrigin, note: str = "") -> None:
        """Take an input unless it is there already."""
        if value is None or key in self.values:
            return
        name, unit, low, high = INPUTS[key]
        self.values[key] = Uncertain(name, value, low, high, key in _BY_FACTOR)
        self.told[key] = DustInput(key, name, value, unit, origin, note)


def gather(record: SystemRecord, solution: Solution | None, overrides: DustOverrides) -> DustInputs:
    """Put together what the dust follows from.

    Parameters
    ----------
    record : SystemRecord
        Stars (Lsun, Msun, Msun/yr, km/s), dust rule (au, km/s) and distance (pc).
    solution : Solution or None
        For the separation at periastron.
    overrides : DustOverrides
        Values in place of the catalogue's, in the units of their keys.

    Returns
    -------
    DustInputs
        Values by key.

    Raises
    ------
    InputRefused
        If a condensation temperature cannot be, or an opacity is half given.
    NotFound
        If a table of opacities is unknown.

    Notes
    -----
    Accuracy: nothing is computed here but a periastron distance. Source: project convention; what is assumed
    says so.
    """
    found = DustInputs(record, {}, {}, _opacity(overrides.opacity))
    for key, value in overrides.inputs.items():
        found.put(key, value, "option")
    found.put(VEIL, overrides.extinction_k_mag, "option")
    for star, word in ((record.system.star_a, "a"), (record.system.star_b, "b")):
        if not found.has("luminosity_lsun"):
            found.put(f"luminosity_{word}_lsun", star.luminosity_lsun, "catalogue")
        if not found.has("mass_msun"):
            found.put(f"mass_{word}_msun", star.mass_msun, "catalogue")
        found.put(f"mass_loss_{word}_msun_yr", star.mass_loss_msun_yr, "catalogue")
        found.put(f"wind_speed_{word}_kms", star.wind_speed_kms, "catalogue")
    _put_star_temperature(found)
    found.put("distance_pc", distance_of(record), _distance_origin(record))
    _put_separation(found, solution)
    found.size_known = _has_size(record, solution)
    _put_flow(found)
    _put_assumed(found, overrides.opacity)
    _check_condensation(found)
    return found


def require_light(inputs: DustInputs) -> tuple[str, ...]:
    """Keys of the stars' light; it is an error when there is none.

    Parameters
    ----------
    inputs : DustInputs
        Luminosities, Lsun.

    Returns
    -------
    tuple of str
        Keys.

    Raises
    ------
    Conflict
        If no luminosity is known.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    keys = inputs.light_keys()
    if keys:
        if len(keys) == 1 and keys[0] != "luminosity_lsun":
            lacking = "B" if "_a_" in keys[0] else "A"
            inputs.notes.append(f"the luminosity of star {lacking} is not known: its light is left out")
        return keys
    name = inputs.record.system.name
    raise Conflict(
        f"Nothing is known of the light that warms the dust of {name}.",
        why="Grain temperatures follow from the luminosity of the stars, and the catalogue has none.",
        hint=f'campaign dust "{name}" --luminosity "(3.0±0.5)e5 Lsun"; to keep it: campaign system change '
        f'"{name}" --luminosity-a "(3.0±0.5)e5 Lsun".',
        code="luminosity-unknown",
    )


def _opacity(asked: DustOpacity) -> Opacity:
    if asked.table is not None:
        return opacity_named(asked.table)
    if asked.kappa_cm2_g is not None:
        if asked.wavelength_um is None or asked.index is None:
            raise InputRefused(
                "The opacity is half given.",
                why="A power law needs its value, the wavelength of it, and its index.",
                hint='For example --opacity "1000±300 cm2/g at 10 um, index 1.2".',
                code="opacity-refused",
            )
        return power_law_opacity(asked.kappa_cm2_g.value, asked.wavelength_um, asked.index)
    return opacity_named(DEFAULT_OPACITY)


def _put_star_temperature(found: DustInputs) -> None:
    """The temperature of the star that gives most of the light."""
    stars = [record for record in (found.record.system.star_a, found.record.system.star_b)]
    known = [star for star in stars if star.temperature_k is not None]
    if known:
        brightest = max(known, key=lambda star: star.luminosity_lsun.value if star.luminosity_lsun else 0.0)
        found.put("star_temperature_k", brightest.temperature_k, "catalogue", f"star {brightest.star}")


def _distance_origin(record: SystemRecord) -> DustOrigin:
    return "catalogue" if record.system.distance_pc is not None else "derived"


def _put_separation(found: DustInputs, solution: Solution | None) -> None:
    """The separation when dust begins: that of the rule, else the smallest one."""
    rule = found.record.rule
    given = found.told.get("separation_au")
    if given is not None:
        found.critical_separation_au = given.value
    elif rule is not None and rule.critical_separation_au is not None:
        found.critical_separation_au = rule.critical_separation_au
        found.put("separation_au", rule.critical_separation_au, "dust rule", "when dust begins")
    elif solution is not None:
        from campaign.studies.derived import derive

        near = [v for v in derive(found.record, solution) if v.quantity == "separation at periastron"]
        if near:
            found.put("separation_au", near[0].value, "derived", "at periastron")
        elif solution.a_au is not None and solution.eccentricity is not None:
            nearest = solution.a_au.value * (1.0 - solution.eccentricity.value)
            found.put("separation_au", Measured(nearest), "derived", "at periastron")


def _has_size(record: SystemRecord, solution: Solution | None) -> bool:
    """Whether the semi-major axis in au is given, or follows from something."""
    if solution is None or not isinstance(solution.period_d, Measured):
        return False
    from campaign.studies.ephemeris import semi_major_axis

    return semi_major_axis(record, solution, solution.period_d.value) is not None


def _put_flow(found: DustInputs) -> None:
    rule, winds = (
        found.record.rule,
        (found.values.get("wind_speed_a_kms"), found.values.get("wind_speed_b_kms")),
    )
    if rule is not None and rule.flow_speed_kms is not None:
        found.put("flow_speed_kms", rule.flow_speed_kms, "dust rule")
    if "flow_speed_kms" not in found.values and winds[0] is not None:
        assert isinstance(winds[0].value, Measured)
        found.put("flow_speed_kms", winds[0].value, "assumed", "the wind of star A")


def _put_assumed(found: DustInputs, asked: DustOpacity) -> None:
    found.put("condensation_k", _CONDENSATION, "assumed", "carbon in winds (memory)")
    found.put(
        "emissivity_index", Measured(1.2, 0.1, 0.1), "assumed", "slopes of published carbons, 3 to 10 um"
    )
    size = found.opacity.grain_radius_um or 0.1
    found.put("grain_radius_um", Measured(size, 0.5 * size, size), "assumed", "to a factor of two")
    found.put("grain_density_g_cm3", Measured(1.8, 0.2, 0.2), "assumed", "amorphous carbon")
    found.put("dust_share", Measured(0.01, 0.01 * 2.0 / 3.0, 0.02), "assumed", "to a factor of three")
    _put_opacity_error(found, asked)


def _put_opacity_error(found: DustInputs, asked: DustOpacity) -> None:
    """The opacity as a factor of its table, with its error."""
    given = asked.kappa_cm2_g
    if asked.error is not None:
        size: float | None = asked.error
        origin: DustOrigin = "option"
    elif given is not None:
        size = None if given.sigma is None else given.sigma / given.value
        origin = "option"
    else:
        size, origin = found.opacity.sigma_ln, "assumed"
    note = "as a factor; between published carbons" if origin == "assumed" else "as a factor"
    found.put("opacity_factor", Measured(1.0, *_factor(size)), origin, note)


def _factor(share: float | None) -> tuple[float | None, float | None]:
    """Errors below and above of a factor that is known to within 1 + share."""
    return (None, None) if share is None else (share / (1.0 + share), share)


def _check_condensation(found: DustInputs) -> None:
    """Let physics refuse a temperature at which nothing condenses."""
    value = found.values["condensation_k"].value
    hottest = value.high if isinstance(value, Range) else value.value
    condensation_radius_au(1.0, [hottest, value.low if isinstance(value, Range) else value.value])


def with_keys(inputs: DustInputs, keys: Iterable[str]) -> tuple[str, ...]:
    """The keys that are inputs here, marked as used.

    Parameters
    ----------
    inputs : DustInputs
        Values in the units of their keys.
    keys : iterable of str
        Keys of inputs or of the results of a fit.

    Returns
    -------
    tuple of str
        The same keys, each once.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    wanted = tuple(dict.fromkeys(keys))
    inputs.used.update(key for key in wanted if key in inputs.values)
    return wanted


def narrowed(inputs: DustInputs, **changed: Measured | Range) -> dict[str, Uncertain]:
    """The values with some of them replaced.

    Parameters
    ----------
    inputs : DustInputs
        Values in the units of their keys.
    **changed : Measured or Range
        By key, in the same unit.

    Returns
    -------
    dict of str to Uncertain
        A copy.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    return inputs.values | {key: replace(inputs.values[key], value=value) for key, value in changed.items()}
