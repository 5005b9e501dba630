"""Families of ions that several classes share."""

from __future__ import annotations

from branchpos.ion_series import IonKind
from branchpos.predicting.headed import Family, Keeps


def head(*start: float) -> Family:
    """Return the part with the end group, by simple cleavage: alpha-cleavage at the first bonds."""
    return Family("head", Keeps.HEAD, 0, IonKind.FRAGMENT, start)


def rearranged_head(*start: float) -> Family:
    """Return the part with the end group and one hydrogen more; its second bond is McLafferty's."""
    return Family("rearranged_head", Keeps.HEAD, 1, IonKind.REARRANGED, start)


def alkenyl(*start: float) -> Family:
    """Return the part with C1 once the end group has left as a neutral, by simple cleavage."""
    return Family("alkenyl", Keeps.HEAD_WITHOUT, 0, IonKind.FRAGMENT, start, smallest=9)


def alkene(*start: float) -> Family:
    """Return the same part as an alkene ion: loss of an alkene or alkane from the far end."""
    return Family("alkene", Keeps.HEAD_WITHOUT, 1, IonKind.REARRANGED, start, smallest=9)


def alkyl(*start: float) -> Family:
    """Return the alkyl part."""
    return Family("alkyl", Keeps.TAIL, 0, IonKind.FRAGMENT, start, smallest=4)
