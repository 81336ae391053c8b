"""Every error of the plan's types told as a fault of ours: key path, what is wrong, nearest key or value."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal, get_args, get_origin

from oddsmodel.errors import Fault
from oddsmodel.plan.examples import example
from oddsmodel.plan.faults import NAMED_SECTIONS, described, fault, heading, key_path, shown_key
from oddsmodel.plan.later import later
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import LARGEST_SEED, LONGEST_WINDOW, SECTIONS, Prior, Repeats, Section, keys_of
from oddsmodel.wording.plain import as_code, plain, quoted

Location = tuple[str | int, ...]
WITHIN: dict[tuple[str, str], tuple[type[Section], str]] = {
    ("records", "repeats"): (Repeats, "a person and an order"),
    ("models", "prior"): (Prior, "m and columns"),
}
"""Keys of a section that hold keys of their own: their type, and what they need in words."""

_WANTED = {
    "string_type": "a text in quotes",
    "tuple_type": "a list in brackets",
    "float_type": "a number",
    "int_type": "a whole number",
    "bool_type": "true or false",
}
_RANGES: dict[str, tuple[str, str]] = {
    "level": ("0.5", "0.999"),
    "hide_counts_below": ("0", "1000"),
    "seed": ("0", str(LARGEST_SEED)),
    "within_days": ("1", str(LONGEST_WINDOW)),
    "from_day": ("0", str(LONGEST_WINDOW)),
    "m": ("0.01", "1000"),
}


@dataclass(frozen=True, slots=True)
class Error:
    """One error of the types: its kind, where it stands, what was found there; the plan's name and content."""

    kind: str
    location: Location
    value: Any
    message: str
    name: str
    data: Mapping[str, Any]

    @property
    def section(self) -> str:
        return str(self.location[0])

    @property
    def key(self) -> str:
        """The key that the error is about, an item of its list left aside."""
        return next(str(part) for part in reversed(self.location) if isinstance(part, str))

    @property
    def where(self) -> str:
        return self.at(self.location)

    def at(self, location: Location) -> str:
        return f"{self.name}, {key_path(location, self.data)}" if location else self.name


def translate(error: Error) -> Fault | None:
    """The fault for one error of the types; None for one that only follows from a key told as "not yet"."""
    return _TRANSLATORS.get(error.kind, _other)(error)


def offer(word: str, valid: Sequence[str], choice: str = "Choose from") -> dict[str, Any]:
    """The facts of a sentence that offers the nearest of some values, or all, in quotes."""
    near = nearest(word, valid)
    return {
        "nearest": None if near is None else quoted(near),
        "valid": [quoted(value) for value in valid],
        "choice": choice,
        "last": "or",
    }


def _offer_keys(word: str, valid: Iterable[str], choice: str) -> dict[str, Any]:
    words = list(valid)
    return {"nearest": nearest(word, words), "valid": words, "choice": choice, "last": "and"}


def _within(location: Location) -> tuple[type[Section], str] | None:
    """The section of its own that a key of a section is; items of lists and names left aside."""
    words = tuple(str(part) for part in location if isinstance(part, str))
    return WITHIN.get((words[0], words[-1])) if len(words) == 2 else None


def _missing(error: Error) -> Fault | None:
    if _follows_from_later(error):
        return None
    if len(error.location) == 1:
        opening = heading(error.section)
        return fault("section-missing", error.name, heading=opening, example=example(error.location))
    return fault("key-missing", error.at(error.location[:-1]), key=error.key, example=example(error.location))


def _follows_from_later(error: Error) -> bool:
    """Whether what is missing would not be asked for if the plan's "not yet" keys were known."""
    return error.location == ("outcome",) and "outcomes" in error.data


def _unknown_key(error: Error) -> Fault:
    code = later(error.location)
    if code:
        return fault(code, error.where)

    key, section, shown = error.key, error.section, plain(error.key, 60)
    if len(error.location) == 1:
        return fault("unknown-section", error.where, key=shown, **_offer_keys(key, SECTIONS, "The sections are"))

    column = str(error.location[1]) if section in NAMED_SECTIONS else None
    if column is not None and isinstance(error.value, Mapping):
        in_full = f"[{section}.{as_code(f'{column}.{key}')}]"
        return fault("dotted-column-name", error.where, key=shown, column=shown_key(column), example=in_full)

    within = _within(error.location[:-1])
    if within is not None:
        facts = _offer_keys(key, within[0].model_fields, "Its keys are")
        return fault("unknown-key", error.where, heading=str(error.location[-2]), key=shown, **facts)

    known = keys_of(SECTIONS[section])
    opening = heading(section, column)
    home = next((other for other, kind in SECTIONS.items() if key in keys_of(kind)), None)
    if home is not None:
        other = f"a column's own heading, such as [{home}.age]" if home in NAMED_SECTIONS else heading(home)
        return fault("key-of-another-section", error.where, heading=opening, key=shown, other=other)
    return fault("unknown-key", error.where, heading=opening, key=shown, **_offer_keys(key, known, "Its keys are"))


