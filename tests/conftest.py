"""Fixtures for all tests."""

import importlib.util
import os
import sys
from pathlib import Path

import numpy as np
import pytest
from hypothesis import settings

settings.register_profile("steady", derandomize=True, deadline=None)
settings.load_profile("steady")


@pytest.hookimpl(trylast=True)
def pytest_sessionfinish(session):
    """In CI a skipped test is a failed run: what was not checked was not checked."""
    reporter = session.config.pluginmanager.get_plugin("terminalreporter")
    if os.environ.get("CI") and reporter and reporter.stats.get("skipped"):
        session.exitstatus = pytest.ExitCode.TESTS_FAILED


@pytest.fixture
def rng():
    """A random generator with a fixed seed."""
    return np.random.default_rng(20260611)


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


@pytest.fixture(scope="session")
def fake():
    """The module that makes outcomes up."""
    path = Path(__file__).with_name("fake_outcome.py")
    spec = importlib.util.spec_from_file_location("fake_outcome", path)
    module = importlib.util.module_from_spec(spec)
    sys.modules["fake_outcome"] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def outcome(fake):
    """A lossy splitter with a planted gain, three rounds, three arms, findings at known places."""
    return fake.fake_outcome(401)
