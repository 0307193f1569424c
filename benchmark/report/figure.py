"""A chart with its words, and its drawing without a browser (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from benchmark.report.spots import Spot

__all__ = ["Chart", "checked", "to_png", "to_svg"]

Row = dict[str, Any]


@dataclass(frozen=True)
class Chart:
    """One figure. ``spec`` is None when there is nothing to draw, and the caption says why.

    ``points`` are exactly the plotted data, with units in their names; ``spots`` are the places of the drawing that
    lead to rows of them.
    """

    key: str
    title: str
    spec: Mapping[str, Any] | None
    caption: str
    alternative: str
    points: tuple[Row, ...] = ()
    spots: tuple[Spot, ...] = ()


def checked(spec: Mapping[str, Any]) -> dict[str, Any]:
    """Return the specification after altair has validated it against the schema it names."""
    from altair.vegalite.schema import core

    core.TopLevelLayerSpec.validate(dict(spec))
    return dict(spec)


def _version(spec: Mapping[str, Any]) -> str:
    """Return the vega-lite version named in the specification, as major.minor."""
    name = str(spec["$schema"]).rsplit("/", 1)[-1].removesuffix(".json").removeprefix("v")
    return ".".join(name.split(".")[:2])


def to_svg(spec: Mapping[str, Any]) -> str:
    """Draw as SVG; nothing may be fetched."""
    import vl_convert

    return str(vl_convert.vegalite_to_svg(dict(spec), vl_version=_version(spec), allowed_base_urls=[]))


def to_png(spec: Mapping[str, Any], scale: float = 2.0) -> bytes:
    """Draw as PNG; nothing may be fetched."""
    import vl_convert

    return bytes(vl_convert.vegalite_to_png(dict(spec), vl_version=_version(spec), scale=scale, allowed_base_urls=[]))
