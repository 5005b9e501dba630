"""What a figure shows, as plain values: layers of expected ions, observations, the ions that are named."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.chain import Chain


@dataclass(frozen=True, slots=True)
class ShownIon:
    """One ion in the ion-series view; abundances relative to the base peak.

    Attributes
    ----------
    mz, carbons : whole mass number and size.
    expected, low, high : expected abundance and its range.
    observed : abundance seen, None where absent, or where the picture shows no observation.
    """

    mz: int
    carbons: int
    expected: float
    low: float
    high: float
    observed: float | None = None


@dataclass(frozen=True, slots=True)
class Layer:
    """One hypothesis.

    Attributes
    ----------
    chain : the structure.
    label : its name, with its probability where it has one.
    ions : by rising m/z.
    """

    chain: Chain
    label: str
    ions: tuple[ShownIon, ...]


@dataclass(frozen=True, slots=True)
class NamedSize:
    """Ions of one size that are named in the figure.

    Attributes
    ----------
    carbons, masses : the size and the mass numbers named.
    note : what is said of them beside m/z and cleavage, such as their weight in bits.
    """

    carbons: int
    masses: tuple[int, ...]
    note: str = ""


@dataclass(frozen=True, slots=True)
class Picture:
    """All that a figure shows.

    Attributes
    ----------
    title, headline : where the data come from; the result.
    layers : one or two hypotheses, best first.
    named : the ions that decide, or that a branch steers.
    threshold : detection threshold relative to the base peak; None where nothing was observed.
    """

    title: str
    headline: str
    layers: tuple[Layer, ...]
    named: tuple[NamedSize, ...]
    threshold: float | None = None


@dataclass(frozen=True, slots=True)
class Cut:
    """A cleavage of a backbone bond.

    Attributes
    ----------
    bond : the lower of the two backbone carbons it parts.
    keeps_left : whether the charge stays on the side of C1.
    """

    bond: int
    keeps_left: bool

    @property
    def words(self) -> str:
        """The bond in words."""
        return f"C{self.bond}|C{self.bond + 1}"


def cuts_of(chain: Chain, carbons: int) -> list[Cut]:
    """Return the cleavages beside a branch that give ions of a size, those at the most branched carbon.

    >>> [(cut.words, cut.keeps_left) for cut in cuts_of(Chain(25, (5, 11)), 13)]
    [('C11|C12', True)]
    >>> cuts_of(Chain(27), 13)
    []
    """
    found: list[tuple[int, Cut]] = []
    for bond in range(1, chain.backbone):
        left = bond + sum(position <= bond for position in chain.methyls)
        if left == carbons:
            found.append((chain.methyls.count(bond), Cut(bond, True)))
        if chain.carbons - left == carbons:
            found.append((chain.methyls.count(bond + 1), Cut(bond, False)))
    best = max((degree for degree, _ in found), default=0)
    return [cut for degree, cut in found if degree == best > 0]
