"""Tables: columns, filters, files and conversions."""

import json
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sweepmill import MissingExtra, SharedTrajectories, SweepmillError, Table, require_independent
from sweepmill.table import RESULTS

ENSEMBLES = [(16, 0.13), (16, 0.16), (32, 0.13)]  # a union: 32 sites have one rate only


def example() -> Table:
    """Three ensembles; `entropy` at two layers, `i3` at none in particular."""
    rows: list[dict[str, Any]] = []
    ensembles = []
    for ordinal, (sites, rate) in enumerate(ENSEMBLES):
        began = len(rows)
        for name, layer in (("entropy", 2), ("entropy", 4), ("i3", None)):
            rows.append(
                {
                    "sites": sites,
                    "measurement_rate": rate,
                    "name": name,
                    "quantity": "tripartite-information" if name == "i3" else "entropy",
                    "region": "half",
                    "layer": layer,
                    "position": None,
                    "trajectories": 200 + ordinal,
                    "mean": float(len(rows)),
                    "standard_error": 0.1 if name == "i3" else None,
                    "variance": 1.0,
                    "minimum": 0.0,
                    "maximum": 3.0,
                    "met_by": "cap" if ordinal else None,
                }
            )
        totals = {"o" * 64: {"trajectories": [0, 200 + ordinal], "digest": "d" * 64}}
        ensembles.append({"key": f"{ordinal}" * 64, "rows": [began, len(rows)], "observations": totals})
    columns = {name: [row[name] for row in rows] for name in rows[0]}
    return Table(columns, {"sweep": "ab12" * 16, "axes": ["sites", "measurement_rate"], "ensembles": ensembles})


def test_columns_are_arrays_of_their_kind() -> None:
    table = example()
    assert len(table) == 9
    assert table.axes == ("sites", "measurement_rate")
    assert table["sites"].dtype == np.int64
    assert table["mean"].dtype == np.float64
    assert np.isnan(table["standard_error"]).sum() == 6
    assert table["layer"].tolist() == [2, 4, None] * 3
    assert "mean" in table
    assert "median" not in table
    with pytest.raises(KeyError, match="no column 'median'; the columns are sites, "):
        table["median"]


def test_columns_of_unequal_length_are_refused() -> None:
    with pytest.raises(ValueError, match="equally long"):
        Table({"a": [1], "b": []})


def test_an_empty_table_is_a_table() -> None:
    empty = Table({name: [] for name in example().columns}, {"ensembles": []})
    assert len(empty) == 0
    assert list(empty.rows()) == []
    assert "0 rows" in repr(empty)
    assert empty.to_pandas().empty
    assert empty.to_xarray() == {}


def test_rows_are_dictionaries() -> None:
    rows = list(example().rows())
    assert rows[3]["measurement_rate"] == 0.16
    assert rows[2]["layer"] is None


def test_where_keeps_rows_that_match_values_and_collections() -> None:
    table = example()
    assert len(table.where(name="i3", sites=16)) == 2
    assert len(table.where(sites=[16, 32])) == 9
    assert len(table.where(layer=None)) == 3
    assert len(table.where(sites=range(10, 20), layer={2, 4})) == 4
    assert len(table.where(measurement_rate=0.1 + 0.06)) == 3  # 0.16 only to 16 digits
    assert len(table.where(measurement_rate=np.linspace(0.13, 0.16, 2))) == 9
    assert len(table.where(sites=64)) == 0
    with pytest.raises(KeyError, match="no column 'size'"):
        table.where(size=64)


def test_where_keeps_the_ensembles_the_rows_rest_on() -> None:
    table = example().where(sites=32, name="i3")
    assert [one["key"][0] for one in table.ensembles] == ["2"]
    assert table.ensembles[0]["rows"] == [0, 1]
    assert [one["rows"] for one in example().where(name="entropy").ensembles] == [[0, 2], [2, 4], [4, 6]]
    assert example().where(sites=64).ensembles == []


def test_tables_that_share_trajectories_are_not_independent() -> None:
    small, large = example().where(sites=16), example().where(sites=32)
    require_independent(small, large)
    with pytest.raises(SharedTrajectories, match=r"circuit\.replicate") as caught:
        require_independent(small, large, example())
    assert caught.value.ensembles == ("0" * 64, "1" * 64, "2" * 64)


def test_pandas_gets_typed_columns_and_the_metadata() -> None:
    frame = example().to_pandas()
    assert frame.shape == (9, 14)
    assert str(frame["layer"].dtype) == "Int64"
    assert frame["mean"].tolist() == [float(i) for i in range(9)]
    assert frame["standard_error"].isna().sum() == 6
    assert frame.attrs["sweep"] == "ab12" * 16


