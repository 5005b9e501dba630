"""Where the shipped reference sets lie: the same call finds them in a wheel and in a checkout."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from branchpos.errors import ReferenceDataError

_PACKAGE = Path(__file__).resolve().parent


def reference_path(name: str) -> Path:
    """Return the path of one shipped reference set.

    Parameters
    ----------
    name : file name inside ``reference_sets/``.

    Raises
    ------
    ReferenceDataError : the set is in neither the installed package nor the checkout.

    >>> reference_path("atomic_masses.json").name
    'atomic_masses.json'
    """
    for folder in (_PACKAGE / "reference_sets", _PACKAGE.parent / "reference_sets"):
        if (folder / name).is_file():
            return folder / name
    raise ReferenceDataError(f"reference set {name!r} is not installed; reinstall branchpos")


def load_reference(name: str) -> dict[str, Any]:
    """Read one shipped JSON reference set (see ``reference_path`` for arguments and errors)."""
    with reference_path(name).open(encoding="utf-8") as stream:
        loaded: dict[str, Any] = json.load(stream)
    return loaded
