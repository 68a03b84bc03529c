"""Exceptions and warnings that users may catch."""

from __future__ import annotations

from typing import Any


class ArgumentTypeError(TypeError):
    """A TypeError about one argument; carries `name` and `value`."""

    def __init__(self, message: str, name: str, value: Any) -> None:
        super().__init__(message)
        self.name = name
        self.value = value

    def __reduce__(self) -> tuple[Any, ...]:
        return (type(self), (str(self), self.name, self.value))


class ArgumentValueError(ValueError):
    """A ValueError about one argument; carries `name` and `value`."""

    def __init__(self, message: str, name: str, value: Any) -> None:
        super().__init__(message)
        self.name = name
        self.value = value

    def __reduce__(self) -> tuple[Any, ...]:
        return (type(self), (str(self), self.name, self.value))


class UnreachableError(ValueError):
    """No number of terms reaches the tolerance asked for (the sup norm beside a jump, say)."""


class TruncationWarning(UserWarning):
    """A series was cut before it reached the tolerance asked for."""