def test_xarray_gets_one_dataset_per_name_with_gaps_where_the_sweep_has_none() -> None:
    sets = example().to_xarray()
    assert sorted(sets) == ["entropy", "i3"]
    entropy, i3 = sets["entropy"], sets["i3"]
    assert dict(entropy.sizes) == {"sites": 2, "measurement_rate": 2, "layer": 2}
    assert dict(i3.sizes) == {"sites": 2, "measurement_rate": 2}
    assert i3.attrs["quantity"] == "tripartite-information"
    assert float(entropy["mean"].sel(sites=16, measurement_rate=0.16, layer=4)) == 4.0
    assert np.isnan(float(entropy["mean"].sel(sites=32, measurement_rate=0.16, layer=4)))
    assert entropy["met_by"].sel(sites=32, measurement_rate=0.13, layer=2).item() == "cap"
    assert set(entropy.data_vars) == set(RESULTS)


def test_xarray_refuses_two_rows_at_one_place() -> None:
    columns = {name: values * 2 for name, values in ((n, example().values(n)) for n in example().columns)}
    with pytest.raises(ValueError, match="two rows"):
        Table(columns).to_xarray()


def test_arrow_gets_types_and_metadata_and_files_are_read_back(tmp_path: Path) -> None:
    import pyarrow as pa
    import pyarrow.parquet

    table = example()
    arrow = table.to_arrow()
    assert arrow.schema.field("layer").type == pa.int64()
    assert arrow.schema.field("mean").type == pa.float64()
    pyarrow.parquet.write_table(arrow, tmp_path / "t.parquet")
    with pa.OSFile(str(tmp_path / "t.arrow"), "wb") as sink, pa.ipc.new_stream(sink, arrow.schema) as writer:
        writer.write_table(arrow)
    body = {"columns": {name: table.values(name) for name in table.columns}, "metadata": table.metadata}
    (tmp_path / "t.json").write_text(json.dumps(body))
    for suffix in ("parquet", "arrow", "json"):
        read = Table.read(tmp_path / f"t.{suffix}")
        assert list(read.rows()) == list(table.rows())
        assert read.metadata == table.metadata


def test_csv_is_read_back_without_its_metadata(tmp_path: Path) -> None:
    example().to_pandas().to_csv(tmp_path / "t.csv", index=False)
    read = Table.read(tmp_path / "t.csv")
    assert read.columns == example().columns
    assert read["mean"].tolist() == example()["mean"].tolist()
    assert read["layer"].tolist() == example()["layer"].tolist()
    assert read.ensembles == []


@pytest.mark.parametrize("name", ["t.json", "t.parquet", "t.arrow"])
def test_a_file_that_is_no_table_is_refused(tmp_path: Path, name: str) -> None:
    (tmp_path / name).write_bytes(b"[1, 2, 3]")
    with pytest.raises(SweepmillError, match="is not the table of a sweep"):
        Table.read(tmp_path / name)


def test_a_suffix_without_a_format_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match=r"one of \.json, \.csv, \.arrow, \.parquet"):
        Table.read(tmp_path / "t.xlsx")


@pytest.mark.parametrize(
    ("method", "module"), [("to_pandas", "pandas"), ("to_xarray", "xarray"), ("to_arrow", "pyarrow")]
)
def test_a_missing_extra_is_named(monkeypatch: pytest.MonkeyPatch, method: str, module: str) -> None:
    monkeypatch.setitem(sys.modules, module, None)
    with pytest.raises(MissingExtra, match=rf'{method}\(\) needs .* pip install "sweepmill\[analysis\]"'):
        getattr(example(), method)()


def test_the_representation_is_aligned_and_short() -> None:
    lines = repr(example()).splitlines()
    assert lines[0] == "Table of sweep ab12ab12ab12: 9 rows, axes sites × measurement_rate"
    assert lines[1].split() == [
        *("sites", "measurement_rate", "name", "layer", "trajectories", "mean", "standard_error", "met_by")
    ]
    assert len({len(line) for line in lines[2:3]}) == 1
    many = Table({"sites": list(range(500)), "mean": [0.5] * 500})
    assert repr(many).splitlines()[-1] == "… and 490 more"
    assert len(many.text().splitlines()) == 502


def test_the_notebook_representation_is_escaped_html() -> None:
    table = Table({"name": ["<b>"], "mean": [1.0]})
    assert "&lt;b&gt;" in table._repr_html_()
    assert "<b>" not in table._repr_html_()
