"""From pydantic's validation errors to faults with the paths and words of a specification."""

from collections.abc import Mapping
from typing import Any

from pydantic import ValidationError

from sweepmill.axes import SHAPE_TAGS
from sweepmill.ensemble import FAMILY_PARAMETERS
from sweepmill.errors import Fault
from sweepmill.language.refusal import KIND, near
from sweepmill.language.tags import LANGUAGE_TAGS
from sweepmill.observation import NAME_PATTERN, PAULI_PATTERN, QUANTITIES, REGION_TAGS
from sweepmill.times import AT_TAGS

# Names of union members: pydantic puts them into locations, a reader never wrote them
_TAGS = SHAPE_TAGS | AT_TAGS | REGION_TAGS | LANGUAGE_TAGS | set(QUANTITIES) | set(FAMILY_PARAMETERS)
KEY_MARK = "[key]"  # stands behind a key of a table that is itself at fault
_UNION_MARKS = ("function-", "int", "PerSite", "PerSide")
_PLAIN = {
    "model_type": "must be a table of fields",
    "model_attributes_type": "must be a table of fields",
    "dict_type": "must be a table of fields",
    "string_type": "must be text",
    "string_unicode": "must be text",
    "invalid_key": "the name of a field must be text",
}
_PATTERNS = {
    NAME_PATTERN: "must be up to 64 letters, digits and the signs _ . and -, a letter first",
    PAULI_PATTERN: "must be a product of the letters X, Y and Z",
}
TOO_DEEP = Fault("", "the specification is nested too deep")


def faults_of(error: ValidationError, raw: Mapping[str, Any]) -> list[Fault]:
    """Every fault of a validation error, once each, with its path in the specification as written."""
    single = isinstance(raw.get("circuit"), Mapping)
    found: dict[Fault, None] = {}
    for item in error.errors(include_url=False):
        if item["type"] in ("recursion_depth_exceeded", "recursion_loop"):
            return [TOO_DEEP]
        path = path_of(item["loc"], single)
        found[Fault(f"{path}.family" if _of_family(item) else path, message_of(item))] = None
    return list(found)


def _of_family(item: Any) -> bool:
    """Whether it is the family that tells no circuit block apart."""
    return str(item.get("ctx", {}).get("discriminator")) == "'family'"


def path_of(location: tuple[int | str, ...], single_circuit: bool) -> str:
    """``("circuit", 0, "sites", "axis-list", 2)`` as ``circuit.sites[2]``."""
    path = ""
    for depth, part in enumerate(location):
        if part == KEY_MARK:
            continue
        if isinstance(part, int):
            path += "" if single_circuit and depth == 1 and location[0] == "circuit" else f"[{part}]"
        elif _named_by_user(location, depth) or (part not in _TAGS and not part.startswith(_UNION_MARKS)):
            path += f".{part}" if path else part
    return path


def _named_by_user(location: tuple[int | str, ...], depth: int) -> bool:
    return depth > 1 and location[depth - 1] == "parameters"


def message_of(item: Any) -> str:
    """One of pydantic's errors in words of a specification."""
    kind, given, context = item["type"], item.get("input"), item.get("ctx", {})
    if kind == "missing":
        return "is missing"
    if kind == "extra_forbidden":
        return "unknown field"
    if kind == "literal_error":
        return f"must be {context['expected']}, got {given!r}"
    if kind == "union_tag_invalid":
        return _bad_tag(context, given)
    if kind == "union_tag_not_found":
        return "is missing" if _of_family(item) else f"needs a field {context['discriminator']}"
    if kind in ("number", "integer", "flag", "layers", "duplicate", "empty", "bounds", KIND):
        return str(item["msg"])
    return f"{_wanted(kind, item['msg'], context)}, got {_short(given)}"


def _wanted(kind: str, message: str, context: Mapping[str, Any]) -> str:
    """What would pass, in words of a specification rather than of the validating library."""
    if kind in _PLAIN:
        return _PLAIN[kind]
    if kind == "too_short":
        return f"needs at least {_items(context['min_length'])}"
    if kind == "too_long":
        return f"takes at most {_items(context['max_length'])}"
    if kind == "string_pattern_mismatch":
        return _PATTERNS.get(context["pattern"], f"must be text of the form {context['pattern']}")
    wanted = message
    for theirs, ours in (("Input should", "must"), ("String should", "must"), ("a valid tuple", "a list")):
        wanted = wanted.replace(theirs, ours)
    return _decapitalized(wanted)


def _items(number: int) -> str:
    return f"{number} item" if number == 1 else f"{number} items"


def _bad_tag(context: Mapping[str, Any], given: Any) -> str:
    if context.get("discriminator") == "'quantity'":
        return f"unknown quantity {context['tag']!r}: one of {', '.join(QUANTITIES)}"
    if context.get("discriminator") == "'family'":
        wanted = str(context["tag"])
        return f"unknown circuit family {wanted!r}{near(wanted, FAMILY_PARAMETERS)} ({', '.join(FAMILY_PARAMETERS)})"
    return f"must be a value or a list of values, got {_short(given)}"


def _decapitalized(text: str) -> str:
    return text[:1].lower() + text[1:]


def _short(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 80 else text[:77] + "..."
