"""``campaign solution``: orbital elements, published or fitted."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import (
    elements_instant,
    measured,
    one_of,
    period,
    plain,
    semi_major_axis,
    whole_number,
)
from campaign.errors import InputRefused, UsageRefused

System = Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")]
Text = str | None


def add(
    system: System,
    label: Annotated[Text, option("--label", "LABEL", "A short name; else 'solution N'.")] = None,
    period_text: Annotated[
        Text, option("--period", "VALUE", '"3127.5±0.3 d", ">32 yr" or "28..32 yr".')
    ] = None,
    epoch: Annotated[Text, option("--epoch", "INSTANT", '"BJD 2461234.2±0.5"; BJD_TDB unless said.')] = None,
    epoch_marks: Annotated[
        Text, option("--epoch-marks", "EVENT", "periastron, 'A in front', 'B in front', onset or maximum.")
    ] = None,
    eccentricity: Annotated[Text, option("--eccentricity", "VALUE", "At least 0 and below 1.")] = None,
    omega: Annotated[Text, option("--omega", "VALUE", 'Argument of periastron, "143±2 deg".')] = None,
    omega_of: Annotated[Text, option("--omega-of", "A|B", "The star that omega belongs to.")] = None,
    inclination: Annotated[Text, option("--inclination", "VALUE", "0 to 180 deg.")] = None,
    node: Annotated[
        Text, option("--node", "VALUE", "Where B recedes from A; deg, North through East.")
    ] = None,
    k_a: Annotated[Text, option("--k-a", "VALUE", "Velocity semi-amplitude of star A, km/s.")] = None,
    k_b: Annotated[Text, option("--k-b", "VALUE", "Velocity semi-amplitude of star B, km/s.")] = None,
    gamma: Annotated[Text, option("--gamma", "VALUE", "Systemic velocity, km/s, positive receding.")] = None,
    a: Annotated[Text, option("--a", "VALUE", 'Semi-major axis: "16±0.2 au" or "7.9±0.3 mas".')] = None,
    correlation: Annotated[
        list[str],
        typer.Option(
            "--correlation",
            metavar="X,Y=R",
            help="Correlation of two elements, as epoch,period=-0.9; may be repeated.",
            show_default=False,
        ),
    ] = [],  # noqa: B006 - typer copies it
    source: Annotated[Text, option("--source", "TEXT", "Who published it and where.")] = None,
    data_until: Annotated[Text, option("--data-until", "INSTANT", "Until when its data reached.")] = None,
    published_cycle: Annotated[
        Text, option("--published-cycle", "N", "The source's own cycle of the epoch.")
    ] = None,
    note: Annotated[Text, option("--note", "TEXT", "Anything worth knowing.")] = None,
    adopt: Annotated[bool, typer.Option("--adopt", help="Forecast from it.", show_default=False)] = False,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Add a set of orbital elements to a system.

    \b
    For example:
      campaign solution add "Lantern 3" --period "3127.5±0.3 d" \\
        --epoch "BJD 2461234.2±0.5" --eccentricity 0.71±0.02 \\
        --omega "143±2 deg" --omega-of A --source "..." --adopt
    """
    from campaign.model.systems import EPOCH_MARKS, Solution
    from campaign.studies import solutions as study

    star = one_of(omega_of, ("A", "B"), "--omega-of")
    if omega is not None and star is None:
        raise UsageRefused(
            "Whose omega is it?",
            why="The arguments of the two stars differ by 180 deg; the wrong one swaps the conjunctions.",
            hint="Add --omega-of A or --omega-of B; papers on spectra usually give that of the star seen.",
        )
    a_au, a_arcsec = semi_major_axis(a)
    draft = Solution(
        id=0,
        system_id=0,
        label=plain(label, "--label", 80) or "",
        period_d=period(period_text),
        epoch_marks=one_of(epoch_marks, EPOCH_MARKS, "--epoch-marks") or "periastron",  # type: ignore[arg-type]
        eccentricity=measured(eccentricity, "", "--eccentricity", low=0.0, high=1.0, high_open=True),
        omega_deg=measured(omega, "deg", "--omega", low=-360.0, high=360.0),
        omega_of=star,  # type: ignore[arg-type]
        inclination_deg=measured(inclination, "deg", "--inclination", low=0.0, high=180.0),
        node_deg=measured(node, "deg", "--node", low=-360.0, high=360.0),
        k_a_kms=measured(k_a, "kms", "--k-a", low=0.0, low_open=True),
        k_b_kms=measured(k_b, "kms", "--k-b", low=0.0, low_open=True),
        gamma_kms=measured(gamma, "kms", "--gamma"),
        a_au=a_au,
        a_arcsec=a_arcsec,
        source=plain(source, "--source", 400) or "",
        note=plain(note, "--note", 2000) or "",
    )
    kept = study.add_solution(
        common.database(db),
        common.stamp(observer),
        system,
        draft,
        elements_instant(epoch, "--epoch"),
        elements_instant(data_until, "--data-until"),
        None
        if published_cycle is None
        else whole_number(published_cycle, "--published-cycle", 1_000_000, 11),
        adopt,
        tuple(_correlation(text) for text in correlation),
    )
    common.report(kept, json=json, quiet=quiet)


