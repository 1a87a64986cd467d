"""Refusals of a mapping: what is not clear about a table, and the words that settle it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from campaign.errors import InputRefused, UsageRefused
from campaign.model.loading import LOAD_KINDS, ColumnUse, LoadKind, TableColumn
from campaign.reading.columnfields import FIELDS, TABLE_CONSTANTS, Field
from campaign.reading.columnpatterns import lone_band
from campaign.reading.numbers import quoted
from campaign.reading.timenames import EXAMPLES
from campaign.reading.units import FAMILIES, accepted_units

_MOST_NAMES = 40
_CONSTANTS = {"system": "system=NAME", "band": "band=K", "star": "star=A", "species": 'species="C III 5696"'}


def _names(columns: Sequence[TableColumn]) -> str:
    return ", ".join(quoted(column.name) for column in columns[:_MOST_NAMES])


def _typed(field: Field) -> str:
    """What a user calls a field: a magnitude "mag" and not "value"."""
    return field.names[0] if field.name == "value" else field.name


def kind_unclear(columns: Sequence[TableColumn], fitting: Sequence[LoadKind]) -> InputRefused:
    """Several kinds fit the columns, or none."""
    if fitting:
        why = f"Its columns would fit {' and '.join(fitting)}."
    else:
        why = (
            f"Its columns are {_names(columns)}; what is needed of one kind of observation is not among them."
        )
    kinds = "|".join(fitting or LOAD_KINDS)
    example = 'and name columns: --as photometry --column "mag=COLUMN"'
    bands = {} if fitting else lone_band(columns)
    for name, band in bands.items():
        example = f'for example --as photometry --column "mag={name}" --constant "band={band}"'
    return InputRefused(
        "It is not clear what the table holds.",
        why=why,
        hint=f"Say it with --as {kinds}, {example}.",
        code="kind-unclear",
        details={"columns": [column.name for column in columns], "fitting": list(fitting)},
    )


def field_unknown(kind: LoadKind, name: str, option: str) -> UsageRefused:
    """A field that tables of this kind do not have."""
    known = ", ".join([field.name for field in FIELDS[kind]] + list(TABLE_CONSTANTS))
    return UsageRefused(
        f"{option}: a table of {kind} has no field {quoted(name)}.",
        why=f"Its fields are {known}.",
        hint="For example --column time=HJD-2450000 --constant band=K.",
        code="field-unknown",
        details={"field": name},
    )


def constant_empty(name: str) -> UsageRefused:
    """A constant without a value."""
    return UsageRefused(
        f"--constant {name} has no value.",
        why="It stands for the cells of a column.",
        hint=f"For example --constant {name}=K.",
    )


def column_unknown(columns: Sequence[TableColumn], text: str) -> InputRefused:
    """A column that the table does not have."""
    return InputRefused(
        f"The table has no column {quoted(text)}.",
        why=f"Its columns are {_names(columns)}.",
        hint="Names count as they stand; a column without a name is called by its number.",
        code="column-missing",
        details={"column": text, "columns": [column.name for column in columns]},
    )


def field_missing(columns: Sequence[TableColumn], field: Field) -> InputRefused:
    """Nothing in the table, and nothing said, for a field that every row needs."""
    said = f"--column {_typed(field)}=COLUMN"
    if field.name in _CONSTANTS:
        said += f", or the same for all rows: --constant {_CONSTANTS[field.name]}"
    return InputRefused(
        f"The table has no column for the {field.spoken}.",
        why=f"Its columns are {_names(columns)}.",
        hint=f"Say where it is: {said}.",
        code="column-missing",
        details={"field": field.name, "columns": [column.name for column in columns]},
    )


def partner_missing(have: str, lacking: str) -> InputRefused:
    """One of two fields that belong together."""
    return InputRefused(
        f"There is a column for {have} and none for {lacking}.",
        why="The two belong together.",
        hint=f"Name it: --column {lacking}=COLUMN.",
        code="column-missing",
        details={"field": lacking},
    )


def band_missing() -> InputRefused:
    """Fluxes that do not say where in the spectrum they are."""
    return InputRefused(
        "Which band are the fluxes in?",
        why="A flux without its band, frequency or energy range cannot be used.",
        hint='Add --constant band=N, --constant "frequency=8.4 GHz", or columns of energies.',
        code="column-missing",
        details={"field": "band"},
    )


def column_ambiguous(columns: Sequence[TableColumn], numbers: Sequence[int], field: Field) -> InputRefused:
    """Several columns for one field, by their places from 1."""
    names = [columns[number - 1].name for number in numbers]
    first = names[0] if names.count(names[0]) == 1 else numbers[0]
    return InputRefused(
        f"More than one column could be the {field.spoken}: {', '.join(quoted(name) for name in names)}.",
        why="Which of them is meant is not guessed.",
        hint=f'Say it: --column "{_typed(field)}={first}".',
        code="column-ambiguous",
        details={"field": field.name, "columns": list(names)},
    )


def shared_unclear(use: ColumnUse, field: Field) -> InputRefused:
    """One column beside several values, which might belong to any of them."""
    return InputRefused(
        f"Which of the values does the column {quoted(use.column)} belong to?",
        why=f"It could be the {field.spoken}, and the table has several columns of values.",
        hint=f'For all of them: --column "{field.name}={use.column}"; else load one at a time.',
        code="column-ambiguous",
        details={"field": field.name, "columns": [use.column]},
    )


def unit_refused(column: TableColumn, unit: str, field: Field) -> InputRefused:
    """A unit that is not one of the field."""
    symbol = FAMILIES[field.unit].symbol
    return InputRefused(
        f"The unit {quoted(unit)} of the column {quoted(column.name)} is not one of the {field.spoken}.",
        why=f"Units accepted here: {accepted_units(field.unit)}.",
        hint=f'Say the right one: --column "{field.name}={column.name} as {symbol}".',
        code="unit-not-accepted",
        details={"column": column.name, "unit": unit},
    )


def time_unclear(column: TableColumn, field: Field, meaning: str) -> UsageRefused:
    """Words that should say how times are counted."""
    return UsageRefused(
        f"--column {field.name}: {quoted(meaning)} does not say how times are counted.",
        why=f"It is said as {EXAMPLES}.",
        hint=f'For example --column "{field.name}={column.name} as MJD_UTC".',
        code="time-unclear",
    )


def table_word_refused(constant: str, text: str, words: Mapping[str, str]) -> UsageRefused:
    """A scale, a place or a decimal mark that is none."""
    return UsageRefused(
        f"--constant {constant}: {quoted(text)} is not known.",
        why=f"It is one of {', '.join(dict.fromkeys(words.values()))}.",
        hint=f"For example --constant {constant}={next(iter(words))}.",
        code=f"{constant}-refused",
    )
