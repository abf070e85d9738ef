"""Small synthetic job folders, written without the demo writer: every number is known in closed form."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from deembed.labels import relabel_ports, select_ports, sparams
from deembed.networks import close_ports
from deembed.shell import embed, shell_from_arms

LIGHT = 299792458.0
LINE_M = 0.03
KIT = f"""
[kit]
name = "bench"
description = "Ideal standards for tests"
reference_impedance_ohm = 50.0
[standards.open]
kind = "open"
[standards.short]
kind = "short"
[standards.load]
kind = "load"
[standards.thru]
kind = "thru"
[standards.line]
kind = "line"
length_m = {LINE_M}
[standards.reflect]
kind = "reflect"
sign = -1
"""
EXPECT = "\n[expect]\npassive = true\nreciprocal = true\n"


def grid(points: int = 21) -> np.ndarray:
    return np.linspace(1e9, 3e9, points)


def delays(frequency: np.ndarray, *seconds: float) -> np.ndarray:
    """Diagonal of one-way phases, shape (frequency, port)."""
    return np.exp(-2j * np.pi * frequency[:, None] * np.array(seconds))


def part(frequency: np.ndarray, ports: int = 3) -> xr.DataArray:
    """A lossy, reciprocal, passive splitter with unequal delays."""
    junction = 0.9 * (2 / ports * np.ones((ports, ports)) - np.eye(ports))
    d = delays(frequency, *(20e-12 * (1 + k) for k in range(ports)))
    return sparams(d[:, :, None] * junction * d[:, None, :], frequency)


def arm(frequency: np.ndarray, number: int) -> xr.DataArray:
    """A passive arm that is not the same from both ends."""
    core = np.array([[0.25, 0.8], [0.8, -0.05 * number]])
    d = delays(frequency, 30e-12, 25e-12 * number)
    return sparams(d[:, :, None] * core * d[:, None, :], frequency)


def box(frequency: np.ndarray, number: int) -> xr.DataArray:
    """An analyzer port's error box, port 1 toward the receivers."""
    core = np.array([[0.1 * number, 0.85], [0.9, 0.15 + 0.05 * number]])
    d = delays(frequency, 50e-12, 10e-12 * number)
    return sparams(d[:, :, None] * core * d[:, None, :], frequency)


def analyzer(frequency: np.ndarray, ports: int) -> xr.Dataset:
    return shell_from_arms({p: box(frequency, p) for p in range(1, ports + 1)})


def read(truth: xr.DataArray, *, on: tuple[int, ...], first_only: bool = False) -> xr.DataArray:
    """Raw reading of something whose ports, in order, sit on these analyzer ports."""
    f = truth.frequency.values
    boxes = shell_from_arms({p: box(f, p) for p in on})
    raw = select_ports(embed(boxes, relabel_ports(truth, on)), sorted(on))
    if first_only:
        raw = raw.where(raw.port_in == 1, 0.0)
    return raw


def standard(name: str, frequency: np.ndarray) -> xr.DataArray:
    reflection = {"open": 1.0, "short": -1.0, "load": 0.0, "reflect": -0.95}
    if name in reflection:
        return sparams(np.full((frequency.size, 1, 1), reflection[name]), frequency)
    length = {"thru": 0.0, "line": LINE_M}[name]
    through = np.exp(-2j * np.pi * frequency * length / LIGHT)[:, None, None]
    return sparams(through * np.array([[0, 1], [1, 0]]), frequency)


def touchstone(s: xr.DataArray) -> str:
    """Touchstone 1.1 text, real and imaginary, every bit of the numbers."""
    count = s.sizes["port_out"]
    lines = ["! invented for a test", "# Hz S RI R 50"]
    for f, m in zip(s.frequency.values, s.values, strict=True):
        flat = m.T.ravel() if count == 2 else m.ravel()
        pairs = [f"{v.real:.17g} {v.imag:.17g}" for v in flat]
        rows = [pairs] if count < 3 else [pairs[i : i + count] for i in range(0, count * count, count)]
        lines.append(f"{f:.17g} " + "\n".join(" ".join(row) for row in rows))
    return "\n".join(lines) + "\n"


def save(folder: Path, name: str, s: xr.DataArray) -> str:
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(touchstone(s))
    return name


