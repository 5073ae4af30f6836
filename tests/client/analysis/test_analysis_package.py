"""The package as a whole: figures, its extra, its public names."""

import subprocess
import sys
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

import sweepmill.analysis
from support.strip import strips
from sweepmill.analysis import Points, fit_collapse, fit_crossings, fit_laws


def test_a_collapse_plots_data_collapse_residuals_and_drift(tmp_path: Path) -> None:
    figure = fit_collapse(strips((16, 32, 64), 0.15, 1e-3, seed=90)).plot(tmp_path / "collapse.png", "K", "L/xi")
    titles = [axes.get_title(loc="left") for axes in figure.axes]
    assert titles[:3] == ["data", "collapse", "residuals"]
    assert titles[3].startswith("drift")
    assert (tmp_path / "collapse.png").stat().st_size > 10_000


def test_crossings_plot_themselves(tmp_path: Path) -> None:
    figure = fit_crossings(strips((16, 32, 64, 128), 0.15, 1e-4, seed=91), 4, 3.0).plot(tmp_path / "crossings.png")
    assert len(figure.axes) == 2
    assert (tmp_path / "crossings.png").stat().st_size > 10_000


def test_an_extrapolation_that_nothing_tests_is_not_drawn() -> None:
    drawn = []
    for sizes in ((16, 32, 64), (16, 32, 64, 128)):
        result = fit_crossings(strips(sizes, 0.15, 1e-4, seed=91), 4, 3.0)
        assert all(not one.fault for one in result.table)
        places = result.plot().axes[1]
        drawn.append(len(places.containers) - len(result.table))
        assert any(np.array(line.get_xdata()).min() == 0 for line in places.lines) == (drawn[-1] == 1)
    assert drawn == [0, 1]  # the marker at infinite size


def test_a_comparison_of_laws_plots_itself(tmp_path: Path) -> None:
    x = np.array([4, 8, 16, 32, 64, 128.0])
    figure = fit_laws(Points.of(x, x, np.log(x), 0.01)).plot(tmp_path / "laws.svg")
    assert len(figure.axes) == 4
    assert (tmp_path / "laws.svg").read_text(encoding="utf-8").startswith("<?xml")


@pytest.mark.parametrize(
    ("missing", "statement"),
    [
        ("scipy", "import sweepmill.analysis"),
        (
            "matplotlib",
            "from sweepmill.analysis import Points, fit_laws; fit_laws(Points.of(1, [1, 2, 4, 8], 1, 1)).plot()",
        ),
    ],
)
def test_what_needs_the_extra_names_it(missing: str, statement: str) -> None:
    statement = statement.replace("[1, 2, 4, 8], 1, 1", "[1, 2, 4, 8], [1, 2, 3, 4], 1")
    script = f"import sys; sys.modules['{missing}'] = None; {statement}"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=False)
    assert done.returncode == 1
    assert 'pip install "sweepmill[analysis]"' in done.stderr.splitlines()[-1]


def test_importing_it_does_not_bring_matplotlib() -> None:
    script = "import sys, sweepmill.analysis; print('matplotlib' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"


def test_all_is_the_list_of_public_names() -> None:
    names = vars(sweepmill.analysis).items()
    public = {name for name, value in names if not name.startswith("_") and not isinstance(value, ModuleType)}
    assert set(sweepmill.analysis.__all__) == public - {"needing"}
