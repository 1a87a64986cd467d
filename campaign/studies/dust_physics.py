"""Grains in the light of a system: temperatures, condensation, the way of the gas, radiation pressure."""

from __future__ import annotations

import shlex
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from campaign.model.dust import CondensationAt, DustPhysics, DustPush, GrainAt, Pushed
from campaign.model.measured import Measured, Range
from campaign.model.propagated import Propagated
from campaign.model.systems import DustRule
from campaign.physics import condensation, radiationpressure, windmomentum
from campaign.physics.dustwindow import travel_delay_d
from campaign.physics.grains import grain_temperature_k
from campaign.studies.dust_inputs import DustInputs, require_light, with_keys
from campaign.studies.propagation import Draws, Propagator

FloatArray = NDArray[np.float64]
Quantity = Callable[[Draws], FloatArray]
# A quantity and the keys that it rests on make a result.
Tell = Callable[..., Propagated]

DISTANCES_AU = (10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1000.0, 2000.0)
_ROWS = 5
_GRAINS = ("emissivity_index", "grain_radius_um")
_WINDS = ("mass_loss_a_msun_yr", "mass_loss_b_msun_yr", "wind_speed_a_kms", "wind_speed_b_kms")


def grains_in_light(
    inputs: DustInputs, distances_au: tuple[float, ...], draws: int, seed: int
) -> DustPhysics:
    """Everything that follows without a look at photometry.

    Parameters
    ----------
    inputs : DustInputs
        Values in the units of their keys.
    distances_au : tuple of float
        Where grain temperatures are told, au; the usual ones when empty.
    draws, seed : int
        Of the random draws (dimensionless).

    Returns
    -------
    DustPhysics
        Temperatures in K, lengths in au, delay in days, speeds in km/s.

    Raises
    ------
    Conflict
        If no luminosity is known.

    Notes
    -----
    Accuracy: optically thin; the stars count as one light at their centre of light, which is a few per cent
    of a condensation radius. Errors from draws, about 1 % of themselves.

    Source: see ``campaign.physics.condensation``, ``radiationpressure`` and ``windmomentum``.
    """
    light_keys = require_light(inputs)
    propagate = Propagator(inputs.values, draws, seed)
    light = _Sum(light_keys)

    def tell(quantity: Quantity, *keys: str) -> Propagated:
        return propagate(quantity, with_keys(inputs, keys))

    def warmth(r_au: float) -> Quantity:
        return lambda d: grain_temperature_k(light(d), r_au, d["emissivity_index"], d["grain_radius_um"])

    grains = tuple(GrainAt(r, tell(warmth(r), *light_keys, *_GRAINS)) for r in distances_au or DISTANCES_AU)
    radius_keys = (*light_keys, *_GRAINS, "condensation_k")
    way = _Way(inputs, light)
    flow = inputs.has("flow_speed_kms")
    if flow and inputs.told["flow_speed_kms"].origin == "assumed":
        inputs.notes.append(
            "the flow is taken as fast as the wind of star A; the shocked gas can be slower, between the two "
            "winds: give --flow-speed"
        )
    if not flow:
        inputs.notes.append("no flow speed: no delay; give --flow-speed, or the wind speed of star A")
    return DustPhysics(
        luminosity_lsun=tell(light, *light_keys),
        grains=grains,
        condensation=_rows(inputs, light, way, draws, seed),
        condensation_radius_au=tell(way.radius, *radius_keys),
        stagnation_from_a_au=tell(way.stagnation_from_a, *_WINDS, "separation_au") if way.known else None,
        travel_au=tell(way.travel, *radius_keys, *way.keys),
        delay_d=tell(way.delay, *radius_keys, *way.keys, "flow_speed_kms") if flow else None,
        launch_speed_kms=_launch(inputs, tell),
        pushes=_pushes(inputs, light, way, tell),
        rule_line=rule_line(inputs, propagate(way.travel, (*radius_keys, *way.keys))) if flow else None,
    )


class _Sum:
    """The sum of some inputs."""

    def __init__(self, keys: tuple[str, ...]) -> None:
        self.keys = keys

    def __call__(self, d: Draws) -> FloatArray:
        return np.asarray(sum(d[key] for key in self.keys))


