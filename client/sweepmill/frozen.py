"""Plain data that cannot be changed: what ensembles hold of a circuit written as data."""

from collections.abc import Mapping
from typing import Any, NoReturn


class FrozenTable(dict[str, Any]):
    """A table that is hashable because it, and everything in it, stays as it is."""

    def __hash__(self) -> int:  # type: ignore[override]
        return hash(frozenset(self.items()))

    def _refuse(self, *_: Any, **__: Any) -> NoReturn:
        raise TypeError("this table is part of an ensemble and cannot be changed")

    __setitem__ = __delitem__ = _refuse
    __ior__ = pop = popitem = clear = update = setdefault = _refuse

    def __reduce__(self) -> tuple[type["FrozenTable"], tuple[dict[str, Any]]]:
        return FrozenTable, (dict(self),)


def freeze(value: Any) -> Any:
    """Lists become tuples and tables frozen ones, at every depth."""
    if isinstance(value, FrozenTable):
        return value
    if isinstance(value, Mapping):
        return FrozenTable({name: freeze(inner) for name, inner in value.items()})
    if isinstance(value, tuple) and all(isinstance(inner, FrozenTable) for inner in value):
        return value
    return tuple(map(freeze, value)) if isinstance(value, list | tuple) else value


def thaw(value: Any) -> Any:
    """The same as lists and dictionaries of its own."""
    if isinstance(value, Mapping):
        return {name: thaw(inner) for name, inner in value.items()}
    return [thaw(inner) for inner in value] if isinstance(value, list | tuple) else value
