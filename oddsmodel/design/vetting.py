"""From the syntax tree to vetted factors: every function, keyword and constant is one that the language has."""

from __future__ import annotations

from collections.abc import Collection

from oddsmodel.design import arithmetic as vetted
from oddsmodel.design.constants import Constants
from oddsmodel.design.factors import (
    Bands,
    BasisSpline,
    Coding,
    Computed,
    CubicSpline,
    Factor,
    Levels,
    PlainColumn,
    RestrictedCubicSpline,
)
from oddsmodel.design.faults import formula_fault, piece
from oddsmodel.design.names import ColumnNames
from oddsmodel.design.syntax import Binary, Call, Items, Name, Node, Number, Sign, Sum, Text
from oddsmodel.design.words import number_text
from oddsmodel.errors import InputFault
from oddsmodel.plan.nearest import nearest

SPLINES = ("bs", "cr", "cc", "rcs")
FACTOR_FUNCTIONS = ("Q", "C", "I", "cut", *SPLINES, *vetted.FUNCTIONS)
CODINGS: dict[str, Coding] = {"Treatment": "treatment", "Sum": "sum", "Poly": "polynomial"}
LARGEST_POWER = 10.0
MOST_DF, MOST_DEGREE, MOST_KNOTS, MOST_EDGES, MOST_LEVELS = 20, 5, 20, 50, 500
FEWEST_RCS, MOST_RCS = 3, 7


