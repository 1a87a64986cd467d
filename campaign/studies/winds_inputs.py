"""What the wind collision of a system is computed from: the catalogue, and what stands in its place."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from campaign.errors import Conflict
from campaign.model.compositions import MIXES, Composition, mix_for
from campaign.model.measured import Covariance, Limit, Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution, Star, StarName, System
from campaign.model.winds import InputOrigin, WindInput, WindOverrides
from campaign.studies.instants import moment_of
from campaign.studies.periastron import periastron_epoch
from campaign.studies.rows import SPOKEN, ForecastRow, build_row, take_size

# Fields of a star that matter: words, unit, option without its star, and the values that they can have.
STAR_FIELDS: dict[str, tuple[str, str, str, tuple[float, float]]] = {
    "mass_loss_msun_yr": ("mass loss", "Msun/yr", "mass-loss", (1e-13, float("inf"))),
    "wind_speed_kms": ("wind speed", "km/s", "wind-speed", (1.0, 299_792.458)),
    "radius_rsun": ("radius", "Rsun", "radius", (1e-4, float("inf"))),
}
RATIO, BETA, FLARE = "momentum_ratio_b_over_a", "beta", "flare_deg"
OTHER_DOMAINS: dict[str, tuple[float, float]] = {
    RATIO: (1e-9, float("inf")),
    BETA: (0.01, 20.0),
    FLARE: (0.0, 180.0),
}
ORBIT_UNITS: dict[str, str] = {
    "epoch": "d", "period_d": "d", "eccentricity": "", "omega_b_deg": "deg", "a_au": "au",
    "a_arcsec": "arcsec", "distance_pc": "pc", "k_a_kms": "km/s", "k_b_kms": "km/s",
    "inclination_deg": "deg", "mass_a_msun": "Msun", "mass_b_msun": "Msun",
}  # fmt: skip
OPTIONS_LABEL = "options"


@dataclass(slots=True)
class WindInputs:
    """Everything that goes in, by name; ``row`` is None without any orbit."""

    record: SystemRecord
    solution: Solution | None
    row: ForecastRow | None
    size: tuple[str, ...]
    values: dict[str, Measured]
    origins: dict[str, InputOrigin]
    compositions: dict[StarName, tuple[Composition, InputOrigin]]
    weaker: StarName = "B"
    notes: list[str] = field(default_factory=list)

    @property
    def stronger(self) -> StarName:
        return "A" if self.weaker == "B" else "B"

    @property
    def has_dates(self) -> bool:
        """Whether periastron can be dated."""
        return self.row is not None and "periastron" in self.row.events

    def has(self, *names: str) -> bool:
        known = {} if self.row is None else self.row.values
        return all(name in self.values or name in known for name in names)

    def momentum_needs(self) -> tuple[str, ...]:
        """Names of what the momentum ratio follows from."""
        if RATIO in self.values:
            return (RATIO,)
        return tuple(f"{name}_{star}" for star in "ab" for name in ("mass_loss_msun_yr", "wind_speed_kms"))

    def measured(self, name: str) -> Measured:
        """One input with its errors."""
        if name in self.values:
            return self.values[name]
        assert self.row is not None
        return Measured(*self.row.values[name])

    def names(self) -> tuple[str, ...]:
        """Every input that any result may rest on."""
        orbit = () if self.row is None else tuple(n for n in self.row.values if n in ORBIT_UNITS)
        return (*self.values, *orbit)


def spoken(name: str) -> str:
    """How a person calls an input.

    Parameters
    ----------
    name : str
        Of ``WindInputs``; the unit is in it.

    Returns
    -------
    str
        Words.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    if name[:-2] in STAR_FIELDS:
        return f"{STAR_FIELDS[name[:-2]][0]} of star {name[-1].upper()}"
    others = {RATIO: "momentum ratio", BETA: "exponent of the velocity law", FLARE: "flare of the shocks"}
    if name.startswith("fraction_"):
        _, star, symbol = name.split("_")
        return f"{symbol} in the wind of star {star.upper()}"
    return others.get(name) or SPOKEN[name]


