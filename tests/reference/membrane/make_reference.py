"""Makes the membrane finite-element references: one JSON and one TOML per case.

    python make_reference.py [NAME ...]      (no name: all cases)

The towers are invented; plans and sizes are those of ordinary concrete cores.
"""

import json
import pathlib
import platform
import sys

import numpy as np
import scipy
import skfem

from membrane_model import (
    Arm, Case, Column, Link, Panel, displacements, floor_stiffness, modes, without_poisson_coupling,
)

HERE = pathlib.Path(__file__).parent
# (element size, size at re-entrant corners), m; each about half the one before.
MESHES = [(1.0, 0.06), (0.5, 0.008), (0.4, 0.001)]


def walls(storeys, groups):
    """Panels from {id: (a, b, thickness or [(last storey, thickness), ...])}."""
    panels = []
    for id, (a, b, thickness) in groups.items():
        if isinstance(thickness, (int, float)):
            thickness = [(storeys, thickness)]
        by_storey, first = [], 1
        for last, t in thickness:
            by_storey += [t] * (last - first + 1)
            first = last + 1
        panels.append(Panel(id, a, b, tuple(by_storey)))
    return panels


def box_nodes(bx, by):
    return {"sw": (-bx / 2, -by / 2), "se": (bx / 2, -by / 2),
            "ne": (bx / 2, by / 2), "nw": (-bx / 2, by / 2)}


def plan(lx, ly, tonnes_per_m2=1.0, centre=(0.0, 0.0)):
    """Extent centred on the origin, with the mass of a uniform floor at `centre`."""
    mass = round(lx * ly * tonnes_per_m2, 6)
    return dict(extent=((-lx / 2, lx / 2), (-ly / 2, ly / 2)), mass_t=mass, mass_centre=centre,
                rotational_inertia_t_m2=round(mass * (lx**2 + ly**2) / 12, 6))


