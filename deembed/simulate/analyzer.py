"""A simulated analyzer: imperfect ports, switch terms, leakage, noise, drift and connectors that never repeat.

It works on waves, port by port, and knows nothing of how calibrations undo it.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.labels import check, ports_of, sparams
from deembed.numeric.linalg import diagonal_matrix, inverse
from deembed.numeric.shell import embed
from deembed.numeric.sparams import cascade

__all__ = ["Analyzer", "Imperfections", "random_analyzer"]


@dataclass(frozen=True)
class Imperfections:
    """What keeps a reading from being the same twice.

    Parameters
    ----------
    trace_noise : float
        Standard deviation relative to the reading.
    noise_floor : float
        Standard deviation added to every ratio.
    repeatability : float
        Reflection of a freshly made connection at 10 GHz, growing with frequency (standard deviation).
    drift_per_reading : float
        Change of each port's tracking from one reading to the next, amplitude and radians at the top frequency.
    """

    trace_noise: float = 3.5e-4
    noise_floor: float = 2e-6
    repeatability: float = 1e-3
    drift_per_reading: float = 2e-5


NONE = Imperfections(0.0, 0.0, 0.0, 0.0)


@dataclass
class Analyzer:
    """An analyzer with N ports.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    boxes : complex array of shape (port, frequency, 2, 2)
        Error box of each port: its port 1 inside, its port 2 where parts are connected.
    switch_terms : complex array of shape (port, frequency)
        What port r sends back into its own receiver while another port drives, a_r / b_r.
    leakage : complex array of shape (frequency, port, port)
        Added to the ratio at a receiver (row) while another port (column) drives.
    imperfections : Imperfections
    rng : numpy Generator
    first_port_only : bool
        Only port 1 drives; the other columns are zero.
    """

    frequency: NDArray
    boxes: NDArray
    switch_terms: NDArray
    leakage: NDArray
    imperfections: Imperfections
    rng: np.random.Generator
    first_port_only: bool = False
    readings: int = field(default=0, init=False)

    def perfect(self) -> Analyzer:
        """The same analyzer without noise, drift or connector scatter."""
        return replace(self, imperfections=NONE)

    def read(self, connected: xr.DataArray) -> xr.DataArray:
        """Raw ratios of what is connected, every port driven in turn.

        Parameters
        ----------
        connected : DataArray of shape (frequency, port_out, port_in)
            Labelled by the analyzer ports it sits on, in 50 ohm.

        Returns
        -------
        DataArray of shape (frequency, port_out, port_in)
        """
        connected = check(connected)
        ports = [p - 1 for p in ports_of(connected)]
        seen = [self._connection(self._drifted(p)) for p in ports]
        oo, oi, io, ii = (
            diagonal_matrix(np.stack([b[:, i, j] for b in seen], axis=-1)) for i in (0, 1) for j in (0, 1)
        )
        inside = embed(oo, oi, io, ii, connected.values)
        raw = np.zeros_like(inside)
        for column, drive in enumerate(ports):
            if self.first_port_only and drive != 0:
                continue
            back = np.stack(
                [self.switch_terms[p] if p != drive else 0 * self.switch_terms[p] for p in ports], axis=-1
            )
            waves = inverse(np.eye(len(ports)) - inside * back[:, None, :]) @ inside[:, :, [column]]
            raw[:, :, column] = waves[..., 0] + self.leakage[:, ports, drive] * (np.asarray(ports) != drive)
        self.readings += 1
        driven = np.array([not self.first_port_only or p == 0 for p in ports])
        return connected.copy(data=self._noisy(raw) * driven)

    def recorded_switch_terms(self) -> dict[int, xr.DataArray]:
        """Switch terms as the analyzer would record them, per port."""
        return {
            p + 1: sparams(self._noisy(g[:, None, None]), self.frequency)
            for p, g in enumerate(self.switch_terms)
        }

    def _drifted(self, port: int) -> NDArray:
        rate = self.imperfections.drift_per_reading * self.readings
        top = self.frequency[-1]
        change = (1 + rate * (0.3 + 0.2 * port)) * np.exp(-1j * rate * self.frequency / top)
        box = self.boxes[port].copy()
        box[:, 0, 1] *= change
        box[:, 1, 0] *= change
        return box

    def _connection(self, box: NDArray) -> NDArray:
        """A connection made afresh: a small, smooth reflection and phase of its own."""
        size = self.imperfections.repeatability
        if size == 0:
            return box
        # A gap or a misplaced pin is a small reactance at the plane: its reflection grows as j w.
        reflection = 1j * size * self.frequency / 10e9 * self.rng.normal()
        phase = size * self.frequency / 10e9 * self.rng.normal()
        through = np.sqrt(1 - np.abs(reflection) ** 2) * np.exp(-1j * phase)
        back = -reflection.conj() * np.exp(-2j * phase)
        joint = np.stack([reflection, through, through, back], axis=-1).reshape(-1, 2, 2)
        return cascade(box, joint)

    def _noisy(self, raw: NDArray) -> NDArray:
        def scatter() -> NDArray:
            return (self.rng.normal(size=raw.shape) + 1j * self.rng.normal(size=raw.shape)) / np.sqrt(2)

        return (
            raw * (1 + self.imperfections.trace_noise * scatter())
            + self.imperfections.noise_floor * scatter()
        )


def random_analyzer(
    frequency: NDArray,
    *,
    rng: np.random.Generator,
    ports: int = 2,
    imperfections: Imperfections | None = None,
    first_port_only: bool = False,
) -> Analyzer:
    """An analyzer with smooth, physically plausible ports drawn at random.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    rng : numpy Generator
    ports : int
    imperfections : Imperfections, optional
        The defaults of `Imperfections` when not given.
    first_port_only : bool

    Returns
    -------
    Analyzer
        Directivity near -35 dB, source match near -28 dB, switch terms near -24 dB, leakage near -100 dB, and a
        metre or so of cable.
    """
    f = np.asarray(frequency, dtype=float)
    boxes = np.stack([_box(f, rng) for _ in range(ports)])
    switch_terms = np.stack([_echoes(f, 10 ** (-24 / 20), rng) for _ in range(ports)])
    leakage = np.zeros((f.size, ports, ports), dtype=complex)
    for r in range(ports):
        for d in range(ports):
            if r != d:
                leakage[:, r, d] = _echoes(f, 10 ** (-100 / 20), rng)
    return Analyzer(
        f,
        boxes,
        switch_terms,
        leakage,
        imperfections or Imperfections(),
        rng,
        first_port_only=first_port_only,
    )


def _echoes(f: NDArray, size: float, rng: np.random.Generator, delay_s: float = 0.4e-9) -> NDArray:
    """A few delayed reflections: smooth over frequency and causal."""
    total = np.zeros(f.size, dtype=complex)
    for share in (0.6, 0.3, 0.2):
        total += share * size * rng.choice([-1, 1]) * np.exp(-2j * np.pi * f * rng.uniform(0.05, 1) * delay_s)
    return total


def _box(f: NDArray, rng: np.random.Generator) -> NDArray:
    delay = rng.uniform(3.2e-9, 5.2e-9)
    pad, skin = (share * np.log(10) / 20 for share in (rng.uniform(0.3, 0.6), rng.uniform(0.6, 0.9)))
    # Skin effect turns the phase as much as it damps, or the cable would answer before it is asked.
    cable = np.exp(-pad - (1 + 1j) * skin * np.sqrt(f / 1e9) - 2j * np.pi * f * delay)
    box = np.empty((f.size, 2, 2), dtype=complex)
    box[:, 0, 0] = _echoes(f, 10 ** (-35 / 20), rng)
    box[:, 1, 1] = _echoes(f, 10 ** (-28 / 20), rng)
    # Source and receiver are different hardware: the two directions differ by a smooth real-ish factor.
    ratio = rng.uniform(0.9, 1.1) * np.exp(1j * 0.05 * rng.normal() * f / f[-1])
    box[:, 1, 0], box[:, 0, 1] = cable * ratio, cable / ratio
    return box
