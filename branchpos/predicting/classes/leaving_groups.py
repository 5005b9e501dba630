"""Alcohols, ethers, amines, acetates: an end group that leaves as a neutral, then an alkene's ions.

Alpha-cleavage (31, 45, 30, 103), loss of water or its kin from the molecular ion (18, 32, 60, 90), and from
what is left the series CnH2n-1 and CnH2n, whose odd- and even-mass ions near the far end show the branch:
an anteiso end swaps M-60 for M-61 and lifts M-89 in a methyl ether. The molecular ion is seldom seen (common
practice).
"""

from __future__ import annotations

from branchpos.end_group import END_GROUPS
from branchpos.predicting.classes.families import alkene, alkenyl, alkyl, head
from branchpos.predicting.headed import ClassRules

_SERIES = (alkenyl(-2.0), alkene(-2.0), alkyl(-4.5))

ALCOHOL = ClassRules(
    END_GROUPS["alcohol"],
    (head(-1.0, -3.5, -5.0, -4.0, -5.5), *_SERIES),
    losses={18: -3.5, 45: -4.0, 17: -5.0},
    fixed={},
    pool=-0.4,
    molecular=-7.0,
)

METHYL_ETHER = ClassRules(
    END_GROUPS["methyl ether"],
    (head(0.0, -4.0, -5.0, -6.0), *_SERIES),
    losses={31: -3.5, 32: -1.8},
    fixed={46: -3.5, 71: -2.5},
    pool=-0.7,
    molecular=-6.5,
)

AMINE = ClassRules(
    END_GROUPS["amine"],
    (head(0.0, -3.0, -3.5, -3.5, -4.0, -3.0, -4.5), alkyl(-5.0)),
    losses={1: -4.0, 15: -5.0, 17: -5.0},
    fixed={28: -2.5, 31: -3.5},
    pool=-2.5,
    molecular=-4.0,
)

ACETATE = ClassRules(
    END_GROUPS["acetate"],
    (head(-2.8, -4.5, -4.5, -3.5, -5.5), *_SERIES),
    losses={60: -2.0, 59: -4.0, 42: -5.0},
    fixed={43: 0.0, 44: -3.5, 61: -1.2},
    pool=-1.0,
    molecular=-7.5,
)

TRIMETHYLSILYL_ETHER = ClassRules(
    END_GROUPS["trimethylsilyl ether"],
    (head(-1.5, -3.0, -4.0, -4.5, -5.0), *_SERIES),
    losses={15: 0.0, 14: -1.8, 90: -4.0},
    fixed={73: -0.7, 75: -0.1, 76: -2.5, 89: -2.5},
    pool=-1.5,
    molecular=-5.5,
    fitted=False,
)