def cases():
    """All reference towers, in the order of the README."""
    n = 16
    yield Case(
        "cantilever_walls", "Four isolated walls, two along X and two along Y", n, 3.2,
        {"a1": (-4, -7), "a2": (4, -7), "b1": (-4, 7), "b2": (4, 7),
         "c1": (-9, -2.5), "c2": (-9, 2.5), "d1": (9, -2.5), "d2": (9, 2.5)},
        walls(n, {"south": ("a1", "a2", 0.3), "north": ("b1", "b2", 0.3),
                  "west": ("c1", "c2", 0.4), "east": ("d1", "d2", 0.4)}),
        **plan(20, 16),
    )
    n = 18
    yield Case(
        "closed_box", "Closed box core 6 x 8 m", n, 3.3, box_nodes(6, 8),
        walls(n, {"south": ("sw", "se", 0.3), "east": ("se", "ne", 0.3),
                  "north": ("nw", "ne", 0.3), "west": ("sw", "nw", 0.3)}),
        **plan(24, 24),
    )
    yield Case(
        "box_one_door", "Box core 6 x 8 m with a door in the south wall", n, 3.3,
        {**box_nodes(6, 8), "d1": (-1, -4), "d2": (1, -4)},
        walls(n, {"south west": ("sw", "d1", 0.3), "south east": ("d2", "se", 0.3),
                  "east": ("se", "ne", 0.3), "north": ("nw", "ne", 0.3),
                  "west": ("sw", "nw", 0.3)}),
        links=[Link("south door", "d1", "d2", 0.7)],
        **plan(22, 20, centre=(0.0, 0.5)),
    )
    yield Case(
        "box_two_doors", "Box core 6 x 8 m with doors in south and north walls", n, 3.3,
        {**box_nodes(6, 8), "d1": (-0.9, -4), "d2": (0.9, -4), "d3": (-0.9, 4), "d4": (0.9, 4)},
        walls(n, {"south west": ("sw", "d1", 0.35), "south east": ("d2", "se", 0.35),
                  "north west": ("nw", "d3", 0.35), "north east": ("d4", "ne", 0.35),
                  "east": ("se", "ne", 0.3), "west": ("sw", "nw", 0.3)}),
        links=[Link("south door", "d1", "d2", 0.7), Link("north door", "d3", "d4", 0.7)],
        **plan(22, 20),
    )
    n = 14
    yield Case(
        "open_channel", "Channel core, web 8 m along Y, flanges 6 m along X", n, 3.2,
        box_nodes(6, 8),
        walls(n, {"south": ("sw", "se", 0.3), "north": ("nw", "ne", 0.3),
                  "west": ("sw", "nw", 0.3)}),
        **plan(20, 18),
    )
    n = 16
    yield Case(
        "coupled_walls", "Two pairs of 4 m piers coupled over 2 m openings, and two plain walls",
        n, 3.2,
        {"a1": (-5, -8), "a2": (-1, -8), "a3": (1, -8), "a4": (5, -8),
         "b1": (-5, 8), "b2": (-1, 8), "b3": (1, 8), "b4": (5, 8),
         "c1": (-10, -3), "c2": (-10, 3), "d1": (10, -3), "d2": (10, 3)},
        walls(n, {"a west": ("a1", "a2", 0.3), "a east": ("a3", "a4", 0.3),
                  "b west": ("b1", "b2", 0.3), "b east": ("b3", "b4", 0.3),
                  "west": ("c1", "c2", 0.35), "east": ("d1", "d2", 0.35)}),
        links=[Link("a link", "a2", "a3", 0.6), Link("b link", "b2", "b3", 0.6)],
        **plan(22, 18),
    )
    n = 15
    yield Case(
        "angle_and_wall", "Eccentric L of 6 and 5 m and a separate wall along Y", n, 3.2,
        {"l1": (-7, -5), "l2": (-1, -5), "l3": (-7, 0), "s1": (8, -3), "s2": (8, 3)},
        walls(n, {"leg x": ("l1", "l2", 0.35), "leg y": ("l1", "l3", 0.35),
                  "separate": ("s1", "s2", 0.3)}),
        **plan(18, 14, centre=(0.5, -0.3)),
    )
    n = 20
    yield Case(
        "stepped_box", "Closed box core 6 x 8 m, walls thinner above mid-height", n, 3.5,
        box_nodes(6, 8),
        walls(n, {"south": ("sw", "se", [(10, 0.5), (20, 0.25)]),
                  "east": ("se", "ne", [(10, 0.4), (20, 0.2)]),
                  "north": ("nw", "ne", [(10, 0.5), (20, 0.25)]),
                  "west": ("sw", "nw", [(10, 0.4), (20, 0.2)])}),
        **plan(26, 24),
    )
    n = 20
    outer = {"p1": (-14, -4), "p2": (14, -4), "p3": (14, 4), "p4": (-14, 4)}
    yield Case(
        "core_outrigger", "Box core 8 x 8 m with four outrigger arms at storey 12", n, 3.5,
        {**box_nodes(8, 8), **outer},
        walls(n, {"south": ("sw", "se", 0.35), "east": ("se", "ne", 0.35),
                  "north": ("nw", "ne", 0.35), "west": ("sw", "nw", 0.35)}),
        arms=[Arm("sw", "p1", (11,), 0.4), Arm("se", "p2", (11,), 0.4),
              Arm("ne", "p3", (11,), 0.4), Arm("nw", "p4", (11,), 0.4)],
        columns=[Column(f"k{i}", f"p{i}", 1.0, 1.0) for i in (1, 2, 3, 4)],
        **plan(30, 24),
    )
    n = 24
    yield Case(
        "deep_outrigger", "Core 9 x 7 m with a door and two arms two storeys deep", n, 3.4,
        {"sw": (-5, -3), "d1": (-1.5, -3), "d2": (0.5, -3), "se": (4, -3),
         "ne": (4, 4), "nw": (-5, 4), "p1": (-14, 4), "p2": (14, 4)},
        walls(n, {"south west": ("sw", "d1", 0.4), "south east": ("d2", "se", 0.4),
                  "east": ("se", "ne", 0.35), "north": ("nw", "ne", 0.4),
                  "west": ("sw", "nw", 0.35)}),
        links=[Link("south door", "d1", "d2", 0.8)],
        arms=[Arm("nw", "p1", (14, 15), 0.4), Arm("ne", "p2", (14, 15), 0.4)],
        columns=[Column("k1", "p1", 1.1, 1.1), Column("k2", "p2", 1.1, 1.1)],
        **plan(30, 22, centre=(0.0, 0.3)),
    )
    n = 12
    yield Case(
        "narrow_piers", "Two pairs of 2 m piers coupled over 2 m openings, and two plain walls",
        n, 3.2,
        {"a1": (-3, -6), "a2": (-1, -6), "a3": (1, -6), "a4": (3, -6),
         "b1": (-3, 6), "b2": (-1, 6), "b3": (1, 6), "b4": (3, 6),
         "c1": (-8, -2), "c2": (-8, 2), "d1": (8, -2), "d2": (8, 2)},
        walls(n, {"a west": ("a1", "a2", 0.3), "a east": ("a3", "a4", 0.3),
                  "b west": ("b1", "b2", 0.3), "b east": ("b3", "b4", 0.3),
                  "west": ("c1", "c2", 0.3), "east": ("d1", "d2", 0.3)}),
        links=[Link("a link", "a2", "a3", 0.6), Link("b link", "b2", "b3", 0.6)],
        **plan(18, 14),
    )
    n = 16
    yield Case(
        "two_cells", "Two-cell core 9 x 7 m with a door in the south wall of each cell", n, 3.3,
        {"sw": (-5, -3.5), "s1": (-3.5, -3.5), "s2": (-1.5, -3.5), "sm": (0, -3.5),
         "s3": (1.0, -3.5), "s4": (3.0, -3.5), "se": (4, -3.5),
         "nw": (-5, 3.5), "nm": (0, 3.5), "ne": (4, 3.5)},
        walls(n, {"south 1": ("sw", "s1", 0.3), "south 2": ("s2", "sm", 0.3),
                  "south 3": ("sm", "s3", 0.3), "south 4": ("s4", "se", 0.3),
                  "north 1": ("nw", "nm", 0.3), "north 2": ("nm", "ne", 0.3),
                  "west": ("sw", "nw", 0.4), "middle": ("sm", "nm", 0.25),
                  "east": ("se", "ne", 0.4)}),
        links=[Link("door 1", "s1", "s2", 0.7), Link("door 2", "s3", "s4", 0.7)],
        **plan(24, 20),
    )