class _Way:
    """From the stagnation point to the condensation radius."""

    def __init__(self, inputs: DustInputs, light: _Sum) -> None:
        self._light = light
        lights = ("luminosity_a_lsun", "luminosity_b_lsun")
        self.known = inputs.has(*_WINDS, "separation_au")
        self._has_lights = inputs.has(*lights)
        self.keys: tuple[str, ...] = (*_WINDS, "separation_au") if self.known else ()
        self._strong = "a"
        if self.known:
            stated = {key: np.array([inputs.values[key].nominal]) for key in _WINDS}
            self._strong = "a" if float(self._eta(stated)[0]) <= 1.0 else "b"
            if self._strong == "b":
                inputs.notes.append(
                    "star B has the stronger wind: the gas streams away on the side of star A"
                )
            if not self._has_lights:
                inputs.notes.append("the centre of light is put midway between the stars")
        else:
            lacking = "the separation" if inputs.has(*_WINDS) else "mass loss and wind speed of both stars"
            inputs.notes.append(
                f"without {lacking} the stagnation point is not known: the way of the gas is counted from "
                "the stars"
            )

    @staticmethod
    def _eta(d: Draws) -> FloatArray:
        """Momentum of the wind of B over that of A."""
        a, b = (
            windmomentum.wind_momentum(d[f"mass_loss_{s}_msun_yr"], d[f"wind_speed_{s}_kms"]) for s in "ab"
        )
        return windmomentum.momentum_ratio(b, a)

    def radius(self, d: Draws) -> FloatArray:
        return condensation.condensation_radius_au(
            self._light(d), d["condensation_k"], d["emissivity_index"], d["grain_radius_um"]
        )

    def stagnation_from_a(self, d: Draws) -> FloatArray:
        _, from_a = windmomentum.stagnation_fractions(self._eta(d))
        return from_a * d["separation_au"]

    def travel(self, d: Draws) -> FloatArray:
        radius = self.radius(d)
        if not self.known:
            return radius
        gap = d["separation_au"]
        from_strong = self.stagnation_from_a(d)
        lights = [d["luminosity_a_lsun"], d["luminosity_b_lsun"]] if self._has_lights else [1.0, 1.0]
        if self._strong == "b":
            from_strong, lights = gap - from_strong, lights[::-1]
        return condensation.travel_distance_au(radius, gap, from_strong, *lights)

    def delay(self, d: Draws) -> FloatArray:
        return np.asarray(travel_delay_d(self.travel(d), d["flow_speed_kms"]))


def _rows(inputs: DustInputs, light: _Sum, way: _Way, draws: int, seed: int) -> tuple[CondensationAt, ...]:
    """Condensation at temperatures spread over the range, each exact."""
    from campaign.studies.dust_inputs import narrowed

    value = inputs.values["condensation_k"].value
    temperatures = (
        np.linspace(value.low, value.high, _ROWS) if isinstance(value, Range) else np.array([value.value])
    )
    star = inputs.values.get("star_temperature_k")
    if star is None:
        inputs.notes.append(
            "no temperature of a star is known: that its light is ultraviolet, where grains absorb with "
            "Q = 1, is taken for granted"
        )
    else:
        inputs.used.add("star_temperature_k")
    keys = (*light.keys, *_GRAINS, "condensation_k")
    found = []
    for t in temperatures.tolist():
        propagate = Propagator(narrowed(inputs, condensation_k=Measured(t, 0.0, 0.0)), draws, seed)
        far = None
        if star is not None:
            stated = {key: np.array([inputs.values[key].nominal]) for key in keys}
            index = stated["emissivity_index"]
            far = float(
                condensation.power_law_condensation_radius_au(light(stated), t, star.nominal, index)[0]
            )
        delay = None
        if inputs.has("flow_speed_kms"):
            delay = propagate(way.delay, (*keys, *way.keys, "flow_speed_kms"))
        found.append(CondensationAt(t, propagate(way.radius, keys), delay, far))
    return tuple(found)


def _launch(inputs: DustInputs, tell: Tell) -> Propagated | None:
    key = _launch_key(inputs)
    if key is None:
        return None
    return tell(lambda d: d[key], key)


def _launch_key(inputs: DustInputs) -> str | None:
    return next((key for key in ("launch_speed_kms", "flow_speed_kms") if inputs.has(key)), None)


