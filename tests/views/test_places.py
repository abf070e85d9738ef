"""Words for places, and states of segments."""

import pytest

from deembed.findings import Finding
from deembed.views.places import place_ports, places, state_of


@pytest.mark.parametrize(
    ("place", "want"),
    [
        ("port 2", ("port", (2,))),
        ("part port 3", ("part port", (3,))),
        ("short 1", ("standard", (1,))),
        ("thru 1-2", ("standard", (1, 2))),
        ("offset short b 2", ("standard", (2,))),
        ("round 1-3", ("round", (1, 3))),
        ("arm 3", ("arm", (3,))),
        ("termination 2", ("termination", (2,))),
        ("switch 1", ("switch", (1,))),
        ("part", ("part", ())),
    ],
)
def test_every_place_of_the_contract_is_understood(place, want):
    assert place_ports(place) == want


def test_places_are_split_at_commas():
    assert places("part port 2, round 1-2") == ("part port 2", "round 1-2")
    assert places("") == ()


def finding(severity, number=1):
    return Finding(f"{severity}-{number}", "kind", "", severity, "text")


def test_the_worst_severity_names_the_state_and_all_are_counted():
    state = state_of([finding("note"), finding("warning"), finding("warning", 2), finding("contradiction")])
    assert state.name == "contradiction"
    assert state.words == "1 contradiction, 2 warnings, 1 note"
    assert len(state.findings) == 4


def test_nothing_noted_and_nothing_there_are_different():
    assert (state_of([]).name, state_of([]).words) == ("plain", "nothing noted")
    absent = state_of([], absent="no arm")
    assert (absent.name, absent.words) == ("absent", "no arm")
    noted = state_of([finding("warning")], absent="no arm")
    assert (noted.name, noted.words) == ("warning", "no arm; 1 warning")
