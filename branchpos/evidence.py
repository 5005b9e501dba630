"""What each observation says for and against a hypothesis."""

from __future__ import annotations

from dataclasses import dataclass

from branchpos.ion_series import IonKind


@dataclass(frozen=True, slots=True)
class IonEvidence:
    """One ion of a hypothesis against the observation.

    Attributes
    ----------
    mz : whole mass number.
    carbons : size of the ion.
    observed : abundance relative to the base peak, None below the threshold.
    expected : the same as the hypothesis predicts it on this instrument.
    threshold : detection threshold, same unit.
    cleavage : in words, the bonds whose cleavage gives the ion.
    kind : how the ion comes about.
    weight_of_evidence : bits for the first hypothesis against the best other; for the others, bits against
        the first.
    """

    mz: int
    carbons: int
    observed: float | None
    expected: float
    threshold: float
    cleavage: str
    kind: IonKind
    weight_of_evidence: float


@dataclass(frozen=True, slots=True)
class Shares:
    """Bits by source; they add up to the difference of the two posteriors.

    Attributes
    ----------
    ions : summed weights of the listed ions.
    other_masses : mass numbers that are no ions of the hypothesis.
    instrument : what the hypothesis pays for tilt, contrast and doublet level.
    retention_index : the measured index against the predicted one.
    prior : the ratio of the priors.
    """

    ions: float
    other_masses: float
    instrument: float
    retention_index: float
    prior: float

    @property
    def total(self) -> float:
        """Summed bits."""
        return self.ions + self.other_masses + self.instrument + self.retention_index + self.prior
