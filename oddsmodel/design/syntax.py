"""The syntax tree of a formula: parsed by hand, bounded in depth, unable to hold what the language does not have."""

from __future__ import annotations

import keyword
from collections.abc import Collection
from dataclasses import dataclass

from oddsmodel.design.faults import formula_fault, piece
from oddsmodel.design.tokens import Token, tokenize
from oddsmodel.errors import InputFault

DEEPEST = 40
MOST_IN_LIST = 500
MODULES = ("np", "numpy")
MODULE_FUNCTIONS = ("log", "log2", "log10", "exp", "sqrt")
KEYWORDS = {
    "if": "conditional",
    "else": "conditional",
    "for": "comprehension",
    "async": "comprehension",
    "lambda": "lambda",
    "and": "logic",
    "or": "logic",
    "not": "logic",
    "in": "logic",
    "is": "logic",
}


@dataclass(frozen=True, slots=True)
class Node:
    """A node of the tree: `at` is its first character, `depth` the levels below and including it."""

    at: int
    depth: int


@dataclass(frozen=True, slots=True)
class Name(Node):
    name: str


@dataclass(frozen=True, slots=True)
class Text(Node):
    value: str


@dataclass(frozen=True, slots=True)
class Number(Node):
    value: float
    written: str


@dataclass(frozen=True, slots=True)
class Items(Node):
    """A list in square brackets."""

    values: tuple[Node, ...]


@dataclass(frozen=True, slots=True)
class Call(Node):
    function: str
    arguments: tuple[Node, ...]
    keywords: tuple[tuple[str, Node], ...]


@dataclass(frozen=True, slots=True)
class Sign(Node):
    """A sign before a factor of a product, a power or an exponent."""

    sign: str
    operand: Node


@dataclass(frozen=True, slots=True)
class Binary(Node):
    """`operator` is one of * / : **."""

    operator: str
    left: Node
    right: Node


@dataclass(frozen=True, slots=True)
class Sum(Node):
    """Items added or taken away, each with its sign, in order."""

    items: tuple[tuple[str, Node], ...]


@dataclass(frozen=True, slots=True)
class FormulaTree:
    """left: None where the formula has no left side. at: where the right side starts."""

    left: Node | None
    right: Node
    at: int


def parse(text: str, where: str, columns: Collection[str] = ()) -> FormulaTree:
    """The tree of a formula, or InputFault at the first thing that is no formula.

    Precedence, from loose to tight: ~, then + and -, then * and /, then :, then a sign, then **.
    columns: names that may be written bare although Python keeps them for itself ("class").
    """
    return _Parser(tokenize(text, where), where, columns).formula()


