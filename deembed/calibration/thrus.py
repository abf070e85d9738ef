"""Which thrus there are, whether they connect all ports, and what is said of pairs that have none."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from deembed import words
from deembed.banding import banded_findings
from deembed.errors import SolveError
from deembed.findings import Finding, finding_id

__all__ = ["chain_findings", "check_connected", "known_pairs"]

Pair = tuple[int, int]
# Load match that changes with the drive by more than this makes a followed pair doubtful (common practice, no source).
_SPREAD_LIMIT = 0.02


def check_connected(pairs: Iterable[Pair], ports: Sequence[int]) -> None:
    """Raise SolveError, naming a thru to read, unless thrus connect every port to every other.

    Parameters
    ----------
    pairs : iterable of (int, int)
        Port pairs with a thru.
    ports : sequence of int
    """
    group = {ports[0]}
    pairs = list(pairs)
    for _ in ports:
        group |= {p for pair in pairs if group & set(pair) for p in pair}
    apart = [p for p in ports if p not in group]
    if apart:
        near, far = ports[0], apart[0]
        text = f"no thru reading between ports {near} and {far}"
        if len(ports) > 2:
            joined = words.listed([p for p in ports if p in group])
            text = f"no thru connects port{'s' if len(group) > 1 else ''} {joined} with {words.listed(apart)}"
        raise SolveError(text, where="calibration", do=f"Read the thru with ports [{near}, {far}].")


def known_pairs(ordered: Iterable[Pair], ports: Sequence[int]) -> NDArray:
    """Receive, drive: which ordered pairs (r, d) were read, shape (n, n)."""
    known = np.zeros((len(ports), len(ports)), dtype=bool)
    for r, d in ordered:
        known[ports.index(r), ports.index(d)] = True
    return known


def chain_findings(
    f: NDArray, spread: NDArray, known: NDArray, ports: Sequence[int], thru: str
) -> list[Finding]:
    """A note on the pairs that were followed through others, and a warning where that is doubtful.

    Parameters
    ----------
    f : array of shape (frequency,)
        [Hz].
    spread : array of shape (..., frequency, n)
        From `numeric.thru_chain.load_match_spread`.
    known : bool array of shape (n, n)
    ports : sequence of int
    thru : str
        Id of a thru, for the places.

    Returns
    -------
    list of Finding
        Kinds ``thru-followed`` (a note) and ``load-match-depends`` (a warning, where ``port 3``).
    """
    n = len(ports)
    missing = [(ports[d], ports[r]) for d in range(n) for r in range(d + 1, n) if not known[r, d]]
    if not missing:
        return []
    where = ", ".join(f"{thru} {a}-{b}" for a, b in missing)
    text = (
        f"No thru was read between ports {words.listed(f'{a} and {b}' for a, b in missing)}: their terms are followed "
        "through other ports, which holds only if load match does not depend on which port drives."
    )
    found = [Finding(finding_id("thru-followed", where), "thru-followed", where, "note", text)]
    for k, port in enumerate(ports):
        size = spread[..., k].reshape(-1, f.size).max(axis=0)
        found += banded_findings(
            f,
            size,
            size > _SPREAD_LIMIT,
            kind="load-match-depends",
            where=f"port {port}",
            severity="warning",
            sentence=f"{{start}} the load match of port {port} differs by up to {{worst}} with the port that "
            f"drives{{at}}, so the pairs without a thru ({where}) cannot be followed through others that well: "
            "read their thrus.",
        )
    return found
