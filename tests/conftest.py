"""Fixtures for all tests."""

import os
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def measured():
    """Folder of real readings: ``DEEMBED_MEASURED``, or ``shared/measured`` beside the project.

    They are used in place, never copied; without them the test is skipped, except where CI must not skip.
    """
    named = os.environ.get("DEEMBED_MEASURED")
    folder = Path(named) if named else Path(__file__).resolve().parents[2] / "shared" / "measured"
    if not folder.is_dir():
        reason = "no real readings: set DEEMBED_MEASURED to their folder"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    return folder
