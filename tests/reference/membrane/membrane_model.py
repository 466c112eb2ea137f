"""Folded-plate membrane model of the walls of a tower with rigid floors.

Every straight line of walls is a two-dimensional plane-stress mesh (s along the
line in plan, z up) of nine-node quadrilaterals (`ElementQuad2` of scikit-fem).

* Horizontal displacement of every wall point at a floor level follows the rigid
  floor (ux, uy, theta about the reference point); between floors it is free.
* Vertical displacement is free everywhere. Lines that meet at a plan node share
  it along the whole height of that node; the horizontal displacements in the
  planes of two such lines stay independent between floors, because the corner
  can move out of the plane of the other wall.
* Link beams and outrigger arms are part of the mesh of their line. Their chords
  are not tied to the floor; only the points where they are part of a wall are.
* Columns are bars along the height. The edge of an arm at a column shares its
  vertical displacement with the bar.
* Out-of-plane bending of walls is left out; `st_venant` adds sum G L t^3 / (3 h)
  on the relative twist of consecutive floors.

One storey is condensed to the vertical displacements at its two floor levels
and the two times three floor freedoms (static condensation, exact); where an arm
goes on into the next storey, both displacements of its cut are kept too. Storeys are
then stacked and all vertical displacements condensed, which leaves the 3 N
floor freedoms. Mass sits on those only, so nothing is lost for the modes.

Units: m, N, kg, s.
"""

from dataclasses import dataclass, field

import numpy as np
import scipy.linalg
import scipy.sparse
import scipy.sparse.linalg
from skfem import Basis, BilinearForm, ElementQuad0, ElementQuad2, ElementVector, MeshQuad
from skfem.helpers import ddot, sym_grad, trace

ROUND = 6  # decimals by which points are told apart, m


@dataclass(frozen=True)
class Panel:
    """A wall between two plan nodes; `thickness[k]` in storey k (counted from 0), m."""

    id: str
    a: str
    b: str
    thickness: tuple


@dataclass(frozen=True)
class Link:
    """A beam over the opening between two panels in one line; top at floor level."""

    id: str
    a: str
    b: str
    depth: float


@dataclass(frozen=True)
class Arm:
    """A wall from a core node to a column through the storeys listed (from 0)."""

    a: str
    b: str
    storeys: tuple
    thickness: float


@dataclass(frozen=True)
class Column:
    id: str
    node: str
    width_x: float
    width_y: float


@dataclass
class Case:
    name: str
    title: str
    storeys: int
    height: float  # of every storey
    nodes: dict
    panels: list
    extent: tuple  # ((x_min, x_max), (y_min, y_max)); its centre is the reference point
    mass_t: float
    mass_centre: tuple
    rotational_inertia_t_m2: float
    links: list = field(default_factory=list)
    arms: list = field(default_factory=list)
    columns: list = field(default_factory=list)
    elastic_modulus: float = 30e9
    poisson_ratio: float = 0.2
    force_kn: float = 100.0  # per storey, X and Y cases
    torque_knm: float = 500.0  # per storey, torque case

    @property
    def reference(self):
        return tuple(0.5 * (low + high) for low, high in self.extent)

    @property
    def shear_modulus(self):
        return self.elastic_modulus / (2 * (1 + self.poisson_ratio))


@dataclass(frozen=True)
class Strip:
    """A stretch of a line: from s0 to s1, m along the line."""

    kind: str  # "wall", "link" or "arm"
    s0: float
    s1: float
    member: object


@dataclass(frozen=True)
class Line:
    """Members that share one straight line in plan and touch end to end."""

    origin: tuple
    direction: tuple
    strips: tuple
    nodes: tuple  # (s, node id)


def lines_of(case):
    """Groups walls, links and arms into straight lines that touch end to end."""
    members = [("wall", p) for p in case.panels]
    members += [("link", l) for l in case.links]
    members += [("arm", a) for a in case.arms]
    groups = []
    for kind, member in members:
        p, q = np.array(case.nodes[member.a]), np.array(case.nodes[member.b])
        d = (q - p) / np.linalg.norm(q - p)
        if d[0] < -1e-9 or (abs(d[0]) < 1e-9 and d[1] < 0):
            d = -d
        new = {"d": d, "members": [(kind, member)], "ends": {member.a, member.b}}
        joined = []
        for group in groups:
            parallel = abs(d[0] * group["d"][1] - d[1] * group["d"][0]) < 1e-9
            if parallel and group["ends"] & new["ends"]:
                new["members"] = group["members"] + new["members"]
                new["ends"] |= group["ends"]
            else:
                joined.append(group)
        groups = joined + [new]
    lines = []
    for group in groups:
        d = group["d"]
        origin = min((case.nodes[n] for n in group["ends"]), key=lambda p: np.dot(p, d))
        along = lambda n: float(np.dot(np.subtract(case.nodes[n], origin), d))
        strips = tuple(
            Strip(kind, *sorted((along(m.a), along(m.b))), m) for kind, m in group["members"]
        )
        nodes = tuple(sorted((along(n), n) for n in group["ends"]))
        lines.append(Line(origin, tuple(d), strips, nodes))
    return lines


