"""One reading of a standard: its labels, its name, and how leading dims meet."""

import re

import numpy as np
import pytest

from deembed.calibration import Reading
from deembed.calibration.sweeps import Sweep, elements, laid_out, response
from deembed.errors import DeembedError, GridError, PortError
from deembed.labels import sparams
from deembed.standards import load_kit

F = np.array([1e9, 2e9, 3e9])


def whole(text):
    return f"^{re.escape(text)}$"


def numbered(ports, leading=()):
    """Every element tells where it belongs: 100 out + in, plus a thousandth per frequency."""
    n = np.asarray(ports)
    s = (100.0 * n[:, None] + n) + 1e-3 * np.arange(F.size)[:, None, None]
    s = np.broadcast_to(s, (*(size for _, size in leading), F.size, n.size, n.size))
    return sparams(s, F, ports=ports, leading=[name for name, _ in leading])


def test_a_reading_is_named_by_standard_and_ports():
    assert Reading("short", (1,), numbered([1])).name == "short 1"
    assert Reading("thru", [2, 1], numbered([1, 2])).name == "thru 2-1"
    assert Reading("thru", (np.int64(2), 1), numbered([1, 2])).ports == (2, 1)


def test_labels_must_be_the_ports():
    text = (
        "short 2: the reading has ports [1] and is said to be on [2]. Select the ports the standard sat on."
    )
    with pytest.raises(PortError, match=whole(text)):
        Reading("short", (2,), numbered([1]))
    with pytest.raises(
        PortError, match=r"^thru 1-2: the reading has ports \[1, 2, 3\] and is said to be on \[1, 2\]"
    ):
        Reading("thru", (1, 2), numbered([1, 2, 3]))


def test_what_is_no_labelled_array_is_said_by_name():
    text = "reading of open 1: a ndarray came; needed a labelled array. Build it with deembed.sparams()."
    with pytest.raises(DeembedError, match=whole(text)):
        Reading("open", (1,), np.ones((3, 1, 1)))


def test_a_reading_cannot_be_changed_afterwards():
    with pytest.raises(AttributeError, match="cannot assign to field 'standard'"):
        Reading("short", (1,), numbered([1])).standard = "open"


def test_elements_are_picked_by_port_number_not_by_place():
    picked = elements(numbered([5, 2, 7]), (7, 5))
    assert [[x.values[1] for x in row] for row in picked] == [[707.001, 705.001], [507.001, 505.001]]


def test_leading_dims_meet_by_name():
    a = elements(numbered([1], (("draw", 2), ("part", 3))), [1])[0][0]
    b = Sweep(np.arange(6.0).reshape(2, 3), ("draw",), {"draw": [7, 8]})
    c = Sweep(np.arange(9.0).reshape(3, 3), ("part",))
    (x, y, z, w), dims, coords = laid_out([a, b, c, Sweep(F)], F)
    assert dims == ("draw", "part", "frequency") and list(coords["draw"]) == [7, 8]
    assert x.shape == y.shape == z.shape == w.shape == (2, 3, 3)
    np.testing.assert_array_equal(y[:, 2], b.values)
    np.testing.assert_array_equal(z[1], c.values)
    np.testing.assert_array_equal(w[1, 2], F)
    turned = Sweep(a.values.swapaxes(0, 1) + np.arange(2)[:, None], ("part", "draw"))
    (first, second), _, _ = laid_out([a, turned], F)
    np.testing.assert_array_equal(second - first, np.broadcast_to(np.arange(2)[:, None, None], (2, 3, 3)))


def test_leading_dims_that_disagree_are_named():
    two, three = Sweep(np.ones((2, 3)), ("draw",)), Sweep(np.ones((3, 3)), ("draw",))
    text = (
        "leading dims differ: dim draw has 2 entries in one reading or definition and 3 in another. "
        "Use the same entries everywhere."
    )
    with pytest.raises(GridError, match=whole(text)):
        laid_out([two, three], F)
    here, there = (Sweep(np.ones((2, 3)), ("draw",), {"draw": [0, k]}) for k in (1, 2))
    text = (
        "leading dims differ: dim draw is labelled otherwise in two readings or definitions. "
        "Use the same labels everywhere."
    )
    with pytest.raises(GridError, match=whole(text)):
        laid_out([here, there], F)


def test_a_model_of_the_kit_is_the_labelled_response_element_by_element():
    kit = load_kit("demo-board-lines")
    model, labelled = response(kit, "line", F), kit.response("line", F)
    for i in (0, 1):
        for j in (0, 1):
            np.testing.assert_array_equal(model[i][j].values, labelled.values[:, i, j])
