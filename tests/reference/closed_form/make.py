"""Recomputes classical closed-form and numerical reference values: `values.json`.

    python make.py

Every quantity is computed by two independent routes where two exist (named in
the function), and the script stops when they part by more than the tolerance
stated there. Om = omega H^2 sqrt(m/EI) throughout; z runs up from the base,
x down from the top. Sources stand at each function and in the JSON.
"""

import json
import pathlib
import platform

import numpy as np
import scipy
from numpy.polynomial import Legendre, Polynomial
from scipy.integrate import solve_bvp
from scipy.linalg import eigh, expm
from scipy.optimize import brentq, minimize, root

FLEXURE = 1.8751040687119611  # first root of cos x cosh x = -1


def agree(what, first, second, tolerance):
    """Stops unless two routes agree, relative to the larger."""
    first, second = np.asarray(first, float), np.asarray(second, float)
    gap = np.max(np.abs(first - second) / np.maximum(np.abs(first), 1e-300))
    if gap > tolerance:
        raise SystemExit(f"{what}: routes differ by {gap:g}: {first} against {second}")


def roots(function, start, step, count):
    """The first `count` sign changes of `function` above `start`."""
    found, low = [], start
    while len(found) < count:
        high = low + step
        if function(low) * function(high) < 0:
            found.append(brentq(function, low, high, xtol=1e-14, rtol=1e-14))
        low = high
    return found


def rounded(value, digits=12):
    if isinstance(value, dict):
        return {str(k): rounded(v, digits) for k, v in value.items()}
    if isinstance(value, (list, tuple, np.ndarray)):
        return [rounded(v, digits) for v in value]
    if isinstance(value, (float, np.floating)):
        return float(f"{value:.{digits}g}")
    return int(value) if isinstance(value, np.integer) else value


# ---------------------------------------------------------------- beams

def ritz(terms, quadrature=160):
    """z^2 P_k(2 z - 1) and its first two derivatives at Gauss points of [0, 1]."""
    at, weight = np.polynomial.legendre.leggauss(quadrature)
    at, weight = 0.5 * (at + 1), 0.5 * weight
    legendre = [Legendre.basis(k, [0, 1]) for k in range(terms)]
    p = np.array([l(at) for l in legendre])
    dp = np.array([l.deriv()(at) if k else 0 * at for k, l in enumerate(legendre)])
    ddp = np.array([l.deriv(2)(at) if k > 1 else 0 * at for k, l in enumerate(legendre)])
    w = at**2 * p
    dw = 2 * at * p + at**2 * dp
    ddw = 2 * p + 4 * at * dp + at**2 * ddp
    return at, weight, w, dw, ddw


def wall_frame():
    """Flexure and shear in parallel, EI w'''' - GA w'' = m omega^2 w, a = H sqrt(GA/EI).

    Route 1: frequency equation, with mu^2 = lam^2 + a^2,
    2 + (2 + a^4/(lam mu)^2) cos lam cosh mu + a^2/(lam mu) sin lam sinh mu = 0, Om = lam mu
    (Heidebrecht and Stafford Smith 1973, J. Struct. Div. ASCE 99; Rutenberg 1975).
    Route 2: Rayleigh-Ritz with 30 polynomials. Tolerance 1e-9.
    Modal data (effective mass and height, Gamma phi_top) from route 2."""
    at, weight, w, dw, ddw = ritz(30)
    table = []
    for a in (0, 0.5, 1, 2, 3, 4, 5, 6, 8, 10, 20, 30):
        def equation(lam):
            mu = np.hypot(lam, a)
            # divided by cosh mu, so that it does not overflow
            return 2 / np.cosh(mu) + (2 + a**4 / (lam * mu) ** 2) * np.cos(lam) \
                + a**2 / (lam * mu) * np.sin(lam) * np.tanh(mu)
        lam = np.array(roots(equation, 0.05, 0.05, 3))
        om = lam * np.hypot(lam, a)
        K = (ddw * weight) @ ddw.T + a**2 * (dw * weight) @ dw.T
        M = (w * weight) @ w.T
        # 1/lambda as the eigenvalue: rounding then spares the lowest modes.
        inverse, vectors = eigh(M, K)
        inverse, vectors = inverse[::-1], vectors[:, ::-1]
        agree(f"wall-frame a={a}", om, inverse[:3] ** -0.5, 1e-9)
        row = {"a": a, "lambda1": lam[0], "om": om, "t1_over_flexure": FLEXURE**2 / om[0]}
        modal = []
        for v in vectors.T[:4]:
            phi = v @ w
            norm, first, moment = (np.sum(weight * f) for f in (phi**2, phi, phi * at))
            top = 1.0 * v.sum()  # every shape is 1 at z = 1
            modal.append({"effective_mass": first**2 / norm, "effective_height": moment / first,
                          "gamma_phi_top": first / norm * top})
        row["modal"] = modal
        table.append(row)
    agree("flexural cantilever", table[0]["om"][0], FLEXURE**2, 1e-12)
    return table


def first_states(system, top_rows, base_columns):
    """det of the fundamental matrix' block that must vanish for a natural frequency."""
    return np.linalg.det(system[np.ix_(top_rows, base_columns)])