def graded(stops, size, fine, finest):
    """Grid lines through all `stops`, near `size` apart; towards stops in `fine`
    (where a re-entrant corner makes stresses singular) shrinking to `finest`."""
    points = [stops[0]]
    for p, q in zip(stops, stops[1:]):
        left = any(abs(p - f) < 1e-9 for f in fine)
        right = any(abs(q - f) < 1e-9 for f in fine)
        count = max(2, int(np.ceil((q - p) / size - 1e-9)))
        cut = list(np.linspace(p, q, count + 1))
        inner = cut[1:-1]
        step = cut[1] - cut[0]
        while step > 1.999 * finest:
            step /= 2
            if left:
                inner = [p + step] + inner
            if right:
                inner = inner + [q - step]
            if not (left or right):
                break
        points += inner + [q]
    return np.array(points)


@BilinearForm
def plane_stress(u, v, w):
    """Virtual work of plane stress times thickness; w.E, w.nu, w.t."""
    e, f = sym_grad(u), sym_grad(v)
    c = w.E / (1 - w.nu**2)
    return w.t * c * ((1 - w.nu) * ddot(e, f) + w.nu * trace(e) * trace(f))


@BilinearForm
def without_poisson_coupling(u, v, w):
    """The same with no lateral strain from vertical stress; E and G = E/(2 (1 + nu)) kept."""
    e, f = sym_grad(u), sym_grad(v)
    G = w.E / (2 * (1 + w.nu))
    return w.t * (w.E * (e[0, 0] * f[0, 0] + e[1, 1] * f[1, 1]) + 4 * G * e[0, 1] * f[0, 1])


