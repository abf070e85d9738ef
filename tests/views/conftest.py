"""The made-up outcome of ../fake_outcome.py as fixtures."""

import importlib.util
import sys
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def fake():
    """The module that makes outcomes up."""
    path = Path(__file__).parents[1] / "fake_outcome.py"
    spec = importlib.util.spec_from_file_location("fake_outcome", path)
    module = importlib.util.module_from_spec(spec)
    sys.modules["fake_outcome"] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def outcome(fake):
    """A lossy splitter with a planted gain, three rounds, three arms, findings at known places."""
    return fake.fake_outcome(401)