def timoshenko():
    """Flexure and shear in series without rotary inertia, s2 = EI/(k GA H^2).

    Route 1: fundamental matrix of (w, psi, M, V), w' = psi + s2 V, psi' = M, M' = -V,
    V' = -Om^2 w, free top (Timoshenko 1921, Phil. Mag. 41). Route 2: Ritz on w and psi
    (22 polynomials each). Tolerance 1e-9. Dunkerley's bound beside."""
    at, weight = np.polynomial.legendre.leggauss(80)
    at, weight = 0.5 * (at + 1), 0.5 * weight
    n = 22
    basis = [Legendre.basis(k, [0, 1]) for k in range(n)]
    p = np.array([at * l(at) for l in basis])
    dp = np.array([l(at) + at * (l.deriv()(at) if k else 0 * at) for k, l in enumerate(basis)])
    table = []
    for s2 in (0.0025, 0.01, 0.04):
        def residual(om):
            A = np.array([[0, 1, 0, s2], [0, 0, 1, 0], [0, 0, 0, -1], [-om**2, 0, 0, 0.0]])
            return first_states(expm(A), [2, 3], [2, 3])
        om = roots(residual, 0.5, 0.5, 3)
        shear = 1 / s2
        K = np.block([
            [shear * (dp * weight) @ dp.T, -shear * (dp * weight) @ p.T],
            [-shear * (p * weight) @ dp.T, (dp * weight) @ dp.T + shear * (p * weight) @ p.T],
        ])
        M = np.zeros_like(K)
        M[:n, :n] = (p * weight) @ p.T
        inverse = eigh(M, K, eigvals_only=True)[::-1][:3]
        agree(f"Timoshenko s2={s2}", om, inverse**-0.5, 1e-9)
        bound = (1 / FLEXURE**4 + s2 / (np.pi / 2) ** 2) ** -0.5
        table.append({"s2": s2, "om": om, "dunkerley_om1": bound})
    return table


def hermite(stiffness, mass, count):
    """Om of a unit cantilever of equal Bernoulli elements with consistent mass."""
    return lowest_pairs(*hermite_matrices(stiffness, mass), count)[0]


def lowest_pairs(K, M, count):
    """Om and shapes of the lowest modes; solved for 1/lambda, which spares them rounding."""
    n = len(K)
    inverse, vectors = eigh(M, K, subset_by_index=(n - count, n - 1))
    om = inverse[::-1] ** -0.5
    return om, vectors[:, ::-1] * om  # unit generalised mass


def hermite_matrices(stiffness, mass):
    n = len(stiffness)
    h = 1 / n
    k = np.array([[12, 6 * h, -12, 6 * h], [6 * h, 4 * h * h, -6 * h, 2 * h * h],
                  [-12, -6 * h, 12, -6 * h], [6 * h, 2 * h * h, -6 * h, 4 * h * h]]) / h**3
    m = h / 420 * np.array([[156, 22 * h, 54, -13 * h], [22 * h, 4 * h * h, 13 * h, -3 * h * h],
                            [54, 13 * h, 156, -22 * h], [-13 * h, -3 * h * h, -22 * h, 4 * h * h]])
    K, M = np.zeros((2, 2 * n + 2, 2 * n + 2))
    for e in range(n):
        at = slice(2 * e, 2 * e + 4)
        K[at, at] += stiffness[e] * k
        M[at, at] += mass[e] * m
    return K[2:, 2:], M[2:, 2:]


def lumped_floors():
    """Cantilever with its mass as m H/n at n equal levels, top included.

    Ratio of Om1 to the continuous 3.516. Route 1: flexibility matrix
    z_i^2 (3 z_j - z_i)/6. Route 2: exact Bernoulli elements, masses on translations,
    rotations condensed. Tolerance 1e-9. Zalka's factor sqrt(n/(n + 2.06)) beside
    (Zalka 2000, Global Structural Analysis of Buildings; from memory)."""
    table = []
    for n in (5, 10, 12, 16, 20, 30, 40, 60):
        z = np.arange(1, n + 1) / n
        low, high = np.minimum.outer(z, z), np.maximum.outer(z, z)
        F = low**2 * (3 * high - low) / 6
        om = (np.linalg.eigvalsh(F)[-1] / n) ** -0.5
        K, _ = hermite_matrices(np.ones(n), np.zeros(n))
        w, r = slice(0, None, 2), slice(1, None, 2)
        K = K[w, w] - K[w, r] @ np.linalg.solve(K[r, r], K[r, w])
        agree(f"lumped n={n}", om, np.sqrt(np.linalg.eigvalsh(K)[0] * n), 1e-8)
        table.append({"floors": n, "ratio": om / FLEXURE**2, "zalka": np.sqrt(n / (n + 2.06))})
    return table


