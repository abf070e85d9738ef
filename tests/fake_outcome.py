"""An outcome made of arithmetic alone (a lossy splitter, error boxes, arms), for pictures and report."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, replace
from types import SimpleNamespace

import numpy as np
import xarray as xr

from deembed.findings import Finding
from deembed.labels import sparams
from deembed.shell import embed, shell_from_arms

ARM_PS = {1: 212.0, 2: 150.0, 3: 90.0}
BOX_PS = {1: 4800.0, 2: 5200.0}


@dataclass(frozen=True)
class FakeOutcome:
    """The fields of an outcome that pictures read."""

    job: object
    part: xr.DataArray
    metrics: xr.Dataset
    findings: tuple
    verdict: str
    raw: dict
    terms: xr.Dataset | None
    rounds: tuple
    assembled: xr.DataArray
    disagreement: xr.DataArray | None
    shell: xr.Dataset | None
    suspects: tuple = ()
    blind_spots: tuple = ()

    def changed(self, **edits):
        return replace(self, **edits)


def splitter(f):
    """Resistor-isolated splitter with some mismatch, and gain above 1 planted around 4 GHz."""
    through = 0.68 * np.exp(-2j * np.pi * f * 60e-12 - 1j * np.pi / 2)
    r1 = 0.12 * np.exp(-2j * np.pi * f * 150e-12)
    r2 = 0.15 * np.exp(-2j * np.pi * f * 40e-12 + 0.6j)
    r3 = 0.09 * np.exp(-2j * np.pi * f * 70e-12 - 0.9j)
    iso = 0.1 * np.exp(-2j * np.pi * f * 100e-12)
    bump = 1 + 0.18 * np.exp(-(((f - 4.06e9) / 0.15e9) ** 2))
    s = np.empty((f.size, 3, 3), complex)
    s[:, 0, 0], s[:, 1, 1], s[:, 2, 2] = r1, r2, r3
    s[:, 0, 1] = s[:, 1, 0] = s[:, 0, 2] = s[:, 2, 0] = through * bump
    s[:, 1, 0] *= 1.004
    s[:, 1, 2] = s[:, 2, 1] = iso
    return sparams(s, f)


def metrics_of(s):
    """The physicality metrics straight from their definitions."""
    v = s.values
    sv = np.linalg.svd(v, compute_uv=False)
    error = np.abs(v - v.swapaxes(-1, -2))
    core = ("frequency", "port_out", "port_in")
    eye = np.eye(v.shape[-1])
    data = {
        "largest_singular_value": ("frequency", sv[:, 0]),
        "smallest_singular_value": ("frequency", sv[:, -1]),
        "power_balance": (("frequency", "port_in"), np.sum(np.abs(v) ** 2, axis=1)),
        "reciprocity_error": (core, error),
        "reciprocity_error_max": ("frequency", error.max(axis=(1, 2))),
        "lossless_error": ("frequency", np.linalg.norm(v.conj().swapaxes(1, 2) @ v - eye, 2, axis=(1, 2))),
    }
    if v.shape[-1] == 3:
        data["reflection_sum"] = ("frequency", np.abs(np.einsum("fii->fi", v)).sum(axis=1))
        data["three_way_floor"] = ("frequency", sv[:, 1] + sv[:, 2] - sv[:, 0])
    return xr.Dataset(data, coords={c: s[c].values for c in core})


def arm_files(f):
    """Mismatched lines of known delay; S21 and S12 have exactly that delay."""
    out = {}
    for port, ps in ARM_PS.items():
        turn = np.exp(-2j * np.pi * f * ps * 1e-12) * 10 ** (-0.4 * np.sqrt(f / 1e9) / 20)
        r = 0.04 * np.exp(-2j * np.pi * f * ps * 2e-12)
        out[port] = sparams(np.moveaxis(np.array([[r, turn], [turn, -r]]), -1, 0), f)
    return out


def error_terms(f):
    """Terms of two boxes with known one-way delays."""

    def line(ps, size):
        return size * np.exp(-2j * np.pi * f * ps * 1e-12)

    track = np.stack([line(2 * BOX_PS[p], 0.9) for p in (1, 2)], axis=1)
    through = np.full((f.size, 2, 2), np.nan, complex)
    load = through.copy()
    isolation = through.copy()
    for r, d in ((1, 0), (0, 1)):
        through[:, r, d] = line(BOX_PS[1] + BOX_PS[2], 0.88)
        load[:, r, d] = line(900.0, 0.06)
        isolation[:, r, d] = 0
    one, two = ("frequency", "port_in"), ("frequency", "port_out", "port_in")
    residual = (1e-3 * (1 + f / f[-1]) * np.exp(2j * np.pi * f / 1e9))[:, None]
    return xr.Dataset(
        {
            "directivity": (one, np.stack([line(300, 0.03), line(350, 0.04)], axis=1)),
            "source_match": (one, np.stack([line(400, 0.07), line(420, 0.05)], axis=1)),
            "reflection_tracking": (one, track),
            "load_match": (two, load),
            "transmission_tracking": (two, through),
            "isolation": (two, isolation),
            "redundancy": (("frequency", "pair"), residual),
        },
        coords={"frequency": f, "port_in": [1, 2], "port_out": [1, 2], "pair": ["1-2"]},
        attrs={"method": "solt", "drive": "every-port", "findings": "[]"},
    )


class FakeJob:
    """A job's tables, and its inputs with made-up hashes."""

    def __init__(self, spec):
        self.spec, self.name, self.inputs = spec, "job.toml", self

    def input_names(self):
        readings = [
            (f"calibration.readings[{k}].file", r.file) for k, r in enumerate(self.spec.calibration.readings)
        ]
        rounds = [(f"rounds[{k}].file", r.file) for k, r in enumerate(self.spec.rounds)]
        arms = [(f"fixture.arms[{k}].file", a.file) for k, a in enumerate(self.spec.fixture.arms)]
        rest = [(f"terminations.{p}", file) for p, file in self.spec.terminations.items()]
        kit = [("calibration.kit", "kit.toml"), ("calibration.kit x", "load.s1p")]
        return [*readings, *rounds, *arms, *rest, *kit]

    def get(self, name, *, key):
        return SimpleNamespace(sha256=hashlib.sha256(name.encode()).hexdigest())


