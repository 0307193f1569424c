"""Drawings fit to stand inside the page (layer 9): parsed, held against a closed list, ids made unique.

Nothing that could run, load or link survives: an element or attribute outside the list is a fault of the program and
stops the report.
"""

from __future__ import annotations

import re
from xml.etree import ElementTree

from benchmark.report.words import visible

__all__ = ["SVG_ATTRIBUTES", "SVG_ELEMENTS", "cleaned", "inline_svg"]

_SVG = "{http://www.w3.org/2000/svg}"
SVG_ELEMENTS = frozenset({"svg", "g", "path", "line", "rect", "text", "tspan", "defs", "clipPath"})
SVG_ATTRIBUTES = frozenset(
    {
        *("viewBox", "width", "height", "x", "y", "x1", "x2", "y1", "y2", "d", "transform", "dx", "dy"),
        *("fill", "fill-opacity", "stroke", "stroke-width", "stroke-opacity", "stroke-dasharray", "stroke-dashoffset"),
        *("stroke-linecap", "stroke-linejoin", "stroke-miterlimit", "opacity", "display"),
        *("font-family", "font-size", "font-weight", "font-style", "text-anchor", "clip-path", "id"),
    }
)
#: written by the drawing library and of no use here
_LEFT_OUT = frozenset(
    {"version", "class", "role", "aria-hidden", "aria-roledescription", "aria-label", "pointer-events", "style"}
)


def _clean(element: ElementTree.Element, prefix: str) -> None:
    name = element.tag.removeprefix(_SVG)
    if not element.tag.startswith(_SVG) or name not in SVG_ELEMENTS:
        message = f"a drawing holds the element {element.tag!r}, which the page does not allow"
        raise ValueError(message)
    element.tag = name
    for attribute in list(element.attrib):
        if attribute in _LEFT_OUT or (attribute == "opacity" and element.get(attribute) == "1"):
            del element.attrib[attribute]
        elif attribute not in SVG_ATTRIBUTES:
            message = f"a drawing holds the attribute {attribute!r}, which the page does not allow"
            raise ValueError(message)
    if "id" in element.attrib:
        element.set("id", prefix + element.attrib["id"])
    if "clip-path" in element.attrib:
        element.set("clip-path", re.sub(r"url\(#([\w-]+)\)", rf"url(#{prefix}\1)", element.attrib["clip-path"]))
    for name, value in element.attrib.items():
        if "url(" in value and name != "clip-path":
            message = f"a drawing refers to something else in {name!r}, which the page does not allow"
            raise ValueError(message)
    for child in element:
        _clean(child, prefix)


def cleaned(svg: str, prefix: str) -> ElementTree.Element:
    """Return the root of a drawing with only what the closed list allows, its ids beginning with ``prefix``.

    Raises
    ------
    ValueError
        Not well-formed, or something outside the closed list.
    """
    root = ElementTree.fromstring(svg)
    _clean(root, prefix)
    return root


def inline_svg(svg: str, key: str, alternative: str) -> str:
    """Return the drawing as one element with role and label, to be put into the page as it is.

    Raises
    ------
    ValueError
        Not well-formed, or something outside the closed list.
    """
    root = cleaned(svg, f"{key}-")
    root.set("role", "img")
    root.set("aria-label", visible(alternative))
    root.set("class", "chart")
    return ElementTree.tostring(root, encoding="unicode", short_empty_elements=True)
