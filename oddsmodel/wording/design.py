"""Sentences of the design floor, by code: what is wrong with a formula, what to do, what a coefficient is called."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.design_labels import LABELS
from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.say import Sentence

OPERATORS = "Terms are joined by + - : * / and ** and by round brackets"
FUNCTIONS = (
    'The functions there are: C(column), I(arithmetic), Q("column name"), log, log2, log10, exp, sqrt, center, '
    "standardize, bs, cr, cc, rcs(x, knots) and cut(x, [edges])"
)
BARE = "Write names of columns, numbers and the functions of the formula language only."
PREPARE = "Prepare what you need as a column of the records."

CONSTRUCTS: dict[str, tuple[str, str]] = {
    "attribute": (
        "“{written}” reaches into something with a full stop (an attribute)",
        'A column whose name has a full stop in it is written Q("its.name"). ' + BARE,
    ),
    "dotted-column": (
        "“{written}” has a full stop in it, as no name without quotation marks may.",
        'Write Q("{written}").',
    ),
    "subscript": ("“{written}” takes a part out of something (a subscript)", PREPARE),
    "call-of-a-value": ("“{written}” calls something that is not a function's name", FUNCTIONS + "."),
    "empty-parentheses": ("“{written}” holds nothing.", "Write a term between the brackets or take them out."),
    "tuple": ("A comma stands between round brackets that belong to no function.", "Join terms by +."),
    "conditional": ("“{written}” is a conditional", PREPARE),
    "comprehension": ("“{written}” is a comprehension or a loop", PREPARE),
    "lambda": ("“{written}” defines a function", FUNCTIONS + "."),
    "logic": ("“{written}” is a logical word", PREPARE + " Who belongs to the model is said under `keep`."),
    "keyword": (
        "“{written}” is a word of the Python language",
        "If it is the name of a column, look how the records spell it. " + BARE,
    ),
    "walrus": ("“{written}” assigns a value", BARE),
    "assignment": ("“{written}” assigns a value", "The outcome is set apart by ~, as in died ~ smoker + age."),
    "comparison": ("“{written}” compares", PREPARE + " For bands of a number write cut(age, [40, 60])."),
    "floor-division": (
        "“{written}” is no sign of the formula language.",
        "Within I(...) a quotient is written with /.",
    ),
    "arrow": ("“{written}” is no sign of the formula language.", OPERATORS + "."),
    "ellipsis": ("“{written}” stands for nothing here", "Write every column out."),
    "nesting-word": ("“{written}” is no sign of the formula language.", "Write a/b for a and, within it, b."),
    "remainder": ("“{written}” is no sign of the formula language.", OPERATORS + "."),
    "caret": (
        "“{written}” is no sign of the formula language.",
        "A power is written **, and that of a number I(age ** 2).",
    ),
    "bit": ("“{written}” is no sign of the formula language.", OPERATORS + "."),
    "bar": ("“{written}” is no sign of the formula language.", OPERATORS + ". Random effects are not part of it."),
    "at": ("“{written}” is no sign of the formula language.", OPERATORS + "."),
    "exclamation": ("“{written}” is no sign of the formula language.", OPERATORS + "."),
    "question": ("“{written}” is no sign of the formula language.", OPERATORS + "."),
    "dollar": ("“{written}” is no sign of the formula language.", "Write the column's name alone."),
    "semicolon": ("“{written}” ends a statement", "Write one formula and nothing after it."),
    "comment": ("“{written}” begins a comment", "Comments go into the plan, outside the formula."),
    "backtick": ("“{written}” is not what names are quoted with here.", 'Write Q("any name").'),
    "braces": ("“{written}” is no bracket of the formula language.", "Use round brackets."),
    "backslash": ("“{written}” is no sign of the formula language.", "A formula may go over several lines as it is."),
    "curly-quote": ("{written} is a curly quotation mark.", 'Write straight ones: Q("any name").'),
    "dash": ("“{written}” is a dash and not a minus sign.", "Write - in its place."),
    "times": (
        "“{written}” is no sign of the formula language.",
        "Write : for a product of columns, or * for both and it.",
    ),
    "null": ("A NUL character stands in the formula.", "Take it out; it has no place in a text."),
    "text-prefix": ("“{written}” before a text makes it run as code or read as bytes", "Write the text without it."),
    "star-arguments": ("“{written}” spreads something over the arguments of a function", "Write each argument out."),
    "keyword-twice": ("“{written}” is given twice.", "Keep one of the two."),
    "argument-after-keyword": ("“{written}” follows an argument that has a name.", "Put arguments with names last."),
    "second-tilde": ("A second “{written}” stands in the formula.", "Write one outcome and one ~."),
}


def _refused(facts: Mapping[str, Any]) -> str:
    what = CONSTRUCTS[facts["construct"]][0].format(**facts)
    return what if what.endswith(".") else f"{what}, which a formula cannot hold. Nothing of it was run."


def _refused_remedy(facts: Mapping[str, Any]) -> str:
    return CONSTRUCTS[facts["construct"]][1].format(**facts)


def _meant(otherwise: str) -> Sentence:
    def remedy(facts: Mapping[str, Any]) -> str:
        return f"Did you mean “{facts['nearest']}”?" if facts["nearest"] else otherwise.format(**facts)

    return remedy


def _arguments(facts: Mapping[str, Any]) -> str:
    least, most = facts["least"], facts["most"]
    wanted = str(most) if least == most else f"{least} to {most}"
    return f"{facts['function']}(...) takes {wanted} {'argument' if most == 1 else 'arguments'} without a name."


def _keyword_remedy(facts: Mapping[str, Any]) -> str:
    if facts["nearest"]:
        return f"Did you mean {facts['nearest']}?"
    if facts["known"]:
        return f"It has {listed(facts['known'])}."
    return "It takes arguments in their places only."


def _bad_value(facts: Mapping[str, Any]) -> str:
    """ "“log(dose)” has no value for 3 records (the first in row 17, where it is log of 0)"."""
    found = plural(facts["faulty_records"], "record")
    row = f"the first is row {count(facts['row'])} of those analysed"
    return f"“{facts['term']}” has no value for {found}, because {facts['reason']} ({row})."


def _levels_known(facts: Mapping[str, Any]) -> str:
    meant = f"Did you mean “{facts['nearest']}”? " if facts["nearest"] else ""
    known = [f"“{level}”" for level in facts["known"]]
    return f"{meant}The levels are {listed(known)}."


FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    # The text as a formula.
    "formula-too-long": (
        "The formula has {length} characters; {longest} is the limit.",
        "Prepare sums of columns in the records, or leave terms out.",
    ),
    "formula-empty": ("The formula is empty.", "Write the terms of the model, as in died ~ smoker + age."),
    "formula-no-right-side": (
        "Nothing follows the ~.",
        "Write the terms of the model, or 1 for none but the intercept.",
    ),
    "formula-no-terms": (
        "The formula has neither a term nor an intercept.",
        "Write a term, or 1 for the intercept alone.",
    ),
    "formula-refused": (_refused, _refused_remedy),
    "formula-character": (
        "The character {name} (U+{number}) has no place in a formula.",
        'Take it out; where it belongs to the name of a column, write Q("any name").',
    ),
    "formula-number": (
        "“{written}” is neither a number nor a name.",
        'Numbers are written as 10, 0.5 or 1e6; a name that begins with a digit as Q("2nd visit").',
    ),
    "formula-number-too-large": (
        "A number in the formula is larger than {largest:g}, or as long as none can need to be.",
        "Measure the column in larger units.",
    ),
    "formula-backslash-in-text": (
        "A backslash in a text may stand before a quotation mark or another backslash only.",
        "Write the backslash twice.",
    ),
    "formula-text-not-closed": (
        "A text in quotation marks is not closed.",
        "Close it with the mark that opens it, on the same line.",
    ),
    "formula-not-closed": ("The bracket {bracket} is not closed.", "Close it with {closing}."),
    "formula-closed-twice": ("The bracket {bracket} closes nothing.", "Take it out, or open it before."),
    "formula-ends-early": (
        "The formula ends where something more is wanted.",
        "Write the term that is missing, or take the last sign out.",
    ),
    "formula-side-by-side": (
        "“{written}” follows without a sign between.",
        'Join terms by +. A name with a space in it is written Q("any name").',
    ),
    "formula-unexpected": ("“{written}” cannot stand here.", OPERATORS + "."),
    "formula-too-deep": ("Brackets or signs are nested more than {deepest} deep.", "Take needless brackets out."),
    "formula-list-too-long": ("A list has more than {most} entries.", "Shorten it."),
    # Names and functions.
    "formula-column-unknown": (
        "The records have no column “{column}”.",
        _meant('Look how the records spell it; a name with spaces is written Q("any name").'),
    ),
    "formula-column-ambiguous": (
        "{number} columns of the records are called “{column}”, told apart only by how their accents are stored.",
        "Rename one of them in the records.",
    ),
    "formula-outcome-on-right": (
        "The outcome “{outcome}” stands among the terms.",
        "Take it out: it stands left of the ~ or nowhere.",
    ),
    "formula-left-side": (
        lambda facts: (
            f"The left side is “{facts['written']}”, but the plan's outcome is “{facts['outcome']}”."
            if facts["written"]
            else f"The left side is more than the name of the outcome, “{facts['outcome']}”."
        ),
        "Write “{outcome}” left of the ~, or leave the left side out.",
    ),
    "formula-function": (
        "There is no function “{function}” in the formula language, and it was not run.",
        _meant(FUNCTIONS + "."),
    ),
    "formula-column-called": (
        "“{function}” is a column, and brackets follow it as if it were a function.",
        "Write : between it and what it is to be multiplied with.",
    ),
    "formula-q-without-text": ("Q(...) takes the name of a column between quotation marks.", 'Write Q("any name").'),
    "formula-column-wanted": (
        "The name of a column is wanted here.",
        'Write it bare, or as Q("any name"); arithmetic goes into I(...).',
    ),
    "formula-keyword": ("{function}(...) has no argument called “{keyword}”.", _keyword_remedy),
    "formula-arguments": (_arguments, "Write it as in {function}(age, ...), with what it needs and no more."),
    "formula-argument-twice": (
        "{function}(...) is given “{argument}” twice, by place and by name.",
        "Keep one of the two.",
    ),
    # Constants.
    "formula-number-wanted": ("A number is wanted here.", "Write it out, such as 10 or 0.5."),
    "formula-whole-number": ("{argument} is {value}, but must be a whole number from {least} to {most}.", "Change it."),
    "formula-list-wanted": ("A list in square brackets is wanted here.", "Write it as in [40, 60, 80]."),
    "formula-list-length": (
        "The list has {number} entries; {least} to {most} are possible.",
        "Make it longer or shorter.",
    ),
    "formula-list-not-rising": ("The numbers of the list do not rise.", "Write each once, the smallest first."),
    "formula-level-twice": ("A level is listed twice.", "List each level once."),
    "formula-constant-impossible": (
        "This arithmetic of constants has no result.",
        "Correct it, or write its result out.",
    ),
    # Levels.
    "formula-contrast": ("“{written}” is no coding of levels.", 'Choose Treatment(reference="level"), Sum or Poly.'),
    "formula-contrast-arguments": ("{contrast} takes no arguments here.", "Write {contrast} alone."),
    "formula-reference-not-listed": (
        "The reference “{reference}” is not in the list of levels.",
        "Add it to the list, or choose another.",
    ),
    # Arithmetic and splines.
    "formula-not-arithmetic": (
        "This is no arithmetic of numbers.",
        "Use names of number columns, numbers, + - * / ** and log, exp or sqrt.",
    ),
    "formula-colon-in-arithmetic": ("A colon has no meaning in arithmetic.", "Write * for a product of numbers."),
    "formula-power-not-constant": ("A power must be a number.", "Write it out, as in I(age ** 2), or use exp and log."),
    "formula-power-too-large": (
        "The power is larger than {largest}.",
        "Use a smaller one, or a spline such as rcs(age, 4).",
    ),
    "formula-division-by-zero": ("This divides by zero.", "Correct the divisor."),
    "formula-no-column": ("This holds no column of the records.", "Name a column in it."),
    "formula-function-in-arithmetic": (
        "{function}(...) is a term of its own and cannot be computed with.",
        "Let it stand alone among the terms.",
    ),
    "formula-spline-without-df": (
        "{function}(...) is given neither df nor knots.",
        "Write it as in {function}(age, df=4).",
    ),
    "formula-df-too-small": (
        "df={df} is too small for {function}(...) of this kind, which needs {least}.",
        "Raise it.",
    ),
    "formula-df-and-knots": (
        "df and the number of knots of {function}(...) do not go together.",
        "Give one of the two.",
    ),
    "formula-knots-too-few": (
        "{function}(...) needs {least} knots within the range or more.",
        "List more, or give df in their place.",
    ),
    "formula-constraints": (
        'The only constraint there is for a spline is "center".',
        'Write constraints="center", or leave it out.',
    ),
    # Terms.
    "formula-no-term": ("This is no term.", 'Write the name of a column, or Q("any name"), or a function of columns.'),
    "formula-number-as-term": (
        "The number {written} stands among the terms, where only 0 (no intercept) and 1 have a meaning.",
        "Arithmetic goes into I(...), as in I(age / 10).",
    ),
    "formula-constant-in-product": (
        "0 or 1 (or 2 and the like) stands in a product of terms, where it has no meaning.",
        "Let it stand in the outermost sum; arithmetic goes into I(...).",
    ),
    "formula-zero-in-parentheses": (
        "0 or - 1 stands within brackets, where it would not take the intercept out.",
        "Let it stand in the outermost sum.",
    ),
    "formula-sign": (
        "A minus sign before a term means nothing here.",
        "Write - 1 for no intercept; arithmetic goes into I(...).",
    ),
    "formula-not-there-to-take": (
        "“{term}” is taken away, but is not among the terms before it.",
        "Correct the name, or leave it out.",
    ),
    "formula-power": (
        "After ** a whole number from 1 to {most} is wanted: products of up to so many terms.",
        "The square of a number is written I(age ** 2).",
    ),
    "formula-power-of-one": (
        "A power of the one term “{term}” is that term itself in the formula language.",
        "For arithmetic write it as in I(age ** 2).",
    ),
    "formula-with-itself": (
        "The product of “{term}” with itself is that term in the formula language.",
        "For arithmetic write it as in I(age * age).",
    ),
    "formula-too-many-terms": ("The formula makes more than {most} terms.", "Leave products out, or lower the power."),
    "formula-too-many-factors": (
        "A term is the product of more than {most} columns.",
        "Lower the power, or leave products out; no records can tell so many apart.",
    ),
    # The formula against the records.
    "design-not-a-number": (
        "“{column}” is of the kind {kind}, and “{term}” needs a number.",
        "Let the column stand alone or in C(...), or correct its kind in the plan.",
    ),
    "design-not-for-models": (
        "“{column}” is of the kind {kind}, which tells records apart and can be no term of a model.",
        "Take it out of the formula, or correct its kind in the plan.",
    ),
    "design-column-missing": ("“{column}” is not among the columns of these records.", "Give records that hold it."),
    "design-column-not-numbers": (
        "“{column}” was a number when the model was built, and here it is not.",
        "Give it as numbers.",
    ),
    "design-not-recorded": (
        lambda facts: (
            f"“{facts['column']}” is not recorded in {plural(facts['missing_records'], 'record')} "
            f"(the first is row {count(facts['row'])} of those given)."
        ),
        "Give complete records.",
    ),
    "design-level-unseen": (
        lambda facts: (
            f"“{facts['column']}” is “{facts['level']}” in {plural(facts['unseen_records'], 'record')} (the first is "
            f"row {count(facts['row'])} of those given), which none was when the model was built."
        ),
        "Leave these records out, or build the model on records that hold the level.",
    ),
    "design-level-unknown": ("“{column}” has no level “{level}”.", _levels_known),
    "design-levels-left-out": (
        lambda facts: (
            f"The list of levels of “{facts['column']}” leaves out “{facts['level']}”, which "
            f"{plural(facts['left_out_records'], 'record')} of those analysed have."
        ),
        "List every level, or leave the records out by `keep`.",
    ),
    "design-reference-absent": (
        "No record of those analysed has the level “{level}”, against which “{column}” is to be compared.",
        "Choose another reference, or look at `keep` and at who was left out.",
    ),
    "design-one-level": (
        "All records analysed have the same level of “{column}”: “{level}”. There is nothing to compare.",
        "Leave it out of the formula, or look at `keep` and at who was left out.",
    ),
    "design-too-many-levels": (
        lambda facts: (
            f"“{facts['column']}” has more than {count(facts['most'])} different values, too many for levels."
        ),
        "Let it stand as a number, or use cut({column}, [edges]).",
    ),
    "design-poly-too-many-levels": (
        "“{term}” has {number} levels; polynomial contrasts are for {most} at most.",
        "Join levels, or take the column as a number.",
    ),
    "design-too-many-columns": (
        "The formula makes more than {most} columns from these records.",
        "Join levels, or leave products out.",
    ),
    "design-no-value": (_bad_value, "Leave these records out by `keep`, or use a function that has a value for them."),
    "design-constant": (
        "“{term}” cannot be made: “{column}” has the same value in all records analysed.",
        "Leave it out of the formula.",
    ),
    "design-knots-tied": (
        lambda facts: (
            f"“{facts['term']}” cannot be made: its knots fall together, because too many records have the same value."
        ),
        lambda facts: (
            f"Fewer would do: rcs with {facts['possible']} knots."
            if facts.get("possible")
            else "Ask for fewer knots, list knots of your own, or let the column stand as a number."
        ),
    ),
    "design-few-values": (
        "“{term}” cannot be made: {columns} columns are wanted of it, and the records have {values} different values.",
        "Ask for less, or take the column as levels with C(...).",
    ),
    "design-knots-outside": (
        "“{term}” cannot be made: a knot lies outside the values of the records analysed, from {lowest} to {highest}.",
        "Put all knots between the two.",
    ),
    "design-no-range": (
        "“{term}” cannot be made: all records analysed have the same value.",
        "Leave it out of the formula.",
    ),
}

FINDINGS: dict[str, Sentence] = {
    "level-without-records": (
        "No record of those analysed has the level “{level}” of {label}, so the model has no coefficient for it."
    ),
    "spline-holds-constant": (
        "“{term}” holds the intercept a second time, so the model has no unique answer. Write it with "
        'constraints="center".'
    ),
}

REASONS: dict[str, Sentence] = {
    "value-log": "the logarithm is of a number above 0 only, and {inside} is {value}",
    "value-sqrt": "the square root is of a number from 0 on only, and {inside} is {value}",
    "value-divided": "it divides by {inside}, which is 0",
    "value-power": "{inside} is {value}, of which there is no such power",
    "value-too-large": "it is larger than any number the computer holds where {inside} is {value}",
}

SENTENCES: dict[str, Sentence] = {
    **{code: what for code, (what, _) in FAULTS.items()},
    **{f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()},
    **FINDINGS,
    **{f"design-{code}": words for code, words in REASONS.items()},
    **LABELS,
}
