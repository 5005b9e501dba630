"""How the ions were made, as records state it: the whole program holds for electron ionisation only."""

from __future__ import annotations

import re
from collections.abc import Iterable

from branchpos.reading.numerals import leading_number, quoted

NOT_ELECTRON = "not electron ionisation"
"""Every warning about another way of making ions begins with these words."""

_ELECTRON_WORDS = re.compile(r"\bei\b|\belectron[- ]?(?:impact|ioni[sz]ation)\b|\b70 ?ev\b")
_OTHER_WORDS = re.compile(
    r"\b(?:[np]?ci|ecni|nici|pici|esi|nanoesi|hesi|apci|appi|fab|lsims|fd|fi|maldi|ldi|dart|desi|tsp)\b"
    r"|chemical|electro-?spray|thermo-?spray|atom bombardment|field (?:desorption|ioni[sz]ation)"
    r"|photo-?ioni[sz]|laser|electron capture"
)
_NEGATIVE = re.compile(r"\bnegative\b|^n(?:eg)?$|\b[a-z]+-(?=$|\s|,)")
_LOWEST_ENERGY = 50.0
"""Electron energy [eV] below which fragment yields leave the plateau near 70 eV (common practice)."""


def ionisation_warnings(
    *, methods: Iterable[str] = (), polarity: str = "", energy: str = "", instrument: str = ""
) -> list[str]:
    """Say what speaks against an electron ionisation spectrum of positive ions near 70 eV.

    Parameters
    ----------
    methods : fields that name the ionisation, as printed in the record; empty ones are passed over.
    polarity : the field that names the polarity.
    energy : the field that names the electron energy [eV].
    instrument : instrument type such as ``GC-EI-TOF``; used where no field names the ionisation.

    >>> ionisation_warnings(methods=["CI"])
    ["not electron ionisation: the record says 'CI'"]
    >>> ionisation_warnings(instrument="GC-EI-TOF", energy="70 eV")
    []
    """
    stated = [text for text in methods if text.strip()]
    notes = [note for text in stated or [instrument] if (note := _method_warning(text, bool(stated)))]
    if _NEGATIVE.search(polarity.strip().lower()) and not notes:
        notes.append(f"{NOT_ELECTRON} of positive ions: the record says {quoted(polarity.strip())}")
    volts = leading_number(energy)
    if volts is not None and 0 < volts < _LOWEST_ENERGY and not notes:
        notes.append(f"electron energy {volts:g} eV: fragment yields differ from those near 70 eV")
    return notes


def _method_warning(text: str, must_name: bool) -> str:
    lowered = text.strip().lower()
    if _OTHER_WORDS.search(lowered):
        return f"{NOT_ELECTRON}: the record says {quoted(text.strip())}"
    if _NEGATIVE.search(lowered) and _ELECTRON_WORDS.search(lowered):
        return f"{NOT_ELECTRON} of positive ions: the record says {quoted(text.strip())}"
    if must_name and not _ELECTRON_WORDS.search(lowered):
        return f"ionisation {quoted(text.strip())} is not known; taken as electron ionisation"
    return ""
