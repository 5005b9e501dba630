"""Acids and their methyl, ethyl and trimethylsilyl esters.

McLafferty rearrangement (60, 74, 88, 132), acylium ions (loss of the alkoxy group), and the series of the
carboxyl end, 87, 143, 199 ... (Ryhage and Stenhagen, J. Lipid Res. 1 (1960) 361, from memory). A methyl on C2
moves the McLafferty ion up by 14; one on C4 lifts the ion of the bond before it. Trimethylsilyl esters show
117, 129, 132, 145 and lose a methyl from silicon.
"""

from __future__ import annotations

from branchpos.end_group import END_GROUPS
from branchpos.predicting.classes.families import alkyl, head, rearranged_head
from branchpos.predicting.headed import ClassRules

_HEAD = (-2.5, -4.0, -0.4, -2.6, -3.5, -2.8, -1.8, -3.5)
_REARRANGED = (-6.0, 0.0, -3.0, -4.5, -4.5, -4.5, -4.0, -4.5)

METHYL_ESTER = ClassRules(
    END_GROUPS["methyl ester"],
    (head(*_HEAD), rearranged_head(*_REARRANGED), alkyl(-4.0)),
    losses={31: -3.0, 32: -4.0, 74: -4.5},
    fixed={59: -2.5},
    pool=-1.8,
    molecular=-2.5,
)

ETHYL_ESTER = ClassRules(
    END_GROUPS["ethyl ester"],
    (head(*_HEAD), rearranged_head(*_REARRANGED), alkyl(-4.0)),
    losses={45: -3.0, 46: -4.0, 88: -4.5},
    fixed={60: -2.0, 61: -2.0, 70: -2.0, 73: -2.0},
    pool=-1.8,
    molecular=-2.5,
)

ACID = ClassRules(
    END_GROUPS["acid"],
    (head(-2.5, -3.5, -0.2, -2.2, -2.8, -2.3, -1.5, -3.0), rearranged_head(*_REARRANGED), alkyl(-3.5)),
    losses={17: -4.5, 18: -4.5, 60: -4.0},
    fixed={61: -3.0},
    pool=-0.8,
    molecular=-1.5,
)

TRIMETHYLSILYL_ESTER = ClassRules(
    END_GROUPS["trimethylsilyl ester"],
    (
        head(-0.3, -2.0, -1.5, -4.5, -4.5, -4.5, -2.5, -4.5),
        rearranged_head(-2.5, -0.9, -2.5, -5.0),
        alkyl(-5.0),
    ),
    losses={15: -1.2, 14: -2.8, 13: -4.0},
    fixed={73: -0.2, 74: -2.5, 75: -0.4, 76: -3.0, 77: -2.5, 47: -2.5, 129: -0.9, 131: -2.0, 133: -2.5},
    pool=-1.5,
    molecular=-4.0,
)
