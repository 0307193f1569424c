"""Every chart of a record, in the order of the report (layer 9)."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from typing import Any

from benchmark.record.shown_units import in_units_of_record
from benchmark.report.advantage import advantage_against_time, advantage_by_node
from benchmark.report.change_parts import change_parts
from benchmark.report.change_picture import change_picture
from benchmark.report.distribution import advantage_distribution
from benchmark.report.energy_delay import energy_delay
from benchmark.report.figure import Chart
from benchmark.report.ladder_chart import ladder_steps
from benchmark.report.margins import requirement_margins
from benchmark.report.need_charts import need_charts
from benchmark.report.parts import where_it_goes
from benchmark.report.ribbons import limits_along_supply
from benchmark.report.rows import ratio_columns
from benchmark.report.steps import node_steps
from benchmark.report.swings import input_swings

__all__ = ["charts"]


@in_units_of_record
def charts(record: Mapping[str, Any]) -> dict[str, Chart]:
    """Return key -> chart; a chart with nothing to draw has no specification and says why in its caption."""
    found = [
        requirement_margins(record),
        energy_delay(record),
        limits_along_supply(record),
        advantage_against_time(record),
        *where_it_goes(record),
        ladder_steps(record),
        advantage_distribution(record),
        input_swings(record),
        advantage_by_node(record),
        *node_steps(record),
        *need_charts(record),
    ]
    if record.get("change") is not None:
        found += [change_picture(record), change_parts(record)]
    if record.get("ratio_only"):
        found = [dataclasses.replace(chart, points=tuple(ratio_columns(chart.points))) for chart in found]
    return {chart.key: chart for chart in found}
