"""``branchpos predict``: the ions and retention index expected of a chain."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from branchpos.cli.failures import Failures, not_writable
from branchpos.cli.options import figure_option, json_option, numbered, quiet_option
from branchpos.errors import InputError

if TYPE_CHECKING:
    from branchpos.workflow.predict import Prediction


@click.command()
@click.argument("names", nargs=-1, required=True, metavar="NAME...")
@json_option
@figure_option
@click.option("--least", type=click.FloatRange(0, 1), default=1e-3, help="Smallest ion to list [0.001].")
@quiet_option
def predict(
    names: tuple[str, ...], json_path: str | None, figure: str | None, least: float, quiet: bool
) -> None:
    """Give the ion series and retention index expected of a chain.

    A NAME is a systematic name (5,11-dimethylpentacosane), shorthand (5,11-diMeC25), or SMILES.
    """
    failures = Failures()
    found = [one for name in names if (one := _predicted(name, least, failures)) is not None]
    if not quiet and json_path != "-":
        from branchpos.reporting.console import show_prediction

        for one in found:
            show_prediction(one.series, one.retention_index)
    if json_path is not None:
        _write_json(json_path, found)
    if figure is not None:
        _draw(figure, found, len(names) > 1)
    failures.finish()


def _predicted(name: str, least: float, failures: Failures) -> Prediction | None:
    from branchpos.naming import parse_chain
    from branchpos.workflow.predict import predict_chain

    try:
        return predict_chain(parse_chain(name), least=least)
    except InputError as problem:
        # A name is an input like a file: what cannot be predicted is one failure, not bad use of the program.
        failures.add(InputError(problem.problem, file=name, place=problem.place, remedy=problem.remedy))
        return None


def _write_json(path: str, found: list[Prediction]) -> None:
    from branchpos.reporting.records import predict_document, write_document

    document = predict_document((one.series, one.retention_index) for one in found)
    try:
        write_document(document, path)
    except OSError as problem:
        raise not_writable(path, problem) from problem


def _draw(path: str, found: list[Prediction], several: bool) -> None:
    from branchpos.reporting.figures import prediction_figure, save_figure
    from branchpos.workflow.picture import picture_of_prediction

    for number, one in enumerate(found, start=1):
        target = numbered(path, number, several)
        try:
            save_figure(prediction_figure(picture_of_prediction(one)), target)
        except OSError as problem:
            raise not_writable(target, problem) from problem