def stepped():
    """Cantilevers of equal zones with stepped EI.

    Route 1: product of the zones' fundamental matrices of (w, w', M, V). Route 2: 240
    Bernoulli elements with consistent mass. Tolerance 1e-7."""
    rows = [
        ("EI top half / bottom half .25, uniform mass", [1, 0.25], [1, 1], 2),
        ("EI top half / bottom half .5, uniform mass", [1, 0.5], [1, 1], 2),
        ("EI top half / bottom half .75, uniform mass", [1, 0.75], [1, 1], 2),
        ("EI and mass of top half .25", [1, 0.25], [1, 0.25], 1),
        ("EI and mass of top half .5", [1, 0.5], [1, 0.5], 1),
        ("EI and mass of top half .75", [1, 0.75], [1, 0.75], 1),
        ("EI 1 .75 .5 .25, uniform mass", [1, 0.75, 0.5, 0.25], [1] * 4, 2),
        ("EI 1 .75 .5 .25, mass .7 + .3 k", [1, 0.75, 0.5, 0.25],
         [1, 0.925, 0.85, 0.775], 2),
    ]
    table = []
    for name, stiffness, mass, count in rows:
        n = len(stiffness)

        def residual(om):
            total = np.eye(4)
            for ei, m in zip(stiffness, mass):
                A = np.array([[0, 1, 0, 0], [0, 0, 1 / ei, 0], [0, 0, 0, 1], [m * om**2, 0, 0, 0.0]])
                total = expm(A / n) @ total
            return first_states(total, [2, 3], [2, 3])
        om = roots(residual, 0.5, 0.25, count)
        each = 240 // n
        agree(name, om, hermite(np.repeat(stiffness, each), np.repeat(mass, each), count), 1e-7)
        table.append({"case": name, "ei": stiffness, "mass": mass, "om": om})
    return table


def wall_frame_static():
    """Wall-frame, or warping with St Venant torsion, under uniform load, a = H sqrt(GA/EI).

    top = (w H^4/8 EI) K1, base moment (bimoment) = (w H^2/2) K2, largest slope
    = (w H^3/6 EI) K3 at z/H (Stafford Smith and Coull 1991, ch. 11). Closed form for K1, K2;
    Ritz polynomials as second route (tolerance 1e-8) and for K3."""
    n = 30
    at, weight, w, dw, ddw = ritz(n)
    legendre = [Legendre.basis(k, [0, 1]) for k in range(n)]
    table = []
    for a in (1, 2, 3, 4, 6, 8, 10):
        sinh, cosh = np.sinh(a), np.cosh(a)
        K1 = 8 / a**4 * ((a * sinh + 1) * (cosh - 1) / cosh - a * sinh + a**2 / 2)
        K2 = 2 / a**2 * ((a * sinh + 1) / cosh - 1)
        q = np.linalg.solve((ddw * weight) @ ddw.T + a**2 * (dw * weight) @ dw.T, w @ weight)
        agree("wall-frame static", [K1, K2], [8 * q.sum(), 4 * q @ (-1.0) ** np.arange(n)], 1e-8)

        def slope(z):
            return sum(c * (2 * z * l(z) + (z * z * l.deriv()(z) if k else 0.0))
                       for k, (c, l) in enumerate(zip(q, legendre)))
        best = minimize(lambda z: -slope(z[0]), [0.5], method="Nelder-Mead",
                        options={"xatol": 1e-10, "fatol": 1e-14}).x[0]
        table.append({"a": a, "K1": K1, "K2": K2, "K3": 6 * slope(best), "z_over_h": best})
    return table


# ---------------------------------------------------------------- outriggers

def outrigger_moments(x, omega, rotation):
    """Moments M_i, in units with S = H = 1, of outriggers x_i from the top."""
    A = 1 - np.maximum.outer(x, x) + omega * np.eye(len(x))
    return np.linalg.solve(A, rotation(x))


LOADS = {
    # name: (free rotation at x from the top, free top drift, base moment); EI = H = w = 1
    "uniform": (lambda x: (1 - x**3) / 6, 1 / 8, 1 / 2),
    # load w (1 - x), greatest at the top: M = x^2/2 - x^3/6
    "triangle": (lambda x: (1 - x**3) / 6 - (1 - x**4) / 24, 1 / 8 - 1 / 30, 1 / 3),
    "point": (lambda x: (1 - x**2) / 2, 1 / 3, 1.0),
}


def outrigger_benefit(x, omega, load):
    rotation, drift, base = LOADS[load]
    x = np.asarray(x, float)
    M = outrigger_moments(x, omega, rotation)
    return M @ (1 - x**2) / 2 / drift, M.sum() / base


def outrigger_optimum(n, omega, load="uniform"):
    start = np.arange(1, n + 1) / (n + 1) * 0.9
    answer = minimize(lambda x: -outrigger_benefit(x, omega, load)[0], start, method="Nelder-Mead",
                      options={"xatol": 1e-11, "fatol": 1e-15, "maxiter": 20000, "maxfev": 20000})
    # Nelder-Mead cannot see below sqrt(eps): finish by Newton on the gradient.
    x = answer.x

    def gradient(x):
        step = 1e-5
        return np.array([
            (8 * (outrigger_benefit(x + step * e, omega, load)[0]
                  - outrigger_benefit(x - step * e, omega, load)[0])
             - outrigger_benefit(x + 2 * step * e, omega, load)[0]
             + outrigger_benefit(x - 2 * step * e, omega, load)[0]) / (12 * step)
            for e in np.eye(n)])
    for _ in range(4):
        jacobian = np.array([(gradient(x + 1e-4 * e) - gradient(x - 1e-4 * e)) / 2e-4
                             for e in np.eye(n)])
        x = x - np.linalg.solve(jacobian, gradient(x))
    return np.sort(x)


