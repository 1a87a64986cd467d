"""``campaign shells``: when shells were launched, and where they will be."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, NamedTuple

import typer

from campaign.commands import common
from campaign.commands.common import AsOfOption, DbOption, JsonOption, option
from campaign.commands.parsing import clock_instant, count, measured, one_of, plain_number
from campaign.errors import InputRefused, UsageRefused

if TYPE_CHECKING:
    from campaign.model.instants import TypedInstant
    from campaign.model.measured import Measured
    from campaign.model.shellquestion import ShellRadius

Text = str | None
_QUANTITIES = {
    "spacing": "spacing_arcsec",
    "motion": "proper_motion_mas_yr",
    "speed": "speed_kms",
    "period": "period_yr",
    "distance": "distance_pc",
}
_LIGHT_KMS = 299_792.458
# One instant in two forms: a scale or the place at which light arrives may differ by minutes.
_SAME_INSTANT_D = 0.01
_SHOWN = {
    "spacing": "1.20±0.05 arcsec",
    "motion": "80±5 mas/yr",
    "speed": "1800±100 km/s",
    "period": "8.6±0.1 yr",
    "distance": "2.1±0.2 kpc",
}
_SPACING = option("--spacing", "VALUE", 'Of one period, "1.20±0.05 arcsec".')
_MOTION = option("--motion", "VALUE", 'Proper motion of a shell, "80±5 mas/yr".')
_SPEED = option("--speed", "VALUE", 'Of the shells, "1800±100 km/s".')
_DISTANCE = option("--distance", "VALUE", '"2.1±0.2 kpc".')
_PERIOD = option("--period", "VALUE", '"8.6±0.1 yr"; the unit is needed.')
_SAMPLE = typer.Option("--sample", help="A system of the invented sample, no database.", show_default=False)
_SOLUTION = option("--solution", "LABEL", "Ephemeris from this one; else from what is adopted.")


def _repeated(flag: str, metavar: str, text: str) -> Any:
    return typer.Option(flag, metavar=metavar, help=text, show_default=False)


def date(
    system: Annotated[
        Text, typer.Argument(metavar="SYSTEM", help="Name or alias.", show_default=False)
    ] = None,
    radius: Annotated[
        list[str],
        _repeated(
            "--radius",
            "VALUE",
            'Youngest first, "0.36±0.02 arcsec"; with index and date "3=5.5±0.1 arcsec on 2031-04-07".',
        ),
    ] = [],  # noqa: B006 - typer copies it
    spacing: Annotated[Text, _SPACING] = None,
    motion: Annotated[Text, _MOTION] = None,
    speed: Annotated[Text, _SPEED] = None,
    distance: Annotated[Text, _DISTANCE] = None,
    period: Annotated[Text, _PERIOD] = None,
    on: Annotated[Text, option("--on", "INSTANT", "When the image with the radii was taken.")] = None,
    correlation: Annotated[
        list[str],
        _repeated("--correlation", "X,Y=R", "Of two stated errors, as speed,distance=0.95; may be repeated."),
    ] = [],  # noqa: B006 - typer copies it
    feature: Annotated[
        Text, option("--feature", "WORD", "What the radii belong to: limb, ring or plume.")
    ] = None,
    inclination: Annotated[
        Text, option("--inclination", "ANGLE", "Of a ring's plane to the sky, or a plume out of it.")
    ] = None,
    measured_at: Annotated[Text, option("--measured-at", "WORD", "Typed radii: edge or peak.")] = None,
    edge_offset: Annotated[
        Text, option("--edge-offset", "VALUE", 'How much larger edges are than peaks, "0.05±0.02 arcsec".')
    ] = None,
    plate_scale_error: Annotated[
        Text, option("--plate-scale-error", "VALUE", 'Shared by an image, "0.5 %".')
    ] = None,
    launch_radius: Annotated[
        Text, option("--launch-radius", "ANGLE", "Where dust condenses, 0.05±0.01 arcsec: for acceleration.")
    ] = None,
    missing: Annotated[
        Text, option("--missing", "P", "Prior probability that a shell went unseen; else 0.1.")
    ] = None,
    scale_errors: Annotated[
        bool,
        typer.Option(
            "--scale-errors", help="Scale the errors by the scatter of the fit.", show_default=False
        ),
    ] = False,
    solution: Annotated[Text, _SOLUTION] = None,
    sample: Annotated[bool, _SAMPLE] = False,
    known_at: Annotated[Text, option("--known-at", "INSTANT", "Hide entries made after it.")] = None,
    draws: Annotated[Text, option("--draws", "N", "Random draws; else 20000.")] = None,
    seed: Annotated[Text, option("--seed", "N", "Of the random draws; else 1.")] = None,
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """Ages and launch dates of shells from their radii or spacing.

    \b
    For example:
      campaign shells date "Kettle 7" --sample   # from the radii logged of it
      campaign shells date --spacing "1.20±0.05 arcsec" \\
        --speed "1800±100 km/s" --distance "2.1±0.2 kpc"
      campaign shells date --radius "0.83±0.03 arcsec" \\
        --radius "2.27±0.03 arcsec" --radius "3.75±0.04 arcsec" \\
        --period "28.1±0.1 yr" --on 2023-07-31
    """
    from campaign.model.shellquestion import ShellQuestion
    from campaign.output import shells_document
    from campaign.studies import date_shells as study

    stated = _stated(spacing=spacing, motion=motion, speed=speed, distance=distance, period=period)
    if system is None:
        _refuse_without_system(sample=sample, db=db, known_at=known_at, solution=solution)
        if not stated and not radius:
            raise UsageRefused(
                "There is nothing to date shells from.",
                why="Neither a system of the catalogue nor a radius or a spacing is given.",
                hint='For example campaign shells date "Kettle 7" --sample, or --spacing "1.20±0.05 arcsec" '
                '--speed "1800±100 km/s" --distance "2.1±0.2 kpc".',
                code="shells-unstated",
            )
    asked = clock_instant(as_of, "--as-of")
    question = ShellQuestion(
        stated=stated,
        radii=_radii(radius, on, measured_at, plate_scale_error, feature),
        correlations=_correlations(correlation),
        feature=one_of(feature, ("limb", "ring", "plume"), "--feature"),  # type: ignore[arg-type]
        inclination_deg=measured(inclination, "deg", "--inclination", low=0.0, high=180.0),
        edge_offset_arcsec=measured(edge_offset, "arcsec", "--edge-offset"),
        launch_radius_arcsec=measured(launch_radius, "arcsec", "--launch-radius", low=0.0, low_open=True),
        scale_errors=scale_errors,
        missing_prior=_prior(missing),
        draws=count(draws, "--draws", 100, 1_000_000),
        seed=count(seed, "--seed", 0, 2**32 - 1),
    )
    result = study.date_shells(
        question,
        _subject(system, sample, db, known_at, asked, solution),
        now=common.now_utc(),
        as_of=asked,
    )
    if json:
        common.write_json(shells_document.dating_json(result))
    else:
        from campaign.output.shells import render_dating

        render_dating(common.stdout_screen(), result)


def _stated(**texts: Text) -> dict[Any, Measured]:
    """The quantities that were typed, by their names and in the units of these."""
    from campaign.reading.shells import LEAST_ARCSEC, MOST_ARCSEC, check_size, read_with_unit

    found: dict[Any, Measured] = {}
    domains: dict[str, tuple[str, float, float]] = {
        "spacing": ("arcsec", LEAST_ARCSEC, MOST_ARCSEC),
        "motion": ("mas/yr", 1e-6, 3.6e7),
        "speed": ("kms", 1e-3, _LIGHT_KMS),
        "distance": ("pc", 1e-3, 1e6),
    }
    for word, text in texts.items():
        if text is None:
            continue
        name, flag, shown = _QUANTITIES[word], f"--{word}", _SHOWN[word]
        if word == "period":
            longest_d = 3.6525e9
            value = read_with_unit(text, "d", flag, shown, low=0.0, low_open=True, high=longest_d)
            check_size(value, text, flag, shown, least=0.01, most=longest_d)
            found[name] = value.scaled(1.0 / 365.25)
            continue
        unit, least, most = domains[word]
        read = measured(
            text, unit, flag, low=0.0, low_open=True, high=most, high_open=word == "speed", shown=shown
        )
        assert read is not None
        found[name] = check_size(read, text, flag, shown, least=least, most=most)
    return found


def _radii(
    texts: list[str], on: Text, measured_at: Text, plate_scale_error: Text, feature: Text
) -> tuple[ShellRadius, ...]:
    from campaign.model.shellquestion import ShellRadius
    from campaign.reading.shells import read_shell_radii

    edge = one_of(measured_at, ("edge", "peak"), "--measured-at")
    scale = plain_number(
        plate_scale_error, "fraction", "--plate-scale-error", low=0.0, high=1.0, shown="0.5 %"
    )
    typed = read_shell_radii(texts)
    common_instant = clock_instant(on, "--on")
    found: list[ShellRadius] = []
    images: list[_TypedImage] = []
    for each in typed:
        if each.instant is not None and common_instant is not None:
            raise InputRefused(
                "The date of an image is given twice.",
                why="--on is the date of all radii, and a radius has one of its own.",
                hint="Leave --on out, or the dates with the radii.",
                code="image-unclear",
            )
        instant = each.instant or common_instant
        image = None if instant is None else _image_of(instant, images)
        found.append(
            ShellRadius(
                radius_arcsec=each.radius_arcsec,
                index=each.index,
                bmjd_tdb=None if image is None else image.bmjd_tdb,
                bmjd_sigma_d=None if image is None else image.sigma_d,
                image="" if image is None else image.text,
                measured_at=edge,  # type: ignore[arg-type]
                plate_scale_error=scale,
                feature=feature,
            )
        )
    return tuple(found)


class _TypedImage(NamedTuple):
    """One image of typed radii: when it was taken, how surely, and how its date was first typed."""

    bmjd_tdb: float
    sigma_d: float
    text: str


def _image_of(instant: TypedInstant, known: list[_TypedImage]) -> _TypedImage:
    """The image of a date: one already named, perhaps in another form, or a new one."""
    from campaign.studies.instants import axis_instant

    new = _TypedImage(axis_instant(instant), max(instant.minus_d or 0.0, instant.plus_d or 0.0), instant.text)
    for image in known:
        # A day typed without a time holds every instant of it; a month or a year does not name one image.
        day = any(_SAME_INSTANT_D < each.sigma_d <= 0.5 for each in (image, new))
        if abs(image.bmjd_tdb - new.bmjd_tdb) <= _SAME_INSTANT_D + (0.5 if day else 0.0):
            return image
    known.append(new)
    return new


def _correlations(texts: list[str]) -> dict[tuple[Any, Any], float]:
    """Each pair once, in whichever order it was typed."""
    found: dict[tuple[Any, Any], float] = {}
    for text in texts:
        (first, second), value = _correlation(text)
        if found.keys() & {(first, second), (second, first)}:
            raise InputRefused(
                f"The correlation '{text}' is given twice.",
                why="One number says how far two errors are one.",
                hint="For example --correlation speed,distance=0.95, once.",
                code="correlation-refused",
            )
        found[first, second] = value
    return found


def _correlation(text: str) -> tuple[Any, float]:
    """``speed,distance=0.95`` as names of two quantities and a number."""
    from campaign.reading.numbers import read_number

    names, equals, number = text.partition("=")
    first, comma, second = (part.strip().casefold() for part in names.partition(","))
    if not equals or not comma or first not in _QUANTITIES or second not in _QUANTITIES or first == second:
        raise InputRefused(
            f"The correlation '{text}' is not understood.",
            why=f"It names two of: {', '.join(_QUANTITIES)}.",
            hint="For example --correlation speed,distance=0.95.",
            code="correlation-refused",
        )
    value = read_number(number, "--correlation", "speed,distance=0.95")
    if not -1.0 <= value <= 1.0:
        raise InputRefused(
            f"A correlation of {value:g} cannot be.",
            why="It lies between -1 and 1.",
            hint="For example --correlation speed,distance=0.95.",
            code="out-of-range",
        )
    return (_QUANTITIES[first], _QUANTITIES[second]), value


def _prior(text: Text) -> float | None:
    return plain_number(
        text, "fraction", "--missing", low=0.0, high=1.0, low_open=True, high_open=True, shown="0.1"
    )


def _refuse_without_system(**given: Any) -> None:
    for name, value in given.items():
        if value:
            flag = f"--{name.replace('_', '-')}"
            raise UsageRefused(
                f"{flag} needs a system.",
                why="Without one nothing is read from a catalogue.",
                hint=f'For example campaign shells date "Kettle 7" {flag} ..., or leave {flag} out.',
                code="system-needed",
            )


def _subject(
    system: Text, sample: bool, db: Text, known_at: Text, as_of: TypedInstant | None, solution: Text
) -> Any:
    """What the catalogue, or the sample, knows of the system; None without one."""
    from campaign.studies import shell_subject

    if system is None:
        return None
    if sample:
        common.refuse_with_sample(db, known_at=known_at)
        return shell_subject.sample_subject(system, as_of, solution)
    entered = clock_instant(known_at, "--known-at")
    return shell_subject.load_subject(common.database(db), system, entered, as_of, solution)


def expect(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    on: Annotated[Text, option("--on", "INSTANT", "When; else now.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "And then, with the episodes up to it.")] = None,
    field: Annotated[Text, option("--field", "ANGLE", "Full width of the field of view, 28arcsec.")] = None,
    resolution: Annotated[
        Text, option("--resolution", "ANGLE", "Resolution or inner working angle, 0.1arcsec.")
    ] = None,
    outer_radius: Annotated[
        Text, option("--outer-radius", "ANGLE", "Largest radius at which shells are still seen.")
    ] = None,
    back: Annotated[
        Text, option("--back", "N", "Past episodes shown; else those in the field, or 10.")
    ] = None,
    motion: Annotated[Text, _MOTION] = None,
    speed: Annotated[Text, _SPEED] = None,
    distance: Annotated[Text, _DISTANCE] = None,
    solution: Annotated[Text, _SOLUTION] = None,
    sample: Annotated[bool, _SAMPLE] = False,
    known_at: Annotated[Text, option("--known-at", "INSTANT", "Hide entries made after it.")] = None,
    draws: Annotated[Text, option("--draws", "N", "Random draws; else 20000.")] = None,
    seed: Annotated[Text, option("--seed", "N", "Of the random draws; else 1.")] = None,
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """Where shells will be, which are seen, and how warm they are.

    \b
    For example:
      campaign shells expect "Kettle 7" --sample --on 2031-08-01
      campaign shells expect "Kettle 7" --sample --on 2029-01-01 \\
        --until 2033-01-01 --field 28arcsec --resolution 0.1arcsec
    """
    from campaign.output import shells_document
    from campaign.studies import expect_shells as study

    asked = clock_instant(as_of, "--as-of")
    question = study.ask(
        _subject(system, sample, db, known_at, asked, solution),
        now=common.now_utc(),
        as_of=asked,
        on=clock_instant(on, "--on"),
        until=clock_instant(until, "--until"),
        stated=_stated(motion=motion, speed=speed, distance=distance),
        field_arcsec=_angle(field, "--field", "28 arcsec"),
        resolution_arcsec=_angle(resolution, "--resolution", "0.1 arcsec"),
        outer_radius_arcsec=_angle(outer_radius, "--outer-radius", "10 arcsec"),
        back=count(back, "--back", 0, 10_000),
        draws=count(draws, "--draws", 100, 1_000_000),
        seed=count(seed, "--seed", 0, 2**32 - 1),
    )
    result = study.expect_shells(*question)
    if json:
        common.write_json(shells_document.expectation_json(result))
    else:
        from campaign.output.shells_expected import render_expectation

        render_expectation(common.stdout_screen(), result)


def _angle(text: Text, name: str, shown: str) -> float | None:
    return plain_number(text, "arcsec", name, low=1e-6, high=36_000.0, shown=shown)
