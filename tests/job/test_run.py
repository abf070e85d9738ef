"""Whole jobs: from raw readings to the part, against the known truth."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from deembed.job import Job, Outcome, load_job
from deembed.labels import select_ports, sparams

Bench = Callable[..., Path]
Truth = Callable[..., xr.DataArray]


def off(outcome: Outcome, truth: xr.DataArray) -> float:
    assert outcome.part.dims == truth.dims
    assert outcome.part.port_out.values.tolist() == truth.port_out.values.tolist()
    return float(np.abs(outcome.part.values - truth.values).max())


@pytest.mark.parametrize(
    "how",
    [
        {"method": "none"},
        {"method": "none", "arms": False, "terminations": {1: 0.2, 2: -0.1j, 3: 0.15}},
        {"method": "solt"},
        {"method": "solt", "terminations": {1: 0.2, 2: -0.1j, 3: 0.15}},
        {"method": "solt", "drive": "first-port-only"},
        {"method": "trl"},
    ],
    ids=lambda how: "-".join(str(v) for v in how.values()),
)
def test_the_part_comes_back(bench: Bench, truth: Truth, how: dict) -> None:
    outcome = load_job(bench(**how)).run()
    assert off(outcome, truth()) < 1e-12
    assert not outcome.contradicts
    assert outcome.metrics.largest_singular_value.max() == pytest.approx(0.9, abs=1e-9)
    assert [one.name for one in outcome.rounds] == ["1-2", "2-3", "3-1"]
    assert (outcome.terms is None) == (how["method"] == "none")
    assert np.nanmax(np.abs(outcome.disagreement)) < 1e-12
    assert set(outcome.raw) >= {"raw/part_12.s2p", "raw/part_23.s2p", "raw/part_31.s2p"}
    assert "hysical" in outcome.verdict


def test_progress_rises_and_says_what_is_done(bench: Bench) -> None:
    seen: list[tuple[float, str]] = []
    load_job(bench(method="none")).run(lambda fraction, words: seen.append((fraction, words)))
    fractions = [fraction for fraction, _ in seen]
    assert fractions == sorted(fractions) and fractions[0] == 0.0 and seen[-1] == (1.0, "done")
    assert "stripping the fixture" in [words for _, words in seen]


def test_rounds_may_name_analyzer_ports_in_any_order(bench: Bench, truth: Truth) -> None:
    job = load_job(bench(method="solt"))
    turned = job.changed({"rounds[2].analyzer_ports": [2, 1], "rounds[2].part_ports": [1, 3]})
    assert off(turned.run(), truth()) < 1e-12
    assert turned.run().rounds[2].port_out.values.tolist() == [1, 3]


def test_an_override_in_one_round_replaces_the_table(bench: Bench, truth: Truth, make: dict) -> None:
    path = bench(method="none", arms=False, terminations={1: 0.2, 2: 0.1, 3: 0.15})
    f = make["grid"]()
    make["save"](path.parent, "raw/wrong.s1p", sparams(np.full((f.size, 1, 1), 0.3), f))
    job = load_job(path).changed({"terminations.3": "raw/wrong.s1p"})
    assert off(job.run(), truth()) > 1e-3
    mended = job.changed({"rounds[0].terminations": {3: "raw/termination_3.s1p"}})
    assert off(mended.run(), truth()) < 1e-9


@pytest.mark.parametrize("ports", [1, 2, 3, 4])
def test_a_part_read_directly_in_one_round(tmp_path: Path, make: dict, ports: int) -> None:
    f = make["grid"]()
    whole = make["part"](f, max(ports, 2))
    whole = whole if ports > 1 else select_ports(whole, (1,))
    make["save"](tmp_path, f"direct.s{ports}p", whole)
    (tmp_path / "job.toml").write_text(
        f'[job]\npart_ports = {ports}\n[analyzer]\nports = 4\n[calibration]\nmethod = "none"\n[[rounds]]\n'
        f'file = "direct.s{ports}p"\npart_ports = {list(range(1, ports + 1))}\n'
    )
    outcome = load_job(tmp_path / "job.toml").run()
    assert off(outcome, whole) == 0.0
    assert outcome.shell is None and outcome.terms is None


def test_sol_reads_a_one_port_part(tmp_path: Path, make: dict) -> None:
    f = make["grid"]()
    make["kit"](tmp_path)
    readings = make["readings"](tmp_path, [("open", (1,)), ("short", (1,)), ("load", (1,))], f)
    antenna = sparams(np.exp(-2j * np.pi * f * 1e-10)[:, None, None] * 0.4, f)
    make["save"](tmp_path, "raw/antenna.s1p", make["read"](antenna, on=(1,)))
    (tmp_path / "job.toml").write_text(
        "[job]\npart_ports = 1\n[analyzer]\nports = 1\n"
        f'[calibration]\nmethod = "sol"\nkit = "kit.toml"\n{readings}'
        '[[rounds]]\nfile = "raw/antenna.s1p"\nanalyzer_ports = [1]\npart_ports = [1]\n[expect]\npassive = '
        "true\n"
    )
    outcome = load_job(tmp_path / "job.toml").run()
    assert off(outcome, antenna) < 1e-12
    assert [b.cause for b in outcome.blind_spots] == ["standards-exchanged"]


def test_whole_sweeps_may_stand_for_one_port(bench: Bench, truth: Truth, make: dict) -> None:
    """An .s2p given for one port: that port's own reflection is used."""
    path = bench(method="solt")
    f = make["grid"]()
    short = make["standard"]("short", f).values[:, 0, 0]
    both = sparams(short[:, None, None] * np.eye(2), f)
    make["save"](path.parent, "raw/both_short.s2p", make["read"](both, on=(1, 2)))
    job = load_job(path)
    edits = {
        f"calibration.readings[{i}].file": "raw/both_short.s2p"
        for i, one in enumerate(job.spec.calibration.readings)
        if one.standard == "short"
    }
    assert len(edits) == 2
    assert off(job.changed(edits).run(), truth()) < 1e-12


