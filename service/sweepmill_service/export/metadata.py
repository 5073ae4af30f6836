"""Metadata of a table: which trajectories it rests on, so that none are taken for independent twice."""

from importlib.metadata import version
from typing import Any

from sweepmill.accumulate import folds_for
from sweepmill.revisions import all_revisions
from sweepmill_service.export.layout import Layout
from sweepmill_service.store import TableEntry
from sweepmill_service.store.tables import Number, version_of


class Provenance:
    """Collects keys, ranges of trajectories and digests while the rows are made."""

    def __init__(self, sweep: str, layout: Layout, frozen: dict[str, str]) -> None:
        self.sweep = sweep
        self.layout = layout
        self.frozen = frozen
        self.ensembles: list[dict[str, Any]] = []
        self.numbers: list[Number] = []

    def note(self, ordinal: int, entries: list[TableEntry], began: int, ended: int) -> None:
        """The totals of one ensemble, which made the rows [began, ended)."""
        key = entries[0].ensemble_key
        self.numbers += [Number(ordinal, one.observation_key, one.trajectories, one.met_by) for one in entries]
        self.ensembles.append(
            {
                "key": key,
                "ordinal": ordinal,
                "rows": [began, ended],
                "frozen": entries[0].frozen,
                "digest": self.frozen.get(key) if entries[0].frozen else None,
                "observations": {entry.observation_key: _total(entry) for entry in entries},
            }
        )

    def version(self) -> str:
        """What `table_version` gives while nothing more is sampled."""
        return version_of(self.sweep, self.numbers)

    def metadata(self) -> dict[str, Any]:
        """Plain data. Only what a table is a function of: nothing about now or this machine."""
        return {
            "sweep": self.sweep,
            "axes": list(self.layout.axes),
            "constants": self.layout.constants,
            "observations": {item.name: key for item, key in self.layout.observation_keys},
            "folds": self._folds(),
            "version": version("sweepmill"),
            "revisions": all_revisions(),
            "ensembles": self.ensembles,
        }

    def _folds(self) -> dict[str, list[int]]:
        """Numbers of folds each observation's totals keep; several where sizes differ in coordinates."""
        shapes = {e.shape: i for i, e in enumerate(self.layout.sweep.ensembles)}
        return {
            item.name: sorted({folds_for(len(self.layout.coordinates(i, item))) for i in shapes.values()})
            for item in self.layout.sweep.observations
        }


def _total(entry: TableEntry) -> dict[str, Any]:
    """Trajectories as the half-open range [0, N)."""
    return {"trajectories": [0, entry.trajectories], "digest": entry.digest}
