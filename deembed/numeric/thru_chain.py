"""Port pairs without a thru of their own, followed through a third port."""

from __future__ import annotations

from dataclasses import replace
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.error_terms import Terms

__all__ = ["complete_pairs", "load_match_spread"]


def complete_pairs(terms: Terms, known: NDArray) -> Terms:
    """Transmission terms of every ordered pair, from those of pairs with a thru.

    Parameters
    ----------
    terms : Terms
        Two-index terms valid where `known`.
    known : bool array of shape (n, n)
        Receive, drive: pairs that were read. Together they must connect all ports.

    Returns
    -------
    Terms
        A missing pair is the mean over all third ports through which it can be followed.

    Notes
    -----
    From boxes and switch terms (Marks 1997) follows tracking_rd = tracking_rk tracking_kd / (reflection_tracking_k
    q_k), q_k = 1 + directivity_k D_k / reflection_tracking_k, D_k = load_match_kd - source_match_k. It holds only if
    what a port sends back does not depend on which port drives; the load match of r is then that read with k driving.
    """
    known = known.copy()
    load, tracking = terms.load_match.copy(), terms.transmission_tracking.copy()
    n_ports = known.shape[0]
    pairs = list(permutations(range(n_ports), 2))
    for _round in range(n_ports):
        found = known.copy()
        for r, d in pairs:
            thirds_ports = [k for k in range(n_ports) if k not in (r, d) and known[r, k] and known[k, d]]
            if known[r, d] or not thirds_ports:
                continue
            by_port = [_through(terms, load, tracking, r, d, k) for k in thirds_ports]
            tracking[..., r, d], load[..., r, d] = (
                np.mean(way, axis=0) for way in zip(*by_port, strict=True)
            )
            found[r, d] = True
        known = found
    return replace(terms, load_match=load, transmission_tracking=tracking)


def _through(
    terms: Terms, load: NDArray, tracking: NDArray, r: int, d: int, k: int
) -> tuple[NDArray, NDArray]:
    reflection, directivity = terms.reflection_tracking[..., k], terms.directivity[..., k]
    with np.errstate(divide="ignore", invalid="ignore"):
        below = reflection + directivity * (load[..., k, d] - terms.source_match[..., k])
        return tracking[..., r, k] * tracking[..., k, d] / below, load[..., r, k]


def load_match_spread(terms: Terms, known: NDArray) -> NDArray:
    """How far the load match of each port depends on the drive, shape (..., n).

    Largest magnitude of the difference to its mean over the drives that were read; zero where only one was.
    """
    spread = np.zeros(terms.directivity.shape)
    for port in range(known.shape[0]):
        drives = np.flatnonzero(known[port])
        if drives.size > 1:
            own = terms.load_match[..., port, drives]
            spread[..., port] = np.abs(own - own.mean(axis=-1, keepdims=True)).max(axis=-1)
    return spread
