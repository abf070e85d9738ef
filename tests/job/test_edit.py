"""A changed job keeps every comment the user typed."""

from __future__ import annotations

import re

import pytest

from deembed.errors import JobError
from deembed.job.edit import edited_text

TEXT = """\
# my job
[job]
title = "A"  # the old board
part_ports = 3

[[rounds]]
file = "a.s2p"  # first
part_ports = [1, 2]

[expect]
passive = true
"""


def test_one_value_changes_and_nothing_else_does() -> None:
    assert edited_text(TEXT, {"rounds[0].file": "b.s2p"}) == TEXT.replace('"a.s2p"', '"b.s2p"')
    assert edited_text(TEXT, {}) == TEXT


def test_tables_merge_none_takes_out_and_lists_grow() -> None:
    edits = {
        "expect": {"passive": None, "lossless": True},
        "rounds[1]": {"file": "c.s2p", "part_ports": (2, 3)},
        "terminations.3": "t.s1p",
        "fixture.arms[0].part_port": 1,
        "analyzer.switch_terms": {1: "s.s1p"},
    }
    text = edited_text(TEXT, edits)
    import tomllib

    assert tomllib.loads(text) == {
        "job": {"title": "A", "part_ports": 3},
        "rounds": [{"file": "a.s2p", "part_ports": [1, 2]}, {"file": "c.s2p", "part_ports": [2, 3]}],
        "expect": {"lossless": True},
        "terminations": {"3": "t.s1p"},
        "fixture": {"arms": [{"part_port": 1}]},
        "analyzer": {"switch_terms": {"1": "s.s1p"}},
    }
    assert "# the old board" in text and "# first" in text and text.startswith("# my job\n")


def test_whole_lists_of_tables_and_single_entries_are_replaced() -> None:
    import tomllib

    text = edited_text(TEXT, {"rounds": [{"file": "x.s2p"}, {"file": "y.s2p"}]})
    assert [one["file"] for one in tomllib.loads(text)["rounds"]] == ["x.s2p", "y.s2p"]
    text = edited_text(text, {"rounds[1]": {"file": "z.s2p"}})
    assert [one["file"] for one in tomllib.loads(text)["rounds"]] == ["x.s2p", "z.s2p"]
    assert "rounds" not in tomllib.loads(edited_text(TEXT, {"rounds": None, "job.no_such_key": None}))
    assert tomllib.loads(edited_text(text, {"rounds[0]": None}))["rounds"] == [{"file": "z.s2p"}]


@pytest.mark.parametrize(
    ("key", "message"),
    [
        (
            "rounds[3].file",
            "rounds[3]: there are 1 entries in rounds, counted from 0. Use [0] to [0], or [1] to add one.",
        ),
        ("job.title.x", "job.title.x: job.title holds 'A', which has no x"),
        ("job.title[0]", "job.title[0]: job.title holds 'A', which has no [0]"),
    ],
)
def test_a_path_that_leads_nowhere_is_said(key: str, message: str) -> None:
    with pytest.raises(JobError, match=f"^{re.escape(message)}$"):
        edited_text(TEXT, {key: 1})
