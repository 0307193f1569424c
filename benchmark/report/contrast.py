"""Contrast of two colours as WCAG 2.2 defines it, and what is left of a colour in grey print (layer 9)."""

from __future__ import annotations

__all__ = ["contrast", "grey", "luminance"]


def luminance(colour: str) -> float:
    """Return the relative luminance [1] of a colour ``#rrggbb``: 0.2126 R + 0.7152 G + 0.0722 B of linear light."""
    channels = [int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(one: str, other: str = "#ffffff") -> float:
    """Return (L1 + 0.05) / (L2 + 0.05) [1] of two colours, the lighter first: from 1 to 21."""
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def grey(colour: str) -> str:
    """Return the grey of the same luminance, as a monochrome printer shows a colour."""
    linear = luminance(colour)
    shown = 12.92 * linear if linear <= 0.0031308 else 1.055 * linear ** (1.0 / 2.4) - 0.055
    return "#" + 3 * f"{round(255.0 * shown):02x}"
