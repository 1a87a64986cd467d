"""ECSV and VOTable of others, through astropy; cells become texts, so that one reading serves all tables."""

from __future__ import annotations

import re
import warnings
from collections.abc import Iterator, Sequence
from decimal import Decimal
from typing import Any

from campaign.errors import CampaignError, InputRefused
from campaign.model.instants import Place, Scale
from campaign.model.loading import ForeignTable, TableBlock, TableColumn
from campaign.reading.tablefile import TableFile

_BLOCK_ROWS = 50_000
# Heads of thousands of columns are shorter, and reading a head takes a hundred times its size in memory.
_MOST_HEAD_BYTES = 4 << 20
_ROW = re.compile(rb"^[^#\s]", re.MULTILINE)
_SCALES: dict[str, Scale] = {
    "utc": "utc",
    "tt": "tt",
    "et": "tt",
    "tdt": "tt",
    "tdb": "tdb",
    "tai": "tai",
    "ut": "utc",
}
_PLACES: dict[str, Place] = {
    "barycenter": "barycentre", "barycentre": "barycentre", "heliocenter": "heliocentre",
    "heliocentre": "heliocentre", "geocenter": "geocentre", "geocentre": "geocentre",
    "topocenter": "observatory", "topocentre": "observatory",
}  # fmt: skip
_MJD_ZERO = Decimal("2400000.5")


def read_ecsv(file: TableFile) -> ForeignTable:
    """A table in ECSV.

    Raises
    ------
    InputRefused
        ``table-unreadable``.
    """
    data = file.stream.read(_MOST_HEAD_BYTES)
    if len(data) == _MOST_HEAD_BYTES:
        if _ROW.search(data) is None:
            why = f"Its head does not end within {_MOST_HEAD_BYTES >> 20} MB."
            raise _unreadable(file, "an ECSV table", why)
        data += file.stream.read()
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise _unreadable(file, "an ECSV table", f"It is not in UTF-8 (line {line}).", line) from error
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            from astropy.table import Table

            # A text without a line end would be taken for the name of a file.
            table = Table.read(text + "\n", format="ascii.ecsv")
    except MemoryError:
        raise
    except Exception as error:  # astropy raises whatever its parsers do
        raise _unreadable(file, "an ECSV table", _first_line(error)) from error
    columns = tuple(_ecsv_column(name, table[name]) for name in table.colnames)
    return ForeignTable("ECSV", columns, _blocks([table[name] for name in table.colnames], len(table)), "row")


def read_votable(file: TableFile) -> ForeignTable:
    """The first table of a VOTable that has rows; TIMESYS says how its times are counted.

    Raises
    ------
    InputRefused
        ``table-unreadable``, ``table-empty``.
    """
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            from astropy.io.votable import parse

            # Piece by piece, so that whoever waits hears how far it is.
            document = parse(file.stream.read, verify="ignore", filename=file.name)
            tables = [table for table in document.iter_tables() if len(table.array)]
            systems = {each.ID: each for each in document.iter_timesys()}
    except (MemoryError, CampaignError):
        raise
    except Exception as error:  # astropy raises whatever its parsers do
        raise _unreadable(file, "a VOTable", _first_line(error)) from error
    if not tables:
        raise InputRefused(
            f"{file.name} holds no rows.",
            why="No table in it has any.",
            hint="Check the file.",
            code="table-empty",
        )
    table = tables[0]
    columns = tuple(_votable_column(field, systems.get(field.ref)) for field in table.fields)
    names = [field.ID for field in table.fields]
    cells = [table.array[name] for name in names]
    number = f", the first of {len(tables)} tables" if len(tables) > 1 else ""
    return ForeignTable(
        f"VOTable{number}", columns, _blocks(cells, len(table.array), nan_is_unknown=True), "row"
    )


