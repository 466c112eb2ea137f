"""Writes `cantilever/K.mtx` and `M.mtx`: a small tower that has a closed form.

Twenty-four Bernoulli beam elements stand up from a fixed base, with masses on
the translations only (rotations carry none, so M is singular as in a tower),
in two uncoupled planes: EI along Y is `RATIO` times that along X. Twist is a
St Venant shaft on polar masses: a chain of equal springs and masses, with half
a mass at the top, whose eigenvalues are 4 k/I sin^2((2 j - 1) pi/(4 n)).

    python make_cantilever.py && python solve_modes.py cantilever
"""

import pathlib

import numpy as np
import scipy.io
import scipy.sparse

LEVELS, HEIGHT = 24, 3.5  # storeys, m
EI, RATIO, GJ = 4.0e12, 1.7, 9.0e11  # N m2, -, N m2
MASS, INERTIA = 6.0e5, 5.0e7  # kg, kg m2 at each floor; half of both at the top


def beam(stiffness, h):
    """Bernoulli element on (u, rotation) below and above; rotation = du/dz."""
    return stiffness / h**3 * np.array([
        [12, 6 * h, -12, 6 * h],
        [6 * h, 4 * h * h, -6 * h, 2 * h * h],
        [-12, -6 * h, 12, -6 * h],
        [6 * h, 2 * h * h, -6 * h, 4 * h * h],
    ])


def matrices():
    """K and M; freedoms of a level: ux, uy, theta, rotation of X, rotation of Y."""
    n = 5 * (LEVELS + 1)
    K = np.zeros((n, n))
    for k in range(LEVELS):
        below, above = 5 * k, 5 * k + 5
        for u, r, stiffness in ((0, 3, EI), (1, 4, RATIO * EI)):
            at = [below + u, below + r, above + u, above + r]
            K[np.ix_(at, at)] += beam(stiffness, HEIGHT)
        at = [below + 2, above + 2]
        K[np.ix_(at, at)] += GJ / HEIGHT * np.array([[1, -1], [-1, 1]])
    mass = np.zeros(n)
    for k in range(1, LEVELS + 1):
        share = 0.5 if k == LEVELS else 1.0
        mass[5 * k:5 * k + 3] = share * MASS, share * MASS, share * INERTIA
    return K[5:, 5:], np.diag(mass[5:])


def main():
    folder = pathlib.Path(__file__).parent / "cantilever"
    folder.mkdir(exist_ok=True)
    for name, matrix in zip("KM", matrices()):
        scipy.io.mmwrite(folder / f"{name}.mtx", scipy.sparse.coo_matrix(matrix),
                         symmetry="symmetric", precision=17,
                         comment=" made by make_cantilever.py (invented data, SI units)")


if __name__ == "__main__":
    main()
