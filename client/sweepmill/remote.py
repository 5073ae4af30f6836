"""A sweep at the service."""

import os
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from urllib.parse import quote

from sweepmill import messages
from sweepmill.errors import UnknownKey
from sweepmill.extras import needing
from sweepmill.folds import FORMATS, Folds
from sweepmill.follow import follow
from sweepmill.messages import EnsembleProgress, ProgressPage, Round, RoundList, Submitted, SweepStatus
from sweepmill.progress import Show, shown
from sweepmill.sweep import Sweep
from sweepmill.table import Table
from sweepmill.table_files import MEDIA_TYPES, media_type
from sweepmill.text import short
from sweepmill.transport import Transport
from sweepmill.values import FORMATS as VALUE_FORMATS
from sweepmill.values import Values


class RemoteSweep:
    """A sweep at the service, by its key; made by `Client.submit` and `Client.sweep`."""

    def __init__(self, transport: Transport, key: str, submitted: Submitted | None = None) -> None:
        self._transport = transport
        self.key = key
        self.submitted = submitted  # what the service said at submission: whether new, and how much was there

    def __repr__(self) -> str:
        return f"<sweep {short(self.key)} at {self._transport.connection.url}>"

    @property
    def _path(self) -> str:
        return f"/v1/sweeps/{self.key}"

    def status(self) -> SweepStatus:
        """State and progress now."""
        return self._transport.fetch(SweepStatus, "GET", self._path)

    def wait(self, progress: bool | Show = True, timeout: float | None = None) -> SweepStatus:
        """Wait until the sweep settles; a lost connection is taken up again.

        `progress`: a display in the terminal, notebook or log; or a function called with every status; or
        False. `timeout` in seconds. Raises SweepStuck, SweepWithdrawn, WaitTimeout, and Unreachable after ten
        minutes without the service. An interrupt ends the waiting, not the sweep.
        """
        try:
            with shown(progress) as show:
                for status in follow(self._transport, self.key, timeout):
                    show(status)
        except KeyboardInterrupt:
            key = short(self.key)
            print(f"sweep {key} goes on unwatched; to watch it again: sweepmill watch {key}", file=sys.stderr)
            raise
        return status

    def ensembles(self, since: int | None = None) -> Iterator[EnsembleProgress]:
        """Progress of every ensemble in table order; `since` (a commit counter): what changed after it."""
        query: dict[str, Any] = {} if since is None else {"since": since}
        while True:
            page = self._transport.fetch(ProgressPage, "GET", f"{self._path}/ensembles", params=query)
            yield from page.ensembles
            if page.next is None:
                return
            query["after"] = page.next

    def rounds(self) -> list[Round]:
        """The rounds in which the goal of the sweep was judged, oldest first; none where it has no goal."""
        return self._transport.fetch(RoundList, "GET", f"{self._path}/rounds").rounds

    def table(self) -> Table:
        """The table as it is now; once settled, the same for ever."""
        return self._fetched("table")

    def histograms(self, folds: bool = False) -> Table:
        """Exact histograms of the observations that keep one: a row for each value that occurred.

        With `folds` also a column `by_fold`: a list of the occurrences in every fold of trajectories.
        """
        body = self._body("histograms", {"folds": "true"} if folds else {})
        return Table(body.columns, body.metadata)

    def folds(self, name: str | None = None) -> Folds:
        """Sums over folds of trajectories, of all observations or one: what fits with jackknife errors start from.

        Raises ServiceError for a name that the sweep does not have.
        """
        body = self._body("folds", {} if name is None else {"name": name})
        return Folds(body.columns, body.metadata)

    def values(self, name: str | None = None) -> Values:
        """Values of every trajectory of an observation that keeps them; needs the extra `analysis`.

        `name` may be left out where only one does. Raises ServiceError for another observation.
        """
        with needing("values()", "analysis"):
            import pyarrow as pa
        accept = {"Accept": MEDIA_TYPES[".arrow"]}
        body = self._transport.retry.run(lambda: self._streamed(f"{self._path}/values{_named(name)}", accept))
        return Values(pa.ipc.open_stream(body).read_all())

    def download_values(self, path: str | Path, name: str | None = None) -> Path:
        """Write the values of every trajectory to a file, as `download` does: .parquet, .arrow or .csv.

        Raises ValueError for another suffix, and ServiceError for an observation that does not keep its values.
        """
        path = Path(path)
        if path.suffix not in VALUE_FORMATS:
            raise ValueError(f"{path.name}: the suffix gives the format, one of {', '.join(VALUE_FORMATS)}")
        return self._downloaded(path, f"{self._path}/values{_named(name)}")

    def _streamed(self, source: str, headers: dict[str, str]) -> bytes:
        with self._transport.stream(source, headers) as response:
            return b"".join(response.iter_bytes())

    def specification(self) -> Sweep:
        """What was submitted, in its normal form: without label and priority, which belong to requests."""
        return Sweep.parse(self._transport.call("GET", f"{self._path}/specification").json())

    def _fetched(self, what: str) -> Table:
        body = self._body(what, {})
        return Table(body.columns, body.metadata)

    def _body(self, what: str, query: dict[str, str]) -> messages.Table:
        headers = {"Accept": MEDIA_TYPES[".json"]}
        return self._transport.fetch(messages.Table, "GET", f"{self._path}/{what}", headers=headers, params=query)

    def download(self, path: str | Path) -> Path:
        """Write the table to a file whose suffix gives the format: .csv, .json, .parquet or .arrow.

        The file appears complete or not at all. Raises ValueError for another suffix, and NotADirectoryError.
        """
        return self._downloaded(Path(path), f"{self._path}/table")

    def download_folds(self, path: str | Path, name: str | None = None) -> Path:
        """Write the sums over folds to a file, as `download` does: .json, .parquet or .arrow.

        Raises ValueError for another suffix, and ServiceError for a name that the sweep does not have.
        """
        path = Path(path)
        if path.suffix not in FORMATS:
            raise ValueError(f"{path.name}: the suffix gives the format, one of {', '.join(FORMATS)}")
        return self._downloaded(path, f"{self._path}/folds{_named(name)}")

    def _downloaded(self, path: Path, source: str) -> Path:
        if not path.parent.is_dir():
            raise NotADirectoryError(f"{path.parent} is not a directory")
        accept = {"Accept": media_type(path)}
        self._transport.retry.run(lambda: self._write(source, path, accept))
        return path

    def _write(self, source: str, path: Path, headers: dict[str, str]) -> None:
        partial = path.with_name(f".{path.name}.{os.getpid()}.part")
        try:
            with (
                self._transport.stream(source, headers) as response,
                partial.open("wb") as file,
            ):
                for chunk in response.iter_bytes():
                    file.write(chunk)
                file.flush()
                os.fsync(file.fileno())
            partial.replace(path)
        finally:
            partial.unlink(missing_ok=True)

    def withdraw(self) -> SweepStatus:
        """Withdraw one's own request; nothing that was sampled is deleted. Raises UnknownKey if there is none."""
        owner = self._transport.connection.owner
        requested = any(request.owner == owner for request in self.status().requests)
        try:
            return self._transport.fetch(SweepStatus, "DELETE", self._path)
        except UnknownKey:
            if not requested:
                raise
            return self.status()  # an attempt whose answer was lost has done it already

    def amend(self, label: str | None = None, priority: int | None = None) -> SweepStatus:
        """Change one's own request; None leaves as it is, an empty label removes it, priorities are -10 to 10."""
        changes: dict[str, Any] = {} if label is None else {"label": label or None}
        if priority is not None:
            changes["priority"] = priority
        return self._transport.fetch(SweepStatus, "PATCH", self._path, json=changes)


def _named(name: str | None) -> str:
    return "" if name is None else f"?name={quote(name, safe='')}"
