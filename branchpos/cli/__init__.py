"""The command line: plain verbs, each a thin call into the workflow.

Nothing heavy is imported here, so that ``branchpos --help`` is quick.
"""

from __future__ import annotations

import click

from branchpos import __version__
from branchpos.cli.failures import Program
from branchpos.cli.isomers import isomers
from branchpos.cli.locate import locate
from branchpos.cli.predict import predict
from branchpos.cli.upkeep import demo, refit, validate

__all__ = ["main"]


@click.group(cls=Program, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="branchpos")
def main() -> None:
    """Place methyl branches on long saturated chains from GC-EI mass spectra and retention indices.

    Exit status: 0 done; 1 some inputs failed, the rest done; 2 bad use.
    """


for _command in (locate, predict, isomers, refit, validate, demo):
    main.add_command(_command)
