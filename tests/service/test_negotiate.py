"""Accept and If-None-Match, as RFC 9110 reads them (sections 12.5.1 and 13.1.2)."""

import pytest

from sweepmill_service.negotiate import choose_format, matches
from sweepmill_service.problems import Refusal


@pytest.mark.parametrize(
    ("accept", "chosen"),
    [
        (None, "json"),
        ("*/*", "json"),
        ("text/csv", "csv"),
        ("text/*", "csv"),
        ("TEXT/CSV; charset=utf-8", "csv"),
        ("application/json;q=0.2, text/csv;q=0.8", "csv"),
        ("text/csv;q=0, */*;q=0.1", "json"),
        ("application/*;q=0.5, application/vnd.apache.parquet", "parquet"),
        ("application/vnd.apache.arrow.stream, text/html", "arrow"),
        ("text/csv;q=high, application/json;q=0.1", "json"),
    ],
)
def test_the_most_wanted_format_is_chosen(accept: str | None, chosen: str) -> None:
    assert choose_format(accept) == chosen


@pytest.mark.parametrize("accept", ["text/html", "application/json;q=0", "image/*"])
def test_nothing_acceptable_is_said_so(accept: str) -> None:
    with pytest.raises(Refusal, match="tables come as"):
        choose_format(accept)


@pytest.mark.parametrize(
    ("header", "current"),
    [(None, False), ('"a"', True), ('"b"', False), ('W/"a"', True), ('"b", "a"', True), ("*", True)],
)
def test_copies_are_compared_weakly(header: str | None, current: bool) -> None:
    assert matches(header, '"a"') is current