def number(value):
    """Ten significant digits: more than the mesh deserves, less than noise."""
    return float(f"{value:.10g}")


def lumped_timoshenko(case):
    """Periods and tips of isolated straight walls by beam theory, for a sanity check.

    Flexibility of a cantilever at the floors: bending z_i^2 (3 z_j - z_i)/(6 E I)
    for z_i <= z_j, shear z_i/(5/6 G A). Walls along X at +-y and along Y at +-x,
    placed symmetrically; St Venant torsion is added in parallel."""
    z = case.height * np.arange(1, case.storeys + 1)
    low, high = np.minimum.outer(z, z), np.maximum.outer(z, z)
    stiffness = {"x": 0.0, "y": 0.0, "twist": 0.0}
    for panel in case.panels:
        (ax, ay), (bx, by) = case.nodes[panel.a], case.nodes[panel.b]
        length, t = np.hypot(bx - ax, by - ay), panel.thickness[0]
        flexibility = low**2 * (3 * high - low) / (6 * case.elastic_modulus * t * length**3 / 12)
        flexibility += low / (5 / 6 * case.shear_modulus * t * length)
        K = np.linalg.inv(flexibility)
        axis, arm = ("x", ay) if ay == by else ("y", ax)
        stiffness[axis] = stiffness[axis] + K
        stiffness["twist"] = stiffness["twist"] + arm**2 * K
        twist = case.shear_modulus * length * t**3 / 3 / case.height
        step = np.eye(case.storeys) - np.eye(case.storeys, k=-1)
        stiffness["twist"] = stiffness["twist"] + twist * step.T @ step
    answer = {}
    for axis, K in stiffness.items():
        mass = case.rotational_inertia_t_m2 if axis == "twist" else case.mass_t
        load = case.torque_knm if axis == "twist" else case.force_kn
        values = scipy.linalg.eigvalsh(K) / (mass * 1e3)
        answer[axis] = {
            "first_period_s": number(2 * np.pi / np.sqrt(values[0])),
            "tip": number(np.linalg.solve(K, np.full(case.storeys, load * 1e3))[-1]),
        }
    return answer


