"""Mass, centre of mass and inertia of an assembly file, worked out apart from the project.

    python3 tests/outside/rollup.py demo-data/rover/rover.toml

Reads what the demo and the fixtures use: assign, own materials, parts, items, nested groups,
placements, `measured`, tanks filled to a level with gravity along -z. Built-in densities are listed below by the name used in the files.
"""
import fnmatch
import json
import math
import pathlib
import re
import sys
import tomllib

from exact_moments import Moments
from meshes import read

# kg/m3, as the project's table of materials gives them.
DENSITY = {"al-6061": 2700, "pom": 1410, "petg": 1270, "hdpe": 955, "pp": 905, "abs": 1045,
           "water": 998.207}
LENGTH = {"mm": 1e-3, "cm": 1e-2, "m": 1.0, "in": 0.0254, "ft": 0.3048}
MASS = {"mg": 1e-6, "g": 1e-3, "kg": 1.0, "t": 1e3, "lb": 0.45359237, "oz": 0.028349523125}


def quantity(value, table, default=None):
    """The nominal value in SI; a bare number takes the `default` factor."""
    if isinstance(value, (int, float)):
        return value * default
    number, unit = re.match(r"\s*([-+0-9.eE]+)\s*([^\s±+]+)", value).groups()
    return float(number) * table[unit]


def density(text):
    table = {f"{m}/{l}3": MASS[m] / LENGTH[l] ** 3 for m in MASS for l in LENGTH}
    return quantity(text.replace("^3", "3").replace("³", "3"), table)


def matrix_product(a, b):
    return [[sum(a[i][k] * b[k][j] for k in range(3)) for j in range(3)] for i in range(3)]


def rotated(rotation, tensor):
    transposed = [list(r) for r in zip(*rotation)]
    return matrix_product(matrix_product(rotation, tensor), transposed)


class Placement:
    """x -> turn(x) + at, where `turn` may hold a mirror."""

    def __init__(self, turn=None, at=(0, 0, 0)):
        self.turn = turn or [[float(i == j) for j in range(3)] for i in range(3)]
        self.at = list(at)

    def point(self, p):
        return [sum(self.turn[i][j] * p[j] for j in range(3)) + self.at[i] for i in range(3)]

    def after(self, inner):
        return Placement(matrix_product(self.turn, inner.turn), self.point(inner.at))


def placements(entry, unit):
    turn = [[float(i == j) for j in range(3)] for i in range(3)]
    if "mirror" in entry:
        n = entry["mirror"]
        n = [float(n == axis) for axis in "xyz"] if isinstance(n, str) else n
        size = sum(x * x for x in n)
        turn = [[float(i == j) - 2 * n[i] * n[j] / size for j in range(3)] for i in range(3)]
    if "turn" in entry:
        axis = entry["turn"]["axis"]
        axis = [float(axis == a) for a in "xyz"] if isinstance(axis, str) else axis
        length = math.sqrt(sum(x * x for x in axis))
        k = [x / length for x in axis]
        angle = quantity(entry["turn"]["angle"], {"deg": math.pi / 180, "rad": 1.0})
        c, s = math.cos(angle), math.sin(angle)
        skew = [[0, -k[2], k[1]], [k[2], 0, -k[0]], [-k[1], k[0], 0]]
        by = [[c * (i == j) + s * skew[i][j] + (1 - c) * k[i] * k[j] for j in range(3)]
              for i in range(3)]
        turn = matrix_product(by, turn)
    places = entry.get("places", [entry.get("at", [0, 0, 0])] * entry.get("count", 1))
    return [Placement(turn, [quantity(x, LENGTH, unit) for x in p]) for p in places]


def item_inertia(entry, mass, unit):
    def length(x):
        return quantity(x, LENGTH, unit)
    if "box" in entry:
        a = [length(x) ** 2 for x in entry["box"]]
        d = [mass * (sum(a) - a[i]) / 12 for i in range(3)]
    elif "cylinder" in entry:
        r, h = length(entry["cylinder"]["radius"]), length(entry["cylinder"]["height"])
        d = [mass * (3 * r * r + h * h) / 12] * 2 + [mass * r * r / 2]
    elif "sphere" in entry:
        d = [mass * 0.4 * length(entry["sphere"]) ** 2] * 3
    else:
        d = [0.0] * 3
    return [[d[i] if i == j else 0.0 for j in range(3)] for i in range(3)]


