"""Drawings for print (layer 9): one SVG of a stated width in millimetres from charts and words, and its other formats.

Lengths inside are pixels of the charts; the final width in millimetres fixes how large a pixel is printed. With
386 pixels on 88 mm the words of the charts (11 px) come out at 7.1 pt and their thinnest lines (0.8 px) at
0.52 pt.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from xml.etree import ElementTree

from benchmark.report.pdf_order import in_one_order
from benchmark.report.style import FONT, INK
from benchmark.report.svg import cleaned
from benchmark.report.words import flat_powers, visible

__all__ = ["POINTS_PER_MM", "Sheet", "points_per_pixel", "printed", "to_bitmap", "to_pdf"]

POINTS_PER_MM = 72.0 / 25.4
_SVG = "http://www.w3.org/2000/svg"


def points_per_pixel(width_mm: float, width: float) -> float:
    """Return the printed size of a pixel [pt] of a drawing ``width`` pixels wide on ``width_mm`` millimetres."""
    return width_mm * POINTS_PER_MM / width


@dataclass
class Sheet:
    """A white rectangle of ``width`` x ``height`` pixels to put drawings and words on."""

    width: float
    height: float
    parts: list[ElementTree.Element] = field(default_factory=list)

    def place(self, svg: str, key: str, left: float, top: float) -> None:
        """Put a drawing with its corner at a place; ``key`` keeps its ids apart from those of others."""
        root = cleaned(svg, f"{key}-")
        group = ElementTree.Element("g", {"transform": f"translate({left:g},{top:g})"})
        group.extend(list(root))
        self.parts.append(group)

    def write(self, text: str, x: float, y: float, size: float = 11.0, *, bold: bool = False) -> None:
        """Write one line of words with its foot at ``y``."""
        marks = {"x": f"{x:g}", "y": f"{y:g}", "font-family": FONT, "font-size": f"{size:g}px", "fill": INK}
        element = ElementTree.Element("text", marks | ({"font-weight": "bold"} if bold else {}))
        element.text = visible(flat_powers(text))
        self.parts.append(element)

    def rule(self, left: float, right: float, y: float) -> None:
        """Draw a horizontal line."""
        marks = {"x1": f"{left:g}", "x2": f"{right:g}", "y1": f"{y:g}", "y2": f"{y:g}"}
        self.parts.append(ElementTree.Element("line", marks | {"stroke": INK, "stroke-width": "1"}))

    def svg(self, width_mm: float, title: str, alternative: str) -> str:
        """Return the drawing with title and description, ``width_mm`` wide."""
        height_mm = width_mm * self.height / self.width
        root = ElementTree.Element(
            "svg",
            {
                "xmlns": _SVG,
                "width": f"{width_mm:g}mm",
                "height": f"{height_mm:.4f}mm",
                "viewBox": f"0 0 {self.width:g} {self.height:g}",
                "role": "img",
            },
        )
        for name, text in (("title", title), ("desc", alternative)):
            ElementTree.SubElement(root, name).text = visible(text)
        ground = {"width": f"{self.width:g}", "height": f"{self.height:g}", "fill": "white"}
        ElementTree.SubElement(root, "rect", ground)
        root.extend(self.parts)
        return ElementTree.tostring(root, encoding="unicode") + "\n"


def printed(svg: str, key: str, width_mm: float, title: str, alternative: str) -> str:
    """Return a chart's drawing as a figure of a stated width."""
    root = ElementTree.fromstring(svg)
    sheet = Sheet(float(root.attrib["width"]), float(root.attrib["height"]))
    sheet.place(svg, key, 0.0, 0.0)
    return sheet.svg(width_mm, title, alternative)


def to_pdf(svg: str) -> bytes:
    """Return a drawing made by ``Sheet.svg`` as a PDF page of its own size: words stay words, fonts are embedded.

    The same drawing gives the same bytes.
    """
    import vl_convert

    def points(match: re.Match[str]) -> str:  # the library counts a pixel as one point
        return f'{match[1]}="{float(match[2]) * POINTS_PER_MM:.4f}"'

    sized = re.sub(r'\b(width|height)="([\d.]+)mm"', points, svg, count=2)
    return in_one_order(bytes(vl_convert.svg_to_pdf(sized)))


def to_bitmap(svg: str, dots_per_inch: float = 300.0) -> bytes:
    """Return a drawing as PNG with its printed size."""
    import vl_convert

    return bytes(vl_convert.svg_to_png(svg, scale=1.0, ppi=dots_per_inch))
