"""Pieces of HTML."""

from collections.abc import Sequence
from html import escape


def table(heads: Sequence[str], rows: Sequence[Sequence[str]], kind: str) -> str:
    """A table of cells that are markup already; the first of each row is its head."""
    head = "".join(f"<th scope='col'>{one}</th>" for one in heads)
    body = "".join(f"<tr><th scope='row'>{row[0]}</th>{''.join(f'<td>{c}</td>' for c in row[1:])}</tr>" for row in rows)
    return f"<table class='{kind}'><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"


def powers(text: str) -> str:
    """Text with its exponents raised: 10^6.1 or 2^k."""
    return " ".join(_raised(word) for word in escape(text).split(" "))


def bold(text: str) -> str:
    """Bold text."""
    return f"<b>{escape(text)}</b>"


def _raised(word: str) -> str:
    base, caret, exponent = word.partition("^")
    if not caret:
        return word
    end = len(exponent.rstrip(";:),."))
    return f"{base}<sup>{exponent[:end].replace('-', '−')}</sup>{exponent[end:]}"
