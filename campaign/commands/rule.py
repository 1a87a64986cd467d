"""``campaign rule``: how dust production follows from the orbit."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import measured, plain, plain_number
from campaign.errors import UsageRefused

System = Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")]
Text = str | None
_CENTURY_D = 36_525.0


def set_(
    system: System,
    separation: Annotated[
        Text, option("--separation", "VALUE", 'Dust is made while nearer than this: "6.4±0.8 au".')
    ] = None,
    condensation_distance: Annotated[
        Text, option("--condensation-distance", "VALUE", 'From collision to condensation: "100±20 au".')
    ] = None,
    flow_speed: Annotated[
        Text, option("--flow-speed", "VALUE", 'Speed on that way: "2000±200 km/s".')
    ] = None,
    maximum_lag: Annotated[
        Text, option("--maximum-lag", "VALUE", "Days from periastron to maximum, with --separation.")
    ] = None,
    phase_onset: Annotated[
        Text, option("--phase-onset", "VALUE", "In periods from periastron; negative before.")
    ] = None,
    phase_maximum: Annotated[Text, option("--phase-maximum", "VALUE", "In periods.")] = None,
    phase_end: Annotated[Text, option("--phase-end", "VALUE", "In periods.")] = None,
    lag_onset: Annotated[
        Text, option("--lag-onset", "VALUE", 'From periastron: "-40±10 d"; negative before.')
    ] = None,
    lag_maximum: Annotated[Text, option("--lag-maximum", "VALUE", "In days.")] = None,
    lag_end: Annotated[Text, option("--lag-end", "VALUE", "In days.")] = None,
    learned: Annotated[
        bool, typer.Option("--learned", help="From the confirmed episodes.", show_default=False)
    ] = False,
    scatter: Annotated[Text, option("--scatter", "DAYS", "Cycle-to-cycle scatter of all three.")] = None,
    scatter_onset: Annotated[Text, option("--scatter-onset", "DAYS", "Of the onset alone.")] = None,
    scatter_maximum: Annotated[Text, option("--scatter-maximum", "DAYS", "Of the maximum alone.")] = None,
    scatter_end: Annotated[Text, option("--scatter-end", "DAYS", "Of the end alone.")] = None,
    note: Annotated[Text, option("--note", "TEXT", "Where it comes from.")] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Say how onset, maximum and end follow from the orbit.

    \b
    For example:
      campaign rule set "Lantern 3" --separation "6.4±0.8 au" \\
        --condensation-distance "100±20 au" --flow-speed "2000±200 km/s"
      campaign rule set "Lantern 3" --phase-onset -0.02±0.01 --phase-end 0.1±0.02
      campaign rule set "Lantern 3" --lag-onset "-40±10 d" --lag-end "200±20 d"
      campaign rule set "Lantern 3" --learned
    """
    from campaign.model.systems import DustRule
    from campaign.studies import rules as study

    spread = {
        name: _scatter_d(name, text, scatter)
        for name, text in (("onset", scatter_onset), ("maximum", scatter_maximum), ("end", scatter_end))
    }
    kind, fields = _kind(
        {
            "separation": (separation, condensation_distance, flow_speed, maximum_lag),
            "phase": (phase_onset, phase_maximum, phase_end),
            "lag": (lag_onset, lag_maximum, lag_end),
            "learned": (True if learned else None,),
        }
    )
    rule = DustRule(
        id=0,
        system_id=0,
        kind=kind,  # type: ignore[arg-type]
        scatter_onset_d=spread["onset"],
        scatter_maximum_d=spread["maximum"],
        scatter_end_d=spread["end"],
        note=plain(note, "--note", 2000) or "",
        **_values(kind, fields),
    )
    common.report(
        study.set_rule(common.database(db), common.stamp(observer), system, rule), json=json, quiet=quiet
    )


def show(system: System, db: DbOption = None, json: JsonOption = False) -> None:
    """A system's dust rule."""
    from campaign.output import systems as output
    from campaign.studies import rules as study

    name, rule = study.show_rule(common.database(db), system)
    if json:
        common.write_json(output.rule_json(name, rule, common.now_iso()))
    else:
        output.render_rule(common.stdout_screen(), name, rule)


def _kind(given: dict[str, tuple[Any, ...]]) -> tuple[str, tuple[Any, ...]]:
    chosen = [kind for kind, values in given.items() if any(value is not None for value in values)]
    if len(chosen) == 1:
        return chosen[0], given[chosen[0]]
    raise UsageRefused(
        "Which rule is it?"
        if not chosen
        else f"Options of {len(chosen)} rules are mixed: {', '.join(chosen)}.",
        why="A system has one rule: separation, phase, lag or learned.",
        hint='For example: campaign rule set "Lantern 3" --separation "6.4±0.8 au"',
    )


def _values(kind: str, fields: tuple[Any, ...]) -> dict[str, Any]:
    if kind == "separation":
        critical, distance, speed, lag = fields
        return {
            "critical_separation_au": measured(critical, "au", "--separation", low=0.0, low_open=True),
            "condensation_distance_au": measured(distance, "au", "--condensation-distance", low=0.0),
            "flow_speed_kms": measured(
                speed, "kms", "--flow-speed", low=0.0, low_open=True, high=299_792.458
            ),
            "maximum_lag_d": measured(lag, "d", "--maximum-lag", low=-_CENTURY_D, high=_CENTURY_D),
        }
    if kind == "learned":
        return {}
    unit, low, high = ("", -0.5, 1.0) if kind == "phase" else ("d", -_CENTURY_D, _CENTURY_D)
    return {
        stage: measured(text, unit, f"--{kind}-{stage}", low=low, high=high)
        for stage, text in zip(("onset", "maximum", "end"), fields, strict=True)
    }


def _scatter_d(stage: str, own: str | None, shared: str | None) -> float | None:
    """The scatter of one stage: its own where it has one, else that of all three."""
    text, name = (own, f"--scatter-{stage}") if own is not None else (shared, "--scatter")
    return plain_number(text, "d", name, low=0.0, high=_CENTURY_D)
