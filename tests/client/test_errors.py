"""One base class to catch, and the tree of the module's docstring."""

import inspect
import re

import sweepmill
from sweepmill import errors


def test_the_tree_in_the_docstring_is_the_tree_of_the_classes() -> None:
    drawn: dict[str, str] = {}
    path: list[str] = []
    for line in (errors.__doc__ or "").splitlines():
        found = re.match(r"([│├└─\s]*)([A-Z]\w+)(?:\s{2,}|$)", line)
        if found:
            depth = len(found[1]) // 4
            path[depth:] = [found[2]]
            drawn[found[2]] = path[depth - 1] if depth else "Exception"
    classes = {n: c for n, c in vars(errors).items() if inspect.isclass(c) and issubclass(c, Exception)}
    assert drawn == {name: kind.__base__.__name__ for name, kind in classes.items() if kind.__base__}


def test_every_error_is_public() -> None:
    classes = {n for n, c in vars(errors).items() if inspect.isclass(c) and issubclass(c, Exception)}
    assert classes <= set(sweepmill.__all__)


def test_a_differing_key_is_reported_with_both_revisions() -> None:
    error = errors.KeyMismatch("a" * 64, "b" * 64, {"x": 1, "y": 2, "z": 1}, {"x": 1, "y": 3})
    assert error.revisions == {"y": (2, 3), "z": (1, None)}
    assert "y is 2 here and 3 there, z is 1 here and absent there" in str(error)


def test_equal_revisions_with_differing_keys_are_reported_as_such() -> None:
    assert "revisions agree" in str(errors.KeyMismatch("a" * 64, "b" * 64, {"x": 1}, {"x": 1}))
