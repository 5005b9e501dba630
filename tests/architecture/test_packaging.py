"""What is shipped, and that the documents say what the scripts do."""

from __future__ import annotations

import os
import re
import subprocess
import sys
import tomllib
import venv
import zipfile
from email.parser import Parser
from pathlib import Path

import numpy
import pytest

import branchpos

ROOT = Path(__file__).resolve().parents[2]
DATA = ("*.json", "*.toml", "*.html", "*.css", "*.typ", "*.svg")


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Build the wheel as pip does, with the build backend that is installed here."""
    folder = tmp_path_factory.mktemp("wheel")
    build = f"import hatchling.build as b; print(b.build_wheel({str(folder)!r}))"
    done = subprocess.run(
        [sys.executable, "-c", build], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    return folder / done.stdout.split()[-1]


def test_every_file_of_the_package_is_in_the_wheel(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        shipped = set(archive.namelist())
    package = ROOT / "branchpos"
    files = [one for pattern in ("*.py", *DATA) for one in package.rglob(pattern)]
    expected = {one.relative_to(ROOT).as_posix() for one in files} | {"branchpos/py.typed"}
    expected |= {f"branchpos/reference_sets/{one.name}" for one in (ROOT / "reference_sets").iterdir()}
    assert expected <= shipped
    assert not [name for name in shipped if name.startswith(("tests/", "reference_sets/"))]


def test_the_wheel_works_outside_the_checkout(wheel: Path, tmp_path: Path) -> None:
    """Unpacked into a fresh environment that sees this one's libraries, run from another folder."""
    fresh = tmp_path / "fresh"
    venv.create(fresh, with_pip=False, system_site_packages=False)
    site = Path(
        subprocess.run(
            [fresh / "bin" / "python", "-c", "import sysconfig; print(sysconfig.get_path('purelib'))"],
            capture_output=True, text=True, check=True,
        ).stdout.strip()
    )  # fmt: skip
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(site)
    libraries = Path(numpy.__file__).parents[1]
    (site / "zz_libraries.pth").write_text(f"import sys; sys.path.append({str(libraries)!r})\n")
    spectrum = tmp_path / "invented.txt"
    spectrum.write_text("m/z,intensity\n43,80\n57,100\n71,70\n85,50\n99,15\n113,10\n127,7\n141,5\n226,4\n")
    done = subprocess.run(
        [fresh / "bin" / "python", "-I", "-m", "branchpos", "locate", spectrum.name],
        cwd=tmp_path, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    where = subprocess.run(
        [fresh / "bin" / "python", "-I", "-c", "import branchpos; print(branchpos.__file__)"],
        cwd=tmp_path, capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert Path(where.stdout.strip()).is_relative_to(site)


def test_an_editable_install_leaves_nothing_that_hides_the_checkout(tmp_path: Path) -> None:
    """A folder ``branchpos`` beside the pointer to the checkout would be imported in its place."""
    build = f"import hatchling.build as b; print(b.build_editable({str(tmp_path)!r}))"
    done = subprocess.run([sys.executable, "-c", build], cwd=ROOT, capture_output=True, text=True, check=True)
    with zipfile.ZipFile(tmp_path / done.stdout.split()[-1]) as archive:
        assert not [name for name in archive.namelist() if name.startswith("branchpos/")]


def test_version_and_metadata_agree(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        name = next(one for one in archive.namelist() if one.endswith("METADATA"))
        metadata = Parser().parsestr(archive.read(name).decode())
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    assert metadata["Version"] == project["version"] == branchpos.__version__
    assert metadata["Requires-Python"] == ">=3.11"
    assert f"## [{project['version']}]" in (ROOT / "CHANGELOG.md").read_text(encoding="utf-8")


def command_block(heading: str) -> str:
    """Return the command under a heading of the README."""
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    found = re.search(rf"{re.escape(heading)}\n+```\w*\n(.+?)\n```", text, flags=re.DOTALL)
    assert found, f"no command under {heading!r}"
    return found.group(1)


def test_continuous_integration_runs_the_command_of_the_readme() -> None:
    command = command_block("Set up a fresh machine and pass the tests:")
    assert "\n" not in command
    assert command in (ROOT / ".ci" / "run").read_text(encoding="utf-8").splitlines()
    assert os.access(ROOT / ".ci" / "run", os.X_OK)


def test_every_dependency_is_used_and_every_library_used_is_declared() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    declared = {re.split(r"[<>=!~ ]", one)[0] for one in project["dependencies"]}
    names = {"scikit-learn": "sklearn"}
    sources = "\n".join(path.read_text(encoding="utf-8") for path in (ROOT / "branchpos").rglob("*.py"))
    imported = set(re.findall(r"^\s*(?:from|import) (\w+)", sources, flags=re.MULTILINE))
    third_party = imported - set(sys.stdlib_module_names) - {"branchpos"}
    fixed = {"sklearn"}  # part of the product's fixed set of packages; nothing imports it yet
    assert third_party | fixed == {names.get(one, one) for one in declared}
