"""Derivatives made to locate branches: the charge stays at the nitrogen, every bond breaks alike.

Pyrrolidides give 113 and 126, then every 14 units; 3-pyridylcarbinol esters 92, 108, 151 and 164, then every
14; dimethyloxazolines 113 and 126, then every 14. Where a methyl sits, a step is 28 (W. W. Christie,
published pages on the mass spectrometry of fatty acid derivatives, from memory). Only one real spectrum was
at hand, an unbranched pyrrolidide, so that the rules carry wide uncertainty.
"""

from __future__ import annotations

from branchpos.end_group import END_GROUPS
from branchpos.predicting.classes.families import head, rearranged_head
from branchpos.predicting.headed import ClassRules

PYRROLIDIDE = ClassRules(
    END_GROUPS["pyrrolidide"],
    (head(-2.5, -3.0, -1.0, -2.5, -2.8, -2.8, -2.8), rearranged_head(-4.0, 0.0, -3.0, -4.5)),
    losses={},
    fixed={70: -2.0, 72: -2.0, 85: -2.5},
    pool=-2.5,
    molecular=-2.5,
    fitted=False,
)

PYRIDYLCARBINOL_ESTER = ClassRules(
    END_GROUPS["3-pyridylcarbinol ester"],
    (head(-3.5, -4.0, -1.0, -2.5, -2.3, -2.3, -2.3), rearranged_head(-4.5, -0.4, -3.0, -4.0)),
    losses={},
    fixed={92: 0.0, 93: -0.8, 108: -0.3, 65: -2.0, 80: -3.0},
    pool=-2.0,
    molecular=-1.5,
    fitted=False,
)

DIMETHYLOXAZOLINE = ClassRules(
    END_GROUPS["dimethyloxazoline"],
    (head(-3.0, -3.5, -0.6, -2.8, -2.8, -2.8, -2.8), rearranged_head(-4.0, 0.0, -3.0, -4.5)),
    losses={15: -3.0},
    fixed={98: -2.5, 55: -2.0},
    pool=-2.2,
    molecular=-2.5,
    fitted=False,
)
