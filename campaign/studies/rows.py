"""What one solution and one dust rule say, as the numbers that a forecast is drawn from."""

from __future__ import annotations

from dataclasses import dataclass, field

from campaign.errors import InputRefused
from campaign.model.forecasts import EVENT_NAMES, EventName
from campaign.model.measured import Limit, Measured, Range
from campaign.model.records import SystemRecord
from campaign.model.systems import DustRule, Solution

# Every uncertain quantity of a forecast, and the values that it can have.
DOMAINS: dict[str, tuple[float, float]] = {
    "epoch": (-float("inf"), float("inf")),
    "period_d": (1e-6, float("inf")),
    "eccentricity": (0.0, 1.0 - 1e-9),
    "omega_b_deg": (-float("inf"), float("inf")),
    "a_au": (1e-9, float("inf")),
    "a_arcsec": (1e-12, float("inf")),
    "distance_pc": (1e-3, float("inf")),
    "k_a_kms": (1e-9, float("inf")),
    "k_b_kms": (1e-9, float("inf")),
    "inclination_deg": (0.0, 180.0),
    "mass_a_msun": (1e-6, float("inf")),
    "mass_b_msun": (1e-6, float("inf")),
    "onset": (-float("inf"), float("inf")),
    "maximum": (-float("inf"), float("inf")),
    "end": (-float("inf"), float("inf")),
    "critical_separation_au": (1e-9, float("inf")),
    "condensation_distance_au": (0.0, float("inf")),
    "flow_speed_kms": (1e-3, 299_792.458),
    "maximum_lag_d": (-float("inf"), float("inf")),
}
NO_RULE = "no dust rule"
SCATTERS: tuple[EventName, ...] = ("onset", "maximum", "end")

# How a person calls each quantity in a note.
SPOKEN: dict[str, str] = {
    "epoch": "epoch",
    "period_d": "period",
    "eccentricity": "eccentricity",
    "omega_b_deg": "omega",
    "a_au": "semi-major axis",
    "a_arcsec": "semi-major axis in arcsec",
    "distance_pc": "distance",
    "k_a_kms": "K of star A",
    "k_b_kms": "K of star B",
    "inclination_deg": "inclination",
    "mass_a_msun": "mass of star A",
    "mass_b_msun": "mass of star B",
    "onset": "onset offset",
    "maximum": "maximum offset",
    "end": "end offset",
    "critical_separation_au": "critical separation",
    "condensation_distance_au": "condensation distance",
    "flow_speed_kms": "flow speed",
    "maximum_lag_d": "lag of the maximum",
}

# Where the semi-major axis in au comes from, in order of preference, and what each way needs.
A_SOURCES: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("given", ("a_au",)),
    ("angle and distance", ("a_arcsec", "distance_pc")),
    ("velocities", ("k_a_kms", "k_b_kms", "inclination_deg")),
    ("masses", ("mass_a_msun", "mass_b_msun")),
)


@dataclass(slots=True)
class ForecastRow:
    """One system with one solution (or none) and its rule, ready to be drawn from.

    ``values`` holds (value, minus, plus) of each known quantity, with None for an unknown error.
    ``events`` maps each event that can be dated to the quantities that it needs. ``omega_reference_deg``
    is the omega of star B by which all solutions of a system count the cycles of their conjunctions.
    """

    record: SystemRecord
    solution: Solution | None
    rule: DustRule | None
    epoch_cycle: int
    values: dict[str, tuple[float, float | None, float | None]] = field(default_factory=dict)
    events: dict[EventName, tuple[str, ...]] = field(default_factory=dict)
    a_source: str | None = None
    omega_reference_deg: float | None = None
    period_is_range: bool = False
    period_limit: Limit | None = None
    notes: list[str] = field(default_factory=list)
    assumptions: list[str] = field(default_factory=list)
    _unknown: dict[EventName, tuple[str, ...]] = field(default_factory=dict, repr=False)

    @property
    def mark(self) -> str:
        return self.solution.epoch_marks if self.solution is not None else "periastron"

    def missing_errors(self, event: EventName, cycle: int) -> list[str]:
        """Names of the quantities whose unknown error leaves this date without an interval."""
        missing = []
        for name in self._without_error(event):
            if name == "period_d" and cycle == self.epoch_cycle and not self._needs_period(event):
                continue
            missing.append(SPOKEN[name])
        return missing

    def _without_error(self, event: EventName) -> tuple[str, ...]:
        known = self._unknown.get(event)
        if known is None:
            needed = ((name, self.values[name]) for name in self.events.get(event, ()))
            known = tuple(name for name, (_, minus, plus) in needed if minus is None or plus is None)
            self._unknown[event] = known
        return known

    def _needs_period(self, event: EventName) -> bool:
        """Whether the period enters even in the cycle of the epoch: as a share of it, or in the size."""
        lagged = event in SCATTERS and self.rule is not None and self.rule.kind == "lag"
        return event != self.mark and not (lagged and self.mark == "periastron")