def _wrong_kind(error: Error) -> Fault:
    found = described(error.value)
    if error.location == ("models",):
        return fault("not-a-list-of-models", error.where, found=found)

    line = example(error.location)
    if error.kind == "tuple_type" and isinstance(error.value, str):
        line = f"{error.key} = [{as_code(error.value)}], in brackets"
    elif error.kind == "string_type" and isinstance(error.location[-1], int):
        line = f"in {line}"
    elif error.kind == "string_type" and isinstance(error.value, bool | int | float) and len(found) < 40:
        line = f"{error.key} = {as_code(str(error.value).lower())}, in quotes"
    elif isinstance(error.value, str):
        line = f"{line}, without quotes"
    return fault("wrong-kind-of-value", error.where, found=found, wanted=_WANTED[error.kind], example=line)


def _not_a_section(error: Error) -> Fault:
    found = described(error.value)
    if error.location in (("columns",), ("derived",)):
        return fault("not-a-section-per-column", error.where, found=found, section=error.section)
    within = _within(error.location)
    if within is not None:
        line = example(error.location)
        return fault("wrong-kind-of-value", error.where, found=found, wanted=within[1], example=line)
    if error.kind == "dict_type":
        line = f"{error.key} = {{diabetes = 1, cancer = 2}}"
        return fault("wrong-kind-of-value", error.where, found=found, wanted="a number for each column", example=line)
    opening = heading(error.section, str(error.location[1]) if error.section in NAMED_SECTIONS else None)
    return fault("not-a-section", error.where, found=found, heading=opening)


def _not_one_of(error: Error) -> Fault:
    word = error.value if isinstance(error.value, str) else ""
    return fault("not-one-of", error.where, found=_found(error.value), **offer(word, _valid_values(error)))


def _valid_values(error: Error) -> tuple[str, ...]:
    within = _within(error.location[:-1])
    section = within[0] if within is not None else SECTIONS[error.section]
    field = keys_of(section)[error.key]
    return _literals(field.annotation)


def _literals(annotation: Any) -> tuple[str, ...]:
    if get_origin(annotation) is Literal:
        return tuple(str(value) for value in get_args(annotation))
    return tuple(value for part in get_args(annotation) for value in _literals(part))


def _out_of_range(error: Error) -> Fault:
    least, most = _RANGES[error.key]
    facts = {"found": _found(error.value).removeprefix("The number "), "least": least, "most": most}
    if error.key == "level" and 50 <= error.value < 100:
        return fault("level-in-percent", error.where, share=f"{error.value / 100:g}", **facts)
    return fault("out-of-range", error.where, **facts)


def _empty_text(error: Error) -> Fault:
    return fault("empty-text", error.where, example=example(error.location))


def _per(error: Error) -> Fault:
    return fault("per-not-positive", error.where, found=_found(error.value))


def _groups(error: Error) -> Fault:
    found, line = described(error.value), example(error.location)
    wanted = "the levels of each group, or a number of groups,"
    return fault("wrong-kind-of-value", error.where, found=found, wanted=wanted, example=line)


def _not_a_day(error: Error) -> Fault:
    return fault("not-a-day", error.where, found=_found(error.value))


def _not_a_size(error: Error) -> Fault:
    return fault("not-a-size", error.where, found=_found(error.value))


def _found(value: Any) -> str:
    """What was found, to open a sentence with."""
    words = quoted(value) if isinstance(value, str) else described(value)
    return words[0].upper() + words[1:]


def _other(error: Error) -> Fault:
    return fault("not-readable-as", error.where, problem=plain(error.message, 120), example=example(error.location))


_TRANSLATORS: dict[str, Callable[[Error], Fault | None]] = {
    "missing": _missing,
    "extra_forbidden": _unknown_key,
    "string_type": _wrong_kind,
    "tuple_type": _wrong_kind,
    "float_type": _wrong_kind,
    "int_type": _wrong_kind,
    "bool_type": _wrong_kind,
    "model_type": _not_a_section,
    "dict_type": _not_a_section,
    "literal_error": _not_one_of,
    "greater_than_equal": _out_of_range,
    "less_than_equal": _out_of_range,
    "finite_number": _out_of_range,
    "string_too_short": _empty_text,
    "string_pattern_mismatch": _empty_text,
    "per_text": _per,
    "per_type": _per,
    "per_range": _per,
    "groups_type": _groups,
    "not_a_day": _not_a_day,
    "not_a_size": _not_a_size,
}