def readings_toml(
    folder: Path, entries: list[tuple[str, tuple[int, ...]]], f: np.ndarray, **how: bool
) -> str:
    text = ""
    for name, on in entries:
        truth = standard(name, f)
        if truth.sizes["port_out"] < len(on):  # one such standard on each port
            truth = sparams(truth.values * np.eye(len(on)), f)
        file = save(folder, f"raw/{name}_{''.join(map(str, on))}.s{len(on)}p", read(truth, on=on, **how))
        text += f'[[calibration.readings]]\nstandard = "{name}"\nports = {list(on)}\nfile = "{file}"\n'
    return text


SOLT = [(name, (port,)) for port in (1, 2) for name in ("open", "short", "load")] + [("thru", (1, 2))]
FIRST = [(name, (1,)) for name in ("open", "short", "load")] + [("thru", (1, 2))]
TRL = [("thru", (1, 2)), ("line", (1, 2)), ("reflect", (1, 2))]
CYCLIC = [(1, 2), (2, 3), (3, 1)]
BOTH_WAYS = [(1, 2), (2, 1), (2, 3), (3, 2), (3, 1), (1, 3)]


def write_job(
    folder: Path,
    *,
    method: str = "solt",
    drive: str = "every-port",
    arms: bool = True,
    points: int = 21,
    terminations: dict[int, complex] | None = None,
    expect: str = EXPECT,
    calibration_grid: np.ndarray | None = None,
) -> Path:
    """A three-port job read in rounds; `part()` is the truth. Returns the job file's path."""
    f = grid(points)
    first_only = drive == "first-port-only"
    whole = part(f)
    if arms:
        whole = embed(shell_from_arms({p: arm(f, p) for p in (1, 2, 3)}), whole)
    text = '# a bench job\n[job]\ntitle = "Bench splitter"  # kept\npart_ports = 3\n'
    text += f'\n[analyzer]\ndrive = "{drive}"\n'
    text += f'\n[calibration]\nmethod = "{method}"\n'
    if method != "none":
        (folder / "kit.toml").parent.mkdir(parents=True, exist_ok=True)
        (folder / "kit.toml").write_text(KIT)
        text += 'kit = "kit.toml"\n'
        entries = {"solt": FIRST if first_only else SOLT, "trl": TRL}[method]
        own = f if calibration_grid is None else calibration_grid
        text += readings_toml(folder, entries, own, first_only=first_only)
    for pair in BOTH_WAYS if first_only else CYCLIC:
        free = ({1, 2, 3} - set(pair)).pop()
        seen = close_ports(whole, {free: (terminations or {}).get(free, 0.0)})
        seen = select_ports(seen, pair)
        raw = (
            relabel_ports(seen, (1, 2)) if method == "none" else read(seen, on=(1, 2), first_only=first_only)
        )
        file = save(folder, f"raw/part_{pair[0]}{pair[1]}.s2p", raw)
        text += f'\n[[rounds]]\nfile = "{file}"\nanalyzer_ports = [1, 2]\npart_ports = {list(pair)}\n'
    if terminations:
        text += "\n[terminations]\n"
        for port, value in terminations.items():
            one = sparams(np.full((f.size, 1, 1), value), f)
            text += f'{port} = "{save(folder, f"raw/termination_{port}.s1p", one)}"\n'
    if arms:
        for p in (1, 2, 3):
            file = save(folder, f"fixture/arm_{p}.s2p", arm(f, p))
            text += f'\n[[fixture.arms]]\npart_port = {p}\nfile = "{file}"\nanalyzer_side = 1\n'
    path = folder / "job.toml"
    path.write_text(text + expect)
    return path


@pytest.fixture
def bench(tmp_path: Path) -> Callable[..., Path]:
    """Write a job folder; keyword arguments as in `write_job`."""

    def build(**how: object) -> Path:
        return write_job(tmp_path / "bench", **how)  # type: ignore[arg-type]

    return build


@pytest.fixture
def truth() -> Callable[..., xr.DataArray]:
    """The part that `bench` jobs must come to."""
    return lambda points=21: part(grid(points))


@pytest.fixture
def make() -> dict[str, Callable]:
    """Pieces to build other jobs with."""
    return {
        "grid": grid,
        "part": part,
        "arm": arm,
        "read": read,
        "save": save,
        "readings": readings_toml,
        "kit": lambda folder: (folder / "kit.toml").write_text(KIT),
        "solt": SOLT,
        "standard": standard,
    }
