"""The demonstration: the antenna splitter of a river-level radar gauge, read in three rounds.

Everything about it is invented. A gauge on a bridge looks down at the water with one transceiver near 6 GHz and two
antennas; the splitter between them sits on a board with three edge-launch arms.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from types import MappingProxyType

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import FileError, JobError
from deembed.labels import relabel_ports, select_ports, sparams
from deembed.networks import close_ports
from deembed.shell import embed, shell_from_arms
from deembed.simulate.analyzer import Analyzer, Imperfections, random_analyzer
from deembed.simulate.demo_text import JOB, NOTES
from deembed.simulate.fixtures import edge_launch_arm
from deembed.simulate.parts import isolating_splitter
from deembed.simulate.passives import termination
from deembed.standards import Kit, load_kit
from deembed.touchstone import write_touchstone

__all__ = ["MISTAKES", "SEED", "write_demo"]

SEED = 20260611
KIT = "generic-coax-3p5mm"
ROUNDS = ((1, 2), (2, 3), (3, 1))
THRU_EXTRA_S = 12e-12
REVERSED_ARM = 2

MISTAKES: Mapping[str, str] = MappingProxyType(
    {
        "standards-exchanged": "open and short were read in each other's place at analyzer port 2",
        "arm-reversed": f"the file of arm {REVERSED_ARM} has its ends exchanged",
        "thru-length": f"the thru is {THRU_EXTRA_S * 1e12:.0f} ps longer than the kit says",
    }
)
"""Mistakes that can be planted, by name."""


@dataclass(frozen=True)
class _Bench:
    """What stands on the table: analyzer, true standards, board."""

    frequency: NDArray
    analyzer: Analyzer
    kit: Kit
    arms: dict[int, xr.DataArray]
    part: xr.DataArray
    terminations: dict[int, xr.DataArray]


def write_demo(
    directory: str | Path, *, mistake: str | None = None, points: int = 1601, seed: int = SEED
) -> Path:
    """Write the folder of a complete job.

    Parameters
    ----------
    directory : str or Path
        New or empty.
    mistake : str, optional
        A name from `MISTAKES`, planted in the readings or files.
    points : int
        Number of frequencies, 50 MHz to 8.05 GHz. Below about 250 the phase of the cables can turn too far from
        one point to the next to be followed, and nobody can tell the sign of a reflection from it.
    seed : int
        The same seed gives the same files, byte for byte.

    Returns
    -------
    Path
        The job file.

    Raises
    ------
    JobError
        Unknown mistake (nearest named), or fewer than 11 points.
    FileError
        A directory that holds something already.
    """
    folder = Path(directory)
    if mistake is not None and mistake not in MISTAKES:
        near = words.nearest(mistake, MISTAKES)
        hint = f"Did you mean {near!r}? " if near else ""
        raise JobError(
            f"no mistake is called {mistake!r}", where="demo", do=f"{hint}Known are {', '.join(MISTAKES)}."
        )
    if points < 11:
        raise JobError(f"{points} points", where="demo", do="Ask for 11 or more.")
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise FileError(
            "is there already and not an empty folder",
            where=str(folder),
            do="Name a new folder for the demonstration.",
        )
    try:
        for name in ("raw", "fixture", "truth"):
            (folder / name).mkdir(parents=True)
    except OSError as error:
        raise FileError(
            f"cannot be made ({error.strerror})", where=str(folder), do="Name a folder that you may write to."
        ) from error
    bench = _bench(points, seed)
    _write_standards(bench, folder, mistake)
    _write_rounds(bench, folder)
    _write_rest(bench, folder, mistake)
    (folder / "NOTES.txt").write_text(NOTES, encoding="utf-8")
    job = folder / "job.toml"
    job.write_text(JOB, encoding="utf-8")
    return job


def _bench(points: int, seed: int) -> _Bench:
    rng = np.random.default_rng(seed)
    f = np.linspace(50e6, 8.05e9, points)
    arms = {
        1: edge_launch_arm(
            f, length_m=0.0180, impedance_ohm=49.2, launch_farad=0.16e-12, launch_henry=0.31e-9
        ),
        2: edge_launch_arm(
            f, length_m=0.0235, impedance_ohm=50.9, launch_farad=0.21e-12, launch_henry=0.27e-9
        ),
        3: edge_launch_arm(
            f, length_m=0.0235, impedance_ohm=50.4, launch_farad=0.14e-12, launch_henry=0.33e-9
        ),
    }
    terminations = {
        1: termination(f, resistance_ohm=51.8, inductance_h=0.10e-9, delay_s=45e-12),
        2: termination(f, resistance_ohm=48.4, inductance_h=0.09e-9, delay_s=60e-12),
        3: termination(f, resistance_ohm=51.2, inductance_h=0.12e-9, delay_s=40e-12),
    }
    analyzer = random_analyzer(f, rng=rng, imperfections=Imperfections())
    return _Bench(f, analyzer, load_kit(KIT), arms, isolating_splitter(f), terminations)


def _comment(what: str) -> list[str]:
    return [what, "Simulated reading, invented: river-level radar gauge, splitter board B"]


def _write_standards(bench: _Bench, folder: Path, mistake: str | None) -> None:
    """Six reflections and a thru; the loads really are a little off, as every load is."""
    f, kit = bench.frequency, bench.kit
    true_kit = kit.changed("load", resistance_ohm=50.12, inductance_h=1.2e-12)
    read = {}
    for port in (1, 2):
        for standard in ("open", "short", "load"):
            true = relabel_ports(true_kit.response(standard, f, z0=50.0), [port])
            read[standard, port] = bench.analyzer.read(true)
    if mistake == "standards-exchanged":
        read["open", 2], read["short", 2] = read["short", 2], read["open", 2]
    for (standard, port), raw in read.items():
        write_touchstone(
            relabel_ports(raw, [1]),
            folder / f"raw/{standard}_{port}.s1p",
            provenance=_comment(f"{standard} at analyzer port {port}, raw"),
        )
    extra = THRU_EXTRA_S if mistake == "thru-length" else 0.0
    through = np.exp(-2j * np.pi * f * extra)
    thru = sparams(through[:, None, None] * np.array([[0.0, 1.0], [1.0, 0.0]]), f)
    write_touchstone(
        bench.analyzer.read(thru),
        folder / "raw/thru_12.s2p",
        provenance=_comment("thru between ports 1 and 2, raw"),
    )


def _write_rounds(bench: _Bench, folder: Path) -> None:
    board = embed(shell_from_arms(bench.arms), bench.part)
    for first, second in ROUNDS:
        (free,) = {1, 2, 3} - {first, second}
        seen = close_ports(board, {free: bench.terminations[free]})
        connected = relabel_ports(select_ports(seen, [first, second]), [1, 2])
        write_touchstone(
            bench.analyzer.read(connected),
            folder / f"raw/part_{first}{second}.s2p",
            provenance=_comment(f"part ports {first} and {second} on analyzer ports 1 and 2, raw"),
        )


def _write_rest(bench: _Bench, folder: Path, mistake: str | None) -> None:
    for port, closing in bench.terminations.items():
        write_touchstone(
            closing,
            folder / f"raw/termination_{port}.s1p",
            provenance=_comment(f"reflection of what closed part port {port}, corrected"),
        )
    for port, arm in bench.arms.items():
        if mistake == "arm-reversed" and port == REVERSED_ARM:
            arm = relabel_ports(select_ports(arm, [2, 1]), [1, 2])
        write_touchstone(
            arm, folder / f"fixture/arm_{port}.s2p", provenance=_comment(f"arm of part port {port}")
        )
    write_touchstone(
        bench.part,
        folder / "truth/part.s3p",
        provenance=_comment("what the simulation started from"),
    )