def outrigger_levels():
    """Optimum levels x_i/H from the top for least top drift (Stafford Smith and Salim 1981,
    J. Struct. Div. ASCE 107(10); Stafford Smith and Coull 1991, ch. 14).

    R = drift reduction/free drift x (1 + alpha), Q = sum M_i/base moment x (1 + alpha).
    Compatibility equations maximised numerically. Checks: one rigid outrigger is the root of
    4 x^3 + 3 x^2 = 1; point load at top has odd multiples of 1/(2 n + 1); two rigid ones are
    McNabb and Muvdi's .312 and .685 (1975, Eng. J. AISC 12(3), from memory)."""
    table = []
    for load, pairs in (
        ("uniform", [(n, om) for n in (1, 2, 3, 4) for om in (0, 0.1, 0.2, 0.5, 1)]),
        ("triangle", [(n, 0) for n in (1, 2, 3, 4)] + [(n, om) for n in (1, 2) for om in (0.2, 0.5)]),
        ("point", [(n, 0) for n in (1, 2, 3)]),
    ):
        for n, omega in pairs:
            x = outrigger_optimum(n, omega, load)
            R, Q = outrigger_benefit(x, omega, load)
            rule, _ = outrigger_benefit(np.arange(1, n + 1) / (n + 1), omega, load)
            table.append({"load": load, "n": n, "omega": omega, "x_over_h": x, "R": R, "Q": Q,
                          "rule_over_best": rule / R})
            if load == "point":
                agree("point load", x, (2 * np.arange(1, n + 1) - 1) / (2 * n + 1), 1e-7)
    agree("one outrigger", table[0]["x_over_h"][0],
          brentq(lambda x: 4 * x**3 + 3 * x**2 - 1, 0, 1), 1e-7)
    fixed = {str(x): outrigger_benefit([x], 0, "uniform")[0] for x in (0, 0.25, 0.5, 0.75)}
    return {"optimum": table, "one_rigid_at_fixed_place_R": fixed}


def outrigger_example():
    """Tower of 240 m with one, two or three outriggers, kN and m (invented sizes).

    Route 1: compatibility equations. Route 2: plane frame of Bernoulli elements for the core,
    bars for the columns (mirror symmetric: v on one side, -v on the other), and a rotational
    spring 1/S1 between core rotation and 2 v/d. Tolerance 1e-8."""
    H, EI, EA, d, EIo, w = 240.0, 35e6 * 1800, 35e6 * 2.0, 36.0, 35e6 * 20, 60.0
    S, S1 = 1 / EI + 2 / (d**2 * EA), d / (12 * EIo)
    alpha, beta = 2 * EI / (d**2 * EA), EI / EIo * d / H
    out = {"height_m": H, "core_ei_knm2": EI, "column_ea_kn": EA, "arm_d_m": d,
           "outrigger_ei_knm2": EIo, "load_kn_per_m": w, "alpha": alpha, "beta": beta,
           "omega": beta / (12 * (1 + alpha)), "free_drift_m": w * H**4 / (8 * EI), "schemes": []}
    agree("omega", out["omega"], S1 / (S * H), 1e-12)
    for x in ([110.0], [75.0, 165.0], [60.0, 130.0, 185.0]):
        x = np.array(x)
        A = S * (H - np.maximum.outer(x, x)) + S1 * np.eye(len(x))
        M = np.linalg.solve(A, w * (H**3 - x**3) / (6 * EI))
        drift = w * H**4 / (8 * EI) - M @ (H**2 - x**2) / (2 * EI)
        base = w * H**2 / 2 - M.sum()
        agree("outrigger frame", np.r_[M, drift], outrigger_frame(H, EI, EA, d, S1, w, x), 1e-8)
        out["schemes"].append({"x_from_top_m": x, "moments_knm": M, "top_drift_m": drift,
                               "base_core_moment_knm": base})
    return out


def outrigger_frame(H, EI, EA, d, S1, w, x):
    n = 48
    h = H / n
    K, _ = hermite_matrices(np.ones(n), np.zeros(n))
    scale = np.ones(2 * n)
    scale[1::2] = H  # unit-length rotations are H times the true ones
    K = EI / H**3 * K * np.outer(scale, scale)
    load = np.zeros(2 * n)
    load[0::2] = w * h
    load[-2] = w * h / 2
    load[-1] = -w * h**2 / 12
    size = 2 * n + len(x)
    full, force = np.zeros((size, size)), np.r_[load, np.zeros(len(x))]
    full[:2 * n, :2 * n] = K
    order = np.argsort(-x)  # lowest outrigger first
    below, z_below = None, 0.0
    for i in order:
        z = H - x[i]
        v = 2 * n + i
        bar = 2 * EA / (z - z_below)  # two columns
        full[v, v] += bar
        if below is not None:
            full[below, below] += bar
            full[v, below] -= bar
            full[below, v] -= bar
        below, z_below = v, z
        theta = 2 * (round(z / h) - 1) + 1
        row = np.zeros(size)
        row[theta], row[v] = 1.0, -2 / d
        full += np.outer(row, row) / S1
    q = np.linalg.solve(full, force)
    moments = [(q[2 * (round((H - xi) / h) - 1) + 1] - 2 / d * q[2 * n + i]) / S1
               for i, xi in enumerate(x)]
    return np.r_[moments, q[2 * n - 2]]


