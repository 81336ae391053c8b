"""Arithmetic of number columns: a plain, picklable expression that is computed by walking it, never by running text."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from oddsmodel.design.words import number_text, written_column

Operator = Literal["*", "/", "**"]
FunctionName = Literal["log", "log2", "log10", "exp", "sqrt", "center", "standardize"]
FUNCTIONS: tuple[FunctionName, ...] = ("log", "log2", "log10", "exp", "sqrt", "center", "standardize")

_SUM, _PRODUCT, _SIGN, _POWER, _ATOM = 1, 2, 3, 4, 5


@dataclass(frozen=True, slots=True)
class ColumnValue:
    """The values of a number column."""

    column: str


@dataclass(frozen=True, slots=True)
class Constant:
    value: float


@dataclass(frozen=True, slots=True)
class Total:
    """Items added or taken away, each with its sign "+" or "-", in order."""

    items: tuple[tuple[str, Expression], ...]


@dataclass(frozen=True, slots=True)
class Operation:
    """left operator right; the right side of ** is a constant."""

    operator: Operator
    left: Expression
    right: Expression


@dataclass(frozen=True, slots=True)
class Function:
    """`center` and `standardize` stand only until the training values are known: `evaluate.remembered` settles them."""

    name: FunctionName
    argument: Expression


Expression = ColumnValue | Constant | Total | Operation | Function


def columns_of(expression: Expression) -> tuple[str, ...]:
    """The record columns that an expression holds, each once, in order."""
    return tuple(dict.fromkeys(_columns(expression)))


def _columns(expression: Expression) -> Iterator[str]:
    if isinstance(expression, ColumnValue):
        yield expression.column
    elif isinstance(expression, Total):
        for _, item in expression.items:
            yield from _columns(item)
    elif isinstance(expression, Operation):
        yield from _columns(expression.left)
        yield from _columns(expression.right)
    elif isinstance(expression, Function):
        yield from _columns(expression.argument)


def text_of(expression: Expression) -> str:
    """The expression in the formula's own words, evenly spaced, with the parentheses that it needs."""
    return _text(expression, _SUM)


def _text(expression: Expression, loosest: int) -> str:
    words, binding = _words(expression)
    return words if binding >= loosest else f"({words})"


def _words(expression: Expression) -> tuple[str, int]:
    if isinstance(expression, ColumnValue):
        return written_column(expression.column), _ATOM
    if isinstance(expression, Constant):
        return number_text(expression.value), _ATOM if expression.value >= 0 else _SIGN
    if isinstance(expression, Function):
        return f"{expression.name}({text_of(expression.argument)})", _ATOM
    if isinstance(expression, Total):
        parts = [f" {sign} {_text(item, _PRODUCT)}" for sign, item in expression.items]
        first = parts[0][3:] if expression.items[0][0] == "+" else f"-{parts[0][3:]}"
        return first + "".join(parts[1:]), _SUM
    if expression.operator == "**":
        return f"{_text(expression.left, _ATOM)} ** {_text(expression.right, _SIGN)}", _POWER
    return f"{_text(expression.left, _PRODUCT)} {expression.operator} {_text(expression.right, _SIGN)}", _PRODUCT
