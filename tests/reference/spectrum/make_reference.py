"""Writes `values.json`: a response-spectrum analysis by another road.

An invented eccentric tower of twelve storeys: three cantilever walls that bend
as Timoshenko beams and share rigid floors. Every wall is a chain of beam
elements on its own rotations; rotations are condensed; modes come from
`scipy.linalg.eigh`. Storey drifts at the ends of the floors and the base shear
are combined by CQC (Wilson, Der Kiureghian and Bayo 1981) under the spectrum of
IS 1893 (Part 1):2016 6.4.2. As a check of the modal sums, the response to a
short base pulse is found twice: by superposition of the modes, and by direct
integration of the condensed equations with `scipy.integrate.solve_ivp`.

    python make_reference.py
"""

import json
import pathlib
import platform

import numpy as np
import scipy
import scipy.integrate
import scipy.linalg

STOREYS, HEIGHT = 12, 3.5  # m
E, NU = 30e9, 0.2  # Pa
MASS, INERTIA = 4.0e5, 3.2e7  # kg, kg m2 about the mass centre
CENTRE = (0.8, -0.5)  # of mass, m
# Walls: from, to (m), thickness (m).
WALLS = [((-7.0, -6.0), (-1.0, -6.0), 0.3), ((-4.0, 7.0), (3.0, 7.0), 0.25), ((8.0, -4.0), (8.0, 4.0), 0.35)]
EXTENT = (10.0, 8.0)  # half sides, m
DAMPING = 0.05
ZONE, IMPORTANCE, REDUCTION = 0.24, 1.2, 4.0
G = 9.80665


def beam(bending, shear, h):
    """Timoshenko element on (u, rotation) below and above; rotation = du/dz in
    bending (Przemieniecki 1968, Theory of Matrix Structural Analysis, 5.6)."""
    p = 12 * bending / (shear * h * h)
    return bending / (h**3 * (1 + p)) * np.array([
        [12, 6 * h, -12, 6 * h],
        [6 * h, (4 + p) * h * h, -6 * h, (2 - p) * h * h],
        [-12, -6 * h, 12, -6 * h],
        [6 * h, (2 - p) * h * h, -6 * h, (4 + p) * h * h],
    ])


def condensed():
    """Stiffness on [ux, uy, theta] of levels 1 to N."""
    floors = 3 * STOREYS
    size = floors + len(WALLS) * STOREYS
    K = np.zeros((size, size))
    shear = E / (2 * (1 + NU))
    for w, (a, b, t) in enumerate(WALLS):
        a, b = np.array(a), np.array(b)
        length = np.linalg.norm(b - a)
        c, s = (b - a) / length
        x, y = (a + b) / 2
        seen = np.array([c, s, s * x - c * y])  # displacement along the wall
        for k in range(STOREYS):
            B = np.zeros((4, size))
            for end, level in enumerate((k, k + 1)):
                if level > 0:
                    B[2 * end, 3 * (level - 1) : 3 * level] = seen
                    B[2 * end + 1, floors + w * STOREYS + level - 1] = 1.0
            K += B.T @ beam(E * t * length**3 / 12, 5 / 6 * shear * t * length, HEIGHT) @ B
            # St Venant's torsion of the strip.
            twist = np.zeros(size)
            twist[3 * k + 2] = 1.0
            if k > 0:
                twist[3 * (k - 1) + 2] = -1.0
            K += shear * length * t**3 / (3 * HEIGHT) * np.outer(twist, twist)
    ff, fr, rr = K[:floors, :floors], K[:floors, floors:], K[floors:, floors:]
    return ff - fr @ np.linalg.solve(rr, fr.T)


def masses():
    x, y = CENTRE
    floor = MASS * np.array([[1, 0, -y], [0, 1, x], [-y, x, x * x + y * y]])
    floor[2, 2] += INERTIA
    return np.kron(np.eye(STOREYS), floor)


def spectrum(period):
    """Sa/g of medium soil."""
    if period < 0.1:
        shape = 1 + 15 * period
    elif period <= 0.55:
        shape = 2.5
    elif period <= 4.0:
        shape = 1.36 / period
    else:
        shape = 0.34
    return ZONE / 2 * IMPORTANCE / REDUCTION * shape * G


def correlation(b):
    z = DAMPING
    return 8 * z**2 * (1 + b) * b**1.5 / ((1 - b**2) ** 2 + 4 * z**2 * b * (1 + b) ** 2)


def probes(axis):
    """Rows that give storey drifts at both ends, bottom to top."""
    rows = []
    for k in range(STOREYS):
        for sign in (-1, 1):
            seen = [1, 0, -sign * EXTENT[1]] if axis == 0 else [0, 1, sign * EXTENT[0]]
            row = np.zeros(3 * STOREYS)
            row[3 * k : 3 * k + 3] = seen
            if k > 0:
                row[3 * k - 3 : 3 * k] -= seen
            rows.append(row / HEIGHT)
    return np.array(rows)


def pulse(t):
    return np.sin(np.pi * t / 0.4) if t < 0.4 else 0.0


def superposition_agrees(K, M, values, shapes, r):
    """Undamped top displacement after a base pulse, by modes and directly."""
    end = 1.3
    at = np.linspace(0, end, 3001)
    by_modes = np.zeros(len(K))
    for value, shape in zip(values, shapes.T):
        omega = np.sqrt(value)
        answer = np.array([pulse(t) for t in at]) * np.sin(omega * (end - at)) / omega
        by_modes += shape * -(shape @ M @ r) * scipy.integrate.simpson(answer, x=at)
    solve = scipy.linalg.lu_factor(M)
    n = len(K)

    def rate(t, q):
        return np.concatenate([q[n:], -scipy.linalg.lu_solve(solve, K @ q[:n]) - r * pulse(t)])

    run = scipy.integrate.solve_ivp(
        rate, (0, end), np.zeros(2 * n), method="DOP853", rtol=1e-9, atol=1e-12, max_step=0.02
    )
    direct = run.y[:n, -1]
    return float(np.abs(direct - by_modes).max() / np.abs(direct).max())


def main():
    K, M = condensed(), masses()
    values, shapes = scipy.linalg.eigh(K, M)
    out = {
        "versions": {"python": platform.python_version(), "numpy": np.__version__, "scipy": scipy.__version__},
        "periods_s": (2 * np.pi / np.sqrt(values[:6])).tolist(),
    }
    # As many modes as the program takes where nine tenths of the mass are in fewer.
    kept = slice(0, 12)
    all_values, all_shapes = values, shapes
    values, shapes = values[kept], shapes[:, kept]
    omega = np.sqrt(values)
    rho = np.array([[correlation(b / a) for b in omega] for a in omega])
    for axis, name in enumerate("xy"):
        r = np.tile(np.eye(3)[axis], STOREYS)
        gamma = shapes.T @ M @ r
        acceleration = np.array([spectrum(2 * np.pi / w) for w in omega])
        drifts = probes(axis) @ shapes * (gamma * acceleration / values)
        shears = gamma**2 * acceleration
        combine = lambda parts: float(np.sqrt(parts @ rho @ parts))
        out[name] = {
            "base_shear_n": combine(shears),
            "storey_drift": [combine(parts) for parts in drifts],
            "superposition_error": superposition_agrees(K, M, all_values, all_shapes, r),
        }
        if out[name]["superposition_error"] > 1e-4:
            raise SystemExit("modes and direct integration part")
    path = pathlib.Path(__file__).parent / "values.json"
    path.write_text(json.dumps(out, indent=1) + "\n")


if __name__ == "__main__":
    main()