def storey_matrix(case, storey, size, finest, st_venant, material):
    """Stiffness of one storey, condensed to its two levels.

    Returns (S, keys, count): S is symmetric, ordered as floor below (ux, uy, theta),
    floor above, then the kept displacements `keys`, (level 0 or 1, key): key is
    ("node", id) or ("line", line, s) for w, ("chord", line, s) for u along an arm's cut.
    """
    h = case.height
    depths = sorted({h - l.depth for l in case.links})
    corners = depths + [0.0, h] if case.links or case.arms else []
    z_lines = graded([0.0] + depths + [h], size, corners, finest)
    x0, y0 = case.reference
    rows, cols, vals = [], [], []  # local -> storey freedoms, all lines stacked
    blocks = []
    key_index = {}  # key -> column; keys of free freedoms
    local = 0

    def column_of(key):
        return key_index.setdefault(key, 6 + len(key_index))

    boundary = {}

    def vertical(key, z):
        """Column of a vertical displacement; those at the two levels are kept."""
        return column_of(("w", key, round(z, ROUND)))

    for number, line in enumerate(lines_of(case)):
        strips = [s for s in line.strips if s.kind != "arm" or storey in s.member.storeys]
        walls = [s for s in strips if s.kind == "wall"]
        # The grid along the line is the same in all storeys, arm or not: levels must match.
        stops = sorted({round(v, ROUND) for s in line.strips for v in (s.s0, s.s1)})
        fine = [v for s in line.strips if s.kind != "wall" for v in (s.s0, s.s1)]
        s_lines = graded(stops, size, fine, finest)
        mesh = MeshQuad.init_tensor(s_lines, z_lines)
        centre = mesh.p[:, mesh.t].mean(axis=1)
        thickness = np.zeros(mesh.nelements)
        for strip in strips:
            inside = (centre[0] > strip.s0) & (centre[0] < strip.s1)
            if strip.kind == "wall":
                thickness[inside] = strip.member.thickness[storey]
            elif strip.kind == "arm":
                thickness[inside] = strip.member.thickness
            else:
                at_ends = [
                    w.member.thickness[storey]
                    for w in walls
                    if min(abs(w.s0 - strip.s1), abs(w.s1 - strip.s0)) < 1e-9
                ]
                assert len(at_ends) == 2, f"link {strip.member.id} has no panel in line at an end"
                thickness[inside & (centre[1] > h - strip.member.depth)] = min(at_ends)
        keep = np.nonzero(thickness > 0)[0]
        mesh = mesh.restrict(keep)
        thickness = thickness[keep]
        basis = Basis(mesh, ElementVector(ElementQuad2()))
        t = basis.with_element(ElementQuad0()).interpolate(thickness)
        K = material.assemble(basis, t=t, E=case.elastic_modulus, nu=case.poisson_ratio)
        blocks.append(K)

        horizontal = np.zeros(basis.N, dtype=bool)
        for dofs in (basis.nodal_dofs, basis.facet_dofs, basis.interior_dofs):
            horizontal[dofs[0]] = True
        node_at = {round(s, ROUND): n for s, n in line.nodes}
        c, d = line.direction
        lever = d * (line.origin[0] - x0) - c * (line.origin[1] - y0)
        for dof in range(basis.N):
            s, z = (round(v, ROUND) for v in basis.doflocs[:, dof])
            in_wall = any(w.s0 - 1e-6 <= s <= w.s1 + 1e-6 for w in walls)
            level = 0 if z == 0 else 1 if z == round(h, ROUND) else None
            goes_on = level is not None and any(
                a.s0 - 1e-6 <= s <= a.s1 + 1e-6 and storey + (1 if level else -1) in a.member.storeys
                for a in strips if a.kind == "arm"
            )
            if horizontal[dof]:
                if in_wall and level is not None:
                    # u = c ux + d uy + theta (d (x - x0) - c (y - y0)); s drops out.
                    entries = [(3 * level, c), (3 * level + 1, d), (3 * level + 2, lever)]
                else:
                    col = column_of(("u", number, s, z))
                    entries = [(col, 1.0)]
                    if goes_on:
                        boundary[(level, ("chord", number, s))] = col
            else:
                key = ("node", node_at[s]) if s in node_at else ("line", number, s)
                col = vertical(key, z)
                entries = [(col, 1.0)]
                if level is not None and (in_wall or s in node_at or goes_on):
                    boundary[(level, key)] = col
            for col, value in entries:
                rows.append(local + dof)
                cols.append(col)
                vals.append(value)
        local += basis.N

        # Column bars along the edges of arms.
        for strip in strips:
            if strip.kind != "arm":
                continue
            s_end = next(s for s, n in line.nodes if n == strip.member.b)
            node = ("node", strip.member.b)
            columns = [q for q in case.columns if q.node == strip.member.b]
            area = sum(q.width_x * q.width_y for q in columns)
            for z_low, z_high in zip(z_lines, z_lines[1:]):
                ends = [vertical(node, z) for z in (z_low, 0.5 * (z_low + z_high), z_high)]
                k = case.elastic_modulus * area / (3 * (z_high - z_low))
                bar = k * np.array([[7.0, -8, 1], [-8, 16, -8], [1, -8, 7]])
                blocks.append(scipy.sparse.csr_matrix(bar))
                rows += [local, local + 1, local + 2]
                cols += ends
                vals += [1.0] * 3
                local += 3
            assert abs(s_end - strip.s0) < 1e-9 or abs(s_end - strip.s1) < 1e-9

    held = {a.b for a in case.arms if storey in a.storeys}
    for column in case.columns:
        if column.node in held:
            continue
        key = ("node", column.node)
        for level, z in ((0, 0.0), (1, h)):
            boundary[(level, key)] = vertical(key, z)
        k = case.elastic_modulus * column.width_x * column.width_y / h
        blocks.append(scipy.sparse.csr_matrix(k * np.array([[1.0, -1], [-1, 1]])))
        rows += [local, local + 1]
        cols += [boundary[(0, key)], boundary[(1, key)]]
        vals += [1.0, 1.0]
        local += 2

    total = 6 + len(key_index)
    T = scipy.sparse.csr_matrix((vals, (rows, cols)), shape=(local, total))
    K = (T.T @ scipy.sparse.block_diag(blocks, format="csr") @ T).tocsr()
    keys = sorted(boundary, key=str)
    outer = list(range(6)) + [boundary[key] for key in keys]
    mask = np.ones(total, dtype=bool)
    mask[outer] = False
    inner = np.nonzero(mask)[0]
    K_oo = K[outer][:, outer].toarray()
    K_io = K[inner][:, outer].toarray()
    lu = scipy.sparse.linalg.splu(
        K[inner][:, inner].tocsc(), permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True}
    )
    S = K_oo - K_io.T @ lu.solve(K_io)
    S = 0.5 * (S + S.T)
    if st_venant:
        k = sum(
            case.shear_modulus * np.hypot(*np.subtract(case.nodes[p.b], case.nodes[p.a]))
            * p.thickness[storey] ** 3 / (3 * h)
            for p in case.panels
        )
        S[2, 2] += k
        S[5, 5] += k
        S[2, 5] -= k
        S[5, 2] -= k
    assert_rigid_motions_cost_nothing(case, S, keys)
    return S, keys, total


