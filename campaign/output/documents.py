"""JSON documents: one to a run, units in the key names, null for what is unknown."""

from __future__ import annotations

import dataclasses
import json
import math
import numbers
from collections.abc import Mapping, Sequence
from enum import Enum
from typing import Any


def document(name: str, data: Any, *, as_of: str | None, warnings: Sequence[str] = ()) -> str:
    """The document ``campaign/NAME/1`` as text that ends in a newline.

    Only ASCII is used, so that no locale, pipe or terminal can change it or be steered by it.
    """
    return dumps({"schema": f"campaign/{name}/1", "as_of": as_of, "data": data, "warnings": list(warnings)})


def error_document(code: str, message: str, hint: str, details: Mapping[str, Any]) -> str:
    """The one shape in which an error reaches a program."""
    return dumps({"error": {"code": code, "message": message, "hint": hint, "details": details}})


def dumps(value: Any) -> str:
    """JSON text of anything that ``plain`` understands, on one line."""
    text = json.dumps(plain(value), ensure_ascii=True, allow_nan=False) + "\n"
    return text.replace("\x7f", "\\u007f")  # the one control character that JSON lets through


def plain(value: Any) -> Any:
    """``value`` in terms of JSON: dataclasses by field name, NaN and infinities as None.

    Floats keep every digit (shortest text that reads back as the same number).
    """
    kind = type(value)
    if value is None or kind in _AS_THEY_ARE:
        return value
    if kind is float:
        return value if math.isfinite(value) else None
    if isinstance(value, (tuple, list)):
        return [plain(item) for item in value]
    if kind is dict:
        return {str(key): plain(item) for key, item in value.items()}
    if (names := _field_names(kind)) is not None:
        return {name: plain(getattr(value, name)) for name in names}
    return _plain_of_other_kinds(value)


_AS_THEY_ARE = frozenset({str, bool, int})


_FIELD_NAMES: dict[type, tuple[str, ...] | None] = {}


def _field_names(kind: type) -> tuple[str, ...] | None:
    if kind not in _FIELD_NAMES:
        is_ours = dataclasses.is_dataclass(kind)
        _FIELD_NAMES[kind] = tuple(field.name for field in dataclasses.fields(kind)) if is_ours else None
    return _FIELD_NAMES[kind]


def _plain_of_other_kinds(value: Any) -> Any:
    if isinstance(value, Enum):
        return plain(value.value)
    if isinstance(value, numbers.Real):
        return int(value) if isinstance(value, numbers.Integral) else plain(float(value))
    if hasattr(value, "tolist"):  # numpy scalars and arrays, without importing numpy
        return plain(value.tolist())
    if isinstance(value, Mapping):
        return plain(dict(value))
    return str(value)
