"""Times general SciPy routes to the lowest modes of a tower, for comparison.

    python peers.py DIRECTORY [DIRECTORY ...] [--count 8] [--repeats 7]

Each DIRECTORY holds `K.mtx` and `M.mtx` (Matrix Market, symmetric, freedoms
ordered level by level). Printed per matrix: size, half bandwidth, and the
median wall time of

* eigsh, shift-invert about 0, SuperLU inside (what one writes first);
* eigsh with OPinv from a banded Cholesky (`cholesky_banded`, `cho_solve_banded`);
  with the factor's share of it;
* exact condensation to the freedoms with mass by the same banded factor, then
  dense `eigh`: the route nearest to the program's own.

The periods of the three routes must agree to 1e-8 or the run stops: a fast
wrong answer is no peer. Set OPENBLAS_NUM_THREADS=1 to time one thread.
"""

import argparse
import os
import pathlib
import platform
import statistics
import time

import numpy as np
import scipy
import scipy.io
import scipy.linalg
import scipy.sparse
import scipy.sparse.linalg as sla


def lower_band(K):
    """K in LAPACK lower band storage."""
    lower = scipy.sparse.tril(K).tocoo()
    width = int((lower.row - lower.col).max())
    band = np.zeros((width + 1, K.shape[0]))
    band[lower.row - lower.col, lower.col] = lower.data
    return band


def superlu(K, M, band, count, start):
    return sla.eigsh(K, k=count, M=M, sigma=0.0, which="LM", v0=start)[0]


def banded(K, M, band, count, start):
    factor = scipy.linalg.cholesky_banded(band, lower=True)
    inverse = sla.LinearOperator(
        K.shape, matvec=lambda b: scipy.linalg.cho_solve_banded((factor, True), b), dtype=float
    )
    return sla.eigsh(K, k=count, M=M, sigma=0.0, which="LM", OPinv=inverse, v0=start)[0]


def factor_only(K, M, band, count, start):
    return scipy.linalg.cholesky_banded(band, lower=True)


def condensed(K, M, band, count, start):
    """Flexibility of the freedoms with mass, F = (K^-1)_mm; F^-1 is the condensed K."""
    heavy = np.nonzero(np.asarray(abs(M).sum(axis=0)).ravel() > 0)[0]
    factor = scipy.linalg.cholesky_banded(band, lower=True)
    unit = np.zeros((K.shape[0], heavy.size))
    unit[heavy, np.arange(heavy.size)] = 1.0
    flexibility = scipy.linalg.cho_solve_banded((factor, True), unit)[heavy]
    mass = M[heavy][:, heavy].toarray()
    root = np.linalg.cholesky(mass)
    inner = root.T @ (0.5 * (flexibility + flexibility.T)) @ root
    top = (heavy.size - count, heavy.size - 1)
    return 1.0 / scipy.linalg.eigh(inner, eigvals_only=True, subset_by_index=top)


ROUTES = [
    ("eigsh, shift-invert, SuperLU", superlu),
    ("eigsh, OPinv by banded Cholesky", banded),
    ("  of which cholesky_banded", factor_only),
    ("banded condensation + dense eigh", condensed),
]


def median_time(route, arguments, repeats):
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        answer = route(*arguments)
        times.append(time.perf_counter() - begin)
    return statistics.median(times), answer


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("directories", nargs="+", type=pathlib.Path)
    parser.add_argument("--count", type=int, default=8)
    parser.add_argument("--repeats", type=int, default=7)
    options = parser.parse_args()
    print(f"Python {platform.python_version()}, numpy {np.__version__}, scipy {scipy.__version__}, "
          f"OPENBLAS_NUM_THREADS={os.environ.get('OPENBLAS_NUM_THREADS', 'unset')}, "
          f"median of {options.repeats}, {options.count} modes")
    print(f"| {'matrix':20} | freedoms | half band | {'route':34} | time, ms |")
    print(f"|{'-' * 22}|----------|-----------|{'-' * 36}|----------|")
    for directory in options.directories:
        K, M = (scipy.sparse.csc_matrix(scipy.io.mmread(directory / f"{n}.mtx")) for n in "KM")
        band = lower_band(K)
        heavy = np.asarray(abs(M).sum(axis=0)).ravel() > 0
        start = np.where(heavy, np.cos(np.arange(K.shape[0]) * 1.7), 0.0)
        reference = None
        for name, route in ROUTES:
            seconds, answer = median_time(route, (K, M, band, options.count, start), options.repeats)
            if route is not factor_only:
                values = np.sort(answer)
                reference = values if reference is None else reference
                worst = np.max(np.abs(values / reference - 1))
                if worst > 1e-8:
                    raise SystemExit(f"{directory}: {name} differs by {worst:g}")
            print(f"| {directory.name:20} | {K.shape[0]:8} | {band.shape[0] - 1:9} | {name:34} "
                  f"| {seconds * 1e3:8.2f} |")


if __name__ == "__main__":
    main()
