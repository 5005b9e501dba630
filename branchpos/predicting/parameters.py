"""The parameters of the cleavage model: what each means, what was believed before the fit, what the fit gave.

All rates and survivals are natural logarithms; a rate is relative to the cleavage of a bond inside an
unbranched stretch. Prior means and standard deviations are judgement from the trade's rules of fragmentation
(McLafferty and Turecek, Interpretation of Mass Spectra, 4th ed., from memory): secondary over primary sites,
tertiary over secondary, small radicals lost unwillingly.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from branchpos.errors import ReferenceDataError
from branchpos.reference_data import load_reference

POOL_SIZES = range(2, 9)
"""Sizes [carbons] of the low alkyl series with a weight of their own; larger ones decay from the last."""
POOL_EVEN_SIZES = range(3, 9)
"""Sizes whose share of even-mass ions in the low series is a parameter of its own."""
SIDE_SERIES = {1: range(3, 12), 2: range(3, 11), 3: range(3, 10)}
"""Ions that all isomers show alike: hydrogens below the even mass (41, 55, 69 ...; 40, 54, 68 ...; 39, 53,
67 ...) and the sizes that have a parameter."""


@dataclass(frozen=True, slots=True)
class Parameter:
    """One parameter of the model with its prior, a normal distribution.

    Attributes
    ----------
    name, meaning : the name in the reference set; what it stands for.
    mean, sd : prior mean and standard deviation, natural-log units.
    """

    name: str
    mean: float
    sd: float
    meaning: str


def _numbered(stem: str, sizes: range, means: tuple[float, ...], sd: float, meaning: str) -> list[Parameter]:
    return [
        Parameter(f"{stem}_{size}", mean, sd, meaning.format(size))
        for size, mean in zip(sizes, means, strict=True)
    ]


PARAMETERS = (
    Parameter("rate_secondary", 1.8, 0.5, "rate of a cleavage whose ion ends in a secondary site"),
    Parameter("rate_tertiary", 4.0, 0.7, "rate of a cleavage whose ion ends in a tertiary site"),
    Parameter("rate_branched_radical", 0.3, 0.3, "gain in rate for each methyl at the radical's end"),
    Parameter("rate_methyl_radical", -3.5, 0.7, "rate of losing a terminal methyl radical"),
    Parameter("rate_ethyl_radical", -0.5, 0.5, "rate of losing an ethyl radical"),
    Parameter("rate_methyl_branch", -0.2, 0.7, "rate of losing a methyl branch"),
    Parameter("rate_methyl_geminal", 1.0, 0.8, "gain in that rate for each of two geminal methyls"),
    Parameter("survival_primary", -1.5, 1.0, "survival of a primary ion of 10 carbons"),
    Parameter("survival_primary_fall", 0.0, 0.7, "its fall with the log of the size"),
    Parameter("survival_branched", -0.5, 0.7, "survival of a secondary ion of 10 carbons"),
    Parameter("survival_branched_fall", 1.0, 0.5, "its fall with the log of the size"),
    Parameter("survival_inner_methyl", -0.7, 0.7, "change of survival with a further methyl inside the ion"),
    Parameter("survival_tertiary", 0.0, 0.4, "change of survival at a tertiary site"),
    *_numbered(
        "pool", POOL_SIZES, (-1.0, 0, 0, -0.5, -1, -2.2, -2.7), 0.6, "weight of C{} among daughter ions"
    ),
    Parameter("pool_decay", 0.25, 0.15, "fall of that weight for each carbon beyond C8"),
    *_numbered(
        "pool_even", POOL_EVEN_SIZES, (-2.2, -1.9, -1.7, -1.6, -0.9, -0.7), 0.4, "even/odd of C{} daughters"
    ),
    Parameter("pool_even_large", -0.6, 0.4, "even/odd of larger daughters"),
    Parameter("even_primary", -0.4, 0.4, "even/odd of a primary ion without methyls"),
    Parameter("even_own_methyl", 0.2, 0.4, "even/odd of a C12 ion with a methyl on its end carbon only"),
    Parameter("even_own_methyl_rise", 0.9, 0.5, "its rise with the log of the size"),
    Parameter("even_inner_methyl", -0.7, 0.4, "even/odd of a C12 ion with a methyl further inside"),
    Parameter("even_inner_methyl_rise", 0.0, 0.4, "its rise with the log of the size"),
    Parameter("even_tertiary", -0.5, 0.4, "change of even/odd at a tertiary site"),
    Parameter(
        "molecular", -4.5, 1.0, "molecular ion of an unbranched chain of 20 carbons, share of all ions"
    ),
    Parameter("molecular_rate", -1.2, 0.4, "its change with the log of the mean rate of a bond"),
    Parameter("molecular_geminal", -2.0, 0.7, "its change for each quaternary carbon"),
    Parameter("molecular_size", 0.0, 0.05, "its change for each carbon beyond 20"),
    *_numbered(
        "side_1",
        SIDE_SERIES[1],
        (-0.9, -1.3, -1.4, -1.5, -0.5, -0.8, -1.3, -2.0, -2.5),
        0.5,
        "ion of C{} two hydrogens below the daughter ion, relative to it",
    ),
    *_numbered("side_2", SIDE_SERIES[2], (-4.0,) * 8, 1.0, "ion of C{} three hydrogens below, likewise"),
    *_numbered("side_3", SIDE_SERIES[3], (-4.0,) * 7, 1.0, "ion of C{} four hydrogens below, likewise"),
)
"""Every parameter, in the order of the vectors below."""


@dataclass(frozen=True, slots=True, eq=False)
class YieldParameters:
    """Values of all parameters with their covariance.

    Attributes
    ----------
    values : shape (parameters,), in the order of ``PARAMETERS``.
    covariance : shape (parameters, parameters), from the curvature of the fit.
    provenance : how the values came about, as text fields.
    """

    values: NDArray[np.float64]
    covariance: NDArray[np.float64]
    provenance: Mapping[str, str]

    def named(self) -> Mapping[str, float]:
        """Return the values by name."""
        return MappingProxyType(dict(zip(parameter_names(), self.values.tolist(), strict=True)))


def parameter_names() -> tuple[str, ...]:
    """Return the names in the order of the vectors."""
    return tuple(parameter.name for parameter in PARAMETERS)


def prior_parameters() -> YieldParameters:
    """Return the state of belief before any spectrum was seen."""
    return YieldParameters(
        np.array([parameter.mean for parameter in PARAMETERS]),
        np.diag([parameter.sd**2 for parameter in PARAMETERS]),
        MappingProxyType({"source": "prior, no spectra"}),
    )


@cache
def fitted_parameters(name: str = "alkane_yields.json") -> YieldParameters:
    """Read the shipped parameters.

    Raises
    ------
    ReferenceDataError : the set is missing, or holds other parameters than the program has.
    """
    return parameters_from_record(load_reference(name), name)


def parameters_from_record(record: Mapping[str, object], name: str) -> YieldParameters:
    """Turn a JSON record, as ``parameters_to_record`` makes it, into parameters."""
    values, covariance = record["values"], record["covariance"]
    if not isinstance(values, Mapping) or tuple(values) != parameter_names():
        raise ReferenceDataError(
            f"{name} does not hold the parameters of this version; run `branchpos refit` again"
        )
    provenance = record["provenance"]
    return YieldParameters(
        np.array(list(values.values()), dtype=float),
        np.array(covariance, dtype=float),
        MappingProxyType(dict(provenance) if isinstance(provenance, Mapping) else {}),
    )


def parameters_to_record(parameters: YieldParameters) -> dict[str, object]:
    """Return the parameters as a JSON-ready record; standard errors are for reading only."""
    errors = np.sqrt(np.diag(parameters.covariance))
    return {
        "provenance": dict(parameters.provenance),
        "values": {k: round(float(v), 5) for k, v in parameters.named().items()},
        "standard_errors": {k: round(float(v), 4) for k, v in zip(parameter_names(), errors, strict=True)},
        "covariance": [[float(f"{v:.4g}") for v in row] for row in parameters.covariance],
    }
