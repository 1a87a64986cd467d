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
    """JSON text of anything that ``plain`` understands."""
    text = json.dumps(plain(value), ensure_ascii=True, allow_nan=False, indent=2) + "\n"
    return text.replace("\x7f", "\\u007f")  # the one control character that JSON lets through


def plain(value: Any) -> Any:
    """``value`` in terms of JSON: dataclasses by field name, NaN and infinities as None.

    Floats keep every digit (shortest text that reads back as the same number).
    """
    if value is None or isinstance(value, (str, bool)):
        return str(value) if isinstance(value, str) else value
    if isinstance(value, Enum):
        return plain(value.value)
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in dataclasses.fields(value)}
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    return _plain_number_or_list(value)


def _plain_number_or_list(value: Any) -> Any:
    if isinstance(value, numbers.Integral):
        return int(value)
    if isinstance(value, numbers.Real):
        number = float(value)
        return number if math.isfinite(number) else None
    if hasattr(value, "tolist"):  # numpy scalars and arrays, without importing numpy
        return plain(value.tolist())
    if isinstance(value, (list, tuple, set, frozenset, Sequence)):
        return [plain(item) for item in value]
    return str(value)
