"""A plane with known geometry on which charts are drawn, layer by layer, in pixels or in data (layer 9)."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from benchmark.report.placing import LINE_HEIGHT, Box, Placed, text_width
from benchmark.report.style import INK, TEXT_SIZE, LinearAxis, LogAxis, Row
from benchmark.report.words import flat_powers, visible

__all__ = ["Canvas", "Label", "Words"]

Axis = LogAxis | LinearAxis


@dataclass(frozen=True)
class Words:
    """Text at a place in pixels; ``align`` left, center or right; the middle of the line stands at ``y``."""

    text: str
    x: float
    y: float
    align: str = "left"
    ink: str = INK
    bold: bool = False


@dataclass(frozen=True)
class Label:
    """Placed words and how they look."""

    placed: Placed
    ink: str = INK
    bold: bool = False

    def words(self) -> list[Words]:
        """One entry per line."""
        box, align = self.placed.box, self.placed.align
        x = box.left if align == "left" else box.right
        return [
            Words(text, x, box.top + LINE_HEIGHT * (line + 0.5), align, self.ink, self.bold)
            for line, text in enumerate(self.placed.lines)
        ]


def _ground(item: Words) -> Box:
    width = text_width(flat_powers(item.text), bold=item.bold) + 2.0
    left = item.x - width * {"left": 0.0, "center": 0.5, "right": 1.0}[item.align]
    return Box(left, item.y - 6.5, left + width, item.y + 6.5)


def _data(rows: Sequence[Mapping[str, Any]]) -> Row:
    return {"values": [dict(row) for row in rows]}


@dataclass
class Canvas:
    """Two axes and the layers drawn so far."""

    x: Axis
    y: Axis
    layers: list[Row] = field(default_factory=list)

    def frame(self) -> None:
        """Draw axes, ticks and grid (an invisible mark carries them)."""
        self.layers.append(
            {
                "data": _data([{"a": self.x.value(0.0), "b": self.y.value(0.0)}]),
                "mark": {"type": "point", "opacity": 0},
                "encoding": {"x": self.x.encode("a", axis=True), "y": self.y.encode("b", axis=True)},
            }
        )

    def _spans(self, corners: Sequence[tuple[float, float, float, float]], mark: Row) -> None:
        if not corners:
            return
        rows = [
            {"a": self.x.value(x0), "b": self.y.value(y0), "c": self.x.value(x1), "d": self.y.value(y1)}
            for x0, y0, x1, y1 in corners
        ]
        self.layers.append(
            {
                "data": _data(rows),
                "mark": mark,
                "encoding": {
                    "x": self.x.encode("a"),
                    "y": self.y.encode("b"),
                    "x2": {"field": "c"},
                    "y2": {"field": "d"},
                },
            }
        )

    def rules(self, lines: Sequence[tuple[float, float, float, float]], **mark: Any) -> None:
        """Draw straight lines given in pixels."""
        self._spans(lines, {"type": "rule", "color": "#6b6b6b", "strokeWidth": 0.8} | mark)

    def boxes(self, boxes: Sequence[Box], **mark: Any) -> None:
        """Draw rectangles given in pixels."""
        corners = [(box.left, box.top, box.right, box.bottom) for box in boxes]
        self._spans(corners, {"type": "rect", "strokeWidth": 0} | mark)

    def path(self, rows: Sequence[Mapping[str, Any]], x: str, y: str, **mark: Any) -> None:
        """Draw a line through rows in their order, one line per value of ``run``."""
        kept = [{x: row[x], y: row[y], "run": row.get("run", ""), "order": i} for i, row in enumerate(rows)]
        if not kept:
            return
        self.layers.append(
            {
                "data": _data(kept),
                "mark": {"type": "line", "strokeCap": "butt", "strokeJoin": "round"} | mark,
                "encoding": {
                    "x": self.x.encode(x),
                    "y": self.y.encode(y),
                    "order": {"field": "order", "type": "quantitative"},
                    "detail": {"field": "run", "type": "nominal"},
                },
            }
        )

    def marks(self, rows: Sequence[Mapping[str, Any]], x: str, y: str, **mark: Any) -> None:
        """Draw symbols at rows."""
        if not rows:
            return
        self.layers.append(
            {
                "data": _data([{x: row[x], y: row[y]} for row in rows]),
                "mark": {"type": "point", "filled": True, "opacity": 1} | mark,
                "encoding": {"x": self.x.encode(x), "y": self.y.encode(y)},
            }
        )

    def symbols(self, places: Sequence[tuple[float, float]], **mark: Any) -> None:
        """Draw symbols at places in pixels."""
        self.marks([{"a": self.x.value(px), "b": self.y.value(py)} for px, py in places], "a", "b", **mark)

    def words(self, words: Sequence[Words], *, back: bool = False) -> None:
        """Write text, with ``back`` on cleared ground."""
        if back:
            self.boxes([_ground(item) for item in words], color="white", opacity=0.85)
        for bold, align in itertools.product((True, False), ("left", "center", "right")):
            rows = [
                {
                    "a": self.x.value(item.x),
                    "b": self.y.value(item.y),
                    "text": visible(flat_powers(item.text)),
                    "ink": item.ink,
                }
                for item in words
                if item.bold == bold and item.align == align
            ]
            if rows:
                self.layers.append(
                    {
                        "data": _data(rows),
                        "mark": {
                            "type": "text",
                            "fontSize": TEXT_SIZE,
                            "align": align,
                            "baseline": "middle",
                            "fontWeight": "bold" if bold else "normal",
                        },
                        "encoding": {
                            "x": self.x.encode("a"),
                            "y": self.y.encode("b"),
                            "text": {"field": "text", "type": "nominal"},
                            "color": {"field": "ink", "type": "nominal", "scale": None, "legend": None},
                        },
                    }
                )

    def backs(self, labels: Sequence[Label]) -> None:
        """Clear the ground behind labels."""
        grown = [
            Box(b.left - 1.0, b.top - 0.5, b.right + 1.0, b.bottom + 0.5)
            for b in (label.placed.box for label in labels)
        ]
        self.boxes(grown, color="white", opacity=0.85)

    def leaders(self, labels: Sequence[Label]) -> None:
        """Draw thin lines from labels that stand off to what they name."""
        self.rules([(*label.placed.anchor, label.placed.x, label.placed.y) for label in labels if label.placed.leader])