def _ecsv_column(name: str, column: Any) -> TableColumn:
    if _is_time(column):
        return TableColumn(name, None, _SCALES.get(column.scale), None, str(_MJD_ZERO))
    unit = _unit_text(getattr(column, "unit", None))
    return TableColumn(name, unit, described=str(getattr(column, "description", None) or ""))


def _votable_column(field: Any, system: Any) -> TableColumn:
    unit = _unit_text(field.unit)
    described = str(field.description or "")
    if system is None:
        return TableColumn(field.name, unit, described=described)
    return TableColumn(
        field.name,
        unit,
        _SCALES.get(str(system.timescale).strip().casefold()),
        _PLACES.get(str(system.refposition).strip().casefold()),
        _origin(system.timeorigin),
        described,
    )


def _unit_text(unit: Any) -> str | None:
    """A unit as people write it: ``erg/s/cm2`` where astropy has ``erg / (s cm2)``."""
    if unit is None:
        return None
    above, _, below = str(unit).partition(" / ")
    divisors = below.strip("()").split()
    # The frequency comes last, as in the names of fluxes.
    return "/".join([above, *sorted(divisors, key=lambda each: each == "Hz")])


def _origin(origin: Any) -> str | None:
    """The JD of the time origin, as text."""
    if origin is None:
        return None
    text = str(origin).strip()
    named = {"MJD-origin": "2400000.5", "JD-origin": "0"}
    return named.get(text, text)


def _is_time(column: Any) -> bool:
    return hasattr(column, "jd1") and hasattr(column, "scale")


def _blocks(columns: Sequence[Any], rows: int, *, nan_is_unknown: bool = False) -> Iterator[TableBlock]:
    for start in range(0, rows, _BLOCK_ROWS):
        part = slice(start, min(start + _BLOCK_ROWS, rows))
        yield TableBlock(
            range(start + 1, part.stop + 1), [_texts(column[part], nan_is_unknown) for column in columns]
        )


def _texts(column: Any, nan_is_unknown: bool) -> list[str]:
    import numpy as np

    if _is_time(column):
        days = zip(np.atleast_1d(column.jd1).tolist(), np.atleast_1d(column.jd2).tolist(), strict=True)
        return [f"{Decimal(day) + Decimal(part) - _MJD_ZERO:.12f}" for day, part in days]
    hidden = np.ma.getmaskarray(column) if isinstance(column, np.ma.MaskedArray) else None
    values = np.asarray(column)
    if values.ndim != 1:
        return [str(value) for value in values]
    unknown = np.zeros(len(values), dtype=bool) if hidden is None else hidden
    if values.dtype.kind == "f":
        if nan_is_unknown:
            unknown = unknown | np.isnan(values)
        # The shortest text of the precision that the table has: 7.31 of a float32 is 7.31.
        texts = (
            [str(value) for value in values]
            if values.dtype.itemsize < 8
            else list(map(repr, values.tolist()))
        )
    elif values.dtype.kind == "S":
        texts = [value.decode("utf-8", "replace") for value in values.tolist()]
    elif values.dtype.kind == "b":
        texts = ["true" if value else "false" for value in values.tolist()]
    else:
        texts = [_text(value) for value in values.tolist()]
    if unknown.any():
        texts = ["" if none else text for text, none in zip(texts, unknown.tolist(), strict=True)]
    return texts


def _text(value: Any) -> str:
    if value is None:
        return ""
    return value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)


def _first_line(error: Exception) -> str:
    text = " ".join(str(error).split())[:300]
    return text if text.endswith(".") else f"{text or type(error).__name__}."


def _unreadable(file: TableFile, form: str, why: str, line: int | None = None) -> InputRefused:
    return InputRefused(
        f"{file.name} cannot be read as {form}" + (f" (line {line})." if line else "."),
        why=why,
        hint="Check the file, or load the table as CSV.",
        code="table-unreadable",
        details={"file": file.name} | ({} if line is None else {"line": line}),
    )