def test_leakage_is_taken_out_where_the_job_says_so(bench: Bench, truth: Truth, make: dict) -> None:
    path = bench(method="solt")
    job = load_job(path)
    apart = np.array([[0, 0.02], [0.03j, 0]])
    for name in ("raw/thru_12.s2p", "raw/part_12.s2p", "raw/part_23.s2p", "raw/part_31.s2p"):
        make["save"](path.parent, name, job.inputs.sparams(name, key="") + apart)
    f = make["grid"]()
    loads = make["read"](sparams(np.zeros((f.size, 2, 2)), f), on=(1, 2))
    make["save"](path.parent, "raw/isolation.s2p", loads + apart)
    assert off(load_job(path).run(), truth()) > 1e-3
    count = len(job.spec.calibration.readings)
    reading = {"standard": "isolation", "ports": [1, 2], "file": "raw/isolation.s2p"}
    edits = {f"calibration.readings[{count}]": reading, "calibration.isolation": True}
    assert off(load_job(path).changed(edits).run(), truth()) < 1e-12


def test_the_reference_impedance_of_the_result(bench: Bench, truth: Truth) -> None:
    from deembed.networks import renormalize

    outcome = load_job(bench(method="solt")).changed({"job.reference_impedance_ohm": 75.0}).run()
    assert (outcome.part.z0 == 75).all() and (outcome.assembled.z0 == 75).all()
    assert np.abs(outcome.part.values - renormalize(truth(), 75.0).values).max() < 1e-12


def test_leading_dims_go_through_the_same_job(bench: Bench, truth: Truth) -> None:
    """Draws are the same functions on an array with one more dim."""
    job = load_job(bench(method="solt", points=5))
    name = "raw/part_23.s2p"
    reading = job.run().raw[name]
    draws = xr.concat([reading, reading * 1.01, reading], dim="draw", coords="minimal", compat="override")
    draws = draws.assign_coords(z0=reading.z0)
    outcome = job.with_reading(name, draws).run()
    assert outcome.part.sizes["draw"] == 3
    assert np.array_equal(outcome.part.isel(draw=0).values, outcome.part.isel(draw=2).values)
    assert np.abs(outcome.part.isel(draw=0).transpose(*truth(5).dims).values - truth(5).values).max() < 1e-12
    assert np.abs(outcome.part.isel(draw=1) - outcome.part.isel(draw=0)).max() > 1e-3


