"""What may import what, and what may be imported when."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
PACKAGE = ROOT / "branchpos"
HEAVY = ("scipy", "sklearn", "matplotlib", "rdkit", "rich", "pandas")
"""Libraries that take from tenths of a second to seconds to import."""


def sources() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


def test_import_contracts_hold() -> None:
    """Floors, stages, plotting, database: the contracts stand in ``pyproject.toml``."""
    done = subprocess.run(
        [sys.executable, "-c", "from importlinter.cli import lint_imports_command as c; c()", "--no-cache"],
        cwd=ROOT, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stdout + done.stderr
    assert "0 broken" in done.stdout


def top_level_imports(tree: ast.Module) -> set[str]:
    """Return the packages imported when the module is, those for type checkers left out."""
    found: set[str] = set()
    for node in tree.body:
        if isinstance(node, ast.Import):
            found |= {alias.name.split(".")[0] for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.level == 0 and node.module:
            found.add(node.module.split(".")[0])
    return found


@pytest.mark.parametrize("path", sources(), ids=lambda path: str(path.relative_to(PACKAGE)))
def test_heavy_libraries_are_imported_where_they_are_used(path: Path) -> None:
    imported = top_level_imports(ast.parse(path.read_text(encoding="utf-8")))
    assert not imported & set(HEAVY)


@pytest.mark.parametrize(
    "statement",
    [
        "import branchpos",
        "import branchpos.cli",
        "from branchpos.workflow.locate import locate_branches",
        "import branchpos as bp; bp.locate, bp.read_spectrum, bp.predict, bp.isomers",
    ],
)
def test_importing_brings_in_nothing_heavy(statement: str) -> None:
    report = f"{statement}\nimport sys\nprint(' '.join(sorted({{m.split('.')[0] for m in sys.modules}})))"
    done = subprocess.run([sys.executable, "-c", report], capture_output=True, text=True, check=True)
    assert not set(done.stdout.split()) & set(HEAVY)


def test_importing_the_package_does_not_even_need_numpy() -> None:
    report = "import branchpos, sys; print('numpy' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", report], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"


def test_every_public_name_is_there() -> None:
    import branchpos

    for name in branchpos.__all__:
        assert getattr(branchpos, name) is not None
    with pytest.raises(AttributeError):
        _ = branchpos.no_such_name
