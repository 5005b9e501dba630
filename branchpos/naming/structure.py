"""Reading line notation (SMILES) into atoms and bonds.

Source: the OpenSMILES specification, version 1.0. Only what a saturated chain and its end groups need: no
charges, isotopes or disconnected parts. Marks of stereochemistry are read and dropped: electron ionisation
cannot see it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from branchpos.errors import NamingError

_TOKEN = re.compile(
    r"(?P<bracket>\[[^\[\]]*\])|(?P<atom>Br|Cl|[BCNOPSFI]|[cnos])|(?P<bond>[-=#:/\\])|(?P<open>\()|(?P<close>\))"
    r"|%(?P<far>\d\d)|(?P<ring>\d)"
)
_BRACKET = re.compile(r"\[(?P<element>[A-Z][a-z]?|[cnos])@{0,2}(?:H(?P<hydrogens>\d*))?\]")
_ORDERS = {"-": 1.0, "/": 1.0, "\\": 1.0, "=": 2.0, "#": 3.0, ":": 1.5}
_VALENCES = {"C": 4, "N": 3, "O": 2, "Si": 4, "H": 1, "F": 1, "Cl": 1, "Br": 1, "I": 1}
_AROMATIC = 1.5


@dataclass(slots=True)
class Structure:
    """Atoms by number and their bonds.

    Attributes
    ----------
    elements : symbol of each atom; lower case where it is written aromatic.
    bonds : for each atom, its neighbours with the bond order (1.5 aromatic).
    hydrogens : hydrogens written on the atom, None where they are implied.
    """

    elements: list[str] = field(default_factory=list)
    bonds: list[dict[int, float]] = field(default_factory=list)
    hydrogens: list[int | None] = field(default_factory=list)

    def add(self, element: str, hydrogens: int | None) -> int:
        """Add one atom and return its number."""
        self.elements.append(element)
        self.bonds.append({})
        self.hydrogens.append(hydrogens)
        return len(self.elements) - 1

    def join(self, a: int, b: int, order: float | None) -> None:
        """Bond two atoms; an unwritten bond is single, or aromatic between aromatic atoms."""
        if order is None:
            aromatic = self.elements[a].islower() and self.elements[b].islower()
            order = _AROMATIC if aromatic else 1.0
        self.bonds[a][b] = self.bonds[b][a] = order

    @property
    def rings(self) -> int:
        """How many independent rings there are (the structure is one piece)."""
        return sum(map(len, self.bonds)) // 2 - len(self.elements) + 1


@dataclass(slots=True)
class _Reading:
    """Where the reader stands: last atom, pending bond, open branches and rings."""

    structure: Structure = field(default_factory=Structure)
    last: int | None = None
    order: float | None = None
    branches: list[int] = field(default_factory=list)
    rings: dict[int, tuple[int, float | None]] = field(default_factory=dict)

    def atom(self, element: str, hydrogens: int | None) -> None:
        new = self.structure.add(element, hydrogens)
        if self.last is not None:
            self.structure.join(self.last, new, self.order)
        self.last, self.order = new, None

    def ring(self, number: int, last: int) -> None:
        """Open a ring closure, or close it."""
        if number in self.rings:
            start, order = self.rings.pop(number)
            self.structure.join(start, last, self.order or order)
        else:
            self.rings[number] = (last, self.order)
        self.order = None


def read_structure(text: str) -> Structure:
    """Read line notation into heavy atoms and bonds.

    Raises
    ------
    NamingError : the text breaks the notation, or uses a part of it that no chain needs; names the character.

    >>> read_structure("CC(C)O").elements
    ['C', 'C', 'C', 'O']
    """
    reading, at = _Reading(), 0
    while at < len(text):
        token = _TOKEN.match(text, at)
        if not token:
            raise _broken(text, at, _unread(text[at]))
        _take(reading, token, text)
        at = token.end()
    if reading.branches or reading.rings or reading.order is not None or reading.last is None:
        raise _broken(text, len(text) - 1, "a branch, ring or bond is left open")
    structure = _without_hydrogen(reading.structure)
    _check_valences(structure, text)
    return structure


def _take(reading: _Reading, token: re.Match[str], text: str) -> None:
    """Let one token change the reading."""
    kind, at = token.lastgroup, token.start()
    if kind == "atom":
        reading.atom(token["atom"], None)
    elif kind == "bracket":
        reading.atom(*_bracket_atom(token["bracket"], text, at))
    elif kind == "close":
        if not reading.branches:
            raise _broken(text, at, "a branch is closed that was not opened")
        reading.last = reading.branches.pop()
    elif reading.last is None:
        raise _broken(text, at, "an atom must come first")
    elif kind == "bond":
        reading.order = _ORDERS[token["bond"]]
    elif kind == "open":
        reading.branches.append(reading.last)
    else:
        reading.ring(int(token["far"] or token["ring"]), reading.last)


def _bracket_atom(bracket: str, text: str, at: int) -> tuple[str, int]:
    found = _BRACKET.fullmatch(bracket)
    if not found:
        raise _broken(text, at, f"the atom {bracket} has a charge, an isotope or a mark that no chain needs")
    hydrogens = found["hydrogens"]
    return found["element"], 0 if hydrogens is None else int(hydrogens or 1)


def _unread(character: str) -> str:
    return "there are several molecules" if character == "." else f"{character!r} cannot be read"


def _broken(text: str, at: int, problem: str) -> NamingError:
    return NamingError(
        f"line notation {text!r}: {problem}",
        place=f"character {at + 1}",
        remedy="write one neutral chain, such as CCCC(C)CC",
    )


def _without_hydrogen(structure: Structure) -> Structure:
    """Return the structure with hydrogens that were written as atoms counted on their neighbours."""
    if "H" not in structure.elements:
        return structure
    heavy = [atom for atom, element in enumerate(structure.elements) if element != "H"]
    renumbered = {old: new for new, old in enumerate(heavy)}
    kept = Structure()
    for old in heavy:
        around = sum(structure.elements[near] == "H" for near in structure.bonds[old])
        written = structure.hydrogens[old]
        kept.add(structure.elements[old], None if written is None else written + around)
    for old in heavy:
        for near, order in structure.bonds[old].items():
            if near in renumbered:
                kept.bonds[renumbered[old]][renumbered[near]] = order
    return kept


def _check_valences(structure: Structure, text: str) -> None:
    """Refuse atoms with too many bonds, and radicals; aromatic atoms are left to the end group's pattern."""
    for element, bonds, hydrogens in zip(
        structure.elements, structure.bonds, structure.hydrogens, strict=True
    ):
        valence = _VALENCES.get(element)
        if valence is None:
            continue
        used = sum(bonds.values()) + (hydrogens or 0)
        if used > valence or (hydrogens is not None and used < valence):
            raise NamingError(
                f"line notation {text!r}: {element} with {used:g} bonds", remedy=f"{element} takes {valence}"
            )