def job():
    """The tables of a job file, as attributes."""
    n = SimpleNamespace
    rounds = tuple(
        n(file=f"raw/part_{a}{b}.s2p", analyzer_ports=(1, 2), part_ports=(a, b), terminations={})
        for a, b in ((1, 2), (2, 3), (3, 1))
    )
    alone = [(s, p) for s in ("open", "short", "load") for p in (1, 2)]
    readings = (
        *(n(standard=s, ports=(p,), file=f"raw/{s}_{p}.s1p") for s, p in alone),
        n(standard="thru", ports=(1, 2), file="raw/thru.s2p"),
    )
    return FakeJob(n(
        job=n(
            title="River-gauge splitter, board <B>", part_ports=3, reference_impedance_ohm=50.0,
            operator='A. "Ampere"',
            instrument="", kit_serial="", kit_due="", temperature_c="23", note="<script>alert(1)</script>",
        ),
        analyzer=n(ports=2, drive="every-port", switch_terms={}),
        calibration=n(method="solt", kit="generic-coax-3p5mm", isolation=False, readings=readings),
        rounds=rounds,
        terminations={3: "raw/termination_3.s1p"},
        fixture=n(
            arms=tuple(n(part_port=p, file=f"fixture/arm_{p}.s2p", analyzer_side=1) for p in (1, 2, 3)),
            coupled=None,
        ),
        expect=n(passive=True, reciprocal=True, lossless=None, tolerance=0.01),
    ))  # fmt: skip


FINDINGS = (
    Finding(
        "gain-part-1", "gain", "", "contradiction",
        "Between 3.86 and 4.26 GHz the part would give out up to 13 % more wave amplitude than it receives.",
        3.86e9, 4.26e9, 1.13, 4.06e9, 12.0,
    ),
    Finding(
        "disagreement-part-port-2-1", "disagreement", "part port 2, round 1-2, round 2-3", "warning",
        "The two readings of S22 differ by up to 0.03.", 4.5e9, 5.5e9, 0.03, 5e9,
    ),
    Finding("arm-loss-arm-3-1", "arm-loss", "arm 3", "warning", "Arm 3 loses 21 dB.", 5.8e9, 6e9, 21.0, 6e9),
    Finding("redundancy-port-2-1", "redundancy", "short 2", "note", "The short at port 2 fits less well."),
    Finding("odd-1", "odd", "switch 7", "note", "Something no segment carries."),
)  # fmt: skip


def fake_outcome(points=401, *, findings=FINDINGS):
    """A whole outcome over 10 MHz to 6 GHz."""
    f = np.linspace(10e6, 6e9, points)
    part = splitter(f)
    shell = shell_from_arms(arm_files(f))
    outer = embed(shell, part)
    ports = ((1, 2), (2, 3), (3, 1))
    rounds, spread = [], np.full((3, points, 3), np.nan, complex)
    for pair in ports:
        one = outer.sel(port_out=list(pair), port_in=list(pair)).copy()
        one.name = "-".join(map(str, pair))
        rounds.append(one)
    for p, (first, second) in enumerate(((0, 2), (0, 1), (1, 2))):
        apart = 0.004 * (p + 1) * np.exp(2j * np.pi * f / 2e9)
        spread[first, :, p], spread[second, :, p] = apart / 2, -apart / 2
    disagreement = xr.DataArray(
        spread, dims=("round", "frequency", "port"),
        coords={"round": [r.name for r in rounds], "frequency": f, "port": [1, 2, 3]},
    )  # fmt: skip
    raw = {f"raw/part_{r.name.replace('-', '')}.s2p": sparams(0.5 * r.values, f) for r in rounds}
    raw["raw/open_1.s1p"] = sparams(np.exp(-2j * np.pi * f * 9e-9)[:, None, None], f)
    return FakeOutcome(
        job(), part, metrics_of(part), tuple(findings),
        "The part cannot be what these readings say: it would give out 13 % more than it receives.",
        raw, error_terms(f), tuple(rounds), outer, disagreement, shell,
    )  # fmt: skip
