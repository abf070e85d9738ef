"""Small linear circuits as nodal admittances, closed form at every frequency at once."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from deembed.numeric.linalg import inverse
from deembed.numeric.sparams import y_to_s

__all__ = ["Circuit", "line_constant"]

LIGHT_SPEED = 299_792_458.0


def line_constant(frequency: NDArray, *, permittivity: float, loss_db_per_m: float) -> NDArray:
    """Propagation constant [1/m] of a TEM line, loss [dB/m] at 1 GHz growing with the square root of frequency.

    The skin effect's inner inductance slows the line as much as its resistance damps it, so it stays causal.
    """
    loss = loss_db_per_m * np.sqrt(frequency / 1e9) * np.log(10) / 20
    return (1 + 1j) * loss + 2j * np.pi * frequency * np.sqrt(permittivity) / LIGHT_SPEED


class Circuit:
    """A circuit between nodes 0, 1, 2, ... and ground (None), at frequencies above zero.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], positive.
    nodes : int
    """

    def __init__(self, frequency: ArrayLike, nodes: int) -> None:
        self.frequency = np.asarray(frequency, dtype=float)
        if (self.frequency <= 0).any():
            raise ValueError("a circuit is computed at frequencies above 0 Hz")
        self.y = np.zeros((self.frequency.size, nodes, nodes), dtype=complex)

    def admittance(self, a: int, b: int | None, y: ArrayLike) -> Circuit:
        """An admittance [S] between two nodes."""
        self.y[:, a, a] += y
        if b is not None:
            self.y[:, b, b] += y
            self.y[:, a, b] -= y
            self.y[:, b, a] -= y
        return self

    def resistor(self, a: int, b: int | None, ohm: float) -> Circuit:
        """A resistor [ohm]."""
        return self.admittance(a, b, 1.0 / ohm)

    def inductor(self, a: int, b: int | None, henry: float) -> Circuit:
        """An inductor [H]."""
        return self.admittance(a, b, 1.0 / (2j * np.pi * self.frequency * henry))

    def capacitor(self, a: int, b: int | None, farad: float) -> Circuit:
        """A capacitor [F]."""
        return self.admittance(a, b, 2j * np.pi * self.frequency * farad)

    def gyrator(self, a: int, b: int, siemens: float) -> Circuit:
        """A lossless one-way turn: the current into b follows the voltage at a, that into a follows minus that at b."""
        self.y[:, b, a] += siemens
        self.y[:, a, b] -= siemens
        return self

    def line(self, a: int, b: int, *, ohm: float, gamma: NDArray, length: float) -> Circuit:
        """A transmission line over ground: impedance [ohm], propagation constant [1/m], length [m]."""
        gl = gamma * length
        if np.abs(np.sinh(gl)).min() < 1e-9:
            raise ValueError("a lossless line of whole half wavelengths has no admittance: give it some loss")
        own, across = 1 / (ohm * np.tanh(gl)), -1 / (ohm * np.sinh(gl))
        self.y[:, a, a] += own
        self.y[:, b, b] += own
        self.y[:, a, b] += across
        self.y[:, b, a] += across
        return self

    def sparams(self, ports: Sequence[int], *, z0: float = 50.0) -> NDArray:
        """S-parameters at the named nodes, shape (frequency, port, port), the other nodes left to themselves."""
        kept = np.asarray(ports)
        rest = np.setdiff1d(np.arange(self.y.shape[-1]), kept)
        y = self.y[:, kept[:, None], kept]
        if rest.size:
            inner = inverse(self.y[:, rest[:, None], rest])
            y = y - self.y[:, kept[:, None], rest] @ inner @ self.y[:, rest[:, None], kept]
        return y_to_s(y, np.full(kept.size, z0))
