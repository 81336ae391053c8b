"""The factors that a formula can hold, as vetted: plain values with names of the records in them, nothing to run."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from oddsmodel.design.arithmetic import Expression, Function, columns_of, text_of
from oddsmodel.design.words import number_text, written_column, written_text

Coding = Literal["treatment", "sum", "polynomial"]
CODING_WORDS: dict[Coding, str] = {"treatment": "Treatment", "sum": "Sum", "polynomial": "Poly"}


def _listed(values: tuple[float, ...]) -> str:
    return f"[{', '.join(number_text(value) for value in values)}]"


@dataclass(frozen=True, slots=True)
class PlainColumn:
    """A column by its name: a number stays one, a column with levels is taken against its reference."""

    column: str

    @property
    def columns(self) -> tuple[str, ...]:
        return (self.column,)

    @property
    def text(self) -> str:
        return written_column(self.column)


@dataclass(frozen=True, slots=True)
class Bands:
    """cut(x, edges): bands of a number, each holding its lower edge; the outermost are open."""

    expression: Expression
    edges: tuple[float, ...]

    @property
    def columns(self) -> tuple[str, ...]:
        return columns_of(self.expression)

    @property
    def text(self) -> str:
        return f"cut({text_of(self.expression)}, {_listed(self.edges)})"


@dataclass(frozen=True, slots=True)
class Levels:
    """C(...): a column or bands taken as levels, with a coding, a reference and an order of levels where given."""

    source: PlainColumn | Bands
    coding: Coding | None = None
    reference: str | None = None
    levels: tuple[str, ...] | None = None

    @property
    def columns(self) -> tuple[str, ...]:
        return self.source.columns

    @property
    def text(self) -> str:
        parts = [self.source.text]
        if self.reference is not None:
            parts.append(f"Treatment(reference={written_text(self.reference)})")
        elif self.coding is not None:
            parts.append(CODING_WORDS[self.coding])
        if self.levels is not None:
            parts.append(f"levels=[{', '.join(written_text(level) for level in self.levels)}]")
        return f"C({', '.join(parts)})"


@dataclass(frozen=True, slots=True)
class Computed:
    """One number computed from number columns: a function of them, or I(...) of arithmetic."""

    expression: Expression

    @property
    def columns(self) -> tuple[str, ...]:
        return columns_of(self.expression)

    @property
    def text(self) -> str:
        words = text_of(self.expression)
        return words if isinstance(self.expression, Function) else f"I({words})"


@dataclass(frozen=True, slots=True)
class BasisSpline:
    """bs(x, df, knots, degree): a B-spline without its first basis function (de Boor 1978)."""

    expression: Expression
    df: int | None
    knots: tuple[float, ...] | None
    degree: int | None

    @property
    def columns(self) -> tuple[str, ...]:
        return columns_of(self.expression)

    @property
    def text(self) -> str:
        degree = "" if self.degree is None else f", degree={self.degree}"
        return f"bs({text_of(self.expression)}{_df_and_knots(self.df, self.knots)}{degree})"


@dataclass(frozen=True, slots=True)
class CubicSpline:
    """cr(x, ...) natural or cc(x, ...) cyclic cubic regression spline (Wood 2006, section 4.1.2)."""

    expression: Expression
    cyclic: bool
    df: int | None
    knots: tuple[float, ...] | None
    centred: bool

    @property
    def columns(self) -> tuple[str, ...]:
        return columns_of(self.expression)

    @property
    def text(self) -> str:
        name = "cc" if self.cyclic else "cr"
        centred = ', constraints="center"' if self.centred else ""
        return f"{name}({text_of(self.expression)}{_df_and_knots(self.df, self.knots)}{centred})"


@dataclass(frozen=True, slots=True)
class RestrictedCubicSpline:
    """rcs(x, k): restricted cubic spline with k knots at Harrell's quantiles, or with the knots given."""

    expression: Expression
    knots: int | tuple[float, ...]

    @property
    def columns(self) -> tuple[str, ...]:
        return columns_of(self.expression)

    @property
    def text(self) -> str:
        knots = str(self.knots) if isinstance(self.knots, int) else _listed(self.knots)
        return f"rcs({text_of(self.expression)}, {knots})"


def _df_and_knots(df: int | None, knots: tuple[float, ...] | None) -> str:
    return ("" if df is None else f", df={df}") + ("" if knots is None else f", knots={_listed(knots)}")


Factor = PlainColumn | Bands | Levels | Computed | BasisSpline | CubicSpline | RestrictedCubicSpline
