"""Fixtures that every test may ask for."""

from __future__ import annotations

from pathlib import Path

import pytest

SHARED = Path(__file__).resolve().parents[2] / "shared"


@pytest.fixture(scope="session")
def shared() -> Path:
    """Return the folder of real spectra, indices and runs beside the checkout."""
    if not SHARED.is_dir():
        pytest.skip(f"the real spectra and retention indices are not at {SHARED}")
    return SHARED
