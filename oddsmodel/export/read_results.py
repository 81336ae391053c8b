"""Read a results.json that anyone may have written: its size, its JSON, its version and every value are vetted."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from oddsmodel.errors import Fault, InputFault
from oddsmodel.export.saved import SavedResults
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain, quoted

LARGEST_MEGABYTES = 30
DEEPEST = 40
MAJOR = 1
MOST_FAULTS = 5
_VERSION = re.compile(r"([0-9]{1,6})\.([0-9]{1,6})")


def read_results(path: Path) -> SavedResults:
    """The results of an earlier run.

    Raises InputFault where the file cannot be read, is no JSON in UTF-8 (no number that is not finite, no key twice),
    is of another major version than 1, or has values that are not as the schema describes them.
    """
    where = plain(str(path))
    data = _parsed(read_bytes(path, LARGEST_MEGABYTES), where)
    if not isinstance(data, dict) or not isinstance(data.get("schema_version"), str):
        raise InputFault(_fault("results-not-ours", where))
    version = _VERSION.fullmatch(data["schema_version"])
    if version is None:
        raise InputFault(_fault("results-not-ours", where))
    if int(version[1]) != MAJOR:
        raise InputFault(_fault("results-other-major", where, found=version[0], major=MAJOR))
    try:
        return SavedResults.model_validate(data)
    except ValidationError as error:
        found = error.errors(include_url=False, include_context=False, include_input=False)
        raise InputFault(list(_told(found, where))) from None


def read_bytes(path: Path, megabytes: int) -> bytes:
    """The bytes of an ordinary file of at most so many megabytes; InputFault otherwise."""
    where = plain(str(path))
    try:
        if path.is_dir():
            raise InputFault(_fault("results-is-a-folder", where))
        if not path.exists():
            raise InputFault(_fault("results-missing", where))
        if not path.is_file():
            raise InputFault(_fault("results-not-a-file", where))
        with path.open("rb") as file:
            raw = file.read(megabytes * 1_000_000 + 1)
    except OSError as error:
        raise InputFault(_fault("results-unreadable", where, reason=error.strerror or type(error).__name__)) from None
    except ValueError:
        # A name with a null character.
        raise InputFault(_fault("results-missing", where)) from None
    if len(raw) > megabytes * 1_000_000:
        raise InputFault(_fault("results-too-large", where, megabytes=megabytes))
    return raw


class _NotAllowed(ValueError):
    """JSON that Python would read and no result holds."""


def _parsed(raw: bytes, where: str) -> Any:
    try:
        text = raw.decode("utf-8-sig")
        data = json.loads(text, parse_constant=_no_constant, parse_float=_finite, object_pairs_hook=_each_key_once)
        if _depth_beyond(data, DEEPEST):
            raise _NotAllowed(say("json-too-deep"))
    except UnicodeDecodeError:
        raise InputFault(_fault("results-not-utf-8", where)) from None
    except json.JSONDecodeError as error:
        raise InputFault(_fault("results-not-json", where, why=say("json-broken", line=error.lineno))) from None
    except _NotAllowed as error:
        raise InputFault(_fault("results-not-json", where, why=str(error))) from None
    except RecursionError:
        raise InputFault(_fault("results-not-json", where, why=say("json-too-deep"))) from None
    except ValueError:
        # Python refuses whole numbers of thousands of digits.
        raise InputFault(_fault("results-not-json", where, why=say("json-number"))) from None
    return data


def _no_constant(_: str) -> float:
    raise _NotAllowed(say("json-number"))


def _finite(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        raise _NotAllowed(say("json-number"))
    return value


def _each_key_once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) < len(pairs):
        seen: set[str] = set()
        twice = next(key for key, _ in pairs if key in seen or seen.add(key))  # type: ignore[func-returns-value]
        raise _NotAllowed(say("json-key-twice", key=quoted(twice)))
    return found


def _depth_beyond(data: Any, deepest: int) -> bool:
    """Whether lists and objects are nested deeper than that; level by level, since a call a level might run out."""
    level = [data]
    for _ in range(deepest):
        level = [
            one
            for value in level
            for one in (value.values() if isinstance(value, dict) else value)
            if isinstance(one, dict | list)
        ]
        if not level:
            return False
    return True


def _told(errors: Sequence[Any], where: str) -> Iterator[Fault]:
    """The first errors, each with its place in the file; several alternatives of one value are told once."""
    places = list(dict.fromkeys(_place(error["loc"]) for error in errors))
    missing = {_place(error["loc"]) for error in errors if error["type"] == "missing"}
    for place in places[:MOST_FAULTS]:
        yield _fault("results-key-missing" if place in missing else "results-value", f"{where}, {place}")
    if len(places) > MOST_FAULTS:
        yield _fault("results-more-faults", where, number=len(places) - MOST_FAULTS)


_ALTERNATIVES = re.compile(r"(dict|list|literal)\[.*\]|float", re.DOTALL)


def _place(location: Sequence[str | int]) -> str:
    """ "models, item 1, coefficients, item 3, odds_ratio", without the alternatives that were tried there."""
    parts: list[str] = []
    for part in location:
        if isinstance(part, int):
            parts.append(f"item {part + 1}")
        elif not (parts and _ALTERNATIVES.fullmatch(part)):
            parts.append(plain(part, 60))
    return ", ".join(parts) or "the whole file"


def _fault(code: str, where: str, **facts: Any) -> Fault:
    return Fault(what=say(code, **facts), where=where, remedy=say(f"{code}-remedy"))