def _take(row: ForecastRow, name: str, measured: Measured | None) -> bool:
    if measured is None:
        return False
    row.values[name] = (measured.value, measured.minus, measured.plus)
    return True


def _orbit(row: ForecastRow, solution: Solution) -> None:
    period = solution.period_d
    if isinstance(period, Measured):
        _take(row, "period_d", period)
    elif isinstance(period, Range):
        half = 0.5 * (period.high - period.low)
        row.values["period_d"] = (period.low + half, half, half)
        row.period_is_range = True
    elif isinstance(period, Limit):
        row.period_limit = period
    if solution.epoch is not None:
        row.values["epoch"] = (solution.epoch.bmjd_tdb, solution.epoch.minus_d, solution.epoch.plus_d)
    _take(row, "eccentricity", solution.eccentricity)
    if solution.omega_deg is not None and solution.omega_of is not None:
        turn = 180.0 if solution.omega_of == "A" else 0.0
        omega = solution.omega_deg
        row.values["omega_b_deg"] = ((omega.value + turn) % 360.0, omega.minus, omega.plus)


def _semi_major_axis(row: ForecastRow, solution: Solution) -> tuple[str, ...]:
    """Fill in what the semi-major axis is computed from; the names needed, or none."""
    system = row.record.system
    distance = system.distance_pc
    if distance is None and system.parallax_mas is not None and solution.a_arcsec is not None:
        distance = distance_of(row.record)
    offers: dict[str, Measured | None] = {
        "a_au": solution.a_au,
        "a_arcsec": solution.a_arcsec,
        "distance_pc": distance,
        "k_a_kms": solution.k_a_kms,
        "k_b_kms": solution.k_b_kms,
        "inclination_deg": solution.inclination_deg,
        "mass_a_msun": system.star_a.mass_msun,
        "mass_b_msun": system.star_b.mass_msun,
    }
    for source, names in A_SOURCES:
        if all(offers[name] is not None for name in names):
            for name in names:
                _take(row, name, offers[name])
            row.a_source = source
            extra = ("period_d", "eccentricity") if source == "velocities" else ("period_d",)
            return names + (extra if source in ("velocities", "masses") else ())
    return ()


def take_size(row: ForecastRow) -> tuple[str, ...]:
    """Fill in what the semi-major axis of a row's orbit is computed from, whatever its rule.

    Parameters
    ----------
    row : ForecastRow
        A row with a solution; its values gain the inputs, in the units of their names.

    Returns
    -------
    tuple of str
        Names of the quantities that the size rests on; empty when nothing gives it.

    Notes
    -----
    Accuracy: nothing is computed here. Source: the order of ``A_SOURCES``.
    """
    return () if row.solution is None else _semi_major_axis(row, row.solution)


def distance_of(record: SystemRecord) -> Measured | None:
    """Distance of a system in pc: the catalogued one, else from its parallax.

    Parameters
    ----------
    record : SystemRecord
        The system; parallax in mas.

    Returns
    -------
    Measured or None
        Distance in pc with asymmetric errors; None when the system has neither.

    Notes
    -----
    Accuracy: a parallax with a relative error above 5 % is converted through a posterior with the
    exponentially decreasing space density prior, never by plain inversion.

    Source: Bailer-Jones 2015, PASP 127, 994.
    """
    system = record.system
    if system.distance_pc is not None or system.parallax_mas is None:
        return system.distance_pc
    parallax = system.parallax_mas
    if parallax.sigma is None:
        return Measured(1000.0 / parallax.value) if parallax.value > 0 else None
    from campaign.physics.distance import distance_from_parallax

    distance = distance_from_parallax(parallax.value, parallax.sigma)
    return Measured(distance.median_pc, distance.minus_pc, distance.plus_pc)