def outrigger_dynamics():
    """First Om of a uniform cantilever with a rotational spring kappa EI/H at height z.

    Fundamental matrices below and above; at the spring M drops by kappa times the slope.
    Route 2: 120 Bernoulli elements. Tolerance 1e-7. `rigid`: slope held at z."""
    table = []
    for z in (0.25, 0.5, 0.6, 0.75, 1.0):
        row = {}
        for kappa in (1, 2, 5, 10, 50, "rigid"):
            def residual(om):
                A = np.array([[0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1], [om**2, 0, 0, 0.0]])
                below, above = expm(A * z), expm(A * (1 - z))
                if kappa == "rigid":  # unknowns: M and V at the base, the spring's moment
                    total = above @ below
                    return np.linalg.det(np.array([
                        [below[1, 2], below[1, 3], 0],
                        [total[2, 2], total[2, 3], above[2, 2]],
                        [total[3, 2], total[3, 3], above[3, 2]]]))
                jump = np.eye(4)
                jump[2, 1] = kappa
                return first_states(above @ jump @ below, [2, 3], [2, 3])
            om = roots(residual, 0.5, 0.25, 1)[0]
            K, M = hermite_matrices(np.ones(120), np.ones(120))
            at = 2 * (round(z * 120) - 1) + 1
            if kappa == "rigid":
                K, M = (np.delete(np.delete(X, at, 0), at, 1) for X in (K, M))
            else:
                K[at, at] += kappa
            agree(f"outrigger dynamics {z} {kappa}", om, lowest_pairs(K, M, 1)[0], 1e-7)
            row[str(kappa)] = om
        table.append({"z_over_h": z, "om1": row})
    return table


# ---------------------------------------------------------------- coupled walls and cores

def coupled_walls():
    """Coupled walls under uniform load: continuum and discrete frame, kN and m.

    Continuum (Chitty 1947; Beck 1962; Rosman 1964; Stafford Smith and Coull 1991, ch. 10):
    closed form for T(z) and top drift, and as a second route `solve_bvp` on
    T'' - K^2 T = -(K^2/(k^2 l)) M(z), T'(0) = 0, T(H) = 0, E (I1+I2) y'' = M - T l.
    Tolerance 1e-6. Frame: Bernoulli walls at their centroid lines, beams of the effective
    span between rigid arms, no shear strain."""
    n, h, E, w = 20, 2.8, 36e6, 16.5
    H = n * h
    A1, A2, I1, I2, l = 1.5, 2.1, 0.3 * 125 / 12, 0.3 * 343 / 12, 8.0
    Ib, b = 0.3 * 0.4**3 / 12, 2.2
    I, A = I1 + I2, A1 + A2
    alpha = np.sqrt(12 * Ib * l**2 / (b**3 * h * I))
    k = np.sqrt(1 + A * I / (A1 * A2 * l**2))
    K, u = k * alpha, k * alpha * H
    F3 = top_drift_factor(u, k)
    drift = w * H**4 / (8 * E * I) * F3

    C2 = w * H / (k**2 * l * K)
    particular = lambda z: w / (k**2 * l) * ((H - z) ** 2 / 2 + 1 / K**2)
    C1 = -(particular(H) + C2 * np.sinh(u)) / np.cosh(u)
    T = lambda z: particular(z) + C1 * np.cosh(K * z) + C2 * np.sinh(K * z)
    q = lambda z: w * (H - z) / (k**2 * l) - K * (C1 * np.sinh(K * z) + C2 * np.cosh(K * z))
    moment = lambda z: w * (H - z) ** 2 / 2
    best = minimize(lambda z: -q(z[0]), [0.4 * H], method="Nelder-Mead",
                    options={"xatol": 1e-9, "fatol": 1e-12}).x[0]

    def equations(s, y):  # s = z/H; T, T', drift, slope
        z = s * H
        return np.array([y[1] * H, (K**2 * y[0] - K**2 / (k**2 * l) * moment(z)) * H,
                         y[3] * H, (moment(z) - y[0] * l) / (E * I) * H])
    s = np.linspace(0, 1, 201)
    bvp = solve_bvp(equations, lambda a, b: np.array([a[1], b[0], a[2], a[3]]), s,
                    np.ones((4, s.size)), tol=1e-10, max_nodes=200000)
    agree("coupled walls", [T(0), drift], [bvp.y[0, 0], bvp.y[2, -1]], 1e-6)

    M0 = moment(0)
    M1, M2 = (M0 - T(0) * l) * I1 / I, (M0 - T(0) * l) * I2 / I
    shear = q(best) * h
    return {
        "inputs": {"storeys": n, "storey_height_m": h, "elastic_modulus_knm2": E,
                   "load_kn_per_m": w, "wall_lengths_m": [5.0, 7.0], "thickness_m": 0.3,
                   "opening_m": 2.0, "beam_depth_m": 0.4, "effective_span_m": b},
        "A1": A1, "A2": A2, "I1": I1, "I2": I2, "l": l, "Ib": Ib,
        "alpha": alpha, "k": k, "k_alpha_h": u,
        "continuum": {
            "top_drift_m": drift, "uncoupled_drift_m": w * H**4 / (8 * E * I),
            "axial_force_kn": T(0), "moment_1_knm": M1, "moment_2_knm": M2,
            "overturning_knm": M0, "coupled_share": T(0) * l / M0,
            "largest_beam_shear_kn": shear, "its_end_moment_knm": shear * b / 2,
            "its_z_over_h": best / H,
            "base_stress_mpa": {"axial_1": T(0) / A1 / 1e3, "bending_1": M1 * 2.5 / I1 / 1e3,
                                "axial_2": T(0) / A2 / 1e3, "bending_2": M2 * 3.5 / I2 / 1e3},
        },
        "discrete_frame": wide_column_frame(n, h, E, w, (A1, A2), (I1, I2), l, Ib, b),
        "F3": [{"u": u, "k": k, "F3": top_drift_factor(u, k)}
               for u in (1, 2, 4, 8, 16) for k in (1.0, 1.05, 1.1, 1.2)],
    }


