"""One line for everything that can be wrong in a study: the key, the value, the bound and the remedy."""

from __future__ import annotations

import difflib
import json
import re
from collections.abc import Iterable, Mapping
from typing import Any, TypeVar

from pydantic import BaseModel, ConfigDict, ValidationError

from scanner.errors import StudyError

LONGEST_VALUE = 60


class Section(BaseModel):
    """A table of the study file: no unknown key, no conversion of types, no NaN.

    Every field of a section has a ``description`` that completes "must be ..." and an example.
    """

    model_config = ConfigDict(strict=True, frozen=True, extra="forbid", allow_inf_nan=False)


AnySection = TypeVar("AnySection", bound=Section)


def shown(value: object) -> str:
    """Write a value as in TOML, on one line and not too long."""
    if isinstance(value, float):
        text = repr(value)
    elif isinstance(value, (bool, int, str)):
        text = (
            json.dumps(value, ensure_ascii=False) if not isinstance(value, int) or value.bit_length() < 1000 else "..."
        )
    elif isinstance(value, Mapping):
        text = "{ " + ", ".join(f"{key} = {shown(item)}" for key, item in value.items()) + " }"
    elif isinstance(value, (list, tuple)):
        text = "[" + ", ".join(shown(item) for item in value) + "]"
    else:
        text = str(value)
    text = "".join(letter if letter.isprintable() else "?" for letter in text)
    return text if len(text) <= LONGEST_VALUE else text[: LONGEST_VALUE - 4] + " ..."


def written(key: str) -> str:
    """Write a key as in TOML: bare where that is possible."""
    return key if key.isascii() and key.replace("_", "").replace("-", "").isalnum() else shown(key)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """Find the known word that the given one was probably meant to be."""
    close = difflib.get_close_matches(word.lower(), list(known), n=1, cutoff=0.6)
    return close[0] if close else None


def unknown_key(path: str, key: str, value: object, known: Iterable[str]) -> StudyError:
    """Name an unknown key, the keys known in its place, and the one that was probably meant."""
    known = list(known)
    guess = nearest(key, known)
    remedy = f"did you mean {guess}?" if guess else "remove it"
    return StudyError(f"{path}.{written(key)} = {shown(value)} is not known: {remedy} (known: {', '.join(known)})")


def read_section(model: type[AnySection], entries: object, path: str) -> AnySection:
    """Validate one table of the study file.

    Raises
    ------
    StudyError
        One line on the first thing that is wrong, unknown keys before all others.
    """
    if not isinstance(entries, Mapping):
        raise StudyError(f"{path} = {shown(entries)} must be a table of {', '.join(model.model_fields)}")
    try:
        return model.model_validate(dict(entries))
    except ValidationError as invalid:
        errors = invalid.errors(include_url=False)
        unknown = [error for error in errors if error["type"] == "extra_forbidden"]
        raise _explain(model, dict((unknown or errors)[0]), path) from None


def _explain(model: type[Section], error: dict[str, Any], path: str) -> StudyError:
    """Turn pydantic's first error into our line."""
    if not error["loc"]:
        return StudyError(f"{path}.{error['ctx']['error']}")
    name, *rest = error["loc"]
    value = error["input"]
    if error["type"] == "extra_forbidden":
        return unknown_key(path, str(name), value, model.model_fields)
    field = model.model_fields[name]
    if error["type"] == "missing":
        example = shown((field.examples or ["..."])[0])
        return StudyError(f"{path}.{name} is missing: it must be {field.description}; add {name} = {example}")
    index = "".join(f"[{part}]" for part in rest if isinstance(part, int))
    bound = f": {name} must be {field.description}" if index else f" must be {field.description}"
    example = f"write for instance {name} = {shown((field.examples or ['...'])[0])}"
    remedy = _remedy(error["type"], value, error.get("ctx", {})) or example
    return StudyError(f"{path}.{name}{index} = {shown(value)}{bound}; {remedy}")


def _remedy(kind: str, value: object, bounds: Mapping[str, object]) -> str:
    """Say what to write instead; empty where that does not follow from the value."""
    if kind == "greater_than_equal":
        return f"raise it to {bounds['ge']} or more"
    if kind == "less_than_equal":
        return f"lower it to {bounds['le']} or less"
    if kind == "literal_error" and isinstance(value, str):
        guess = nearest(value, re.findall(r"'(\w+)'", str(bounds["expected"])))
        return f'did you mean "{guess}"?' if guess else "write one of them"
    if isinstance(value, float) and value.is_integer():
        return f"write {int(value)}" if abs(value) < 1e15 else "write a smaller number"
    if isinstance(value, str) and kind in {"int_type", "float_type"}:
        return "write it without quotes" if value.strip().isascii() and value.strip().isdigit() else "write a number"
    return ""
