"""Which representation of a table a request wants, and whether it has it already (RFC 9110)."""

from collections.abc import Mapping
from http import HTTPStatus
from typing import NamedTuple

from sweepmill_service.problems import Refusal

MEDIA_TYPES: Mapping[str, str] = {
    "json": "application/json",
    "csv": "text/csv",
    "arrow": "application/vnd.apache.arrow.stream",
    "parquet": "application/vnd.apache.parquet",
}

# Lists have no place in CSV
NESTED: Mapping[str, str] = {name: media for name, media in MEDIA_TYPES.items() if name != "csv"}


class Range(NamedTuple):
    """One media range of an Accept header."""

    pattern: str
    quality: float


def choose_format(accept: str | None, offered: Mapping[str, str] = MEDIA_TYPES, what: str = "tables") -> str:
    """The format of ``offered`` named best by ``accept``; the first, JSON, where nothing is preferred.

    Raises Refusal (406) if none fits.
    """
    ranges = parse_accept(accept or "*/*")
    quality = {name: _quality(media, ranges) for name, media in offered.items()}
    best = max(quality, key=lambda name: quality[name])  # the first of equals, JSON before all
    if quality[best] <= 0:
        raise Refusal(HTTPStatus.NOT_ACCEPTABLE, f"{what} come as {', '.join(offered.values())}")
    return best


def parse_accept(accept: str) -> list[Range]:
    """Media ranges with their quality; a range with a malformed quality counts as not wanted."""
    return [_parse_range(part) for part in accept.split(",") if part.strip()]


def _parse_range(text: str) -> Range:
    pattern, *parameters = (piece.strip().lower() for piece in text.split(";"))
    quality = 1.0
    for parameter in parameters:
        name, _, value = parameter.partition("=")
        if name.strip() == "q":
            quality = _parse_quality(value.strip())
    return Range(pattern, quality)


def _parse_quality(text: str) -> float:
    digits = text.replace(".", "", 1)
    return min(float(text), 1.0) if digits.isdecimal() and digits.isascii() else 0.0


def _quality(media: str, ranges: list[Range]) -> float:
    """Quality of a media type: the most specific range that matches it decides."""
    for pattern in (media, media.partition("/")[0] + "/*", "*/*"):
        matching = [wanted.quality for wanted in ranges if wanted.pattern == pattern]
        if matching:
            return max(matching)
    return 0.0


def matches(if_none_match: str | None, etag: str) -> bool:
    """Whether the client's copies include ``etag`` (weak comparison)."""
    if if_none_match is None:
        return False
    held = {tag.strip().removeprefix("W/") for tag in if_none_match.split(",")}
    return "*" in held or etag in held
