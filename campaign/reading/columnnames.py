"""Which columns of a table are taken for what: by usual names, by what the user said, never by a guess.

Two columns for one field, a kind that two sets of columns would fit, and a time without its scale are
refused with the words that settle it.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace

from campaign.errors import InputRefused
from campaign.model.loading import (
    KNOWLEDGE_KINDS,
    LOAD_KINDS,
    ColumnUse,
    LoadKind,
    MappingRequest,
    TableColumn,
    TableMapping,
    TimeMeaning,
    ValueTarget,
)
from campaign.reading import columnrefusals as refusals
from campaign.reading.columnfields import FIELDS, TABLE_CONSTANTS, VELOCITY_NAMES, Field, field_named, key
from campaign.reading.columnpatterns import (
    CLOCK_NAMES,
    DATE_NAMES,
    Found,
    band_columns,
    columns_called,
    is_called,
    limit_names,
    split_brackets,
    split_unit,
)
from campaign.reading.timenames import from_origin, read_time_name, spoken, stated
from campaign.reading.units import FAMILIES, unit_factor

# A table of rejects has its reasons in it when it comes back.
IGNORED = frozenset({"reason"})
# Of these the first that is found will do, and the others are told as not used.
_DESCRIPTIVE = frozenset(
    {"instrument", "observer", "source", "text", "quality", "comparison_star", "notes", "note"}
)
_PER_VALUE = ("value", "error", "error_minus", "error_plus", "limit", "limit_sigma", "angle", "angle_error")
_SCALE_WORDS = {"utc": "utc", "ut": "utc", "gmt": "utc", "tt": "tt", "tdt": "tt", "tdb": "tdb", "tai": "tai"}
_PLACE_WORDS = {
    "observatory": "observatory", "topocentre": "observatory", "topocenter": "observatory",
    "geocentre": "geocentre", "geocenter": "geocentre", "earth": "geocentre",
    "heliocentre": "heliocentre", "heliocenter": "heliocentre", "sun": "heliocentre",
    "barycentre": "barycentre", "barycenter": "barycentre",
}  # fmt: skip
_DECIMAL_WORDS = {"comma": "comma", ",": "comma", "point": "point", ".": "point"}
_AS = re.compile(r"(?P<name>.+?)\s+as\s+(?P<meaning>\S.*)")


def understand(columns: Sequence[TableColumn], request: MappingRequest) -> TableMapping:
    """What the columns of a table are taken for.

    Parameters
    ----------
    columns
        Of the table.
    request
        What the user said; it counts before what names say.

    Raises
    ------
    UsageRefused
        A field or a word of the request is not known.
    InputRefused
        ``kind-unclear``, ``column-missing``, ``column-ambiguous``, ``scale-missing``, ``time-contradicted``,
        ``unit-not-accepted``.
    """
    if request.kind is not None:
        return _Understanding(request.kind, columns, request).mapping("")
    fitting = [kind for kind in LOAD_KINDS if _Understanding(kind, columns, request, is_trial=True).fits]
    if len(fitting) > 1 and fitting[0] not in KNOWLEDGE_KINDS:
        # A light curve may well have the position of its star in every row.
        fitting = [kind for kind in fitting if kind not in KNOWLEDGE_KINDS]
    if len(fitting) != 1:
        raise refusals.kind_unclear(columns, fitting)
    return _Understanding(fitting[0], columns, request).mapping(f"taken for {fitting[0]}, by its columns")


class _Understanding:
    """The columns of one table under one kind; a trial raises nothing and picks the first of several."""

    def __init__(
        self,
        kind: LoadKind,
        columns: Sequence[TableColumn],
        request: MappingRequest,
        *,
        is_trial: bool = False,
    ) -> None:
        self._kind = kind
        self._fields = {field.name: field for field in FIELDS[kind]}
        self._columns = columns
        self._request = request
        self._is_trial = is_trial
        self._is_knowledge = kind in KNOWLEDGE_KINDS
        self._uses: dict[str, ColumnUse] = {}
        self._meanings: dict[str, TimeMeaning] = {}
        self._taken: set[int] = set()
        self._table_words: dict[str, str] = {}
        self._constants = self._given_constants()
        self._take_given()
        self._take_named()
        self._targets = self._find_targets()

    @property
    def fits(self) -> bool:
        """Whether what tells this kind from others is there by name; the rest may be said for all rows."""
        told = {"system", "star", "species"}
        if self._kind == "episodes" and not self._has_stage():
            return False
        return all(
            self._has(field.name)
            for field in FIELDS[self._kind]
            if field.is_required and field.name not in told
        )

    def mapping(self, why: str) -> TableMapping:
        """The mapping, once everything needed is there."""
        for field in FIELDS[self._kind]:
            if field.is_required and not self._has(field.name):
                raise refusals.field_missing(self._columns, field)
        self._check_together()
        notes = [why] if why else []
        self._state_times(notes)
        has_decimal_commas = self._table_word("decimal", _DECIMAL_WORDS) == "comma"
        if has_decimal_commas:
            notes.append("a comma in a number is its decimal point")
        used = self._taken | {use.number for target in self._targets for use in target.fields.values()}
        return TableMapping(
            self._kind,
            self._uses,
            self._constants,
            self._targets,
            self._meanings,
            tuple(
                column.name
                for number, column in enumerate(self._columns, start=1)
                if number not in used and column.name and key(column.name) not in IGNORED
            ),
            self._request.missing,
            tuple(notes),
            has_decimal_commas,
        )

    def _has(self, name: str) -> bool:
        return (
            name in self._uses
            or name in self._constants
            or any(name in target.constants or name in target.fields for target in self._targets)
        )

    def _has_stage(self) -> bool:
        return any(name in self._uses for name in ("onset", "maximum", "end"))

    def _given_constants(self) -> dict[str, str]:
        constants: dict[str, str] = {}
        for name, text in self._request.constants.items():
            if key(name) in TABLE_CONSTANTS:
                self._table_words[key(name)] = text
                continue
            field = self._field(name, "--constant")
            if field is not None:
                if not text.strip():
                    raise refusals.constant_empty(name)
                constants[field.name] = text
        return constants

    def _field(self, name: str, option: str) -> Field | None:
        field = self._fields.get("time") if key(name) == "time" else field_named(self._kind, name)
        if field is None and not self._is_trial:
            raise refusals.field_unknown(self._kind, name, option)
        return field

    def _take_given(self) -> None:
        for name, text in self._request.columns.items():
            field = self._field(name, "--column")
            if field is None:
                continue
            number, meaning = self._find_column(text)
            if number is not None:
                self._take(field, number, meaning)
            elif not self._is_trial:
                raise refusals.column_unknown(self._columns, text)

    def _find_column(self, text: str) -> tuple[int | None, str]:
        """Place of a column named by the user, and the meaning after ``as``."""
        place = self._place_of(text)
        split = _AS.fullmatch(text.strip()) if place is None else None
        return (self._place_of(split["name"]), split["meaning"]) if split else (place, "")

    def _place_of(self, text: str) -> int | None:
        wanted = " ".join(text.split())
        names = [" ".join(column.name.split()) for column in self._columns]
        bare = [split_brackets(name)[0] for name in names]
        for known, same in ((names, str), (names, str.casefold), (bare, str), (bare, str.casefold)):
            places = [place for place, name in enumerate(known, start=1) if same(name) == same(wanted)]
            if len(places) == 1:
                return places[0]
        if re.fullmatch("[1-9][0-9]{0,5}", wanted) and int(wanted) <= len(names):
            return int(wanted)
        return None

    def _take_named(self) -> None:
        found: dict[str, list[tuple[int, str]]] = {}
        for number, column in enumerate(self._columns, start=1):
            if number in self._taken or key(column.name) in IGNORED:
                continue
            name, unit = self._named(column)
            if name and name not in self._uses and name not in self._constants:
                found.setdefault(name, []).append((number, unit))
        self._take_clock(found)
        for name, places in found.items():
            number, unit = self._chosen(self._fields[name], places)
            self._take(self._fields[name], number, unit)
        self._take_star()

    def _take_clock(self, found: dict[str, list[tuple[int, str]]]) -> None:
        """A column of dates and a column of clock times beside it are one time."""
        numbers = [number for number, _ in found.get("time", ())]
        if len(numbers) != 2 or self._is_knowledge:
            return
        numbers.sort(key=lambda number: key(self._columns[number - 1].name) in CLOCK_NAMES)
        date, clock = (self._columns[number - 1] for number in numbers)
        meanings = [self._time_of(column) or TimeMeaning("jd") for column in (date, clock)]
        scales = {meaning.scale for meaning in meanings if meaning.scale}
        if (
            key(date.name) not in DATE_NAMES
            or key(clock.name) not in CLOCK_NAMES
            or any(meaning.count != "text" for meaning in meanings)
            or len(scales) > 1
        ):
            return
        del found["time"]
        self._taken.update(numbers)
        self._meanings["time"] = replace(meanings[0], scale=next(iter(scales), None))
        names = f"{date.name} and {clock.name}"
        self._uses["time"] = ColumnUse("time", names, numbers[0], clock_number=numbers[1])

    def _take_star(self) -> None:
        """A column of stars names systems, where nothing else does and no star of a system is meant."""
        name = "name" if self._kind == "systems" else "system"
        if "star" in self._fields or self._has_plain(name):
            return
        places = [
            number for number, column in enumerate(self._columns, start=1) if key(column.name) == "star"
        ]
        if len(places) == 1 and places[0] not in self._taken:
            self._take(self._fields[name], places[0], "")

    def _chosen(self, field: Field, places: Sequence[tuple[int, str]]) -> tuple[int, str]:
        """The one column of several for a field: one called by its very name, if it is no time."""
        if len(places) > 1 and field.type != "instant":
            exact = [each for each in places if key(self._columns[each[0] - 1].name) == key(field.name)]
            if len(exact) == 1:
                return exact[0]
        if len(places) > 1 and not self._is_trial and field.name not in _DESCRIPTIVE:
            raise refusals.column_ambiguous(self._columns, [number for number, _ in places], field)
        return places[0]

    def _named(self, column: TableColumn) -> tuple[str, str]:
        """The field that a column is named after, and the unit in its name."""
        if not self._is_knowledge and self._time_of(column) is not None:
            return "time", ""
        field = field_named(self._kind, column.name)
        if field is not None:
            return field.name, ""
        split = split_unit(column.name)
        field = field_named(self._kind, split[0]) if split else None
        return (field.name, split[1]) if field is not None and split else ("", "")

    def _time_of(self, column: TableColumn, *, is_said: bool = False) -> TimeMeaning | None:
        """What a column means as a time: by its name, the unit beside it, and the head of the table."""
        bare, in_brackets = split_brackets(column.name)
        by_name = read_time_name(column.name) or read_time_name(bare)
        if by_name is None and not is_said:
            return None
        if column.offset_jd is not None:
            from_head = from_origin(column.offset_jd, column.scale, column.place)
            if from_head is not None:
                return from_head
        if by_name is None:
            return None
        if by_name.count == "text":
            for unit in (in_brackets, column.unit):
                by_unit = read_time_name(unit) if unit else None
                if by_unit is not None and by_unit.count != "text":
                    return by_unit
                if by_unit is not None and by_unit.scale is not None and by_name.scale is None:
                    return replace(by_name, scale=by_unit.scale, place=column.place)
        if column.scale is not None and by_name.scale is None:
            return replace(by_name, scale=column.scale, place=column.place or by_name.place)
        return by_name

    def _take(self, field: Field, number: int, meaning: str) -> None:
        column = self._columns[number - 1]
        self._taken.add(number)
        unit = None
        if field.type == "instant":
            self._meanings[field.name] = self._instant_meaning(field, column, meaning)
        elif field.type in ("number", "measured"):
            said = meaning or split_brackets(column.name)[1]
            unit = self._checked_unit(field, column, said or column.unit, is_said=bool(said))
            if unit is None:
                unit = self._suffix_unit(field, column)
        self._uses[field.name] = ColumnUse(field.name, column.name, number, unit)

    def _instant_meaning(self, field: Field, column: TableColumn, meaning: str) -> TimeMeaning:
        if not meaning:
            return self._time_of(column, is_said=True) or TimeMeaning("text")
        said = read_time_name(meaning)
        if said is None:
            raise refusals.time_unclear(column, field, meaning)
        return said

    def _checked_unit(
        self, field: Field, column: TableColumn, unit: str | None, *, is_said: bool
    ) -> str | None:
        """The unit of a column, if it is one of the field's; beside a plain number it may say anything."""
        if unit is None:
            return None
        for family in (field.unit, "erg/s/cm2") if field.unit == "jy" else (field.unit,):
            try:
                unit_factor(unit, family, column.name, unit, "")
            except InputRefused:
                continue
            return unit
        if self._is_trial or not (FAMILIES[field.unit].factors or is_said):
            return None
        raise refusals.unit_refused(column, unit, field)

    def _suffix_unit(self, field: Field, column: TableColumn) -> str | None:
        """The unit at the end of a name such as ``rho_mas``, if it is one of the field."""
        split = split_unit(column.name)
        factors = FAMILIES[field.unit].factors
        return split[1] if split is not None and split[1] in factors else None

    def _find_targets(self) -> tuple[ValueTarget, ...]:
        if self._is_knowledge:
            return ()
        if "value" in self._uses:
            return (ValueTarget({name: self._uses[name] for name in _PER_VALUE if name in self._uses}),)
        if self._kind == "photometry" and not self._has_plain("band"):
            return self._targets_of(band_columns(self._columns, self._taken), "band")
        if self._kind == "velocity" and not self._has_plain("star"):
            names = {star: [f"{base}{star}" for base in VELOCITY_NAMES] for star in ("A", "B")}
            return self._targets_of(columns_called(self._columns, self._taken, names), "star")
        return ()

    def _has_plain(self, name: str) -> bool:
        return name in self._uses or name in self._constants

    def _targets_of(self, found: Found, constant: str) -> tuple[ValueTarget, ...]:
        field = self._fields["value"]
        targets = []
        for word, (number, errors) in found.items():
            fields = {"value": self._target_use(field, number)}
            place = self._place_called(errors, number)
            if place is not None:
                fields["error"] = self._target_use(replace(field, name="error"), place)
            place = self._place_called(limit_names(word), number) if "limit" in self._fields else None
            if place is not None:
                fields["limit"] = ColumnUse("limit", self._columns[place - 1].name, place)
            targets.append(ValueTarget(fields, {constant: word}))
        return tuple(self._with_shared(target, len(targets)) for target in targets)

    def _place_called(self, names: Sequence[str], besides: int) -> int | None:
        """The first column that is called by one of ``names`` and still free."""
        for place, column in enumerate(self._columns, start=1):
            if place != besides and place not in self._taken and is_called(column, names):
                return place
        return None

    def _with_shared(self, target: ValueTarget, number: int) -> ValueTarget:
        """The target with columns that belong to no band or star by name: to the only one, or as was said."""
        said = {field.name for name in self._request.columns if (field := self._field(name, "--column"))}
        shared = {}
        for name in _PER_VALUE:
            if name not in self._uses or name in target.fields:
                continue
            if number > 1 and name not in said and not self._is_trial:
                raise refusals.shared_unclear(self._uses[name], self._fields[name])
            shared[name] = self._uses[name]
        return replace(target, fields={**target.fields, **shared})

    def _target_use(self, field: Field, number: int) -> ColumnUse:
        column = self._columns[number - 1]
        unit = split_brackets(column.name)[1] or column.unit
        return ColumnUse(
            field.name, column.name, number, self._checked_unit(field, column, unit, is_said=False)
        )

    def _state_times(self, notes: list[str]) -> None:
        scale = self._table_word("scale", _SCALE_WORDS)
        place = self._table_word("place", _PLACE_WORDS)
        for name, named in self._meanings.items():
            use = self._uses[name]
            meaning = stated(named, scale, place, use.column)  # type: ignore[arg-type]
            if meaning.by_convention:
                notes.append(f"{use.column}: {meaning.by_convention}")
            self._meanings[name] = meaning
            self._uses[name] = replace(use, meaning=spoken(meaning))

    def _table_word(self, constant: str, words: Mapping[str, str]) -> str | None:
        text = self._table_words.get(constant)
        if text is None:
            return None
        word = words.get(key(text))
        if word is None:
            raise refusals.table_word_refused(constant, text, words)
        return word

    def _check_together(self) -> None:
        for one, other in (("error_minus", "error_plus"), ("energy_low", "energy_high")):
            if self._has(one) != self._has(other):
                have, lacking = (one, other) if self._has(one) else (other, one)
                raise refusals.partner_missing(have, lacking)
        if self._kind == "flux" and not any(map(self._has, ("band", "frequency", "energy_low"))):
            raise refusals.band_missing()
        if self._kind == "photometry" and not self._has("band"):
            raise refusals.field_missing(self._columns, self._fields["band"])
        if self._kind == "episodes" and not self._has_stage():
            raise refusals.field_missing(self._columns, self._fields["onset"])