def assert_rigid_motions_cost_nothing(case, S, keys):
    """The six rigid motions of a free storey must produce no force."""
    x0, y0 = case.reference
    lines, motions = lines_of(case), np.zeros((6, len(S)))
    for axis in range(3):
        motions[axis, [axis, axis + 3]] = 1.0
    for axis in range(2):  # tilt: ux = z, w = -(x - x0)
        motions[4 + axis, 3 + axis] = case.height
    for at, (level, key) in enumerate(keys, 6):
        if key[0] == "node":
            x, y = case.nodes[key[1]]
        else:
            line = lines[key[1]]
            x, y = np.add(line.origin, np.multiply(key[2], line.direction))
        if key[0] == "chord":
            c, d = line.direction
            motions[:3, at] = c, d, d * (x - x0) - c * (y - y0)
            motions[4:, at] = c * case.height * level, d * case.height * level
        else:
            motions[3:, at] = 1.0, -(x - x0), -(y - y0)
    force = S @ motions.T
    scale = np.abs(S).max() * np.abs(motions).max()
    assert np.abs(force).max() < 1e-8 * scale, np.abs(force).max() / scale


def floor_stiffness(case, size, finest, st_venant=True, material=plane_stress):
    """Stiffness on the 3 N floor freedoms (ux, uy, theta of levels 1..N in turn).

    Returns (K, freedoms of one storey's mesh)."""
    N, cache, matrices, meshed = case.storeys, {}, [], 0
    for storey in range(N):
        kind = (tuple(p.thickness[storey] for p in case.panels),
                tuple(s in a.storeys for a in case.arms for s in (storey - 1, storey, storey + 1)))
        if kind not in cache:
            cache[kind] = storey_matrix(case, storey, size, finest, st_venant, material)
        S, keys, total = cache[kind]
        meshed = max(meshed, total)
        matrices.append((S, keys))
    # Kept displacements numbered level by level; None for floor freedoms and the fixed base.
    number = {}
    for k, (_, keys) in enumerate(matrices):
        for level, key in keys:
            if k + level > 0:
                number[(k + level, key)] = None
    for index, name in enumerate(sorted(number, key=lambda name: (name[0], str(name[1])))):
        number[name] = index
    n = len(number)
    K_ff, K_wf = np.zeros((3 * N, 3 * N)), np.zeros((n, 3 * N))
    entries, width = [], 0
    for k, (S, keys) in enumerate(matrices):
        floors = [(i, 3 * (k - 1) + i) for i in range(6) if k > 0 or i >= 3]
        walls = [(i, number[(k + level, key)]) for i, (level, key) in enumerate(keys, 6)
                 if k + level > 0]
        local_f, global_f = np.array(floors).T
        local_w, global_w = np.array(walls).T
        K_ff[np.ix_(global_f, global_f)] += S[np.ix_(local_f, local_f)]
        K_wf[np.ix_(global_w, global_f)] += S[np.ix_(local_w, local_f)]
        entries.append((global_w, S[np.ix_(local_w, local_w)]))
        width = max(width, np.ptp(global_w))
    band = np.zeros((width + 1, n))  # lower form
    for at, block in entries:
        row, col = np.meshgrid(at, at, indexing="ij")
        lower = row >= col
        band[row[lower] - col[lower], col[lower]] += block[lower]
    K = K_ff - K_wf.T @ scipy.linalg.solveh_banded(band, K_wf, lower=True)
    return 0.5 * (K + K.T), meshed


def floor_mass(case):
    """Mass matrix of one floor about the reference point, kg and kg m2."""
    m, inertia = case.mass_t * 1e3, case.rotational_inertia_t_m2 * 1e3
    x, y = np.subtract(case.mass_centre, case.reference)
    return np.array([
        [m, 0, -m * y],
        [0, m, m * x],
        [-m * y, m * x, inertia + m * (x * x + y * y)],
    ])


def modes(case, K, count=6):
    """Lowest modes: list of (period s, (share X, share Y, share twist))."""
    M = scipy.linalg.block_diag(*[floor_mass(case)] * case.storeys)
    values, vectors = scipy.linalg.eigh(K, M, subset_by_index=(0, count - 1))
    x, y = np.subtract(case.mass_centre, case.reference)
    found = []
    for value, vector in zip(values, vectors.T):
        ux, uy, theta = vector.reshape(-1, 3).T
        energy = np.array([
            case.mass_t * np.sum((ux - y * theta) ** 2),
            case.mass_t * np.sum((uy + x * theta) ** 2),
            case.rotational_inertia_t_m2 * np.sum(theta**2),
        ])
        found.append((2 * np.pi / np.sqrt(value), energy / energy.sum()))
    return found


def displacements(case, K):
    """Floor displacements (N x 3) under the X, Y and torque cases."""
    results = []
    for axis, value in ((0, case.force_kn), (1, case.force_kn), (2, case.torque_knm)):
        force = np.zeros((case.storeys, 3))
        force[:, axis] = value * 1e3
        results.append(scipy.linalg.solve(K, force.ravel(), assume_a="pos").reshape(-1, 3))
    return results