def top_drift_factor(u, k):
    return 1 - (1 - 4 / u**2 + 8 * (1 + u * np.sinh(u) - np.cosh(u)) / (u**4 * np.cosh(u))) / k**2


def wide_column_frame(n, h, E, w, areas, inertias, l, Ib, b):
    """Freedoms of a level: u, theta_1, theta_2, v_1, v_2 (u shared, theta = du/dz)."""
    K = np.zeros((5 * n + 5, 5 * n + 5))
    k = np.array([[12, 6 * h, -12, 6 * h], [6 * h, 4 * h * h, -6 * h, 2 * h * h],
                  [-12, -6 * h, 12, -6 * h], [6 * h, 2 * h * h, -6 * h, 4 * h * h]]) / h**3
    for level in range(n):
        lo, up = 5 * level, 5 * level + 5
        for i in (0, 1):
            at = [lo, lo + 1 + i, up, up + 1 + i]
            K[np.ix_(at, at)] += E * inertias[i] * k
            at = [lo + 3 + i, up + 3 + i]
            K[np.ix_(at, at)] += E * areas[i] / h * np.array([[1, -1], [-1, 1]])
    # Beam ends: rotation -theta as dv/dx (sway to +x lowers the right side of a wall).
    left = (5.0 - (b - 2.0)) / 2  # wall centroid to the end of the flexible span
    right = l - b - left
    beam = np.array([[12, 6 * b, -12, 6 * b], [6 * b, 4 * b * b, -6 * b, 2 * b * b],
                     [-12, -6 * b, 12, -6 * b], [6 * b, 2 * b * b, -6 * b, 4 * b * b]]) * E * Ib / b**3
    ends = np.array([  # rows: v_left, slope_left, v_right, slope_right; columns: u th1 th2 v1 v2
        [0, -left, 0, 1, 0], [0, -1, 0, 0, 0], [0, 0, right, 0, 1], [0, 0, -1, 0, 0.0]])
    for level in range(1, n + 1):
        at = slice(5 * level, 5 * level + 5)
        K[at, at] += ends.T @ beam @ ends
    force = np.zeros(5 * n + 5)
    force[5::5] = w * h
    force[5 * n] = w * h / 2
    q = np.zeros(5 * n + 5)
    q[5:] = np.linalg.solve(K[5:, 5:], force[5:])
    levels = q.reshape(-1, 5)
    shears = [(beam @ ends @ levels[j])[0] for j in range(1, n + 1)]
    worst = int(np.argmax(np.abs(shears)))
    axial = E * areas[0] / h * (levels[1, 3] - levels[0, 3])
    moments = [-(E * inertias[i] * k @ np.array([0, 0, levels[1, 0], levels[1, 1 + i]]))[1]
               for i in (0, 1)]
    return {"top_drift_m": levels[-1, 0], "axial_force_kn": abs(axial),
            "moment_1_knm": abs(moments[0]), "moment_2_knm": abs(moments[1]),
            "largest_beam_shear_kn": abs(shears[worst]), "at_level": worst + 1}


