"""Refusing what is not of the language, in words that say what would pass."""

from collections.abc import Iterable, Mapping
from difflib import get_close_matches
from typing import Any, NoReturn

from pydantic import BaseModel
from pydantic_core import PydanticCustomError

KIND = "language"


def refuse(message: str) -> NoReturn:
    """A validation error with exactly this message."""
    raise PydanticCustomError(KIND, "{message}", {"message": message})


def near(name: str, known: Iterable[str]) -> str:
    """``: did you mean 'cx'?`` where something is spelled like it, else nothing."""
    found = get_close_matches(name, list(known), n=1, cutoff=0.6)
    return f": did you mean {found[0]!r}?" if found else ""


def keys_of(value: Any) -> set[str]:
    """Names of the fields of a table or of a model made of one."""
    if isinstance(value, BaseModel):
        return set(type(value).model_fields)
    return {str(name) for name in value} if isinstance(value, Mapping) else set()


def printable(text: str) -> str:
    """Text that a terminal or a log shows as it is: no control characters, no line breaks."""
    if not text.isprintable():
        refuse(f"must be of printable characters, got {shown(text)}")
    return text


def shown(value: Any) -> str:
    """A value in a message, cut where it is long."""
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."