class _Parser:
    def __init__(self, tokens: list[Token], where: str, columns: Collection[str]) -> None:
        self.tokens, self.where, self.columns = tokens, where, columns
        self.position = 0
        self.open = 0

    def formula(self) -> FormulaTree:
        if self.at_end():
            raise self.fault("formula-empty")
        left = None
        if not self.meets("~"):
            left = self.sum()
            if not self.meets("~"):
                return FormulaTree(None, self.ended(left), 0)
        self.step()
        if self.at_end():
            raise self.fault("formula-no-right-side")
        start = self.now.at
        return FormulaTree(left, self.ended(self.sum()), start)

    def ended(self, node: Node) -> Node:
        if not self.at_end():
            raise self.unexpected()
        return node

    def sum(self) -> Node:
        self.open += 1
        if self.open > DEEPEST:
            raise self.fault("formula-too-deep", deepest=DEEPEST)
        start = self.now.at
        sign = self.step().text if self.meets("+", "-") else "+"
        items = [(sign, self.product())]
        while self.meets("+", "-"):
            items.append((self.step().text, self.product()))
        self.open -= 1
        if len(items) == 1 and items[0][0] == "+":
            return items[0][1]
        return Sum(start, self.deeper(*(node for _, node in items)), tuple(items))

    def product(self) -> Node:
        node = self.interaction()
        while self.meets("*", "/"):
            node = self.binary(node, self.step().text, self.interaction())
        return node

    def interaction(self) -> Node:
        node = self.signed()
        while self.meets(":"):
            node = self.binary(node, self.step().text, self.signed())
        return node

    def signed(self) -> Node:
        if not self.meets("+", "-"):
            return self.power()
        sign = self.step()
        self.open += 1
        if self.open > DEEPEST:
            raise self.fault("formula-too-deep", deepest=DEEPEST)
        operand = self.signed()
        self.open -= 1
        return Sign(sign.at, self.deeper(operand), sign.text, operand)

    def power(self) -> Node:
        node = self.primary()
        if not self.meets("**"):
            return node
        operator = self.step().text
        self.open += 1
        if self.open > DEEPEST:
            raise self.fault("formula-too-deep", deepest=DEEPEST)
        exponent = self.signed()
        self.open -= 1
        return self.binary(node, operator, exponent)

    def binary(self, left: Node, operator: str, right: Node) -> Node:
        return Binary(left.at, self.deeper(left, right), operator, left, right)

    def primary(self) -> Node:
        token = self.now
        if token.kind == "name":
            node = self.name()
        elif token.kind == "text":
            node = Text(self.step().at, 1, str(token.value))
        elif token.kind == "number":
            self.step()
            node = Number(token.at, 1, float(token.value or 0.0), token.text)
        elif self.meets("("):
            self.step()
            if self.meets(")"):
                raise self.refused("empty-parentheses", "()", token.at)
            node = self.sum()
            if self.meets(","):
                raise self.refused("tuple", ",")
            self.closed(")", token)
        elif self.meets("["):
            node = self.items()
        else:
            raise self.unexpected()
        self.nothing_attached(node)
        return node

    def nothing_attached(self, node: Node) -> None:
        """An attribute, a subscript or a call of what is no function name is refused."""
        if self.meets("."):
            raise self.refused("attribute", ".")
        if self.meets("["):
            raise self.refused("subscript", "[")
        if self.meets("("):
            raise self.refused("call-of-a-value", "(")

    def name(self) -> Node:
        token = self.step()
        if keyword.iskeyword(token.text) and token.text not in self.columns:
            raise self.refused(KEYWORDS.get(token.text, "keyword"), token.text, token.at)
        name = token.text
        if self.meets("."):
            name = self.attribute(token)
        if self.meets("("):
            return self.call(name, token)
        return Name(token.at, 1, name)

    def attribute(self, token: Token) -> str:
        """np.log and its like are spellings of log; any other attribute is refused."""
        self.step()
        named = self.now.text if self.now.kind == "name" else ""
        following = self.tokens[min(self.position + 1, len(self.tokens) - 1)].text
        if token.text in MODULES and named in MODULE_FUNCTIONS and following == "(":
            return self.step().text
        dotted = f"{token.text}.{named}"
        construct = "dotted-column" if dotted in self.columns else "attribute"
        raise self.refused(construct, dotted, token.at)

    def call(self, function: str, token: Token) -> Node:
        opening = self.step()
        arguments: list[Node] = []
        keywords: dict[str, Node] = {}
        while not self.meets(")"):
            if self.meets("*", "**"):
                raise self.refused("star-arguments", self.now.text)
            if self.now.kind == "name" and self.tokens[self.position + 1].text == "=":
                name = self.step()
                self.step()
                if name.text in keywords:
                    raise self.refused("keyword-twice", name.text, name.at)
                keywords[name.text] = self.sum()
            elif keywords:
                raise self.refused("argument-after-keyword", self.now.text)
            else:
                arguments.append(self.sum())
            if not self.meets(","):
                break
            self.step()
        self.closed(")", opening)
        depth = self.deeper(*arguments, *keywords.values())
        return Call(token.at, depth, function, tuple(arguments), tuple(keywords.items()))

    def items(self) -> Node:
        opening = self.step()
        values: list[Node] = []
        while not self.meets("]"):
            values.append(self.sum())
            if len(values) > MOST_IN_LIST:
                raise self.fault("formula-list-too-long", most=MOST_IN_LIST)
            if not self.meets(","):
                break
            self.step()
        self.closed("]", opening)
        return Items(opening.at, self.deeper(*values), tuple(values))

    @property
    def now(self) -> Token:
        return self.tokens[self.position]

    def at_end(self) -> bool:
        return self.now.kind == "end"

    def step(self) -> Token:
        token = self.now
        self.position += 1
        return token

    def meets(self, *operators: str) -> bool:
        return self.now.kind == "operator" and self.now.text in operators

    def closed(self, bracket: str, opening: Token) -> None:
        if self.at_end():
            raise formula_fault("formula-not-closed", self.where, opening.at, bracket=opening.text, closing=bracket)
        if not self.meets(bracket):
            raise self.unexpected()
        self.step()

    def deeper(self, *nodes: Node) -> int:
        depth = 1 + max((node.depth for node in nodes), default=0)
        if depth > DEEPEST:
            raise self.fault("formula-too-deep", deepest=DEEPEST)
        return depth

    def fault(self, code: str, at: int | None = None, **facts: object) -> InputFault:
        return formula_fault(code, self.where, self.now.at if at is None else at, **facts)

    def refused(self, construct: str, written: str, at: int | None = None) -> InputFault:
        return self.fault("formula-refused", at, construct=construct, written=piece(written))

    def unexpected(self) -> InputFault:
        """What to say of a token that cannot stand where it does."""
        token = self.now
        if token.kind == "end":
            return self.fault("formula-ends-early")
        if token.kind == "name" and keyword.iskeyword(token.text):
            return self.refused(KEYWORDS.get(token.text, "keyword"), token.text)
        if token.text == "=":
            return self.refused("assignment", "=")
        if token.text == "~":
            return self.refused("second-tilde", "~")
        if token.text in (")", "]"):
            return self.fault("formula-closed-twice", bracket=token.text)
        before = self.tokens[self.position - 1] if self.position else None
        if token.kind != "operator" and before and (before.kind != "operator" or before.text in (")", "]")):
            return self.fault("formula-side-by-side", written=piece(token.text))
        return self.fault("formula-unexpected", written=piece(token.text))
