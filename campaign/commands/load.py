"""``campaign load``: a table of many observations, or of systems, solutions or episodes."""

from __future__ import annotations

import sys
import time
from typing import TYPE_CHECKING, Annotated, Any

import typer

from campaign.commands import common
from campaign.commands.common import (
    DbOption,
    DryRunOption,
    JsonOption,
    ObserverOption,
    QuietOption,
    option,
)
from campaign.commands.interrupts import LateInterrupts
from campaign.commands.parsing import one_of, plain
from campaign.errors import CampaignError, Conflict, InputRefused, UsageRefused

if TYPE_CHECKING:
    from campaign.model.loading import Loaded, LoadWanted, Understood

Text = str | None
Texts = list[str] | None
_EXIT_BAD_ROWS = InputRefused.exit_status


def _flag(flag: str, text: str) -> Any:
    return typer.Option(flag, help=text, show_default=False)


def load(
    file: Annotated[
        Text, typer.Argument(metavar="FILE", help="CSV, TSV, text, ECSV, VOTable, also gzip; - is stdin.")
    ] = None,
    as_: Annotated[
        Text,
        option(
            "--as", "KIND", "photometry, velocity, position, shell, line, flux, systems, solutions, episodes."
        ),
    ] = None,
    column: Annotated[
        Texts, option("--column", "FIELD=NAME", 'Which column: mag=m, or "time=t as HJD_UTC-2450000".')
    ] = None,
    constant: Annotated[
        Texts, option("--constant", "FIELD=VALUE", "The same for all rows: band=K, site=..., scale=utc.")
    ] = None,
    system: Annotated[Text, option("--system", "SYSTEM", "All rows are of this system.")] = None,
    missing: Annotated[
        Texts, option("--missing", "TEXT", "Cells of this text are unknown: 99.99, --.")
    ] = None,
    mapping: Annotated[Text, option("--mapping", "NAME", "Columns as in a mapping that was kept.")] = None,
    keep_mapping: Annotated[Text, option("--keep-mapping", "NAME", "Keep the mapping under a name.")] = None,
    encoding: Annotated[
        Text, option("--encoding", "NAME", "Of a text: latin-1, utf-16, ...; else UTF-8.")
    ] = None,
    skip_bad: Annotated[
        bool, _flag("--skip-bad", "Load the good rows where some are bad; exit status 3.")
    ] = False,
    rejects: Annotated[
        Text, option("--rejects", "FILE", "Write the bad rows there, with their reasons.")
    ] = None,
    also: Annotated[
        bool, _flag("--also", "Load rows too that differ from a known observation in their value alone.")
    ] = False,
    dry_run: DryRunOption = False,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Load a table: all of it in one step, or nothing.

    Columns are known by their usual names and units (mag, e_mag, band, filter, HJD-2450000, BJD_TDB,
    date, RV, rho, theta, radius, EW, flux, a column for each band, ...). What they do not say is said
    with --column and --constant, also scale=utc, place=observatory, photometric_system=2MASS and
    decimal=comma; what is needed and not there is told with what to type.

    \b
    For example:
      campaign load lightcurve.csv --system "Lantern 3" --constant band=K
      campaign load survey.txt.gz --system "Lantern 3" --constant band=V \\
        --column "time=t as HJD_UTC-2450000" --column mag=m --dry-run
      campaign load velocities.tsv --constant scale=utc --rejects bad.csv
      campaign load orbits.csv --as solutions --skip-bad
    """
    from campaign.output import loading as output
    from campaign.output.progress import Progress
    from campaign.studies import load as study

    path = _path(file)
    wanted = _wanted(as_, column, constant, system, missing, mapping, keep_mapping, encoding)
    wanted = _with_flags(wanted, skip_bad, also, dry_run, _rejects_place(rejects))
    screen = common.stderr_screen()
    late = LateInterrupts()
    try:
        with late, Progress(screen, time.monotonic, quiet=quiet) as progress:

            def shown(understood: Understood) -> None:
                progress.clear()
                if not (json or quiet):
                    output.render_understood(screen, understood)

            def told(stage: str, done: int, total: int | None) -> None:
                progress.told(stage, done, total)
                late.watch(stage)

            standard_input = None if sys.stdin is None else sys.stdin.buffer
            place, stamp = common.database(db), common.stamp(observer)
            loaded = study.load_table(place, stamp, path, standard_input, wanted, shown, told)
    except KeyboardInterrupt:
        common.tell("Interrupted: nothing was loaded, and nothing was left behind.", quiet=quiet)
        raise
    if late.came and not dry_run:
        common.tell("The interrupt came too late to keep anything out.", quiet=quiet)
    loaded = _with_rejects(loaded, rejects)
    if loaded.is_refused:
        if not (json or quiet):
            (output.render_bad if loaded.bad else output.render_conflicts)(screen, loaded)
            output.render_warnings(screen, loaded)
        raise _refusal(loaded, rejects)
    if json:
        common.write_json(output.loaded_json(loaded, common.now_iso()))
    else:
        _report(loaded, quiet=quiet)
    if loaded.bad_rows:
        raise typer.Exit(_EXIT_BAD_ROWS)


def _path(file: str | None) -> str:
    if file is None:
        raise UsageRefused(
            "Which table is to be loaded?",
            why="A file is needed; - reads standard input.",
            hint="For example: campaign load lightcurve.csv --system NAME --constant band=K",
            details={"missing": "FILE"},
        )
    return file


def _wanted(
    kind: str | None,
    columns: Texts,
    constants: Texts,
    system: str | None,
    missing: Texts,
    mapping: str | None,
    keep_mapping: str | None,
    encoding: str | None,
) -> LoadWanted:
    from campaign.model.loading import LOAD_KINDS, LoadWanted, MappingRequest

    fixed = _pairs(constants, "--constant", "band=K")
    if system is not None:
        if "system" in {name.strip().casefold() for name in fixed}:
            raise UsageRefused(
                "--system and --constant system= say the same thing.", hint="Leave one of them out."
            )
        fixed["system"] = system
    kind_word: Any = one_of(kind, LOAD_KINDS, "--as")
    return LoadWanted(
        MappingRequest(kind_word, _pairs(columns, "--column", "mag=COLUMN"), fixed, tuple(missing or ())),
        mapping=plain(mapping, "--mapping", 200),
        keep_mapping=plain(keep_mapping, "--keep-mapping", 200),
        encoding=encoding,
    )


def _with_flags(
    wanted: LoadWanted, skip_bad: bool, also: bool, dry_run: bool, keeps_rejected: bool
) -> LoadWanted:
    from dataclasses import replace

    return replace(
        wanted, skip_bad=skip_bad, also_conflicts=also, rehearse=dry_run, keeps_rejected=keeps_rejected
    )


def _pairs(texts: Texts, flag: str, example: str) -> dict[str, str]:
    """``FIELD=VALUE`` by field; each at most once."""
    pairs: dict[str, str] = {}
    for text in texts or ():
        name, equals, value = text.partition("=")
        name = name.strip()
        if not equals or not name or not value.strip() or name in pairs:
            why = (
                f"The field {name} was given before."
                if name in pairs
                else "A field, = and a value are expected."
            )
            raise UsageRefused(
                f"{flag} {text[:80]} is not understood.", why=why, hint=f"For example {flag} {example}."
            )
        pairs[name] = value.strip()
    return pairs


def _rejects_place(path: str | None) -> bool:
    """Whether bad rows are to be written; never over a file that is there."""
    if path is None:
        return False
    from campaign.output.files import is_kept_file

    if is_kept_file(path):
        raise Conflict(
            f"There is already a file {path}.",
            why="Bad rows are never written over a file that is there.",
            hint="Name another file with --rejects, or move that one.",
            code="file-exists",
        )
    return True


def _with_rejects(loaded: Loaded, path: str | None) -> Loaded:
    if path is None or not loaded.rejected:
        return loaded
    from dataclasses import replace

    from campaign.output.files import write_whole
    from campaign.output.loading import rejects_pieces

    try:
        write_whole(path, rejects_pieces(loaded))
    except CampaignError as error:
        if loaded.operation_id is not None:
            error.hint = (
                f"The good rows are in the catalogue all the same, as operation {loaded.operation_id}; load "
                "the file again with another --rejects, nothing goes in twice."
            )
            error.details["operation"] = loaded.operation_id
        raise
    return replace(loaded, rejects_file=path)


def _refusal(loaded: Loaded, rejects: str | None) -> CampaignError:
    from campaign.output.loading import advice, loaded_data, reasons_text

    details = loaded_data(loaded)
    if loaded.bad_rows:
        said = advice(loaded)
        return InputRefused(
            f"Nothing was loaded: {loaded.bad_rows:,} of {loaded.rows_read:,} rows cannot be.",
            why=f"By reason: {reasons_text(loaded)}.",
            hint=(f"Mend {rejects} and load it; the good rows" if rejects else "Mend the rows; the good ones")
            + " go in with --skip-bad"
            + (f"; {said}." if said else "."),
            code="rows-refused",
            details=details,
        )
    return Conflict(
        f"Nothing was loaded: {len(loaded.conflicts):,} of the rows differ from known observations in value.",
        why="They are of the same system, time, band and site as what is known, and have another value.",
        hint="Look at both; load them beside the known ones with --also, or correct one: campaign amend N.",
        code="value-conflict",
        details=details,
    )


def _report(loaded: Loaded, *, quiet: bool) -> None:
    from campaign.output import loading as output

    if loaded.bad and not quiet:
        output.render_bad(common.stderr_screen(), loaded)
    if not quiet:
        output.render_loaded(common.stdout_screen(), loaded)
        output.render_warnings(common.stderr_screen(), loaded)