def build_row(record: SystemRecord, solution: Solution | None) -> ForecastRow:
    """Read one solution and the system's rule into a row.

    Parameters
    ----------
    record : SystemRecord
        System, solutions, rule and episodes.
    solution : Solution or None
        The solution to forecast from; None to rest on the episodes alone.

    Returns
    -------
    ForecastRow
        Values with errors (units in their names), events that can be dated, notes.

    Raises
    ------
    InputRefused
        If the rule is of an unknown kind.

    Notes
    -----
    Accuracy: nothing is computed here except omega_B = omega_A + 180 deg.

    Source: conventions of the project (DEVELOPERS.md).
    """
    rule = record.rule
    row = ForecastRow(record, solution, rule, _epoch_cycle(record, solution))
    if solution is not None:
        _orbit(row, solution)
    if row.period_limit is not None or not {"epoch", "period_d"} <= row.values.keys():
        _explain_dateless(row)
        if solution is not None and (rule is None or rule.kind != "learned"):
            return row
    base: tuple[str, ...] = ("epoch", "period_d")
    dated = base[0] in row.values and base[1] in row.values
    has_direction = {"eccentricity", "omega_b_deg"} <= row.values.keys()
    if dated and row.mark in ("A in front", "B in front") and has_direction:
        base = (*base, "eccentricity", "omega_b_deg")
        row.notes.append(f"periastron derived from the epoch of '{row.mark}' with e and omega")
    elif dated and row.mark != "periastron":
        # Only what the epoch marks recurs with a known date.
        row.events[row.mark] = base  # type: ignore[index]
        row.notes.append(f"the epoch marks '{row.mark}' and periastron cannot be derived from it")
        if rule is None or rule.kind != "learned":
            return row
        dated = False
    if dated:
        row.events["periastron"] = base
        if has_direction:
            both = tuple(dict.fromkeys((*base, "eccentricity", "omega_b_deg")))
            row.events["A in front"] = row.events["B in front"] = both
            if row.mark in ("A in front", "B in front"):
                row.events[row.mark] = ("epoch", "period_d")  # type: ignore[index]
        else:
            row.notes.append("no e and omega: conjunctions are not forecast")
    _apply_rule(row, base if dated else ())
    return row


def _epoch_cycle(record: SystemRecord, solution: Solution | None) -> int:
    if solution is None or solution.epoch_cycle is None:
        return 0
    return solution.epoch_cycle


def _explain_dateless(row: ForecastRow) -> None:
    if row.solution is None:
        return
    if row.period_limit is not None:
        word = "longer than" if row.period_limit.side == "above" else "shorter than"
        row.notes.append(f"the period is only known to be {word} {row.period_limit.bound / 365.25:.4g} yr")
    elif "period_d" not in row.values:
        row.notes.append("the solution has no period")
    else:
        row.notes.append("the solution has no epoch")


def _apply_rule(row: ForecastRow, base: tuple[str, ...]) -> None:
    rule = row.rule
    if rule is None:
        row.notes.append(f"{NO_RULE}: periastron alone" if base else NO_RULE)
        return
    if rule.kind == "learned":
        return  # dated from the episodes, see campaign.studies.learned
    if not base:
        return
    if rule.kind in ("phase", "lag"):
        for event, offset in (("onset", rule.onset), ("maximum", rule.maximum), ("end", rule.end)):
            if _take(row, event, offset):
                row.events[event] = (*base, event)  # type: ignore[index]
    elif rule.kind == "separation":
        _apply_separation(row, rule, base)
    else:
        raise InputRefused(
            f"The dust rule of {row.record.system.name} is of an unknown kind.",
            why=f"'{rule.kind}' is none of phase, lag, separation, learned.",
            hint="Set it again with: campaign rule set.",
            code="unknown-rule",
        )
    if any(row.events.get(event) for event in SCATTERS) and not _scatter_stated(rule):
        row.assumptions.append("no cycle-to-cycle scatter stated: taken as none")


def _scatter_stated(rule: DustRule) -> bool:
    return any(s is not None for s in (rule.scatter_onset_d, rule.scatter_maximum_d, rule.scatter_end_d))


def _apply_separation(row: ForecastRow, rule: DustRule, base: tuple[str, ...]) -> None:
    solution = row.solution
    assert solution is not None
    axis = _semi_major_axis(row, solution)
    if not axis or "eccentricity" not in row.values:
        lacking = "eccentricity" if "eccentricity" not in row.values else "semi-major axis in au"
        row.notes.append(f"rule 'separation' needs the {lacking}: no onset forecast")
        return
    if not _take(row, "critical_separation_au", rule.critical_separation_au):
        row.notes.append("rule 'separation' has no critical separation: no onset forecast")
        return
    window = (*base, "eccentricity", *axis, "critical_separation_au")
    delay: tuple[str, ...] = ()
    if _take(row, "condensation_distance_au", rule.condensation_distance_au):
        if _take(row, "flow_speed_kms", rule.flow_speed_kms):
            delay = ("condensation_distance_au", "flow_speed_kms")
        else:
            row.values.pop("condensation_distance_au")
    if not delay:
        row.assumptions.append("no condensation distance and flow speed: dust appears without delay")
    needed = tuple(dict.fromkeys((*window, *delay)))
    row.events["onset"] = row.events["end"] = needed
    peak = ("maximum_lag_d",) if _take(row, "maximum_lag_d", rule.maximum_lag_d) else delay
    row.events["maximum"] = tuple(dict.fromkeys((*window, *peak)))


def ordered_events(row: ForecastRow) -> tuple[EventName, ...]:
    """The row's datable events in the fixed order of the trade."""
    return tuple(event for event in EVENT_NAMES if event in row.events)
