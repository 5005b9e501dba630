"""Atomic masses, formulas, m/z of ions, isotope patterns."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from branchpos.reference_data import load_reference

ELEMENTS = ("C", "H", "N", "O", "Si")
"""Elements that the chain classes can hold, in the order used by ``Formula``."""


@cache
def isotopes(element: str) -> tuple[tuple[int, float, float], ...]:
    """Return (mass number, mass [u], mole fraction) of each stable isotope of an element.

    Source: AME2020 and IUPAC CIAAW, as named in ``reference_sets/atomic_masses.json``.

    >>> isotopes("C")[0]
    (12, 12.0, 0.9893)
    """
    rows = load_reference("atomic_masses.json")["isotopes"][element]
    return tuple((int(number), float(mass), float(share)) for number, mass, share in rows)


@cache
def electron_mass() -> float:
    """Return the electron's mass [u] (CODATA 2018)."""
    return float(load_reference("atomic_masses.json")["electron"])


@dataclass(frozen=True, slots=True, order=True)
class Formula:
    """An elemental composition; counts may be negative in a difference of formulas.

    >>> str(Formula(27, 56)), Formula(27, 56).nominal_mass
    ('C27H56', 380)
    >>> str(Formula(17, 34, o=2) - Formula(1, 3, o=1))
    'C16H31O'
    """

    c: int = 0
    h: int = 0
    n: int = 0
    o: int = 0
    si: int = 0

    def __add__(self, other: Formula) -> Formula:
        return Formula(*(a + b for a, b in zip(self.counts, other.counts, strict=True)))

    def __sub__(self, other: Formula) -> Formula:
        return Formula(*(a - b for a, b in zip(self.counts, other.counts, strict=True)))

    def __str__(self) -> str:
        return "".join(f"{el}{count if count != 1 else ''}" for el, count in self.items() if count)

    @property
    def counts(self) -> tuple[int, int, int, int, int]:
        """Atoms of C, H, N, O, Si."""
        return (self.c, self.h, self.n, self.o, self.si)

    def items(self) -> Iterator[tuple[str, int]]:
        """Iterate over (element, count), Hill order for carbon compounds."""
        return iter(zip(ELEMENTS, self.counts, strict=True))

    @property
    def nominal_mass(self) -> int:
        """Mass of the most abundant isotopes in whole mass numbers [u]."""
        return sum(isotopes(el)[0][0] * count for el, count in self.items())

    @property
    def exact_mass(self) -> float:
        """Monoisotopic mass of the neutral [u].

        >>> round(Formula(27, 56).exact_mass, 4)
        380.4382
        """
        return sum(isotopes(el)[0][1] * count for el, count in self.items())

    @property
    def cation_mz(self) -> float:
        """m/z of the singly charged positive ion [Th]; the electron's mass is taken off.

        >>> round(Formula(6, 13).cation_mz, 4)
        85.1012
        """
        return self.exact_mass - electron_mass()


def parse_formula(text: str) -> Formula:
    """Read a formula such as ``C27H56``.

    Raises
    ------
    ValueError : an element is unknown or the text is not a formula.

    >>> parse_formula("C19H40O").nominal_mass
    284
    """
    if not re.fullmatch(r"(?:(?:Si|C|H|N|O)\d*)+", text):
        raise ValueError(f"{text!r} is not a formula of C, H, N, O and Si")
    counts: dict[str, int] = dict.fromkeys(ELEMENTS, 0)
    for element, number in re.findall(r"(Si|C|H|N|O)(\d*)", text):
        counts[element] += int(number or 1)
    return Formula(*counts.values())


def isotope_pattern(formula: Formula | Mapping[str, int], peaks: int = 4) -> NDArray[np.float64]:
    """Return the abundances of M, M+1, ... relative to the all-light isotopologue.

    Convolution of the elements' own patterns, whole mass numbers.

    Parameters
    ----------
    formula : composition, all counts at least 0.
    peaks : how many mass numbers from M upwards.

    Returns
    -------
    array of shape (peaks,), first entry 1.

    >>> isotope_pattern(Formula(16, 33), 3).round(4)
    array([1.    , 0.1768, 0.0147])
    """
    pattern = np.zeros(peaks)
    pattern[0] = 1.0
    for element, count in formula.items():
        rows = isotopes(element)
        single = np.zeros(peaks)
        for number, _, share in rows:
            if number - rows[0][0] < peaks:
                single[number - rows[0][0]] = share / rows[0][2]
        for _ in range(count):
            pattern = np.convolve(pattern, single)[:peaks]
    return pattern
