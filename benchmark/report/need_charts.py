"""Charts of what would be needed (layer 9): none unless the record holds the answers."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.figure import Chart
from benchmark.report.number_lines import number_lines
from benchmark.report.opportunity_chart import opportunity_charts
from benchmark.report.trade_chart import trade_chart

__all__ = ["need_charts", "need_charts_in_column"]

Record = Mapping[str, Any]


def need_charts(record: Record) -> list[Chart]:
    """Return break-evens, trade curve and maps at full width."""
    if not record.get("need"):
        return []
    return [number_lines(record), trade_chart(record), *opportunity_charts(record)]


def need_charts_in_column(record: Record, column: float) -> list[Chart]:
    """Return the same charts for one column of so many pixels."""
    if not record.get("need"):
        return []
    return [
        number_lines(record, column - 134.0, 118.0, 16.0),
        trade_chart(record, column - 86.0, 280.0),
        *opportunity_charts(record, column - 86.0, 330.0),
    ]
