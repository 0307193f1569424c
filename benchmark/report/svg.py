"""Drawings fit to stand inside the page (layer 9): parsed, held against a closed list, ids made unique.

Nothing that could run or load survives, and a link leads to a place on the same page or stops the report, as any
element or attribute outside the list does: it is a fault of the program.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from xml.etree import ElementTree

from benchmark.report.spots import Spot
from benchmark.report.trails import data_id, mark_id
from benchmark.report.words import visible

__all__ = ["SVG_ATTRIBUTES", "SVG_ELEMENTS", "cleaned", "inline_svg"]

_SVG = "{http://www.w3.org/2000/svg}"
SVG_ELEMENTS = frozenset({"svg", "g", "path", "line", "rect", "text", "tspan", "defs", "clipPath", "a", "title"})
#: the only address a drawing may hold: a place on the page it stands in
_FRAGMENT = re.compile(r"#[A-Za-z][A-Za-z0-9_-]*")
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
    if name == "a":
        _link(element)
    for attribute in list(element.attrib):
        if attribute in _LEFT_OUT or (attribute == "opacity" and element.get(attribute) == "1"):
            del element.attrib[attribute]
        elif attribute not in SVG_ATTRIBUTES and not (name == "a" and attribute == "href"):
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


def _link(element: ElementTree.Element) -> None:
    """Refuse a link that leads anywhere but to a place on the page."""
    if not _FRAGMENT.fullmatch(element.get("href", "")):
        message = f"a drawing links to {element.get('href', 'nothing')!r}, which the page does not allow"
        raise ValueError(message)


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


def _links(key: str, spots: Sequence[Spot]) -> ElementTree.Element:
    """Return a group of links, one per spot; the first that leads to a row carries the id the row leads back to."""
    group = ElementTree.Element("g", {"role": "list"})
    met: set[int] = set()
    for spot in spots:
        item = ElementTree.SubElement(group, "g", {"role": "listitem"})
        link = ElementTree.SubElement(item, "a", {"href": spot.href or f"#{data_id(key, spot.row)}"})
        _link(link)
        if spot.row not in met:
            link.set("id", mark_id(key, spot.row))
            met.add(spot.row)
        ElementTree.SubElement(link, "title").text = visible(spot.name)
        box = {"x": spot.box.left, "y": spot.box.top}
        size = {"width": spot.box.right - spot.box.left, "height": spot.box.bottom - spot.box.top}
        marks = {name: f"{value:.1f}" for name, value in (box | size).items()}
        ElementTree.SubElement(link, "rect", marks | {"fill": "transparent"})
    return group


def inline_svg(svg: str, key: str, alternative: str, title: str = "", spots: Sequence[Spot] = ()) -> str:
    """Return the drawing as one element with role and label, to be put into the page as it is.

    Parameters
    ----------
    svg : str
        The drawing.
    key : str
        Key of the chart; ids begin with it.
    alternative : str
        What the drawing shows, in words.
    title : str
        Name of the whole, needed where there are ``spots``.
    spots : sequence of Spot
        Places that become links, above the drawing.

    Raises
    ------
    ValueError
        Not well-formed, or something outside the closed list, or a link that leaves the page.
    """
    root = cleaned(svg, f"{key}-")
    if spots:  # what is inside an image cannot be reached, so the drawing is the image and the links stand beside it
        image = ElementTree.Element("g", {"role": "img", "aria-label": visible(alternative)})
        image.extend(list(root))
        for child in list(root):
            root.remove(child)
        root.extend([image, _links(key, spots)])
        root.set("role", "group")
        root.set("aria-label", visible(f"{title}, marks lead to their numbers"))
    else:
        root.set("role", "img")
        root.set("aria-label", visible(alternative))
    root.set("class", "chart")
    return ElementTree.tostring(root, encoding="unicode", short_empty_elements=True)
