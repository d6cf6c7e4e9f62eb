"""Our own colours, safe for the colour-blind and at least 3:1 against white and against the dark page; never alone:
every series also has a shape, a dash or a label."""

from __future__ import annotations

# mid-tones that hold on both themes; order is the order of series
SERIES = ("#2f7fb5", "#c2571a", "#2a8f6d", "#9a5fb0", "#8a7a1f", "#b8436a", "#5f7482", "#6a58d6", "#a0522d")
DASHES = ((1, 0), (6, 3), (2, 2), (8, 3, 2, 3))
SHAPES = ("circle", "square", "triangle-up", "diamond", "cross")
GOOD, WARN, STOP = "#2a8f6d", "#b07a10", "#c03f3f"
NEUTRAL = "#7a8794"


def contrast(first: str, second: str) -> float:
    """Return the contrast ratio of two colours by WCAG 2.1 (1 to 21)."""
    light, dark = sorted((_luminance(first), _luminance(second)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def _luminance(colour: str) -> float:
    channels = [int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
