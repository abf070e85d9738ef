"""Findings: kept whole through JSON and datasets, sorted, and their bands merged sensibly."""

import json

import numpy as np
import pytest
import xarray as xr

from deembed.findings import (
    BlindSpot,
    Finding,
    Suspect,
    attach,
    bands_over,
    finding_id,
    findings_of,
    sort_findings,
)

GAIN = Finding("gain-part-1", "gain", "", "contradiction", "Too much.", 1e9, 2e9, 0.1, 1.5e9, 4.0)


def test_a_finding_survives_json_and_unknown_numbers_are_null():
    assert Finding.from_dict(json.loads(json.dumps(GAIN.as_dict()))) == GAIN
    bare = Finding("a", "b", "c", "note", "d", worst=float("nan")).as_dict()
    assert bare["worst"] is None and bare["significance"] is None
    assert Finding.from_dict({**GAIN.as_dict(), "later": 1}) == GAIN


def test_others_become_plain_dicts():
    spot = BlindSpot("arm-reversed", "arm 1", float("inf"), "a line", "text")
    assert spot.as_dict()["unseen_error_db"] is None
    assert Suspect("x", "y", 0.5, "z").as_dict() == {"cause": "x", "where": "y", "score": 0.5, "text": "z"}


def test_a_severity_that_is_none():
    with pytest.raises(ValueError, match="severity is 'bad'; it must be one of contradiction, warning, note"):
        Finding("a", "b", "c", "bad", "d")


def test_ids_are_stable_words():
    assert finding_id("gain") == "gain-part-1"
    assert finding_id("redundancy", "thru 1-2", 2) == "redundancy-thru-1-2-2"
    assert finding_id("x", "part port 1, part port 3") == "x-part-port-1-part-port-3-1"


def test_contradictions_come_first_then_the_more_significant():
    note, warning = (Finding(s, s, "", s, "") for s in ("note", "warning"))
    strong = Finding("w2", "w", "", "warning", "", significance=9.0)
    assert sort_findings([note, warning, strong, GAIN]) == (GAIN, strong, warning, note)


def test_a_dataset_carries_findings_and_keeps_those_it_had():
    data = attach(attach(xr.Dataset(), [GAIN]), [Finding("n", "n", "", "note", "x")])
    assert [f.id for f in findings_of(data)] == ["gain-part-1", "n"]
    assert findings_of(xr.Dataset()) == ()


def test_close_bands_are_one_band():
    f = np.linspace(0, 100, 101)
    mask = np.zeros(101, dtype=bool)
    mask[[10, 11, 13, 50, 90]] = True
    assert bands_over(f, mask) == [(10, 13), (50, 50), (90, 90)]
    assert bands_over(f, mask, gap=0.37) == [(10, 50), (90, 90)]
    assert bands_over(f, mask, gap=1.0) == [(10, 90)]
    assert bands_over(f, ~mask & False) == []
    assert bands_over([5.0], [True]) == [(0, 0)]
