"""Constants in a formula, within bounds: numbers, whole numbers, texts and lists of them."""

from __future__ import annotations

import math
from itertools import pairwise

from oddsmodel.design.faults import formula_fault
from oddsmodel.design.syntax import Items, Node, Number, Sign, Sum, Text
from oddsmodel.design.tokens import LARGEST_CONSTANT
from oddsmodel.design.words import number_text
from oddsmodel.errors import InputFault


class Constants:
    """Reads constants from nodes; `where` names the formula in faults."""

    def __init__(self, where: str) -> None:
        self.where = where

    def number(self, node: Node) -> float:
        """A number, with a sign or without."""
        if isinstance(node, Number):
            return node.value
        if isinstance(node, Sign) and isinstance(node.operand, Number):
            return node.operand.value if node.sign == "+" else -node.operand.value
        if isinstance(node, Sum) and len(node.items) == 1 and isinstance(node.items[0][1], Number):
            return -node.items[0][1].value
        raise self.fault("formula-number-wanted", node)

    def whole(self, node: Node, least: int, most: int, argument: str) -> int:
        """A whole number from `least` to `most`."""
        value = self.number(node)
        if not value.is_integer() or not least <= value <= most:
            raise self.fault(
                "formula-whole-number", node, argument=argument, value=number_text(value), least=least, most=most
            )
        return int(value)

    def numbers(self, node: Node, most: int, least: int = 1) -> tuple[float, ...]:
        """A list of rising numbers."""
        values = [self.number(value) for value in self.items(node, most, least)]
        if any(later <= earlier for earlier, later in pairwise(values)):
            raise self.fault("formula-list-not-rising", node)
        return tuple(values)

    def text(self, node: Node) -> str:
        """A text, or a number as the level it stands for."""
        return node.value if isinstance(node, Text) else number_text(self.number(node))

    def texts(self, node: Node, most: int) -> tuple[str, ...]:
        """A list of different texts."""
        values = [self.text(value) for value in self.items(node, most, 2)]
        if len(set(values)) < len(values):
            raise self.fault("formula-level-twice", node)
        return tuple(values)

    def items(self, node: Node, most: int, least: int) -> tuple[Node, ...]:
        if not isinstance(node, Items):
            raise self.fault("formula-list-wanted", node)
        if not least <= len(node.values) <= most:
            raise self.fault("formula-list-length", node, number=len(node.values), least=least, most=most)
        return node.values

    def computed(self, operator: str, left: float, right: float, node: Node) -> float:
        """left operator right, bounded: InputFault where there is no such number or it is too large."""
        try:
            value = left * right if operator == "*" else left / right if operator == "/" else left**right
        except (ZeroDivisionError, OverflowError):
            raise self.fault("formula-constant-impossible", node) from None
        if isinstance(value, complex):
            raise self.fault("formula-constant-impossible", node)
        return self.bounded(float(value), node)

    def bounded(self, value: float, node: Node) -> float:
        if not math.isfinite(value) or abs(value) > LARGEST_CONSTANT:
            raise self.fault("formula-number-too-large", node, written="", largest=LARGEST_CONSTANT)
        return value

    def fault(self, code: str, node: Node, **facts: object) -> InputFault:
        return formula_fault(code, self.where, node.at, **facts)
