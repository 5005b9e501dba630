"""The rules of each chain class with an end group, one file a family of classes, and the table of all."""

from __future__ import annotations

from branchpos.predicting.classes.carbonyls import ALDEHYDE, METHYL_KETONE
from branchpos.predicting.classes.esters import ACID, ETHYL_ESTER, METHYL_ESTER, TRIMETHYLSILYL_ESTER
from branchpos.predicting.classes.leaving_groups import (
    ACETATE,
    ALCOHOL,
    AMINE,
    METHYL_ETHER,
    TRIMETHYLSILYL_ETHER,
)
from branchpos.predicting.classes.remote_charge import DIMETHYLOXAZOLINE, PYRIDYLCARBINOL_ESTER, PYRROLIDIDE
from branchpos.predicting.headed import ClassRules

CLASS_RULES: dict[str, ClassRules] = {
    rules.end_group.name: rules
    for rules in (
        ALCOHOL,
        METHYL_ETHER,
        AMINE,
        ALDEHYDE,
        METHYL_KETONE,
        ACID,
        METHYL_ESTER,
        ETHYL_ESTER,
        TRIMETHYLSILYL_ESTER,
        TRIMETHYLSILYL_ETHER,
        ACETATE,
        PYRROLIDIDE,
        PYRIDYLCARBINOL_ESTER,
        DIMETHYLOXAZOLINE,
    )
}
"""Every class with an end group by its name."""
