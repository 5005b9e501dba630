"""Names of the trade that say nothing of the structure: isoprenoid alkanes and fatty acids.

Source: IUPAC Recommendations 1993, Appendix, for the fatty acids; Peters, Walters and Moldowan, The Biomarker
Guide, for the isoprenoids (both from memory). Names with two meanings in use, such as isooctane, are left
out.
"""

from __future__ import annotations

ISOPRENOIDS: dict[str, tuple[int, tuple[int, ...]]] = {
    "farnesane": (12, (2, 6, 10)),
    "norpristane": (15, (2, 6, 10)),
    "pristane": (15, (2, 6, 10, 14)),
    "phytane": (16, (2, 6, 10, 14)),
    "crocetane": (16, (2, 6, 11, 15)),
    "squalane": (24, (2, 6, 10, 15, 19, 23)),
    "lycopane": (32, (2, 6, 10, 14, 19, 23, 27, 31)),
}
"""Backbone and methyl positions by name."""

FATTY_ACIDS: dict[str, int] = {
    "capro": 6,
    "capryl": 8,
    "pelargon": 9,
    "capr": 10,
    "laur": 12,
    "myrist": 14,
    "palmit": 16,
    "margar": 17,
    "stear": 18,
    "arachid": 20,
    "behen": 22,
    "lignocer": 24,
    "cerot": 26,
    "montan": 28,
    "meliss": 30,
}
"""Carbons of the unbranched acid whose name ends in ``ic acid`` and its ester in ``ate``."""
