"""Numbers as options take them: plain decimals, and nothing that Python's own reading adds to them."""

from __future__ import annotations

import re
from typing import Any

import click

__all__ = ["NUMBER", "NumberRange", "is_number"]

_NUMBER = re.compile(r"\s*[-+]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:e[-+]?[0-9]+)?\s*|[-+]?(?:nan|inf)", re.IGNORECASE)


def is_number(text: str) -> bool:
    """Whether text is a decimal number; ``nan`` and ``inf`` are, so that what asks for the number can refuse them.

    Examples
    --------
    >>> [is_number(text) for text in ("-1.5e3", ".5", "1_0", "١", "0x1", "ten")]
    [True, True, False, False, False, False]
    """
    return _NUMBER.fullmatch(text) is not None


class _Number(click.types.FloatParamType):
    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        """Read a decimal number."""
        if isinstance(value, str) and not is_number(value):
            self.fail(f"{value!r} must be a number, like 7.5", param, ctx)
        return super().convert(value, param, ctx)


class NumberRange(click.FloatRange, _Number):
    """A decimal number in a range."""


NUMBER = _Number()
"""For ``type=`` of an option."""
