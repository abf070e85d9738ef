"""Pictures as plain data: what is drawn, in which unit, and what it says in words.

Made once per outcome and used by plots, report and widgets alike; knows neither matplotlib nor widgets.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import DeembedError
from deembed.findings import Finding

_SAID = {
    "gain": "gain above 1",
    "power-balance": "more power out than in",
    "non-reciprocity": "not reciprocal",
    "lossless": "not lossless",
    "three-way": "three-way law",
    "missing": "no values",
    "not-computed": "no values",
    "disagreement": "readings differ",
}

__all__ = ["Band", "Limit", "Picture", "Reading", "Trace", "bands_of", "one_sweep", "room_around", "s_name"]


@dataclass(frozen=True, eq=False)
class Trace:
    """One curve.

    Parameters
    ----------
    name : str
        Its direct label, e.g. ``S21``.
    x, y : float arrays of shape (frequency,)
        Frequency [Hz] and value in the picture's unit; on a reflection chart real and imaginary part.
    hue, dash : int
        Place in the palette and among the line styles; a pair such as S21 and S12 shares its hue.
    frequency : float array of shape (frequency,)
        Frequency of each point [Hz].
    wraps : bool
        True where the value is cyclic (phase): jumps over half a turn are gaps, not lines.
    """

    name: str
    x: NDArray
    y: NDArray
    hue: int = 0
    dash: int = 0
    frequency: NDArray = field(default_factory=lambda: np.empty(0))
    wraps: bool = False

    def __post_init__(self) -> None:
        for key in ("x", "y"):
            object.__setattr__(self, key, np.asarray(getattr(self, key), dtype=float))
        own = self.frequency if np.size(self.frequency) else self.x
        object.__setattr__(self, "frequency", np.asarray(own, dtype=float))

    @property
    def empty(self) -> bool:
        """True where no point has a value."""
        return not bool(np.any(np.isfinite(self.x) & np.isfinite(self.y)))


@dataclass(frozen=True)
class Limit:
    """A level that means something, e.g. 1 for the gain of a passive part."""

    value: float
    words: str


@dataclass(frozen=True)
class Band:
    """A band of frequencies [Hz] a finding speaks of, with a word to stand beside it."""

    from_hz: float
    to_hz: float
    word: str
    severity: str = "note"
    finding: str = ""


@dataclass(frozen=True)
class Reading:
    """One value read off a picture at one frequency [Hz]."""

    name: str
    value: complex | float
    unit: str
    frequency: float

    @property
    def words(self) -> str:
        """The value as an engineer would write it, e.g. ``S21 -3.52 dB``."""
        if isinstance(self.value, complex):
            text = (
                f"{self.value.real:+.4f} {'+' if self.value.imag >= 0 else '-'} j{abs(self.value.imag):.4f}"
            )
        else:
            text = f"{self.value:.4g}" if np.isfinite(self.value) else "no value"
        return f"{self.name} {text} {self.unit}".strip()


@dataclass(frozen=True, eq=False)
class Picture:
    """Everything a drawing needs.

    Parameters
    ----------
    name : str
        Key in the inventory, e.g. ``part.gain``.
    title, x_label, y_label : str
    traces : tuple of Trace
    unit : str
        Of y, for readouts.
    kind : str
        ``lines`` over frequency, or ``reflection`` (reflection chart).
    limits : tuple of Limit
    bands : tuple of Band
    alt : str
        What the picture shows, in words and with a value or two.
    missing : tuple of str
        Curves that have no value at any frequency, e.g. directions nobody drove.
    y_floor : float, optional
        The axis never starts above this (0 for magnitudes of errors).
    """

    name: str
    title: str
    y_label: str
    traces: tuple[Trace, ...]
    unit: str = ""
    kind: str = "lines"
    x_label: str = "Frequency"
    limits: tuple[Limit, ...] = ()
    bands: tuple[Band, ...] = ()
    alt: str = ""
    missing: tuple[str, ...] = ()
    y_floor: float | None = None

    def __post_init__(self) -> None:
        if self.kind not in ("lines", "reflection"):
            raise DeembedError(f"kind {self.kind!r} is not lines or reflection", where=f"picture {self.name}")
        gone = tuple(t.name for t in self.traces if t.empty)
        object.__setattr__(self, "missing", (*self.missing, *gone))
        object.__setattr__(self, "traces", tuple(t for t in self.traces if not t.empty))

    @property
    def span(self) -> tuple[float, float]:
        """First and last frequency with a grid point [Hz]; (0, 0) when there is nothing to show."""
        if not self.traces:
            return 0.0, 0.0
        return (
            float(min(t.frequency[0] for t in self.traces)),
            float(max(t.frequency[-1] for t in self.traces)),
        )

    def at(self, hz: float) -> tuple[Reading, ...]:
        """Every curve's value at the grid point nearest to a frequency [Hz]; nothing is interpolated."""
        out = []
        for t in self.traces:
            i = int(np.argmin(np.abs(t.frequency - hz)))
            value = complex(t.x[i], t.y[i]) if self.kind == "reflection" else float(t.y[i])
            out.append(Reading(t.name, value, self.unit, float(t.frequency[i])))
        return tuple(out)

    def with_bands(self, bands: Iterable[Band]) -> Picture:
        """The same picture with these bands shaded."""
        return replace(self, bands=tuple(bands))


def s_name(port_out: int, port_in: int) -> str:
    """``S21``; with two-digit ports ``S10,2``."""
    comma = "," if max(port_out, port_in) > 9 else ""
    return f"S{port_out}{comma}{port_in}"


def one_sweep(data: xr.DataArray | xr.Dataset, *, what: str) -> None:
    """Raise unless the data is one sweep: a picture has no place for leading dimensions.

    Raises
    ------
    DeembedError
        Names the dimensions that must be reduced first.
    """
    known = {"frequency", "port_out", "port_in", "pair", "round", "port", "rank", "property"}
    extra = [str(d) for d in data.dims if d not in known]
    if extra:
        raise DeembedError(
            f"{what} also runs along {words.listed(extra)}",
            where="picture",
            do="Select one entry of it or average over it first.",
        )


def room_around(
    from_hz: float, to_hz: float, *, span: Sequence[float], share: float = 0.15
) -> tuple[float, float]:
    """A band with some room on either side, inside a span, so that a finding's edges can be seen.

    Parameters
    ----------
    from_hz, to_hz : float
        Band [Hz]; both may be equal.
    span : (float, float)
        What there is to see [Hz].
    share : float
        Room on each side as a share of the band; a band of one point gets 2 % of the span.

    Returns
    -------
    (float, float)
        [Hz]
    """
    room = max(share * (to_hz - from_hz), 0.02 * (span[1] - span[0]))
    return max(from_hz - room, span[0]), min(to_hz + room, span[1])


def bands_of(findings: Iterable[Finding], *, kinds: Iterable[str] | None = None) -> tuple[Band, ...]:
    """Bands of the findings that have one (notes aside), of some kinds or of all."""
    wanted = None if kinds is None else set(kinds)
    return tuple(
        Band(f.from_hz, f.to_hz, _SAID.get(f.kind, f.kind.replace("-", " ")), f.severity, f.id)
        for f in findings
        if f.from_hz is not None
        and f.to_hz is not None
        and f.severity != "note"
        and (wanted is None or f.kind in wanted)
    )
