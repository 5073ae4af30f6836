"""A circuit as the TOML somebody would write."""

import json
from collections.abc import Mapping
from typing import Any

from sweepmill.ensemble import PROGRAM


def circuit_toml(form: Mapping[str, Any]) -> str:
    """A ``[circuit]`` table of a layered normal form, one line per layer, ready for a specification."""
    lines = ["[circuit]"]
    for name, value in form.items():
        if name in PROGRAM:
            lines += [f"{name} = [", *(f"  {_inline(layer)}," for layer in value), "]"]
        elif name != "revision":
            lines.append(f"{name} = {_inline(value)}")
    return "\n".join(lines)


def _inline(value: Any) -> str:
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{name} = {_inline(inner)}" for name, inner in value.items()) + " }"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(map(_inline, value)) + "]"
    return json.dumps(value)
