"""From the text of a `keep` condition to its nodes, by recursive descent; nothing in it is ever evaluated as code.

condition  :=  both ("or" both)*
both       :=  single ("and" single)*
single     :=  "not" single | "(" condition ")" | comparison
comparison :=  operand (sign operand)+  |  column ["not"] "in" "[" value ("," value)* "]"
               |  column "is" ["not"] "recorded"
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, NoReturn

from oddsmodel.errors import InputFault
from oddsmodel.plan.nearest import nearest
from oddsmodel.records import condition_nodes as nodes
from oddsmodel.records.condition_nodes import Condition
from oddsmodel.records.condition_text import Token, tokens
from oddsmodel.records.faults import fault
from oddsmodel.records.kinds import is_number
from oddsmodel.records.same_value import matching
from oddsmodel.records.types import Column
from oddsmodel.wording.plain import as_code, quoted

__all__ = ["Condition", "vet_condition"]

DEEPEST = 50
MIRRORED = {"==": "==", "!=": "!=", "<": ">", "<=": ">=", ">": "<", ">=": "<="}
ORDER = ("<", "<=", ">", ">=")


def vet_condition(text: str, columns: Mapping[str, Column], where: str) -> Condition:
    """The condition in `text`, every name and level in it known.

    where: the place of the text, for faults (the plan and its key).
    Raises: InputFault with the place of the character and what was expected there.
    """
    reader = _Reader(tokens(text, where), columns, where)
    node = reader.condition(0)
    reader.expect_end()
    return Condition(text, tuple(dict.fromkeys(reader.used)), node)


@dataclass
class _Reader:
    found: list[Token]
    columns: Mapping[str, Column]
    where: str
    position: int = 0
    used: list[str] = field(default_factory=list)

    def condition(self, depth: int) -> nodes.Node:
        parts = [self.both(depth)]
        while self.take("word", "or"):
            parts.append(self.both(depth))
        return parts[0] if len(parts) == 1 else nodes.AnyOf(tuple(parts))

    def both(self, depth: int) -> nodes.Node:
        parts = [self.single(depth)]
        while self.take("word", "and"):
            parts.append(self.single(depth))
        return parts[0] if len(parts) == 1 else nodes.AllOf(tuple(parts))

    def single(self, depth: int) -> nodes.Node:
        if depth > DEEPEST:
            self.refuse(self.next, "condition-too-deep", deepest=DEEPEST)
        if self.take("word", "not"):
            return nodes.Not(self.single(depth + 1))
        if self.take("sign", "("):
            inner = self.condition(depth + 1)
            if not self.take("sign", ")"):
                self.unexpected("a closing parenthesis, and or or")
            return inner
        return self.comparison()

    def comparison(self) -> nodes.Node:
        first = self.operand()
        if self.take("word", "is"):
            negated = self.take("word", "not")
            if not self.take("word", "recorded"):
                self.unexpected('the word "recorded"')
            node: nodes.Node = nodes.IsRecorded(self.column_of(first).name)
            return nodes.Not(node) if negated else node
        negated = self.take("word", "not")
        if negated or (self.next.kind, self.next.text) == ("word", "in"):
            if not self.take("word", "in"):
                self.unexpected('the word "in"')
            node = self.among(first)
            return nodes.Not(node) if negated else node
        parts: list[nodes.Node] = []
        left = first
        while self.next.kind == "sign" and self.next.text in MIRRORED:
            sign = self.advance().text
            right = self.operand()
            parts.append(self.compared(left, sign, right))
            left = right
        if not parts:
            if first.kind == "name":
                self.refuse(first, "condition-bare-column", column=quoted(self.column_of(first).name))
            self.unexpected("a comparison such as == or <")
        return parts[0] if len(parts) == 1 else nodes.AllOf(tuple(parts))

    def operand(self) -> Token:
        """A column's name, a number (a minus sign before it belongs to it) or a text."""
        if self.take("sign", "-"):
            if self.next.kind != "number":
                self.unexpected("a number")
            number = self.advance()
            return Token("number", f"-{number.text}", number.at - 1)
        if self.next.kind not in ("name", "number", "text"):
            self.unexpected("a column, a number or a text in quotation marks")
        token = self.advance()
        following = (self.next.kind, self.next.text)
        if token.kind == "name" and following == ("sign", "("):
            self.refuse(token, "condition-call", name=quoted(token.text))
        return token

    def among(self, first: Token) -> nodes.Node:
        column = self.column_of(first)
        if not self.take("sign", "["):
            self.unexpected("a list in brackets")
        values = [self.value()]
        while self.take("sign", ","):
            values.append(self.value())
        if not self.take("sign", "]"):
            self.unexpected("a comma or a closing bracket")
        if column.kind == "number":
            return nodes.NumberAmong(column.name, tuple(self.number(value, column) for value in values))
        return nodes.LevelAmong(column.name, tuple(self.level(value, column) for value in values))

    def value(self) -> Token:
        token = self.operand()
        if token.kind == "name":
            self.refuse(token, "condition-bare-text", text=quoted(token.text), written=as_code(token.text))
        return token

    def compared(self, left: Token, sign: str, right: Token) -> nodes.Node:
        if left.kind != "name" and right.kind != "name":
            self.refuse(left, "condition-without-column")
        if left.kind != "name":
            left, sign, right = right, MIRRORED[sign], left
        column = self.column_of(left)
        if right.kind == "name":
            return self.of_two_columns(column, sign, right)
        if column.kind == "number":
            number = nodes.Operand(None, self.number(right, column))
            return nodes.NumberComparison(nodes.Operand(column.name), sign, number)
        if sign not in ORDER:
            node = nodes.LevelAmong(column.name, (self.level(right, column),))
            return node if sign == "==" else nodes.Not(node)
        if column.kind != "ordered":
            self.refuse(left, "condition-order", column=quoted(column.name), kind=column.kind)
        at = column.levels.index(self.level(right, column))
        chosen = [level for place, level in enumerate(column.levels) if nodes.COMPARE[sign](place, at)]
        return nodes.LevelAmong(column.name, tuple(chosen))

    def of_two_columns(self, column: Column, sign: str, right: Token) -> nodes.Node:
        if right.text not in self.columns:
            self.refuse(right, "condition-bare-text", text=quoted(right.text), written=as_code(right.text))
        other = self.column_of(right)
        if column.kind != "number" or other.kind != "number":
            self.refuse(right, "condition-two-columns", columns=[quoted(column.name), quoted(other.name)])
        return nodes.NumberComparison(nodes.Operand(column.name), sign, nodes.Operand(other.name))

    def column_of(self, token: Token) -> Column:
        if token.kind != "name":
            self.refuse(token, "condition-not-a-column", text=quoted(token.text))
        if token.text not in self.columns:
            near = nearest(token.text, self.columns)
            self.refuse(
                token,
                "condition-unknown-column",
                column=quoted(token.text),
                nearest="" if near is None else quoted(near),
            )
        self.used.append(token.text)
        return self.columns[token.text]

    def number(self, token: Token, column: Column) -> float:
        if not is_number(token.text):
            self.refuse(token, "condition-number-with-text", column=quoted(column.name), text=quoted(token.text))
        return float(token.text)

    def level(self, token: Token, column: Column) -> str:
        if column.kind in ("identifier", "date"):
            return token.text
        value = float(token.text) if token.kind == "number" else token.text
        found = matching(value, column.levels)
        if found is None:
            near = nearest(token.text, column.levels)
            self.refuse(
                token,
                "condition-unknown-level",
                column=quoted(column.name),
                level=quoted(token.text),
                levels=[quoted(level) for level in column.levels[:10]],
                nearest="" if near is None else quoted(near),
            )
        return found

    @property
    def next(self) -> Token:
        return self.found[self.position]

    def advance(self) -> Token:
        token = self.found[self.position]
        self.position += 1
        return token

    def take(self, kind: str, text: str) -> bool:
        """Whether the next token is this one; if so it is passed."""
        if (self.next.kind, self.next.text) != (kind, text):
            return False
        self.position += 1
        return True

    def expect_end(self) -> None:
        if self.next.kind != "end":
            self.unexpected("and, or, or the end of the condition")

    def unexpected(self, expected: str) -> NoReturn:
        token = self.next
        met = "the end of the condition" if token.kind == "end" else quoted(token.text)
        self.refuse(token, "condition-unexpected", met=met, expected=expected)

    def refuse(self, token: Token, code: str, **facts: Any) -> NoReturn:
        raise InputFault(fault(code, f"{self.where}, character {token.at}", **facts))
