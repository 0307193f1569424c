"""Everything a record folder holds, from the record alone (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from benchmark.record.write import summary, to_json
from benchmark.report.charts import charts
from benchmark.report.figure import to_png, to_svg
from benchmark.report.page import page
from benchmark.report.tables import tables, write_csv

__all__ = ["fill_folder", "report_page"]


def report_page(record: Mapping[str, Any]) -> str:
    """Return the page of a record alone, as ``fill_folder`` writes it."""
    drawn = charts(record)
    drawings = {key: to_svg(chart.spec) for key, chart in drawn.items() if chart.spec is not None}
    return page(record, drawn, drawings)


def fill_folder(place: Path, record: Mapping[str, Any]) -> None:
    """Write record, summary, tables, figures and page into an existing empty folder.

    Identical records give identical bytes. A chart with nothing to draw has no figure; its caption says why.

    Parameters
    ----------
    place : Path
        Existing empty folder.
    record : mapping
        As ``run_study`` returns it, or as read from ``record.json``.
    """
    (place / "tables").mkdir()
    (place / "figures").mkdir()
    (place / "record.json").write_text(to_json(record), encoding="utf-8")
    (place / "summary.json").write_text(to_json(summary(record)), encoding="utf-8")
    for name, rows in tables(record).items():
        write_csv(rows, place / "tables" / f"{name}.csv")
    drawn = charts(record)
    drawings: dict[str, str] = {}
    for key, chart in drawn.items():
        write_csv(chart.points, place / "tables" / f"chart-{key}.csv")
        if chart.spec is not None:
            drawings[key] = to_svg(chart.spec)
            (place / "figures" / f"{key}.svg").write_text(drawings[key], encoding="utf-8")
            (place / "figures" / f"{key}.png").write_bytes(to_png(chart.spec))
    (place / "report.html").write_text(page(record, drawn, drawings), encoding="utf-8")