def results(case):
    """Solves one case on every mesh; results of the finest, and how they changed."""
    history = []
    for size, finest in MESHES:
        K, meshed = floor_stiffness(case, size, finest)
        history.append((K, meshed, modes(case, K), displacements(case, K)))
        periods = " ".join(f"{period:.4f}" for period, _ in history[-1][2])
        print(f"{case.name:18} size {size:5} freedoms a storey {meshed:7} periods {periods}",
              flush=True)
    K, meshed, found, moved = history[-1]
    before = history[-2]
    period_change = [abs(a[0] / b[0] - 1) for a, b in zip(found, before[2])]
    tip_change = [abs(a[-1][i] / b[-1][i] - 1)
                  for i, (a, b) in enumerate(zip(moved, before[3]))]
    if max(period_change[:3]) > 1e-3:
        raise SystemExit(f"{case.name}: first periods still change by {max(period_change[:3])}")
    record = {
        "case": case.name,
        "title": case.title,
        "made_with": {
            "python": platform.python_version(), "numpy": np.__version__,
            "scipy": scipy.__version__, "scikit-fem": skfem.__version__,
        },
        "st_venant": True,
        "storeys": case.storeys,
        "storey_height_m": case.height,
        "elastic_modulus_gpa": case.elastic_modulus / 1e9,
        "poisson_ratio": case.poisson_ratio,
        "reference_m": case.reference,
        "extent_m": {"x": case.extent[0], "y": case.extent[1]},
        "mass_t": case.mass_t,
        "mass_centre_m": case.mass_centre,
        "rotational_inertia_t_m2": case.rotational_inertia_t_m2,
        "nodes_m": case.nodes,
        "walls": [{"id": p.id, "from": p.a, "to": p.b, "thickness_m": p.thickness}
                  for p in case.panels],
        "links": [{"id": l.id, "from": l.a, "to": l.b, "depth_m": l.depth} for l in case.links],
        "columns": [{"id": c.id, "node": c.node, "width_x_m": c.width_x, "width_y_m": c.width_y}
                    for c in case.columns],
        "arms": [{"from": a.a, "to": a.b, "storeys": [s + 1 for s in a.storeys],
                  "thickness_m": a.thickness} for a in case.arms],
        "mesh": {
            "element": "ElementQuad2, plane stress",
            "size_m": MESHES[-1][0],
            "size_at_openings_m": MESHES[-1][1],
            "freedoms_of_one_storey": meshed,
            "coarser_size_m": MESHES[-2][0],
            "coarser_size_at_openings_m": MESHES[-2][1],
            "period_change_from_coarser": [number(c) for c in period_change],
            "tip_change_from_coarser": [number(c) for c in tip_change],
        },
        "modes": mode_records(found),
        "load_cases": load_case_records(case, moved),
    }
    # The same mesh without Poisson coupling: the floors then restrain nothing but what
    # beam and panel theory also restrain, so idealisations can be compared more closely.
    K, _ = floor_stiffness(case, *MESHES[-1], material=without_poisson_coupling)
    record["without_poisson_coupling"] = {
        "modes": mode_records(modes(case, K)),
        "load_cases": load_case_records(case, displacements(case, K)),
    }
    if case.name == "cantilever_walls":
        record["beam_theory"] = lumped_timoshenko(case)
    return record


def mode_records(found):
    names = ("X", "Y", "twist")
    return [
        {"period_s": number(period), "direction": names[int(np.argmax(share))],
         "share_x": number(round(share[0], 9)), "share_y": number(round(share[1], 9)),
         "share_twist": number(round(share[2], 9))}
        for period, share in found
    ]


def load_case_records(case, moved):
    records = {}
    loads = (("uniform X", "force_kn_per_storey", case.force_kn),
             ("uniform Y", "force_kn_per_storey", case.force_kn),
             ("uniform torque", "torque_knm_per_storey", case.torque_knm))
    for (name, key, load), floors in zip(loads, moved):
        scale = np.abs(floors).max()
        clean = [[0.0 if abs(v) < 1e-8 * scale else number(v) for v in row] for row in floors]
        records[name] = {
            key: load,
            "tip": dict(zip(("ux_m", "uy_m", "theta_rad"), clean[-1])),
            "floors_ux_m_uy_m_theta_rad": clean,
        }
    return records


def plain(value):
    """A number as TOML likes it, without a needless tail."""
    return repr(float(value)) if value != int(value) else f"{int(value)}.0"