def test_a_coupled_fixture_is_stripped(tmp_path: Path, make: dict) -> None:
    from deembed.shell import embed, shell_from_network

    f = make["grid"]()
    rng = np.random.default_rng(5)
    core = rng.normal(size=(4, 4)) + 1j * rng.normal(size=(4, 4))
    board = sparams(np.broadcast_to(core / 4, (f.size, 4, 4)), f)
    shell = shell_from_network(board, analyzer_side_ports=(1, 3), part_side_ports=(2, 4))
    inner = make["part"](f, 2)
    make["save"](tmp_path, "board.s4p", board)
    make["save"](tmp_path, "whole.s2p", embed(shell, inner))
    (tmp_path / "job.toml").write_text(
        '[job]\npart_ports = 2\n[calibration]\nmethod = "none"\n[[rounds]]\nfile = "whole.s2p"\npart_ports '
        "= [1, 2]\n"
        '[fixture.coupled]\nfile = "board.s4p"\nanalyzer_side_ports = [1, 3]\npart_side_ports = [2, 4]\n'
    )
    assert off(load_job(tmp_path / "job.toml").run(), inner) < 1e-10


def test_interpolation_only_when_the_job_says_so(bench: Bench, truth: Truth) -> None:
    path = bench(method="solt", calibration_grid=np.linspace(0.9e9, 3.1e9, 221))
    outcome = load_job(path).changed({"job.interpolate": True}).run()
    assert off(outcome, truth()) < 1e-5
    assert outcome.terms.frequency.equals(outcome.part.frequency)
    notes = [f for f in outcome.findings if f.kind == "interpolated"]
    assert len(notes) == 1 and notes[0].text.startswith(
        "The error terms went from 221 points, 900 MHz to 3.1 GHz onto the part's grid of 21 points, 1 GHz "
        "to 3 GHz"
    )


def test_arms_terminations_and_switch_terms_are_brought_over_too(
    bench: Bench, truth: Truth, make: dict
) -> None:
    path = bench(method="trl", terminations={1: 0.2, 2: 0.1, 3: 0.15})
    fine = np.linspace(0.9e9, 3.1e9, 111)
    make["save"](path.parent, "fixture/arm_1.s2p", make["arm"](fine, 1))
    make["save"](path.parent, "raw/termination_1.s1p", sparams(np.full((111, 1, 1), 0.2), fine))
    for port in (1, 2):
        make["save"](path.parent, f"raw/switch_{port}.s1p", sparams(np.zeros((111, 1, 1)), fine))
    edits = {"analyzer.switch_terms": {1: "raw/switch_1.s1p", 2: "raw/switch_2.s1p"}, "job.interpolate": True}
    outcome = load_job(path).changed(edits).run()
    assert off(outcome, truth()) < 1e-5
    assert sorted(f.where for f in outcome.findings if f.kind == "interpolated") == [
        "arm 1",
        "switch 1",
        "switch 2",
        "termination 1",
    ]


def test_recorded_switch_terms_are_not_applied_to_solt_and_that_is_said(
    bench: Bench, truth: Truth, make: dict
) -> None:
    path = bench(method="solt")
    f = make["grid"]()
    make["save"](path.parent, "raw/switch_1.s1p", sparams(np.full((f.size, 1, 1), 0.3), f))
    outcome = load_job(path).changed({"analyzer.switch_terms": {1: "raw/switch_1.s1p"}}).run()
    assert off(outcome, truth()) < 1e-12
    assert [f.text for f in outcome.findings if f.kind == "switch-terms-unused"] == [
        "The recorded switch terms of analyzer port 1 were not applied: method solt does not use them, "
        "but compares them with what its terms imply."
    ]
    (witness,) = (f for f in outcome.findings if f.kind == "switch-terms")
    assert (witness.where, witness.severity) == ("switch 1", "warning")


def test_a_job_is_immutable_and_changes_into_another(bench: Bench) -> None:
    job = load_job(bench(method="none"))
    before = job.to_toml()
    other = job.changed({"job.title": "B"}, expect={"lossless": True})
    assert isinstance(other, Job) and other.spec.job.title == "B" and other.spec.expect.lossless is True
    assert job.to_toml() == before and job.spec.job.title == "Bench splitter"
    assert "# a bench job" in other.to_toml()
    with pytest.raises(AttributeError, match="cannot assign to field"):
        job.text = ""  # type: ignore[misc]
