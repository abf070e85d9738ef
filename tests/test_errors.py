"""Errors read as: where: what. What to do."""

import pytest

from deembed import errors


def test_the_message_has_its_three_parts():
    error = errors.GridError("the grids differ", where="short 1", do="Read both on one grid.")
    assert str(error) == "short 1: the grids differ. Read both on one grid."
    assert (error.what, error.where, error.do) == ("the grids differ", "short 1", "Read both on one grid.")
    assert str(errors.FileError("gone.", where="x", do="Look.")) == "x: gone. Look."
    assert str(errors.SolveError("no way")) == "no way"


@pytest.mark.parametrize("name", errors.__all__)
def test_every_error_is_a_value_error(name):
    assert issubclass(getattr(errors, name), ValueError)