class Vetter:
    """Turns names and calls into factors; the names of the records are the only names it knows."""

    def __init__(self, names: ColumnNames) -> None:
        self.names, self.where = names, names.where
        self.constants = Constants(names.where)

    def factor(self, node: Node) -> Factor:
        """The factor that a name or a call stands for, or InputFault."""
        if isinstance(node, Name):
            return PlainColumn(self.column(node))
        if not isinstance(node, Call):
            raise self.fault("formula-no-term", node)
        if node.function == "Q":
            return PlainColumn(self.column(node))
        if node.function == "C":
            return self.levels(node)
        if node.function == "cut":
            return self.bands(node)
        if node.function in SPLINES:
            return self.spline(node)
        if node.function == "I" or node.function in vetted.FUNCTIONS:
            return Computed(self.arithmetic(node))
        raise self.unknown_function(node)

    def column(self, node: Node) -> str:
        """The column of a bare name or of Q("any name")."""
        if isinstance(node, Name):
            return self.names.found(node.name, node.at)
        if isinstance(node, Call) and node.function == "Q":
            self.shape(node, most=1)
            quoted = node.arguments[0]
            if not isinstance(quoted, Text):
                raise self.fault("formula-q-without-text", node)
            return self.names.found(quoted.value, quoted.at)
        raise self.fault("formula-column-wanted", node)

    def levels(self, call: Call) -> Levels:
        """C(column or cut(...), contrast, levels=[...])."""
        self.shape(call, most=3, keywords=("contrast", "levels"))
        first = call.arguments[0]
        bands = isinstance(first, Call) and first.function == "cut"
        source = self.bands(first) if bands and isinstance(first, Call) else PlainColumn(self.column(first))
        given = dict(zip(("contrast", "levels"), call.arguments[1:], strict=False))
        given |= self.keywords(call, given)
        coding, reference = self.contrast(given["contrast"]) if "contrast" in given else (None, None)
        levels = self.constants.texts(given["levels"], MOST_LEVELS) if "levels" in given else None
        if levels is not None and reference is not None and reference not in levels:
            raise self.fault("formula-reference-not-listed", given["contrast"], reference=piece(reference))
        return Levels(source, coding, reference, levels)

    def contrast(self, node: Node) -> tuple[Coding, str | None]:
        """The coding that a contrast names, and the reference level where it gives one."""
        name = node.name if isinstance(node, Name) else node.function if isinstance(node, Call) else ""
        coding = CODINGS.get(name)
        if coding is None:
            raise self.fault("formula-contrast", node, written=piece(name))
        if not isinstance(node, Call) or not (node.arguments or node.keywords):
            return coding, None
        if coding != "treatment":
            raise self.fault("formula-contrast-arguments", node, contrast=name)
        self.shape(node, least=0, most=1, keywords=("reference",))
        given = [*node.arguments, *self.keywords(node, ("reference",) if node.arguments else ()).values()]
        return coding, self.constants.text(given[0])

    def bands(self, call: Call) -> Bands:
        """cut(x, [edges])."""
        self.shape(call, least=2, most=2)
        edges = self.constants.numbers(call.arguments[1], MOST_EDGES)
        return Bands(self.numbers(call), edges)

    def spline(self, call: Call) -> Factor:
        if call.function == "rcs":
            self.shape(call, least=2, most=2)
            knots = call.arguments[1]
            if isinstance(knots, Items):
                return RestrictedCubicSpline(self.numbers(call), self.constants.numbers(knots, MOST_KNOTS, FEWEST_RCS))
            number = self.constants.whole(knots, FEWEST_RCS, MOST_RCS, "knots")
            return RestrictedCubicSpline(self.numbers(call), number)
        order = ("df", "knots", "degree") if call.function == "bs" else ("df", "knots", "constraints")
        positional = 4 if call.function == "bs" else 3
        self.shape(call, most=positional, keywords=order)
        given = dict(zip(order, call.arguments[1:], strict=False))
        given |= self.keywords(call, given)
        if "df" not in given and "knots" not in given:
            raise self.fault("formula-spline-without-df", call, function=call.function)
        df = self.constants.whole(given["df"], 1, MOST_DF, "df") if "df" in given else None
        inner = self.constants.numbers(given["knots"], MOST_KNOTS) if "knots" in given else None
        if call.function == "bs":
            degree = self.constants.whole(given["degree"], 0, MOST_DEGREE, "degree") if "degree" in given else None
            return self.basis_spline(call, df, inner, degree)
        centred = "constraints" in given
        if centred and self.constants.text(given["constraints"]) != "center":
            raise self.fault("formula-constraints", given["constraints"])
        return self.cubic_spline(call, df, inner, centred)

    def basis_spline(self, call: Call, df: int | None, inner: tuple[float, ...] | None, degree: int | None) -> Factor:
        least = 3 if degree is None else max(degree, 1)
        if df is not None and df < least:
            raise self.fault("formula-df-too-small", call, function="bs", df=df, least=least)
        if df is not None and inner is not None and len(inner) != df - (3 if degree is None else degree):
            raise self.fault("formula-df-and-knots", call, function="bs")
        return BasisSpline(self.numbers(call), df, inner, degree)

    def cubic_spline(self, call: Call, df: int | None, inner: tuple[float, ...] | None, centred: bool) -> Factor:
        cyclic = call.function == "cc"
        least = 2 if centred else 3
        if df is not None and df < least:
            raise self.fault("formula-df-too-small", call, function=call.function, df=df, least=least)
        if df is not None and inner is not None and len(inner) != df - 2 + centred + cyclic:
            raise self.fault("formula-df-and-knots", call, function=call.function)
        if inner is not None and len(inner) < 1 + cyclic:
            raise self.fault("formula-knots-too-few", call, function=call.function, least=1 + cyclic)
        return CubicSpline(self.numbers(call), cyclic, df, inner, centred)

    def numbers(self, call: Call) -> vetted.Expression:
        """The first argument of a call: arithmetic that holds a column."""
        return self.holding_a_column(call.arguments[0])

    def holding_a_column(self, node: Node) -> vetted.Expression:
        expression = self.arithmetic(node)
        if isinstance(expression, vetted.Constant):
            raise self.fault("formula-no-column", node)
        return expression

    def arithmetic(self, node: Node) -> vetted.Expression:
        """Arithmetic of number columns; parts without a column become one constant."""
        if isinstance(node, Name):
            return vetted.ColumnValue(self.column(node))
        if isinstance(node, Number):
            return vetted.Constant(node.value)
        if isinstance(node, Sign):
            return self.total(((node.sign, node.operand),), node)
        if isinstance(node, Sum):
            return self.total(node.items, node)
        if isinstance(node, Binary):
            return self.operation(node)
        if isinstance(node, Call):
            return self.function(node)
        raise self.fault("formula-not-arithmetic", node)

    def total(self, items: tuple[tuple[str, Node], ...], node: Node) -> vetted.Expression:
        parts = tuple((sign, self.arithmetic(item)) for sign, item in items)
        values = [one.value if sign == "+" else -one.value for sign, one in parts if isinstance(one, vetted.Constant)]
        if len(values) == len(parts):
            return vetted.Constant(self.constants.bounded(sum(values), node))
        return parts[0][1] if len(parts) == 1 and parts[0][0] == "+" else vetted.Total(parts)

    def operation(self, node: Binary) -> vetted.Expression:
        if node.operator == ":":
            raise self.fault("formula-colon-in-arithmetic", node)
        left, right = self.arithmetic(node.left), self.arithmetic(node.right)
        if node.operator == "**":
            if not isinstance(right, vetted.Constant):
                raise self.fault("formula-power-not-constant", node.right)
            if abs(right.value) > LARGEST_POWER:
                raise self.fault("formula-power-too-large", node.right, largest=number_text(LARGEST_POWER))
        if isinstance(left, vetted.Constant) and isinstance(right, vetted.Constant):
            return vetted.Constant(self.constants.computed(node.operator, left.value, right.value, node))
        if node.operator == "/" and right == vetted.Constant(0.0):
            raise self.fault("formula-division-by-zero", node.right)
        operator: vetted.Operator = "**" if node.operator == "**" else "*" if node.operator == "*" else "/"
        return vetted.Operation(operator, left, right)

    def function(self, call: Call) -> vetted.Expression:
        if call.function == "Q":
            return vetted.ColumnValue(self.column(call))
        if call.function not in ("I", *vetted.FUNCTIONS):
            if call.function in FACTOR_FUNCTIONS:
                raise self.fault("formula-function-in-arithmetic", call, function=call.function)
            raise self.unknown_function(call)
        self.shape(call, most=1)
        argument = self.holding_a_column(call.arguments[0])
        for name in vetted.FUNCTIONS:
            if name == call.function:
                return vetted.Function(name, argument)
        return argument

    def shape(self, call: Call, *, least: int = 1, most: int, keywords: tuple[str, ...] = ()) -> None:
        """InputFault where a call has too few or too many arguments, or a keyword that its function does not have."""
        for name, value in call.keywords:
            if name not in keywords:
                near = nearest(name, keywords) or ""
                raise self.fault(
                    "formula-keyword",
                    value,
                    function=call.function,
                    keyword=piece(name),
                    known=list(keywords),
                    nearest=near,
                )
        if not least <= len(call.arguments) <= most:
            raise self.fault("formula-arguments", call, function=call.function, least=least, most=most)

    def keywords(self, call: Call, given: Collection[str]) -> dict[str, Node]:
        """The keywords of a call, none of which may be given in its place as well."""
        for name, value in call.keywords:
            if name in given:
                raise self.fault("formula-argument-twice", value, function=call.function, argument=name)
        return dict(call.keywords)

    def unknown_function(self, call: Call) -> InputFault:
        near = nearest(call.function, FACTOR_FUNCTIONS) or ""
        a_column = call.function in self.names.exact
        code = "formula-column-called" if a_column else "formula-function"
        return self.fault(code, call, function=piece(call.function), nearest=near)

    def fault(self, code: str, node: Node, **facts: object) -> InputFault:
        return formula_fault(code, self.where, node.at, **facts)
