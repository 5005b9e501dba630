"""What a spectrum may come from."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from branchpos.chain import Chain


class Rival(Enum):
    """Hypotheses that are no methyl-branched chain of the asked classes."""

    OTHERWISE_BRANCHED = "a saturated hydrocarbon branched in another way"
    ALKENE = "an alkene or ring, whose position this spectrum cannot place"
    NO_CHAIN = "another compound"


@dataclass(frozen=True, slots=True)
class Hypothesis:
    """One hypothesis with its prior.

    Attributes
    ----------
    subject : a chain, or one of the rivals.
    log_prior : natural log of the prior probability.
    """

    subject: Chain | Rival
    log_prior: float
