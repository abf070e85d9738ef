"""A shell is a 2N-port around an N-port: error boxes and fixtures alike.

Blocks are named outer (toward the analyzer) and inner (toward the part); ``f_oi`` is the response at outer
ports to waves entering at inner ports. One arm per port is the case of diagonal blocks.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.linalg import inverse

__all__ = ["embed", "strip"]


def embed(f_oo: NDArray, f_oi: NDArray, f_io: NDArray, f_ii: NDArray, s: NDArray) -> NDArray:
    """What is seen at the outer ports of a shell with a part inside.

    Parameters
    ----------
    f_oo, f_oi, f_io, f_ii : complex arrays of shape (..., n, n)
        Blocks of the shell.
    s : complex array of shape (..., n, n)
        The part, in the inner ports' reference impedances.

    Returns
    -------
    complex array of shape (..., n, n)
        ``M = F_oo + F_oi S (1 - F_ii S)^-1 F_io``; NaN where part and shell resonate without loss.
    """
    return f_oo + f_oi @ s @ inverse(np.eye(s.shape[-1]) - f_ii @ s) @ f_io


def strip(f_oo: NDArray, f_oi: NDArray, f_io: NDArray, f_ii: NDArray, m: NDArray) -> NDArray:
    """The part inside a shell, from what is seen at its outer ports (the inverse of `embed`).

    Parameters
    ----------
    f_oo, f_oi, f_io, f_ii : complex arrays of shape (..., n, n)
        Blocks of the shell.
    m : complex array of shape (..., n, n)
        Response at the outer ports.

    Returns
    -------
    complex array of shape (..., n, n)
        ``X = F_oi^-1 (M - F_oo) F_io^-1``, ``S = X (1 + F_ii X)^-1``; NaN where nothing passes the shell.
    """
    x = inverse(f_oi) @ (m - f_oo) @ inverse(f_io)
    return x @ inverse(np.eye(m.shape[-1]) + f_ii @ x)