def below(triangles, height):
    """The closed surface of what lies below z = height: facets cut there, and a fan over the cut."""
    out, middle = [], None
    for triangle in triangles:
        polygon, ends = [], {}
        for i in range(3):
            p, q = triangle[i], triangle[(i + 1) % 3]
            a, b = p[2] - height, q[2] - height
            assert a != 0, "a vertex on the plane of the liquid"
            if a < 0:
                polygon.append(p)
            if (a < 0) != (b < 0):
                s = a / (a - b)
                x = [p[0] + s * (q[0] - p[0]), p[1] + s * (q[1] - p[1]), height]
                polygon.append(x)
                ends["leaves" if a < 0 else "enters"] = x
        out += [[polygon[0], polygon[k], polygon[k + 1]] for k in range(1, len(polygon) - 1)]
        if ends:
            middle = middle or ends["leaves"]
            out.append([middle, ends["enters"], ends["leaves"]])
    return out


def roll_up(path):
    """{"mass_kg", "centre_of_mass_m", "inertia_kg_m2", "parts": {path: mass}} of a TOML assembly."""
    path = pathlib.Path(path)
    document = tomllib.loads(path.read_text(encoding="utf-8"))
    unit = LENGTH[document["assembly"]["unit"]]
    own = {k.lower(): density(v["density"]) for k, v in document.get("material", {}).items()}
    meshes, leaves = {}, []

    def material(entry, part, body):
        if "material" in entry:
            name = entry["material"]
        else:
            name = next(a["material"] for a in document.get("assign", [])
                        if fnmatch.fnmatchcase(body, a.get("body", "*"))
                        and fnmatch.fnmatchcase(part, a.get("part", "*")))
        return own.get(name.lower()) or DENSITY[name.lower()]

    def solid(entry, part):
        file, _, wanted = entry["mesh"].partition("#")
        if file not in meshes:
            meshes[file] = [(n or pathlib.Path(file).stem, t) for n, t in read(path.parent / file)]
        chosen = [b for b in meshes[file] if wanted in ("", b[0])]
        assert len(chosen) == 1, entry
        name, triangles = chosen[0]
        if (file, name) not in cache:
            cache[file, name] = Moments(triangles)
        m = cache[file, name]
        rho = material(entry, part, name)
        mass = rho * float(m.volume) * unit ** 3
        if "measured" in entry:
            weighed = quantity(entry["measured"], MASS)
            rho, mass = rho * weighed / mass, weighed
        inertia = [[rho * float(x) * unit ** 5 for x in row] for row in m.inertia]
        return mass, [float(x) * unit for x in m.centroid], inertia

    def liquid(entry):
        (_, triangles), = read(path.parent / entry["mesh"])
        level = quantity(entry["fill"], LENGTH, unit) / unit
        height = min(p[2] for t in triangles for p in t) + level
        m = Moments(below(triangles, height))
        rho = own.get(entry["liquid"].lower()) or DENSITY[entry["liquid"].lower()]
        inertia = [[rho * float(x) * unit ** 5 for x in row] for row in m.inertia]
        return rho * float(m.volume) * unit ** 3, [float(x) * unit for x in m.centroid], inertia

    def walk(table, outer, prefix):
        for entry in table.get("tank", []):
            inner, = placements(entry, unit)
            mass, centre, inertia = liquid(entry)
            where = outer.after(inner)
            assert where.turn == Placement().turn, "a tank that is turned"
            leaves.append((prefix + entry["name"], mass, where.point(centre), inertia))
        for entry in table.get("part", []) + table.get("item", []):
            name = prefix + entry["name"]
            for n, inner in enumerate(placements(entry, unit)):
                if "mesh" in entry:
                    mass, centre, inertia = solid(entry, name)
                else:
                    mass, centre = quantity(entry["mass"], MASS), [0.0] * 3
                    inertia = item_inertia(entry, mass, unit)
                where = outer.after(inner)
                leaves.append((name + (f"#{n + 1}" if n else ""), mass, where.point(centre),
                               rotated(where.turn, inertia)))
        for group in table.get("group", []):
            for inner in placements(group, unit):
                walk(group, outer.after(inner), f"{prefix}{group['name']}/")

    cache = {}
    walk(document, Placement(), "")
    total = math.fsum(m for _, m, _, _ in leaves)
    centre = [math.fsum(m * c[i] for _, m, c, _ in leaves) / total for i in range(3)]
    inertia = [[0.0] * 3 for _ in range(3)]
    for _, mass, c, own_inertia in leaves:
        d = [c[i] - centre[i] for i in range(3)]
        square = sum(x * x for x in d)
        for i in range(3):
            for j in range(3):
                inertia[i][j] += own_inertia[i][j] + mass * ((i == j) * square - d[i] * d[j])
    return {"mass_kg": total, "centre_of_mass_m": centre, "inertia_kg_m2": inertia,
            "parts": {n: m for n, m, _, _ in leaves}}


if __name__ == "__main__":
    print(json.dumps(roll_up(sys.argv[1]), indent=1, ensure_ascii=False))