def gather(record: SystemRecord, solution: Solution | None, overrides: WindOverrides) -> WindInputs:
    """Put together what the wind collision follows from.

    Parameters
    ----------
    record : SystemRecord
        The system; mass loss in Msun/yr, wind speed in km/s, radius in Rsun.
    solution : Solution or None
        Elements; None when there are none.
    overrides : WindOverrides
        What stands in for the catalogue.

    Returns
    -------
    WindInputs
        Values by name, with which star has the weaker wind.

    Raises
    ------
    Conflict
        If the momentum ratio follows from nothing: mass loss or wind speed of a star is missing.

    Notes
    -----
    Accuracy: nothing is computed here but which momentum is the larger. Source: project convention.
    """
    changed, orbit = _overridden(record, solution, overrides)
    row, size = _row(changed, orbit, overrides)
    inputs = WindInputs(changed, orbit, row, size, {}, {}, {})
    for star, given in ((changed.system.star_a, overrides.star_a), (changed.system.star_b, overrides.star_b)):
        _take_star(inputs, star, given)
    for name, value in ((RATIO, overrides.momentum_ratio_b_over_a), (BETA, overrides.beta)):
        if value is not None:
            inputs.values[name], inputs.origins[name] = value, "option"
    if overrides.flare_deg is not None:
        inputs.values[FLARE], inputs.origins[FLARE] = overrides.flare_deg, "option"
    inputs.compositions = {
        "A": _composition(inputs, changed.system.star_a, overrides.composition_a),
        "B": _composition(inputs, changed.system.star_b, overrides.composition_b),
    }
    _require_momenta(inputs)
    inputs.weaker = "B" if nominal_ratio_b_over_a(inputs) <= 1.0 else "A"
    _note_unused(inputs, overrides)
    return inputs


def nominal_ratio_b_over_a(inputs: WindInputs) -> float:
    """Momentum of B's wind over that of A's, at the stated values.

    Parameters
    ----------
    inputs : WindInputs
        With the ratio itself, or both winds in Msun/yr and km/s.

    Returns
    -------
    float
        Dimensionless; above 1 when B has the stronger wind.

    Raises
    ------
    InputRefused
        If a value is zero or negative.

    Notes
    -----
    Accuracy: exact. Source: definition.
    """
    from campaign.physics.domain import positive
    from campaign.physics.windmomentum import momentum_ratio, wind_momentum

    if RATIO in inputs.values:
        return float(positive(inputs.values[RATIO].value, "momentum ratio", "0.03"))
    of = {
        star: wind_momentum(
            inputs.values[f"mass_loss_msun_yr_{star}"].value, inputs.values[f"wind_speed_kms_{star}"].value
        )
        for star in "ab"
    }
    return float(momentum_ratio(of["b"], of["a"]))


def told_inputs(inputs: WindInputs, used: set[str]) -> tuple[WindInput, ...]:
    """The inputs that results rest on, with where each comes from.

    Parameters
    ----------
    inputs : WindInputs
        Values in the units of their names.
    used : set of str
        Names that some result rests on.

    Returns
    -------
    tuple of WindInput
        In the order of stars, options and orbit.

    Notes
    -----
    Accuracy: as typed. Source: project convention.
    """
    told = []
    for name in inputs.names():
        if name not in used:
            continue
        unit = STAR_FIELDS[name[:-2]][1] if name[:-2] in STAR_FIELDS else ORBIT_UNITS.get(name, "")
        if name == FLARE:
            unit = "deg"
        told.append(
            WindInput(spoken(name), inputs.measured(name), unit, inputs.origins.get(name, "catalogue"))
        )
    return tuple(told)


def _overridden(
    record: SystemRecord, solution: Solution | None, overrides: WindOverrides
) -> tuple[SystemRecord, Solution | None]:
    system = replace(
        record.system,
        star_a=replace(record.system.star_a, **overrides.star_a),
        star_b=replace(record.system.star_b, **overrides.star_b),
        **overrides.system,
    )
    changes = dict(overrides.solution)
    if overrides.epoch is not None:
        changes |= _epoch(record.system, solution, overrides)
    if changes:
        base = solution or Solution(0, system.id, OPTIONS_LABEL, epoch_cycle=0)
        solution = replace(base, covariance=_left_of(base.covariance, changes), **changes)
    # The dust rule plays no part here.
    return replace(record, system=system, rule=None, episodes=()), solution


def _epoch(system: System, solution: Solution | None, overrides: WindOverrides) -> dict[str, Any]:
    """A periastron in place of the epoch, with the cycle that it has by the count of the solution."""
    assert overrides.epoch is not None
    moment = moment_of(overrides.epoch, system)
    cycle = 0
    if solution is not None and solution.epoch is not None:
        period = overrides.solution.get("period_d") or solution.period_d
        earlier = periastron_epoch(solution, period.value) if isinstance(period, Measured) else None
        if earlier is not None and isinstance(period, Measured):
            cycle = round((moment.bmjd_tdb - earlier) / period.value)
        cycle += solution.epoch_cycle or 0
    return {"epoch": moment, "epoch_marks": "periastron", "epoch_cycle": cycle}