def toml(case):
    """The same tower in the full form of the program's input file."""
    n = case.storeys
    pair = lambda p: "[" + ", ".join(plain(v) for v in p) + "]"
    out = [
        f"# {case.title}.",
        "# Invented tower, written by make_reference.py: compare with the JSON of the same name.",
        "", "[tower]", f'name = "{case.title}"', f"reference_m = {pair(case.reference)}",
        "", "[mass]", 'structure = "none"',
        "", "[[concrete]]", f"storeys = [1, {n}]", 'grade = "M40"',
        f"elastic_modulus_gpa = {plain(case.elastic_modulus / 1e9)}",
        f"poisson_ratio = {case.poisson_ratio}",
        "", "[[storeys]]", f"count = {n}", f"height_m = {case.height}",
        f"extent_m = {{ x = {pair(case.extent[0])}, y = {pair(case.extent[1])} }}",
        f"mass_t = {plain(case.mass_t)}", f"mass_centre_m = {pair(case.mass_centre)}",
        f"rotational_inertia_t_m2 = {plain(case.rotational_inertia_t_m2)}",
    ]
    for id, at in case.nodes.items():
        out += ["", "[[nodes]]", f'id = "{id}"', f"at_m = {pair(at)}"]
    groups = {}
    for panel in case.panels:
        groups.setdefault(panel.thickness, []).append(panel)
    name_of = {}
    for index, thickness in enumerate(groups, 1):
        name_of[thickness] = f"group {index}"
        zones, first = [], 0
        for k in range(1, n + 1):
            if k == n or thickness[k] != thickness[first]:
                zones.append(f"  {{ storeys = [{first + 1}, {k}], "
                             f"thickness_mm = {plain(round(thickness[first] * 1e3, 6))} }},")
                first = k
        out += ["", "[[wall_groups]]", f'id = "group {index}"', "zones = [", *zones, "]"]
    for panel in case.panels:
        out += ["", "[[walls]]", f'id = "{panel.id}"', f'group = "{name_of[panel.thickness]}"',
                f'from = "{panel.a}"', f'to = "{panel.b}"']
    sizes = sorted({(c.width_x, c.width_y) for c in case.columns})
    for index, (wx, wy) in enumerate(sizes, 1):
        out += ["", "[[column_groups]]", f'id = "columns {index}"',
                f"zones = [ {{ storeys = [1, {n}], width_x_mm = {plain(wx * 1e3)}, "
                f"width_y_mm = {plain(wy * 1e3)} }} ]"]
    for column in case.columns:
        index = sizes.index((column.width_x, column.width_y)) + 1
        out += ["", "[[columns]]", f'id = "{column.id}"', f'group = "columns {index}"',
                f'node = "{column.node}"', "bends = false"]
    depths = sorted({link.depth for link in case.links})
    for index, depth in enumerate(depths, 1):
        out += ["", "[[link_groups]]", f'id = "links {index}"',
                f"zones = [ {{ storeys = [1, {n}], depth_mm = {plain(round(depth * 1e3, 6))} }} ]"]
    for link in case.links:
        out += ["", "[[links]]", f'id = "{link.id}"',
                f'group = "links {depths.index(link.depth) + 1}"',
                f'from = "{link.a}"', f'to = "{link.b}"']
    if case.arms:
        storeys, thickness = case.arms[0].storeys, case.arms[0].thickness
        assert all((a.storeys, a.thickness) == (storeys, thickness) for a in case.arms)
        arms = ", ".join(f'{{ from = "{a.a}", to = "{a.b}" }}' for a in case.arms)
        out += ["", "[outriggers]", f"arms = [ {arms} ]",
                f"thickness_mm = {plain(thickness * 1e3)}",
                f"places = [ {{ storeys = [{storeys[0] + 1}, {storeys[-1] + 1}], in_use = true }} ]"]
    factors = "walls = 1.0, wall_shear = 1.0, columns = 1.0, beams = 1.0, links = 1.0, arms = 1.0"
    out += ["", "[base]", 'kind = "fixed"', "", "[cracking]",
            'source = "uncracked, to compare with the membrane model"',
            f"unfactored = {{ {factors} }}", f"factored = {{ {factors} }}"]
    for name, direction, force, torque in (
        ("uniform X", "x", case.force_kn, None), ("uniform Y", "y", case.force_kn, None),
        ("uniform torque", "x", 0.0, case.torque_knm),
    ):
        out += ["", "[[lateral_cases]]", f'name = "{name}"', f'direction = "{direction}"',
                'action = "wind"',
                f"forces = [ {{ storeys = [1, {n}], force_kn = {plain(force)} }} ]"]
        if torque is not None:
            out += [f"torques = [ {{ storeys = [1, {n}], torque_knm = {plain(torque)} }} ]"]
    return "\n".join(out) + "\n"


def main():
    wanted = set(sys.argv[1:])
    for case in cases():
        if wanted and case.name not in wanted:
            continue
        record = results(case)
        (HERE / f"{case.name}.json").write_text(json.dumps(record, indent=1) + "\n")
        (HERE / f"{case.name}.toml").write_text(toml(case))


if __name__ == "__main__":
    main()
