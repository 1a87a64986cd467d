"""Options that are text need no validator; importing one would cost every command 55 ms.

typer validates each parameter with pydantic, also one that was not given or is a plain string. Numbers,
paths and choices still go that way; the result is the same in every case.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any

_PLAIN = (str, int, float, bool)


class TextFirst:
    """Stands in for typer's validator: absent values and text directly, all else by the validator."""

    def __init__(self, validator: Callable[[], Any], descriptor: Any) -> None:
        self._validator = validator
        self._annotation = descriptor.annotation
        self._checked = descriptor.is_ranged or descriptor.parameter_info.parser is not None

    def coerce(self, value: Any, param: Any, ctx: Any) -> Any:
        """The value that the command receives."""
        many = param.multiple or param.nargs == -1
        if value is None:
            return () if many else None
        if not self._checked:
            if not many and self._annotation in _PLAIN and type(value) is self._annotation:
                return value
            if many and self._annotation == list[str] and not isinstance(value, str):
                return list(value)
        return self._validator().coerce(value, param=param, ctx=ctx)


def read_text_directly(parameters: Iterable[Any]) -> list[Any]:
    """Let the parameters of a command skip the validator wherever it would change nothing."""
    known = list(parameters)
    for parameter in known:
        descriptor = getattr(parameter, "type_descriptor", None)
        validator = getattr(parameter, "get_runtime_param", None)
        if descriptor is None or validator is None:
            continue  # another typer: the slower way stays right
        if "get_runtime_param" in vars(parameter):
            continue  # done before
        stand_in = TextFirst(validator, descriptor)
        parameter.get_runtime_param = lambda stand_in=stand_in: stand_in
    return known
