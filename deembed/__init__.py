"""From raw analyzer readings to S-parameters at a part's own planes, and whether to believe them.

Names are loaded when first used, so that ``import deembed`` costs nothing.
"""

from __future__ import annotations

import importlib
from typing import Any

_HOME = {
    "BlindSpot": "deembed.findings",
    "DeembedError": "deembed.errors",
    "Finding": "deembed.findings",
    "Kit": "deembed.standards",
    "Reading": "deembed.calibration",
    "admittance": "deembed.networks",
    "assemble": "deembed.threeport",
    "assess": "deembed.physicality",
    "cascade": "deembed.networks",
    "chain": "deembed.networks",
    "close_ports": "deembed.networks",
    "correct": "deembed.calibration",
    "embed": "deembed.shell",
    "from_skrf": "deembed.touchstone",
    "impedance": "deembed.networks",
    "load_job": "deembed.job",
    "load_kit": "deembed.standards",
    "open_outcome": "deembed.job",
    "predict_raw": "deembed.calibration",
    "read_touchstone": "deembed.touchstone",
    "renormalize": "deembed.networks",
    "select_ports": "deembed.labels",
    "shell_from_arms": "deembed.shell",
    "shell_from_network": "deembed.shell",
    "solve_sol": "deembed.calibration",
    "solve_solt": "deembed.calibration",
    "solve_trl": "deembed.calibration",
    "sparams": "deembed.labels",
    "strip": "deembed.shell",
    "to_skrf": "deembed.touchstone",
    "transfer": "deembed.networks",
    "write_touchstone": "deembed.touchstone",
}

__all__ = sorted(_HOME)
__version__ = "0.1.0"


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'deembed' has no attribute {name!r}")
    value = getattr(importlib.import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted([*globals(), *_HOME])
