"""The answer for one spectrum: posterior, credible set, the call or why there is none."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from branchpos.chain import Chain
from branchpos.evidence import IonEvidence, Shares
from branchpos.naming import shorthand, systematic_name


class Status(Enum):
    """What a verdict amounts to."""

    ASSIGNED = "assigned"
    NARROWED = "narrowed"
    OPEN = "open"
    UNBRANCHED = "unbranched"
    NOT_A_CHAIN = "not a methyl-branched chain"


@dataclass(frozen=True, slots=True)
class RankedHypothesis:
    """One chain with its posterior.

    Attributes
    ----------
    chain : the structure.
    posterior : probability among all hypotheses, rivals included.
    log_likelihood : natural log, spectrum and retention index.
    retention_z : measured minus predicted index in joint standard deviations, None without an index.
    ions, shares : the evidence, see ``IonEvidence`` and ``Shares``; empty and None beyond the leading ones.
    """

    chain: Chain
    posterior: float
    log_likelihood: float
    retention_z: float | None
    ions: tuple[IonEvidence, ...] = ()
    shares: Shares | None = None

    @property
    def name(self) -> str:
        """Systematic name."""
        return systematic_name(self.chain)


@dataclass(frozen=True, slots=True)
class Verdict:
    """The answer for one spectrum.

    Attributes
    ----------
    source, title : where the spectrum came from.
    status : see ``Status``.
    call : name of the structure called, or the status in words.
    hypotheses : ranked chains, best first.
    considered : how many chains were scored.
    none_of_these : probability of all rivals together.
    rivals : probability of each rival by its description.
    level : probability that the credible set claims.
    credible_set : the fewest leading chains that reach the level; where rivals are needed to reach it, they
        are named among the reasons.
    prior : the prior, in words.
    reasons : why the verdict is what it is, in words.
    warnings : doubts about the data.
    """

    source: str
    title: str
    status: Status
    call: str
    hypotheses: tuple[RankedHypothesis, ...]
    considered: int
    none_of_these: float
    rivals: tuple[tuple[str, float], ...]
    level: float
    credible_set: tuple[str, ...]
    prior: str
    reasons: tuple[str, ...]
    warnings: tuple[str, ...]

    def to_table(self) -> list[dict[str, object]]:
        """Return one plain record a hypothesis, as data-frame libraries take them."""
        return [
            {
                "rank": rank,
                "name": one.name,
                "shorthand": shorthand(one.chain),
                "chain_class": one.chain.end_group.name,
                "backbone_carbons": one.chain.backbone,
                "methyl_positions": list(one.chain.methyls),
                "formula": str(one.chain.formula),
                "posterior": one.posterior,
                "log_likelihood": one.log_likelihood,
                "retention_z": one.retention_z,
            }
            for rank, one in enumerate(self.hypotheses, start=1)
        ]

    def __str__(self) -> str:
        lines = [f"{self.title or self.source or 'spectrum'}: {self.call} ({self.status.value})"]
        lines += [f"  {one.posterior:7.3f}  {one.name}" for one in self.hypotheses[:5]]
        lines += [f"  {self.none_of_these:7.3f}  none of these", *(f"  {why}" for why in self.reasons)]
        return "\n".join(lines)

    def _repr_html_(self) -> str:
        from html import escape

        rows = "".join(
            f"<tr><td>{one.posterior:.3f}</td><td>{escape(one.name)}</td></tr>"
            for one in self.hypotheses[:10]
        )
        return (
            f"<p><b>{escape(self.call)}</b> ({escape(self.status.value)})</p>"
            f"<table><tr><th>posterior</th><th>structure</th></tr>{rows}"
            f"<tr><td>{self.none_of_these:.3f}</td><td>none of these</td></tr></table>"
        )
