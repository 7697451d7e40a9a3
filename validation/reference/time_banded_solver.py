"""Times LAPACK's general banded solver (dgbsv) on a matrix of the chain's shape, for DEVELOPERS.md.

500 nodes of three unknowns: order 1500, five diagonals below and above. The time of an LU factorisation with partial
pivoting does not depend on the values beyond the pivots it chooses; the matrix here is diagonally weighted like the
solver's own, so that it pivots seldom. The right-hand side is included, the copy of the matrix is subtracted.

Run: OPENBLAS_NUM_THREADS=1 python validation/reference/time_banded_solver.py
"""

import time

import numpy
from scipy.linalg.lapack import dgbsv

NODES, WIDTH = 500, 5


def fastest(function, repetitions=300):
    """The shortest of many runs, seconds."""
    best = float("inf")
    for _ in range(repetitions):
        begun = time.perf_counter()
        function()
        best = min(best, time.perf_counter() - begun)
    return best


def main():
    rng = numpy.random.default_rng(1)
    order = 3 * NODES
    band = rng.standard_normal((3 * WIDTH + 1, order))
    band[2 * WIDTH] += 12.0
    band = numpy.asfortranarray(band)
    rhs = rng.standard_normal((order, 1))
    work, x = band.copy(order="F"), rhs.copy()

    def copy():
        work[...] = band
        x[...] = rhs

    def solve():
        copy()
        dgbsv(WIDTH, WIDTH, work, x, overwrite_ab=True, overwrite_b=True)

    seconds = fastest(solve) - fastest(copy)
    print(f"dgbsv: {seconds * 1e6:.1f} us for {NODES} nodes, {seconds / NODES * 1e9:.0f} ns a node")


main()
