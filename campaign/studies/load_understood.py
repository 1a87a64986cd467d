"""What was understood of a table, in lines for people."""

from __future__ import annotations

from dataclasses import replace

from campaign.model.loading import (
    ColumnUse,
    ForeignTable,
    MappingLine,
    TableMapping,
    Understood,
    ValueTarget,
)
from campaign.reading.columnfields import FIELDS
from campaign.reading.columnpatterns import split_brackets
from campaign.reading.timenames import time_name
from campaign.reading.units import FAMILIES
from campaign.studies.load_fields import value_column

_OF_VALUE = ("value", "error", "error_minus", "error_plus", "limit", "limit_sigma", "angle", "angle_error")
_ERROR_OF = {"error": "value", "error_minus": "value", "error_plus": "value", "angle_error": "angle"}


def understood_mapping(file: str, table: ForeignTable, mapping: TableMapping) -> Understood:
    """The mapping in words: each field with the column or constant that it comes from.

    Parameters
    ----------
    file : str
        Name of the file.
    table : ForeignTable
        For its form.
    mapping : TableMapping
        As understood; units as in the table.

    Returns
    -------
    Understood
        Lines in the order of the fields.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    lines: list[MappingLine] = []
    for field in FIELDS[mapping.kind]:
        if field.name in _OF_VALUE and mapping.targets:
            if field.name == "value":
                for target in mapping.targets:
                    lines += _target_lines(mapping, target)
            continue
        use = mapping.columns.get(field.name)
        if use is not None:
            origin = f"column {use.column}" if use.clock_number is None else f"columns {use.column}"
            lines.append(MappingLine(field.name, origin, use.meaning or _unit(use, field.unit)))
        elif field.name in mapping.constants:
            lines.append(MappingLine(field.name, "all rows", mapping.constants[field.name]))
    notes = list(mapping.notes)
    if mapping.missing:
        texts = ", ".join(["empty ones", *filter(None, mapping.missing)])
        notes.append(f"cells taken for unknown: {texts}")
    return Understood(file, table.form, mapping.kind, tuple(lines), mapping.unused, tuple(notes))


def names_for_rejects(table: ForeignTable, mapping: TableMapping) -> tuple[str, ...]:
    """Names under which columns mean in a CSV what they mean in a table that says more than names.

    Parameters
    ----------
    table : ForeignTable
        Whose head may say units, and how times are counted.
    mapping : TableMapping
        As understood.

    Returns
    -------
    tuple of str
        One for each column; units in brackets.

    Notes
    -----
    Accuracy: exact. Source: project convention.
    """
    if all(column.name == str(number) for number, column in enumerate(table.columns, start=1)):
        # Numbers would not be taken for names; a column is called by its number all the same.
        return tuple(f"column {column.name}" for column in table.columns)
    names = []
    times = {mapping.columns[name].number: meaning for name, meaning in mapping.instants.items()}
    for number, column in enumerate(table.columns, start=1):
        name = column.name
        if column.scale is not None or column.offset_jd is not None:
            meaning = times.get(number)
            name = (time_name(meaning) if meaning is not None else None) or name
        elif column.unit and split_brackets(name)[1] is None:
            name = f"{name} [{column.unit}]"
        names.append(name)
    return tuple(names)


def _target_lines(mapping: TableMapping, target: ValueTarget) -> list[MappingLine]:
    has_energies = "energy_low" in mapping.columns or "energy_low" in mapping.constants
    unit = value_column(mapping.kind, has_energies=has_energies).unit
    about = "".join(f" of {name} {word}" for name, word in target.constants.items())
    spoken = {field.name: field for field in FIELDS[mapping.kind]}
    lines = []
    for name in _OF_VALUE:
        use = target.fields.get(name)
        if use is not None:
            own = spoken[name].unit
            family = "" if name in ("limit", "limit_sigma") else (own if name.startswith("angle") else unit)
            if use.unit is None and name in _ERROR_OF:
                # An error without a unit of its own has that of its value.
                use = replace(use, unit=target.fields[_ERROR_OF[name]].unit)
            lines.append(MappingLine(spoken[name].spoken + about, f"column {use.column}", _unit(use, family)))
        elif name in mapping.constants:
            lines.append(MappingLine(spoken[name].spoken + about, "all rows", mapping.constants[name]))
    return lines


def _unit(use: ColumnUse, family: str) -> str:
    if not family:
        return ""
    return (
        f"in {use.unit}" if use.unit else f"in {FAMILIES[family].symbol}" if FAMILIES[family].symbol else ""
    )
