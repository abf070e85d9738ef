"""Every job in docs/job-files.md runs and comes to the part it was written for."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from deembed.job import load_job
from deembed.job.schema import JobFile
from deembed.job.validate import validate
from deembed.labels import relabel_ports, select_ports, sparams
from deembed.networks import close_ports
from deembed.shell import embed, shell_from_arms, shell_from_network
from deembed.standards import load_kit

PAGE = Path(__file__).parents[2] / "docs" / "job-files.md"
JOBS = re.findall(r"```toml\n(.*?)```", PAGE.read_text(encoding="utf-8"), re.DOTALL)


def supply(spec: JobFile, folder: Path, make: dict) -> xr.DataArray:
    """Write every file a documented job names; returns the part it must come to."""
    f = make["grid"](11)
    count = spec.job.part_ports
    inner = select_ports(make["part"](f, max(count, 2)), range(1, count + 1))
    whole = inner
    for arm in spec.fixture.arms:
        make["save"](folder, arm.file, make["arm"](f, arm.part_port))
    if spec.fixture.arms:
        sides = {a.part_port: a.analyzer_side for a in spec.fixture.arms}
        arms = {a.part_port: make["arm"](f, a.part_port) for a in spec.fixture.arms}
        whole = embed(shell_from_arms(arms, analyzer_side=sides), inner)
    if spec.fixture.coupled is not None:
        board = np.array(
            [[0.1, 0.05, 0.8, 0.02], [0.05, 0.2, 0.01, 0.7], [0.8, 0.01, 0.1, 0], [0.02, 0.7, 0, 0.1]]
        )
        network = sparams(np.broadcast_to(board, (f.size, 4, 4)), f)
        make["save"](folder, spec.fixture.coupled.file, network)
        shell = shell_from_network(network, analyzer_side_ports=(1, 2), part_side_ports=(3, 4))
        whole = embed(shell, inner)
    closing = {port: 0.05j * port for port in spec.terminations}
    for port, file in spec.terminations.items():
        make["save"](folder, file, sparams(np.full((f.size, 1, 1), closing[port]), f))
    for file in spec.analyzer.switch_terms.values():
        make["save"](folder, file, sparams(np.zeros((f.size, 1, 1)), f))
    first_only = spec.analyzer.drive == "first-port-only"
    for one in spec.rounds:
        free = {p: closing.get(p, 0.0) for p in range(1, count + 1) if p not in one.part_ports}
        seen = select_ports(close_ports(whole, free), one.part_ports)
        on = one.analyzer_ports or tuple(range(1, len(one.part_ports) + 1))
        raw = (
            relabel_ports(seen, on)
            if spec.calibration.method == "none"
            else make["read"](seen, on=on, first_only=first_only)
        )
        make["save"](folder, one.file, raw)
    kit = load_kit(spec.calibration.kit) if spec.calibration.kit else None
    for reading in spec.calibration.readings:
        truth = kit.response(reading.standard, f)
        if truth.sizes["port_out"] < len(reading.ports):
            truth = sparams(truth.values * np.eye(len(reading.ports)), f, z0=50.0)
        ports = range(1, len(reading.ports) + 1)
        raw = make["read"](relabel_ports(truth, ports), on=reading.ports, first_only=first_only)
        wide = int(reading.file[-2])
        if wide > len(reading.ports):
            raw = sparams(raw.values * np.diag([1.0, 0.0]), f)
        make["save"](folder, reading.file, raw)
    return inner


def test_the_page_has_an_example_of_every_method() -> None:
    from deembed.job.methods import METHODS

    assert {validate(text).calibration.method for text in JOBS} == set(METHODS)


@pytest.mark.parametrize("text", JOBS, ids=lambda text: re.search('method = "(.*?)"', text)[1])
def test_a_documented_job_runs(text: str, tmp_path: Path, make: dict) -> None:
    truth = supply(validate(text), tmp_path, make)
    (tmp_path / "job.toml").write_text(text)
    outcome = load_job(tmp_path / "job.toml").run()
    assert np.abs(outcome.part.values - truth.values).max() < 1e-9
    assert not outcome.contradicts