def adopt(
    system: System,
    labels: Annotated[
        list[str],
        typer.Argument(metavar="LABEL[=WEIGHT]...", help="One label, or several each with its weight."),
    ],
    instead: Annotated[
        bool, typer.Option("--instead", help="In place of what is adopted now.", show_default=False)
    ] = False,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Forecast from one solution, or from several with weights.

    \b
    For example:
      campaign solution adopt "Lantern 3" "visual 2025" --instead
      campaign solution adopt "Lantern 3" "visual 2025=0.7" "solution 1=0.3"
    """
    from campaign.studies import solutions as study

    weights = dict(_weighted(text) for text in labels)
    kept = study.adopt_solutions(common.database(db), common.stamp(observer), system, weights, instead)
    common.report(kept, json=json, quiet=quiet)


def list_(system: System, db: DbOption = None, json: JsonOption = False) -> None:
    """The solutions of a system side by side."""
    from campaign.output import systems as output
    from campaign.studies import systems as study

    record = study.load_record(common.database(db), system)
    if json:
        common.write_json(output.solutions_json(record, common.now_iso()))
    else:
        output.render_solutions(common.stdout_screen(), record)


def show(
    system: System,
    label: Annotated[str | None, typer.Argument(metavar="[LABEL]", help="Else the adopted one.")] = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """One solution, element by element, and what follows from it."""
    from campaign.output import systems as output
    from campaign.studies import systems as study
    from campaign.studies.derived import derive

    record = study.load_record(common.database(db), system)
    solution = study.require_solution(record, label)
    derived = derive(record, solution)
    if json:
        common.write_json(output.solution_json(record, solution, derived, common.now_iso()))
    else:
        output.render_solution(common.stdout_screen(), record, solution, derived)


def _published(cycle: str | None) -> int | None:
    return None if cycle is None else whole_number(cycle, "--published-cycle", 1_000_000, 11)


def _weighted(text: str) -> tuple[str, float | None]:
    from campaign.reading.numbers import read_number

    label, equals, weight = text.rpartition("=")
    if not equals:
        return text, None
    return label, read_number(weight, "weight")


_ELEMENTS = {
    "period": "period_d", "epoch": "epoch", "eccentricity": "eccentricity", "omega": "omega_deg",
    "inclination": "inclination_deg", "node": "node_deg", "k-a": "k_a_kms", "k-b": "k_b_kms",
    "gamma": "gamma_kms", "a": "a",
}  # fmt: skip


def _correlation(text: str) -> tuple[str, str, float]:
    """``epoch,period=-0.9`` as field names and a number."""
    from campaign.reading.numbers import read_number

    names, equals, number = text.partition("=")
    first, comma, second = (part.strip().casefold() for part in names.partition(","))
    if not equals or not comma or first not in _ELEMENTS or second not in _ELEMENTS or first == second:
        raise InputRefused(
            f"The correlation '{text}' is not understood.",
            why=f"It names two of: {', '.join(_ELEMENTS)}.",
            hint="For example --correlation epoch,period=-0.9.",
            code="correlation-refused",
        )
    value = read_number(number, "--correlation")
    if not -1.0 < value < 1.0:
        raise InputRefused(
            f"A correlation of {value:g} cannot be.",
            why="It lies between -1 and 1.",
            hint="For example --correlation epoch,period=-0.9.",
            code="out-of-range",
        )
    return _ELEMENTS[first], _ELEMENTS[second], value
