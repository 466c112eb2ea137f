"""Lowest eigenvalues of K phi = lambda M phi by two independent SciPy routes.

    python solve_modes.py DIRECTORY [--count 12] [--output FILE]

DIRECTORY holds `K.mtx` and `M.mtx`, real symmetric in Matrix Market coordinate
form (Boisvert, Pozo and Remington 1996, NISTIR 5935), SI units. M may be
singular: floors carry mass, walls' vertical displacements do not.

Route 1, sparse: `scipy.sparse.linalg.eigsh` (ARPACK, Lehoucq, Sorensen and Yang
1998) in shift-invert mode about 0, K factored by SuperLU.
Route 2, dense: freedoms without mass are condensed exactly,
K_c = K_mm - K_ms K_ss^-1 K_sm, then `scipy.linalg.eigh` (LAPACK) on K_c, M_mm.

Writes both lists of eigenvalues (rad2/s2), the periods (s), the largest
relative difference between the routes, the residuals of route 1 and the
versions. Fails when the routes differ by more than 1e-7.
"""

import argparse
import json
import pathlib
import platform

import numpy as np
import scipy
import scipy.io
import scipy.linalg
import scipy.sparse
import scipy.sparse.linalg


def read(path):
    """A symmetric matrix; raises when the file holds one that is not."""
    matrix = scipy.sparse.csc_matrix(scipy.io.mmread(path))
    skew = abs(matrix - matrix.T).max()
    if skew > 1e-9 * abs(matrix).max():
        raise SystemExit(f"{path}: not symmetric (largest difference {skew:g})")
    return (0.5 * (matrix + matrix.T)).tocsc()


def carries_mass(M):
    """Freedoms with any entry in M."""
    return np.asarray(abs(M).sum(axis=0)).ravel() > 0


def sparse_route(K, M, count):
    """Eigenvalues, ascending, and relative residuals |K x - l M x| / |K x|."""
    # A fixed start in the range of M: the answer does not vary from run to run.
    start = np.where(carries_mass(M), np.cos(np.arange(K.shape[0]) * 1.7), 0.0)
    values, vectors = scipy.sparse.linalg.eigsh(
        K, k=count, M=M, sigma=0.0, which="LM", mode="normal", v0=start, tol=1e-13
    )
    order = np.argsort(values)
    values, vectors = values[order], vectors[:, order]
    forces = K @ vectors
    residual = np.linalg.norm(forces - (M @ vectors) * values, axis=0)
    return values, residual / np.linalg.norm(abs(K) @ abs(vectors), axis=0)


def dense_route(K, M, count):
    """Eigenvalues, ascending, of the exactly condensed problem."""
    heavy = carries_mass(M)
    m, s = np.nonzero(heavy)[0], np.nonzero(~heavy)[0]
    condensed = K[m][:, m].toarray()
    if s.size:
        coupling = K[s][:, m].toarray()
        rest = K[s][:, s].toarray()
        condensed -= coupling.T @ scipy.linalg.solve(rest, coupling, assume_a="pos")
    condensed = 0.5 * (condensed + condensed.T)
    return scipy.linalg.eigh(
        condensed, M[m][:, m].toarray(), eigvals_only=True, subset_by_index=(0, count - 1)
    )


def solve(K, M, count):
    """The record that is written as JSON."""
    count = min(count, int(carries_mass(M).sum()) - 1)
    sparse, residual = sparse_route(K, M, count)
    dense = dense_route(K, M, count)
    difference = float(np.max(np.abs(sparse / dense - 1)))
    if difference > 1e-7:
        raise SystemExit(f"the two routes differ by {difference:g}: {sparse} against {dense}")
    return {
        "made_with": {
            "python": platform.python_version(), "numpy": np.__version__, "scipy": scipy.__version__,
        },
        "freedoms": K.shape[0],
        "freedoms_with_mass": int(carries_mass(M).sum()),
        "eigenvalues_rad2_s2": [float(v) for v in dense],
        "eigenvalues_sparse_route": [float(v) for v in sparse],
        "periods_s": [float(2 * np.pi / np.sqrt(v)) for v in dense],
        "largest_relative_difference": difference,
        "largest_residual": float(residual.max()),
    }


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("directory", type=pathlib.Path)
    parser.add_argument("--count", type=int, default=12)
    parser.add_argument("--output", type=pathlib.Path, help="default: DIRECTORY/modes.json")
    arguments = parser.parse_args()
    K, M = read(arguments.directory / "K.mtx"), read(arguments.directory / "M.mtx")
    record = solve(K, M, arguments.count)
    output = arguments.output or arguments.directory / "modes.json"
    output.write_text(json.dumps(record, indent=1) + "\n")
    print(f"{output}: {len(record['periods_s'])} modes, first period {record['periods_s'][0]:.6f} s, "
          f"routes differ by {record['largest_relative_difference']:.1e}")


if __name__ == "__main__":
    main()