def _left_of(covariance: Covariance | None, changed: Mapping[str, Any]) -> Covariance | None:
    """What stays of a covariance when some of its elements are replaced."""
    if covariance is None:
        return None
    kept = [i for i, name in enumerate(covariance.names) if name not in changed]
    if len(kept) < 2:
        return None
    matrix = tuple(tuple(covariance.matrix[i][j] for j in kept) for i in kept)
    return Covariance(tuple(covariance.names[i] for i in kept), matrix)


def _row(
    record: SystemRecord, solution: Solution | None, overrides: WindOverrides
) -> tuple[ForecastRow | None, tuple[str, ...]]:
    if solution is None:
        return None, ()
    row = build_row(record, solution)
    size = take_size(row)
    if solution.inclination_deg is not None and "inclination_deg" not in row.values:
        tilt = solution.inclination_deg
        row.values["inclination_deg"] = (tilt.value, tilt.minus, tilt.plus)
    if {"period_d", "eccentricity"} & set(size) - row.values.keys():
        return row, ()
    return row, size


def _take_star(inputs: WindInputs, star: Star, given: Mapping[str, Any]) -> None:
    for name in STAR_FIELDS:
        value = getattr(star, name)
        if value is not None:
            key = f"{name}_{star.star.lower()}"
            inputs.values[key] = value
            inputs.origins[key] = "option" if name in given else "catalogue"


def _composition(
    inputs: WindInputs, star: Star, given: Composition | None
) -> tuple[Composition, InputOrigin]:
    found: tuple[Composition, InputOrigin]
    if given is not None:
        found = (given, "option")
    elif (mix := mix_for(star.spectral_type)) is not None:
        found = (mix, "spectral type")
    else:
        found = (MIXES["solar"], "assumed")
        inputs.notes.append(
            f"no spectral type of star {star.star}: solar composition assumed; give --composition-"
            f"{star.star.lower()} WC, or mass fractions"
        )
    for symbol, fraction in found[0].mass_fractions:
        if fraction.error_known:
            key = f"fraction_{star.star.lower()}_{symbol}"
            inputs.values[key], inputs.origins[key] = fraction, found[1]
    return found


def _require_momenta(inputs: WindInputs) -> None:
    if RATIO in inputs.values:
        return
    missing = [name for name in inputs.momentum_needs() if name not in inputs.values]
    if not missing:
        return
    name = inputs.record.system.name
    lacking = ", ".join(spoken(each) for each in missing)
    options = " ".join(f'{_option(each)} "{_FORMS[each]}"' for each in missing)
    raise Conflict(
        f"The winds of {name} cannot be compared.",
        why=f"The {lacking} {'is' if len(missing) == 1 else 'are'} not known.",
        hint=f'Keep it: campaign system change "{name}" {options}; or add the options to this command; or '
        "give the ratio itself, B over A: --momentum-ratio 0.03±0.01",
        code="wind-unknown",
        details={"missing": missing, "options": [_option(each) for each in missing]},
    )


# Accepted forms, of the size that such a star may have.
_FORMS = {
    "mass_loss_msun_yr_a": "(2.0±0.5)e-5 Msun/yr",
    "wind_speed_kms_a": "2300±100 km/s",
    "mass_loss_msun_yr_b": "(8±3)e-7 Msun/yr",
    "wind_speed_kms_b": "2600±150 km/s",
}


def _option(name: str) -> str:
    return f"--{STAR_FIELDS[name[:-2]][2]}-{name[-1]}"


def _note_unused(inputs: WindInputs, overrides: WindOverrides) -> None:
    """Say which of the given options change nothing."""
    source = None if inputs.row is None else inputs.row.a_source
    options = {
        "--distance": "distance_pc" in overrides.system and source != "angle and distance",
        "--mass-a": "mass_msun" in overrides.star_a and source != "masses",
        "--mass-b": "mass_msun" in overrides.star_b and source != "masses",
        "--k-a": "k_a_kms" in overrides.solution and source != "velocities",
        "--k-b": "k_b_kms" in overrides.solution and source != "velocities",
    }
    unused = [name for name, is_unused in options.items() if is_unused]
    if unused:
        came = "its semi-major axis is not known" if source is None else f"its size comes from: {source}"
        inputs.notes.append(f"{' and '.join(unused)} change{'s' if len(unused) == 1 else ''} nothing: {came}")
    period = None if inputs.solution is None else inputs.solution.period_d
    if isinstance(period, Limit):
        inputs.notes.append("the period is only a limit: no dates")
