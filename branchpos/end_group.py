"""Chain classes: what sits at C1, and what it adds to the formula of the bare alkane."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.masses import Formula


@dataclass(frozen=True, slots=True, order=True)
class EndGroup:
    """One chain class.

    Attributes
    ----------
    name : as spelt in options and results.
    added : what the formula holds beyond the alkane with the same carbon skeleton.
    first_free : lowest position that a methyl branch can take.
    symmetric : true where the chain can be numbered from either end.
    """

    name: str
    added: Formula
    first_free: int = 2
    symmetric: bool = False


_CLASSES = (
    EndGroup("alkane", Formula(), symmetric=True),
    EndGroup("alkene", Formula(h=-2)),
    EndGroup("alcohol", Formula(o=1)),
    EndGroup("methyl ether", Formula(c=1, h=2, o=1)),
    EndGroup("amine", Formula(h=1, n=1)),
    EndGroup("aldehyde", Formula(h=-2, o=1)),
    EndGroup("methyl ketone", Formula(c=1, o=1)),
    EndGroup("acid", Formula(h=-2, o=2)),
    EndGroup("methyl ester", Formula(c=1, o=2)),
    EndGroup("ethyl ester", Formula(c=2, h=2, o=2)),
    EndGroup("trimethylsilyl ester", Formula(c=3, h=6, o=2, si=1)),
    EndGroup("trimethylsilyl ether", Formula(c=3, h=8, o=1, si=1)),
    EndGroup("acetate", Formula(c=2, h=2, o=2)),
    EndGroup("pyrrolidide", Formula(c=4, h=5, n=1, o=1)),
    EndGroup("3-pyridylcarbinol ester", Formula(c=6, h=3, n=1, o=2)),
    EndGroup("dimethyloxazoline", Formula(c=4, h=5, n=1, o=1)),
)

END_GROUPS = {group.name: group for group in _CLASSES}
"""Every chain class by its name."""

PLACED_CLASSES = tuple(name for name in END_GROUPS if name != "alkene")
"""Classes whose branches can be placed; alkenes are recognised only."""

ALKANE = END_GROUPS["alkane"]
"""The class without an end group."""
