"""Plain numpy kernels on ``(..., n, n)`` arrays: no labels, only numpy and scipy."""