def open_core():
    """Channel core under uniform torque, without and with lintels; kN and m.

    Section by Vlasov's sectorial co-ordinates: formulas, and numerical integration of
    omega^2 as second route (tolerance 1e-9). Twist: G J th' - E Iw th''' = t (H - z), warping
    held at the base (Vlasov 1961; Stafford Smith and Coull 1991, ch. 13). Route 2:
    Ritz polynomials (tolerance 1e-8)."""
    a, h, t, H, E, m = 6.0, 8.0, 0.3, 100.0, 30e6, 100.0
    G = E / 2.4
    sections = []
    for a_, h_, t_ in ((6, 8, 0.3), (5, 10, 0.4), (6, 8, 0.45)):
        sections.append(channel_section(a_, h_, t_))
    Iw, J = sections[0]["iw"], sections[0]["j"]
    Ib, b, spacing = 0.3 * 0.6**3 / 12, 8.0, 4.0
    enclosed = 2 * a * h
    J1 = 12 * E * Ib * enclosed**2 / (b**3 * spacing * G)
    out = {"sections": sections, "lintel_added_j": J1, "twice_enclosed_area": enclosed}
    corner, tip = sections[0]["sectorial_corner"], sections[0]["sectorial_tip"]
    for name, torsion in (("open", J), ("with_lintels", J + J1)):
        u = H * np.sqrt(G * torsion / (E * Iw))
        K1 = 8 / u**4 * ((u * np.sinh(u) + 1) * (np.cosh(u) - 1) / np.cosh(u)
                         - u * np.sinh(u) + u**2 / 2)
        K2 = 2 / u**2 * ((u * np.sinh(u) + 1) / np.cosh(u) - 1)
        twist, bimoment = m * H**4 / (8 * E * Iw) * K1, m * H**2 / 2 * K2
        at, weight, w, dw, ddw = ritz(24)
        stiffness = E * Iw / H**3 * ((ddw * weight) @ ddw.T + u**2 * (dw * weight) @ dw.T)
        coefficients = np.linalg.solve(stiffness, m * H * (w @ weight))
        # Curvature at z = 0: w'' = 2 P_k(-1) = 2 (-1)^k.
        curvature = coefficients @ (2.0 * (-1.0) ** np.arange(24)) / H**2
        agree("core twist", [twist, bimoment], [coefficients.sum(), E * Iw * curvature], 1e-8)
        out[name] = {"u": u, "top_twist_rad": twist, "bimoment_knm2": bimoment,
                     "warping_stress_tip_mpa": abs(bimoment * tip / Iw) / 1e3,
                     "warping_stress_corner_mpa": abs(bimoment * corner / Iw) / 1e3,
                     "period_s": torsion_period(u, E * Iw, H)}
    out["warping_only_twist_rad"] = m * H**4 / (8 * E * Iw)
    perimeter = 2 * (a + h)
    out["closed_tube_bredt_j"] = 4 * (a * h) ** 2 / (perimeter / t)
    equivalent = 12 * E * Ib / (G * b**2 * spacing)
    out["lintel_equivalent_plate_m"] = equivalent
    out["lintel_bredt_j"] = 4 * (a * h) ** 2 / ((2 * a + h) / t + h / equivalent)
    # Torsion of the closed tube as a pure shear shaft (warping of a closed box left aside).
    mass, r2 = 144.0, 96.0  # t/m, m2; kN and t go together
    out["closed_tube_period_s"] = 4 * H / np.sqrt(G * out["closed_tube_bredt_j"] / (mass * r2))
    out["flexural_period_ix_s"] = 2 * np.pi * H**2 / FLEXURE**2 * np.sqrt(mass / (E * sections[0]["ix"]))
    out["flexural_period_iy_s"] = 2 * np.pi * H**2 / FLEXURE**2 * np.sqrt(mass / (E * sections[0]["iy"]))
    out["mass_t_per_m"], out["radius_of_gyration_squared_m2"] = mass, r2
    return out


def torsion_period(u, EIw, H):
    """Warping cantilever with St Venant torsion: the wall-frame equation with m r^2 = 144 x 96."""
    def equation(lam):
        mu = np.hypot(lam, u)
        return 2 / np.cosh(mu) + (2 + u**4 / (lam * mu) ** 2) * np.cos(lam) \
            + u**2 / (lam * mu) * np.sin(lam) * np.tanh(mu)
    lam = roots(equation, 0.05, 0.05, 1)[0]
    om = lam * np.hypot(lam, u)
    return 2 * np.pi * H**2 / om * np.sqrt(144.0 * 96.0 / EIw)


def channel_section(a, h, t):
    e = 3 * a**2 / (6 * a + h)
    Iw = t * h**2 * a**3 * (3 * a + 2 * h) / (12 * (6 * a + h))
    corner, tip = e * h / 2, e * h / 2 - a * h / 2
    # Sectorial co-ordinate about the shear centre, linear along each plate.
    linear = lambda length, p, q: length * (p * p + p * q + q * q) / 3
    numeric = t * (linear(h, corner, -corner) + 2 * linear(a, corner, tip))
    agree("sectorial inertia", Iw, numeric, 1e-9)
    # Principal pole: integral of omega times the distance along the web axis vanishes.
    s = np.polynomial.legendre.leggauss(6)
    y = lambda p, q: 0.5 * (p + q) + 0.5 * (q - p) * s[0]
    web = np.sum(s[1] * y(corner, -corner) * y(h / 2, -h / 2)) * h / 2
    flanges = 2 * np.sum(s[1] * y(corner, tip)) * a / 2 * h / 2
    if abs(web + flanges) > 1e-9 * abs(web):
        raise SystemExit(f"shear centre of channel {a} x {h} is off")
    area = t * (2 * a + h)
    back = 2 * a * t * a / 2 / area
    return {"a": a, "h": h, "t": t, "area": area,
            "ix": t * h**3 / 12 + 2 * a * t * h**2 / 4,
            "iy": 2 * (t * a**3 / 12 + a * t * (a / 2 - back) ** 2) + h * t * back**2,
            "shear_centre_e": e, "iw": Iw, "j": t**3 * (2 * a + h) / 3,
            "sectorial_corner": corner, "sectorial_tip": tip}


# ---------------------------------------------------------------- optimum zones

