"""Aldehydes and methyl ketones.

Alpha-cleavage to acylium ions (29, 43) and McLafferty rearrangement (44, 58; 14 higher for each methyl on the
carbon beside the carbonyl); aldehydes lose water, ethene and acetaldehyde (M-18, M-28, M-44) (common
practice).
"""

from __future__ import annotations

from branchpos.end_group import END_GROUPS
from branchpos.predicting.classes.families import alkene, alkenyl, alkyl, head, rearranged_head
from branchpos.predicting.headed import ClassRules

ALDEHYDE = ClassRules(
    END_GROUPS["aldehyde"],
    (
        head(-0.5, 0.0, -0.6, -1.4, -2.0, -3.0, -4.5),
        rearranged_head(-4.0, -0.6, -3.0, -3.0, -4.0, -4.5),
        alkenyl(-2.5),
        alkene(-2.5),
        alkyl(-4.5),
    ),
    losses={18: -3.0, 28: -3.5, 43: -4.0, 44: -2.0, 46: -2.5},
    fixed={},
    pool=-0.5,
    molecular=-4.5,
)

METHYL_KETONE = ClassRules(
    END_GROUPS["methyl ketone"],
    (
        head(-0.2, -2.0, -1.3, -2.8, -4.0, -4.5),
        rearranged_head(-4.0, 0.0, -4.0, -3.5, -4.5),
        alkyl(-4.0),
    ),
    losses={15: -4.0, 58: -3.5, 60: -4.0},
    fixed={59: -1.3},
    pool=-2.0,
    molecular=-3.0,
)
