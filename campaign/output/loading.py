"""What a load understood, refused, found and did."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator
from typing import Any

from campaign.model.loading import BadCell, Loaded, LoadWarning, Understood
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.safe import visible
from campaign.output.suspicion import render_suspicions
from campaign.output.tables import Column, print_table

MOST_SHOWN = 20
REASON = "reason"
_SHOWN_TEXT = 40
# Longer ones are no mark of the unknown that anybody would type.
_LONGEST_UNKNOWN = 20
# Cells that are no value, and how tables say that there is none (common practice, no source).
_NO_VALUE = frozenset({"value-unreadable", "number-unreadable", "out-of-range", "error-negative"})
_UNKNOWN = re.compile(
    r"[+-]?9+(?:\.9+0*|\.0+)?|[+-]?99+\.[0-9]|n\.?/?a\.?n?|null|none|nd|-+|\.\.+|[*?x]", re.IGNORECASE
)
_DECIMAL_COMMA = re.compile(r"[+\-\u2212<>]?[0-9]+,[0-9]+(?:\s*(?:±|\+-)\s*[0-9]+,[0-9]+)?")
_JULIAN = re.compile(r"[BH]?JD(?:_(?:UTC|TT|TDB))?", re.IGNORECASE)
_FEW_DAYS = re.compile(r"[0-9]{4,5}(?:\.[0-9]*)?")
# Counted from JD 2450000 dates of our time are below this, counted from JD 2400000 above.
_MOST_LATE_DAYS = 25_000.0
# How a refused word of quality is told which ones there are.
_QUALITIES = "good, doubtful, bad"
_UNITS = {"kms": "km/s", "jy": "Jy", "angstrom": "Å"}


def render_understood(screen: Screen, understood: Understood) -> None:
    """The mapping that was understood."""
    screen.heading(f"{understood.file}: {understood.form}, taken for {understood.kind}")
    rows = [(f"  {line.field}", line.origin, line.meaning) for line in understood.lines]
    columns = (Column("  field"), Column("from", shrinks=True), Column("read as", shrinks=True))
    print_table(screen, columns, rows)
    if understood.unused:
        screen.wrapped("  not used: " + ", ".join(understood.unused), hang=4)
    for note in understood.notes:
        screen.wrapped(f"  note: {note}", hang=4)


def render_bad(screen: Screen, loaded: Loaded) -> None:
    """The first bad cells, and how many there are for which reason."""
    rows = [
        (str(cell.line), cell.column or "", cell.code, _cut(cell.text), cell.why)
        for cell in loaded.bad[:MOST_SHOWN]
    ]
    columns = (
        Column(loaded.line_word, align="right"),
        Column("column", shrinks=True),
        Column("reason"),
        Column("cell", shrinks=True),
        Column("why", shrinks=True, min_width=20),
    )
    print_table(screen, columns, rows)
    if len(loaded.bad) > MOST_SHOWN:
        screen.wrapped(f"... and {len(loaded.bad) - MOST_SHOWN:,} more; --json and --rejects FILE list all.")
    if not loaded.is_refused:
        # The refusal says it otherwise.
        screen.wrapped("By reason: " + reasons_text(loaded) + ".", hang=2)


def render_conflicts(screen: Screen, loaded: Loaded) -> None:
    """The first rows that differ in value from what is known."""
    rows = [
        (
            str(each.line),
            each.system,
            each.band or "",
            f"{each.bmjd_tdb:.5f}",
            f"{each.value:g}",
            f"{each.known_value:g}",
            _UNITS.get(each.unit, each.unit),
            str(each.known_id),
        )
        for each in loaded.conflicts[:MOST_SHOWN]
    ]
    columns = (
        Column(loaded.line_word, align="right"),
        Column("system", shrinks=True),
        Column("band"),
        Column("BMJD_TDB", align="right"),
        Column("new", align="right"),
        Column("known", align="right"),
        Column("unit", drop=1),
        Column("as number", align="right"),
    )
    print_table(screen, columns, rows)
    if len(loaded.conflicts) > MOST_SHOWN:
        screen.wrapped(f"... and {len(loaded.conflicts) - MOST_SHOWN:,} more; --json lists all.")


def render_loaded(screen: Screen, loaded: Loaded) -> None:
    """What went in, in a few lines."""
    screen.wrapped(summary(loaded), hang=2)
    for what, number in loaded.made.items():
        screen.wrapped(f"  {'would make' if loaded.rehearsed else 'made'} {number} {what}")
    if loaded.kept_mapping is not None:
        screen.wrapped(f"  mapping kept as '{loaded.kept_mapping}'")
    if loaded.rejects_file is not None:
        screen.wrapped(f"  bad rows written to {loaded.rejects_file}")
    if loaded.operation_id is not None and loaded.added:
        screen.wrapped(f"  take it back with: campaign undo {loaded.operation_id}")
    render_suspicions(screen, loaded.suspicions)


def render_warnings(screen: Screen, loaded: Loaded) -> None:
    """What an observer should look at."""
    for warning in loaded.warnings:
        screen.wrapped(f"Warning: {warning_text(warning, loaded.line_word)}", hang=2)


def warning_text(warning: LoadWarning, line_word: str) -> str:
    """A warning with the first lines that it concerns."""
    if not warning.lines:
        return warning.text
    more = ", ..." if warning.more else ""
    word = line_word if len(warning.lines) == 1 else f"{line_word}s"
    return f"{warning.text} ({word} {', '.join(map(str, warning.lines))}{more})"


def summary(loaded: Loaded) -> str:
    """One sentence on what went in."""
    kind = loaded.understood.kind
    verb = "would add" if loaded.rehearsed else "added"
    parts = [f"{_counted(loaded.rows_read, 'row')} read", f"{verb} {loaded.added:,} ({kind})"]
    if loaded.already_known:
        parts.append(f"{loaded.already_known:,} in the catalogue already")
    if loaded.repeated:
        parts.append(f"{loaded.repeated:,} more than once in the table")
    if loaded.without_value:
        parts.append(f"{_counted(loaded.without_value, 'row')} without a value left out")
    if loaded.bad_rows:
        parts.append(f"{_counted(loaded.bad_rows, 'bad row')} left out")
    if loaded.conflicts:
        parts.append(f"{len(loaded.conflicts):,} beside a known value that differs")
    said = "; ".join(parts)
    if not loaded.added and loaded.already_known and not loaded.bad_rows:
        said += "; nothing is new"
    return f"{loaded.understood.file}: {said}"


def _counted(number: int, word: str) -> str:
    return f"{number:,} {word}{'' if number == 1 else 's'}"


def reasons_text(loaded: Loaded) -> str:
    """Bad cells by reason, the most frequent first."""
    return ", ".join(f"{code} {number:,}" for code, number in loaded.reasons.items())


def advice(loaded: Loaded) -> str:
    """What settles many bad cells at once, if there is such a thing."""
    texts = [cell.text.strip() for cell in loaded.bad if cell.code in _NO_VALUE]
    short = (text for text in texts if len(text) <= _LONGEST_UNKNOWN)
    unknown = next(filter(_UNKNOWN.fullmatch, short), None)
    said = [] if unknown is None else [f'if "{unknown}" stands for unknown, say --missing "{unknown}"']
    if any("comma" in cell.why and _DECIMAL_COMMA.fullmatch(cell.text.strip()) for cell in loaded.bad):
        said.append("decimal commas are read with --constant decimal=comma")
    if "value-missing" in loaded.reasons:
        said.append('rows without a value are left out with --missing ""')
    if any(cell.code == "choice-refused" and _QUALITIES in cell.why for cell in loaded.bad):
        said.append("if the column holds something else than that, leave it out with --constant quality=good")
    if "system-not-found" in loaded.reasons:
        said.append("systems are listed by: campaign system list, and new ones added first")
    few = next((cell for cell in loaded.bad if _is_short_count(cell)), None)
    if few is not None:
        offset = 2_400_000 if float(few.text) >= _MOST_LATE_DAYS else 2_450_000
        said.append(
            f"if {offset} is to be added to the times, say "
            f'--column "time={few.column} as {few.column}-{offset}"'
        )
    return "; ".join(said)


def _is_short_count(cell: BadCell) -> bool:
    """Whether a cell is a Julian Date without its first digits, which the name of its column does not say."""
    return (
        cell.code == "instant-impossible"
        and _JULIAN.fullmatch(cell.column or "") is not None
        and _FEW_DAYS.fullmatch(cell.text.strip()) is not None
    )


def _cut(text: str) -> str:
    return text if len(text) <= _SHOWN_TEXT else text[: _SHOWN_TEXT - 1] + "…"


def loaded_json(loaded: Loaded, as_of: str) -> str:
    """Document ``load``."""
    return document(
        "load",
        loaded_data(loaded),
        as_of=as_of,
        warnings=[warning_text(warning, loaded.line_word) for warning in loaded.warnings],
    )


def loaded_data(loaded: Loaded) -> dict[str, Any]:
    """What a load came to, for programs: every bad cell and conflict."""
    return {
        "file": loaded.understood.file,
        "form": loaded.understood.form,
        "kind": loaded.understood.kind,
        "mapping": {
            "fields": plain(loaded.understood.lines),
            "unused": list(loaded.understood.unused),
            "notes": list(loaded.understood.notes),
        },
        "dry_run": loaded.rehearsed,
        "refused": loaded.is_refused,
        "rows_read": loaded.rows_read,
        "added": loaded.added,
        "already_known": loaded.already_known,
        "repeated": loaded.repeated,
        "without_value": loaded.without_value,
        "bad_rows": loaded.bad_rows,
        "reasons": loaded.reasons,
        "bad": [_bad_data(loaded, cell) for cell in loaded.bad],
        "conflicts": plain(loaded.conflicts),
        "warnings": plain(loaded.warnings),
        "made": dict(loaded.made),
        "kept_mapping": loaded.kept_mapping,
        "rejects_file": loaded.rejects_file,
        "operation": loaded.operation_id,
        "suspected": plain(loaded.suspicions),
    }


def _bad_data(loaded: Loaded, cell: BadCell) -> dict[str, Any]:
    return {
        "file": loaded.understood.file,
        "line": cell.line,
        "column": cell.column,
        "reason": cell.code,
        "why": cell.why,
        "text": cell.text,
    }


def _mendable(text: str) -> str:
    return "\n".join("\t".join(map(visible, line.split("\t"))) for line in text.split("\n"))


def rejects_pieces(loaded: Loaded) -> Iterator[str]:
    """The bad rows as a CSV that can be mended and loaded again: the same columns, and the reason.

    Cells are as they stood, but for characters that cannot be seen; lines of a text stay lines. A row
    that has more cells than there are columns keeps them behind the reason, and one that has fewer stays
    as short as it is, so that neither is taken for a good one before it is mended.
    """
    buffer = io.StringIO()
    writer, quoting = (
        csv.writer(buffer, lineterminator="\n", quoting=how) for how in (csv.QUOTE_MINIMAL, csv.QUOTE_ALL)
    )
    # The reasons of an earlier load make way for those of this one.
    own = [place for place, name in enumerate(loaded.columns) if name.strip().casefold() != REASON]
    width = len(own)
    writer.writerow([*(visible(loaded.columns[place]) for place in own), REASON])
    for row in loaded.rejected:
        cells = list(row.cells)
        if len(cells) >= len(loaded.columns):
            cells = [*(cells[place] for place in own), *cells[len(loaded.columns) :]]
        reason = "; ".join(f"{cell.column or 'row'}: {cell.code}: {cell.why}" for cell in row.bad)
        texts = [_mendable(text) for text in (*cells[:width], reason, *cells[width:])]
        # A line that begins with # would be a comment.
        (quoting if texts[0].startswith("#") else writer).writerow(texts)
        if buffer.tell() > 1 << 16:
            yield buffer.getvalue()
            buffer.seek(0)
            buffer.truncate()
    yield buffer.getvalue()
