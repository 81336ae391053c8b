"""Arithmetic of number columns computed for all records at once; a record without a value is a fault, never a NaN."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from oddsmodel.design.arithmetic import (
    ColumnValue,
    Constant,
    Expression,
    Function,
    Operation,
    Total,
    text_of,
)
from oddsmodel.design.faults import piece
from oddsmodel.design.reading import Array, Reader
from oddsmodel.design.weighted import weighted_deviation, weighted_mean
from oddsmodel.errors import InputFault
from oddsmodel.plan.faults import fault
from oddsmodel.wording import say
from oddsmodel.wording.numbers import decimal

if TYPE_CHECKING:
    from oddsmodel.design.training import Training

NUMPY: dict[str, Callable[[Array], Array]] = {
    "log": np.log,
    "log2": np.log2,
    "log10": np.log10,
    "exp": np.exp,
    "sqrt": np.sqrt,
}


def evaluate(expression: Expression, reader: Reader) -> Array:
    """The values (n,) of an expression whose `center` and `standardize` are settled.

    InputFault where a column is not recorded, and where the expression has no value (log of a number that is not
    above 0, sqrt of a negative one, division by 0, a result beyond the largest number), with how many and the first.
    """
    with np.errstate(all="ignore"):
        return np.asarray(_value(expression, reader), dtype=np.float64)


def remembered(expression: Expression, training: Training) -> Expression:
    """The expression with `center` and `standardize` replaced by arithmetic with the means and deviations found here.

    Standard deviations divide by the number of records. InputFault where one is 0.
    """
    if isinstance(expression, Total):
        return Total(tuple((sign, remembered(item, training)) for sign, item in expression.items))
    if isinstance(expression, Operation):
        left, right = remembered(expression.left, training), remembered(expression.right, training)
        return Operation(expression.operator, left, right)
    if not isinstance(expression, Function):
        return expression
    argument = remembered(expression.argument, training)
    if expression.name not in ("center", "standardize"):
        return Function(expression.name, argument)
    values, counts = training.values(argument)
    centred = Total((("+", argument), ("-", Constant(weighted_mean(values, counts)))))
    if expression.name == "center":
        return centred
    deviation = weighted_deviation(values, counts, lost=0)
    if deviation == 0.0:
        term, column = piece(text_of(expression)), piece(text_of(expression.argument))
        raise InputFault(fault("design-constant", training.reader.where, term=term, column=column))
    return Operation("/", centred, Constant(deviation))


def _value(expression: Expression, reader: Reader) -> Array | float:
    if isinstance(expression, ColumnValue):
        return reader.number(expression.column)
    if isinstance(expression, Constant):
        return expression.value
    if isinstance(expression, Function):
        return _function(expression, reader)
    if isinstance(expression, Operation):
        return _operation(expression, reader)
    total: Array | float = 0.0
    for place, (sign, item) in enumerate(expression.items):
        value = _value(item, reader)
        signed = value if sign == "+" else -value
        total = signed if not place else total + signed
    return _finite(total, np.asarray(total), expression, expression, reader)


def _function(expression: Function, reader: Reader) -> Array:
    argument = np.asarray(_value(expression.argument, reader))
    if expression.name in ("log", "log2", "log10"):
        _all_good(argument > 0, "log", expression, expression.argument, argument, reader)
    if expression.name == "sqrt":
        _all_good(argument >= 0, "sqrt", expression, expression.argument, argument, reader)
    result = NUMPY[expression.name](argument)
    return np.asarray(_finite(result, argument, expression, expression.argument, reader))


def _operation(expression: Operation, reader: Reader) -> Array | float:
    left, right = _value(expression.left, reader), _value(expression.right, reader)
    if expression.operator == "*":
        return _finite(left * right, np.asarray(left), expression, expression.left, reader)
    if expression.operator == "/":
        divisor = np.asarray(right)
        _all_good(divisor != 0, "divided", expression, expression.right, divisor, reader)
        return _finite(left / right, np.asarray(left), expression, expression.left, reader)
    base, power = np.asarray(left), float(right)
    if not power.is_integer():
        _all_good(base >= 0, "power", expression, expression.left, base, reader)
    if power < 0:
        _all_good(base != 0, "power", expression, expression.left, base, reader)
    return _finite(base**power, base, expression, expression.left, reader)


def _finite(
    result: Array | float, argument: Array, expression: Expression, inside: Expression, reader: Reader
) -> Array | float:
    _all_good(np.isfinite(result), "too-large", expression, inside, argument, reader)
    return result


def _all_good(
    good: NDArray[np.bool_] | np.bool_,
    reason: str,
    expression: Expression,
    inside: Expression,
    argument: Array,
    reader: Reader,
) -> None:
    """Raise the fault of records where `good` does not hold; `argument` is the value of `inside` that is to blame."""
    if np.all(good):
        return
    bad = np.broadcast_to(~np.asarray(good), (reader.records,))
    row = int(np.argmax(bad))
    value = float(np.broadcast_to(argument, (reader.records,))[row])
    why = say(
        f"design-value-{reason}",
        inside=piece(text_of(inside)),
        value=decimal(value, 0) if value.is_integer() else f"{value:.6g}",
    )
    facts = {"faulty_records": int(bad.sum()), "row": reader.first + row + 1, "reason": why}
    raise InputFault(fault("design-no-value", reader.where, term=piece(text_of(expression)), **facts))