def _pushes(inputs: DustInputs, light: _Sum, way: _Way, tell: Tell) -> tuple[DustPush, ...]:
    launch, masses = _launch_key(inputs), inputs.mass_keys()
    if launch is None or not masses:
        if not masses:
            inputs.notes.append("no mass of a star is known: no ratio of radiation pressure to gravity")
        return ()
    if len(masses) == 1 and masses[0] != "mass_msun":
        lacking = "B" if "_a_" in masses[0] else "A"
        inputs.notes.append(f"the mass of star {lacking} is not known: its pull is left out")
    pull = _Sum(masses)
    given = inputs.has("kappa_pr_cm2_g")
    kappa_keys = ("kappa_pr_cm2_g",) if given else ("grain_radius_um", "grain_density_g_cm3")
    radius_keys = (*light.keys, *_GRAINS, "condensation_k")

    def kappa(d: Draws) -> FloatArray:
        if given:
            return d["kappa_pr_cm2_g"]
        return radiationpressure.geometric_opacity_cm2_g(d["grain_radius_um"], d["grain_density_g_cm3"], 1.0)

    def push(kind: Pushed, share: Callable[[Draws], FloatArray | float], extra: tuple[str, ...]) -> DustPush:
        def opacity(d: Draws) -> FloatArray:
            return np.asarray(kappa(d) * share(d))

        def beta(d: Draws) -> FloatArray:
            return radiationpressure.radiation_pressure_ratio(light(d), pull(d), opacity(d))

        def speed(d: Draws) -> FloatArray:
            return radiationpressure.terminal_speed_kms(d[launch], way.radius(d), pull(d), beta(d))

        keys = (*kappa_keys, *extra)
        return DustPush(
            kind,
            tell(opacity, *keys),
            tell(beta, *light.keys, *masses, *keys),
            tell(speed, *radius_keys, *masses, *keys, launch),
        )

    return (
        push("free grains", lambda d: 1.0, ()),
        push("grains with their gas", lambda d: d["dust_share"], ("dust_share",)),
    )


def rule_line(inputs: DustInputs, travel_au: Propagated) -> str | None:
    """The command that gives the system the delay found here as its rule ``separation``.

    Parameters
    ----------
    inputs : DustInputs
        Critical separation (au) and flow speed (km/s).
    travel_au : Propagated
        Way of the gas, au.

    Returns
    -------
    str or None
        Ready to type; None without a critical separation.

    Notes
    -----
    Accuracy: three digits. Source: the form that ``campaign rule set`` reads.
    """
    flow = _as_measured(inputs.told["flow_speed_kms"].value)
    if inputs.critical_separation_au is None:
        inputs.notes.append(
            "a rule 'separation' needs the separation below which dust is made: give --separation to have "
            "the line that sets it"
        )
        return None
    critical = _as_measured(inputs.critical_separation_au)
    rule = inputs.record.rule
    if not inputs.size_known:
        inputs.notes.append(
            "the rule of that line dates no dust before the size of the orbit is known: give the adopted "
            "solution --a, or the system what it follows from (masses, or a distance with a in arcsec)"
        )
    if rule is not None and rule.kind != "separation":
        inputs.notes.append(f"the line for the dust rule would take the place of the rule '{rule.kind}'")
    if travel_au.lo68 is None or travel_au.hi68 is None or travel_au.median is None:
        way = Measured(travel_au.value or 0.0)
    else:
        middle = travel_au.median
        way = Measured(middle, middle - travel_au.lo68, travel_au.hi68 - middle)
    words = [
        "campaign", "rule", "set", inputs.record.system.name, "--separation", f"{_typed(critical)} au",
        "--condensation-distance", f"{_typed(way)} au", "--flow-speed", f"{_typed(flow)} km/s",
        *_kept_of(inputs.record.rule),
    ]  # fmt: skip
    return " ".join(_quoted(word) for word in words)


def _kept_of(rule: DustRule | None) -> list[str]:
    """What a rule in force says beside the delay, so that setting it again loses nothing."""
    if rule is None or rule.kind != "separation":
        return []
    words = []
    if rule.maximum_lag_d is not None:
        words += ["--maximum-lag", f"{_typed(rule.maximum_lag_d)} d"]
    for stage in ("onset", "maximum", "end"):
        scatter = getattr(rule, f"scatter_{stage}_d")
        if scatter is not None:
            words += [f"--scatter-{stage}", f"{scatter:g} d"]
    return words


def _as_measured(value: Measured | Range) -> Measured:
    """A range as its middle and standard deviation, for what reads no range."""
    if isinstance(value, Measured):
        return value
    spread = (value.high - value.low) / float(np.sqrt(12.0))
    return Measured(0.5 * (value.low + value.high), spread, spread)


def _typed(value: Measured) -> str:
    """A value with its errors in a form that the program reads."""
    if value.minus is None or value.plus is None:
        return f"{value.value:.6g}"
    if value.is_symmetric:
        return f"{value.value:.6g}±{value.plus:.3g}"
    smallest = max(min(value.minus, value.plus), 1e-12)
    places = max(0, 1 - int(np.floor(np.log10(smallest))))
    return f"{value.value:.{places}f} +{value.plus:.{places}f} -{value.minus:.{places}f}"


def _quoted(word: str) -> str:
    """In double quotes where a shell needs any and they are enough; else as the shell itself quotes."""
    if shlex.quote(word) == word:
        return word
    return f'"{word}"' if not set(word) & set('"$`\\!') else shlex.quote(word)
