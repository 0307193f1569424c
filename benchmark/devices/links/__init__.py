"""Links: values of a set that state the same thing, or bound each other (layer 4).

A device model declares its links in ``DeviceModel.links``; what a link is stands in ``link``.
"""

from __future__ import annotations

from benchmark.devices.links.link import Judged, Link, judged

__all__ = ["Judged", "Link", "judged"]
