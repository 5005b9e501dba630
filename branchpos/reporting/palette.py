"""The one palette: told apart by colour-blind readers and in greyscale, and never the only sign of a meaning.

Lightness steps carry the distinction (observed darkest, second hypothesis middle, first lightest); the hues
are amber and violet, which all common kinds of colour blindness keep apart (common practice).
"""

from __future__ import annotations

INK = "#1d1f24"
"""Text, observed abundances."""
FIRST = "#f3c56b"
"""Range expected by the first hypothesis: filled."""
FIRST_LINE = "#9a6a0a"
"""Its expected value."""
SECOND = "#6b4aa0"
"""Range expected by the second hypothesis: outlined and hatched."""
QUIET = "#8b9098"
"""Axes, threshold, carbon numbers."""
FAINT = "#e4e6ea"
"""Guides behind the data."""
PAPER = "#ffffff"


def luminance(colour: str) -> float:
    """Return the relative luminance of a colour, 0 black to 1 white (WCAG 2.1, definition of the term).

    >>> luminance("#ffffff"), luminance("#000000")
    (1.0, 0.0)
    """
    channels = [int(colour[start : start + 2], 16) / 255 for start in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
