"""Retention indices of every class that has a retention model."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from branchpos.end_group import ALKANE, END_GROUPS, EndGroup
from branchpos.predicting.ester_retention import index_of_equivalent, predict_equivalent_chain_length
from branchpos.predicting.retention import predict_retention
from branchpos.workflow.model import Model

FloatArray = NDArray[np.float64]

_METHYL_ESTER = END_GROUPS["methyl ester"]


def has_retention_model(end_group: EndGroup) -> bool:
    """Tell whether indices of the class can be predicted.

    >>> has_retention_model(ALKANE), has_retention_model(END_GROUPS["amine"])
    (True, False)
    """
    return end_group in (ALKANE, _METHYL_ESTER)


def predict_index(
    positions: NDArray[np.int16], backbone: int, end_group: EndGroup, model: Model
) -> tuple[FloatArray, FloatArray]:
    """Return predicted indices on the n-alkane scale and their standard deviations [units]."""
    rows = positions.astype(np.intp)
    if end_group == ALKANE:
        return predict_retention(rows, backbone, model.retention)
    lengths = predict_equivalent_chain_length(rows, backbone)
    found = [index_of_equivalent(float(length), float(sd)) for length, sd in zip(*lengths, strict=True)]
    return np.array([one.value for one in found]), np.array([one.sd for one in found])
