"""A comparison of routes as files in a folder."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from porkgrid.figures.compare import draw_comparison
from porkgrid.figures.style import save_figure
from porkgrid.survey.compare import Comparison, comparison_table
from porkgrid.survey.folder import write_whole


def write_comparison(comparison: Comparison, folder: Path, formats: Sequence[str]) -> list[Path]:
    """Write comparison.csv, the bi-elliptic transfer of every departure date, and the figure; files."""
    tables = {"comparison.csv": comparison_table(comparison)}
    for yardstick in comparison.yardsticks:
        if yardstick.baselines:
            ends = yardstick.route.lower().replace(" → ", "-").replace(" ", "-")
            tables[f"bielliptic-{ends}.csv"] = yardstick.bielliptic
    for name, table in tables.items():
        write_whole(folder / name, table.to_csv(index=False))
    figure = save_figure(draw_comparison(comparison), folder / "comparison", formats)
    return [*(folder / name for name in tables), *figure]
