"""Make the tables of tests/golden/tables: fold sums of published examples, sampled here.

    python tests/golden/make_tables.py NAME [NAME …]

A table holds the exact integer fold sums (fold = k mod folds) of the first N trajectories of every ensemble, so that
every fit of the tests can be repeated from it, and any fold recomputed.
"""

import argparse
import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import sweepmill
from sweepmill import Sweep
from sweepmill.coordinates import coordinates
from sweepmill.sweep import Point
from sweepmill_worker.sample import sample

HERE = Path(__file__).with_name("tables")
EXAMPLES = Path(sweepmill.__file__).parent / "examples" / "published"


def sampled(name: str, sweep: Sweep) -> dict[str, Any]:
    """The table of an example, ensemble by ensemble."""
    rows = [row for point in sweep.points for row in rows_of(sweep, point)]
    return {"example": name, "sweep": sweep.key, "axes": list(sweep.axes), "rows": rows}


def rows_of(sweep: Sweep, point: Point) -> Iterator[dict[str, Any]]:
    """One row per observation: axes, number of trajectories, unit, digest of the total, fold sums."""
    named = sweep.observations
    batch = sample(point.ensemble, [one.observation for one in named], 0, point.cap)
    for name, observation in named:
        total = batch.accumulators[observation.key]
        (place,) = coordinates(point.ensemble, observation)
        yield {
            "ensemble": point.ensemble.key,
            **{axis: point.ensemble.columns[axis] for axis in sweep.axes},
            "name": name,
            "trajectories": total.count,
            "scale": place.scale,
            "digest": total.digest,
            "fold_sums": total.fold_sums[:, 0, 0].tolist(),
        }


def written(table: dict[str, Any]) -> str:
    """JSON with one row a line."""
    head = {name: value for name, value in table.items() if name != "rows"}
    rows = ",\n".join(json.dumps(row, separators=(",", ":")) for row in table["rows"])
    return json.dumps(head)[:-1] + f', "rows": [\n{rows}\n]}}\n'


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("names", nargs="+")
    for name in parser.parse_args().names:
        table = sampled(name, Sweep.read(EXAMPLES / f"{name}.toml"))
        (HERE / f"{name}.json").write_text(written(table))


if __name__ == "__main__":
    main()
