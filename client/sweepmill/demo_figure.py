"""The figure of the demo: I3 against the measurement rate, one curve per size."""

from pathlib import Path

import matplotlib as mpl
from matplotlib.figure import Figure

from sweepmill.table import Table

COLORS = ("#c8963e", "#5f8a5b", "#3d5a80", "#7a4069")
MARKERS = "osD^"


def draw(table: Table, path: Path) -> Path:
    """Write the figure; error bars are one standard error."""
    with mpl.rc_context({"font.size": 11, "axes.spines.top": False, "axes.spines.right": False}):
        figure = Figure(figsize=(6.4, 4.4), layout="constrained")
        axes = figure.add_subplot()
        sizes = sorted({int(size) for size in table.values("sites")})
        for size, color, marker in zip(sizes, COLORS, MARKERS, strict=False):
            part = table.where(sites=size)
            axes.errorbar(
                part["measurement_rate"],
                part["mean"],
                yerr=part["standard_error"],
                color=color,
                marker=marker,
                markersize=5,
                capsize=2,
                linewidth=1.2,
                label=f"L = {size}",
            )
        axes.set_xlabel("measurement rate p per site and layer")
        axes.set_ylabel("tripartite information I3 (bits)")
        axes.set_title("Skerry ring (invented): curves cross at the transition", fontsize=11, loc="left")
        axes.legend(frameon=False)
        figure.savefig(path, dpi=150)
    return path