def zones_period():
    """Least volume of a cantilever with N equal zones whose first frequency is that of the
    uniform one; EI proportional to k, mass 1 - mu + mu k.

    The set {k : K(k) - Om^2 M(k) positive semidefinite} is convex, so a point that meets
    the Karush-Kuhn-Tucker conditions is the optimum; SLSQP on 120 Bernoulli
    elements, a Newton polish, then those conditions are checked to 1e-5. The continuous limit without mass
    that scales is 3.516^2/20 (w = z^2, EI proportional to 1/4 - z/3 + z^4/12)."""
    table = []
    for mu in (0.0, 0.1, 0.2):
        for n in (2, 3, 4, 5):
            for lower in (0.0, 0.5):
                if lower and (mu, n) != (0.2, 4):
                    continue
                table.append(optimum_zones(n, mu, lower))
    return {"optimum": table, "continuous_mu_0": FLEXURE**4 / 20}


def optimum_zones(n, mu, lower):
    elements = 120 // n * n
    zone = np.repeat(np.arange(n), elements // n)
    parts = [hermite_matrices((zone == i) * 1.0, (zone == i) * 1.0) for i in range(n)]
    fixed = hermite_matrices(np.zeros(elements), np.ones(elements))[1]

    def lowest(k):
        K = sum(ki * p[0] for ki, p in zip(k, parts))
        M = (1 - mu) * fixed + mu * sum(ki * p[1] for ki, p in zip(k, parts))
        om, vector = lowest_pairs(K, M, 1)
        value, v = om[0] ** 2, vector[:, 0]
        slope = np.array([v @ p[0] @ v - value * mu * (v @ p[1] @ v) for p in parts])
        return value, slope
    target = FLEXURE**4
    answer = minimize(
        lambda k: k.mean(), np.linspace(1.3, max(lower, 0.3), n), jac=lambda k: np.full(n, 1 / n),
        bounds=[(max(lower, 1e-3), 10)] * n, method="SLSQP",
        constraints={"type": "ineq", "fun": lambda k: lowest(k)[0] / target - 1,
                     "jac": lambda k: lowest(k)[1] / target},
        options={"ftol": 1e-14, "maxiter": 500})
    k = answer.x
    free = k > max(lower, 1e-3) + 1e-7

    def conditions(x):
        """Equal slopes in the free zones, and the frequency kept."""
        trial = k.copy()
        trial[free] = x
        value, slope = lowest(trial)
        slope = slope[free] / slope[free].mean()
        return np.r_[slope[1:] - slope[:-1], value / target - 1]
    k[free] = root(conditions, k[free], tol=1e-12).x
    value, slope = lowest(k)
    level = slope[free].mean()
    spread = np.ptp(slope[free]) / level
    if abs(value / target - 1) > 1e-8 or spread > 1e-5 or np.any(slope[~free] > level):
        raise SystemExit(f"zones {n} {mu}: not optimal ({value / target - 1:g}, {spread:g})")
    return {"mu": mu, "zones": n, "lower_bound": lower, "ratio": k.mean(), "k_base_to_top": k}


def zones_drift():
    """Least volume with N equal zones under a top-drift limit, EI proportional to k.

    k_i proportional to sqrt(a_i/L_i), a_i the zone integral of M m; ratio
    (sum sqrt(a_i L_i))^2 / sum a_i (optimality criterion; Lagrange). Second route: SLSQP
    (tolerance 1e-7). Limits for many zones: 16/25 (uniform load), 3/4 (top load)."""
    table = []
    for load, integrand in (
        ("uniform", Polynomial([0, 0, 0, 0.5])), ("top point", Polynomial([0, 0, 1.0])),
    ):  # in x from the top: M m = x^2/2 x, and x x
        for n in (2, 3, 4, 5, 10):
            edges = np.linspace(0, 1, n + 1)
            a = np.diff(integrand.integ()(edges))[::-1]  # base to top
            ratio = np.sum(np.sqrt(a / n)) ** 2 / a.sum()
            k = np.sqrt(a * n)
            k *= np.sum(a / k) / a.sum()
            answer = minimize(lambda k: k.mean(), np.ones(n), method="SLSQP",
                              bounds=[(1e-3, 10)] * n, options={"ftol": 1e-15, "maxiter": 500},
                              constraints={"type": "ineq", "fun": lambda k: 1 - np.sum(a / k) / a.sum()})
            agree(f"drift zones {load} {n}", [k.mean(), ratio], [ratio, answer.fun], 1e-7)
            table.append({"load": load, "zones": n, "ratio": ratio, "k_base_to_top": k})
    return {"optimum": table, "continuous": {"uniform": 16 / 25, "top point": 3 / 4}}


def main():
    parts = {
        "wall_frame": wall_frame, "wall_frame_static": wall_frame_static,
        "timoshenko": timoshenko, "lumped_floors": lumped_floors,
        "stepped": stepped, "outrigger_levels": outrigger_levels,
        "outrigger_example": outrigger_example, "outrigger_dynamics": outrigger_dynamics,
        "coupled_walls": coupled_walls, "open_core": open_core,
        "zones_period": zones_period, "zones_drift": zones_drift,
    }
    record = {"made_with": {"python": platform.python_version(), "numpy": np.__version__,
                            "scipy": scipy.__version__}}
    for name, part in parts.items():
        record[name] = {"about": " ".join(part.__doc__.split()), "values": part()}
        print(name, "done", flush=True)
    path = pathlib.Path(__file__).parent / "values.json"
    path.write_text(json.dumps(rounded(record), indent=1) + "\n")


if __name__ == "__main__":
    main()
