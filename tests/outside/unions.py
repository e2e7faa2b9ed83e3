"""What overlapping bodies come to, counted once, against manifold3d (PyPI) and closed forms.

    python3 -m venv .venv && .venv/bin/pip install -r tests/outside/requirements.txt
    .venv/bin/python tests/outside/unions.py target/release/bismar

Every scene is a few closed convex bodies, or hollow ones, each under its own name. `weigh --filled`
must give the volume and centroid of their union, and `check` what each pair shares, within the
error figures that they print (three standard errors: of N comparisons some 0.3 % would fail by
chance alone, if those figures were no more than honest; the scenes are the same on every run).
manifold3d works out unions of the same f64 meshes by exact rules up to rounding, which 1e-9 covers.
"""
import math
import random
import re
import sys
import tempfile

import manifold3d
import numpy

import shapes
from running import Tally, run

MM3 = 1e-9
ROUNDING = 1e-9


def solid(faces):
    """The same mesh for manifold3d, welded by coordinates."""
    index, triangles = {}, []
    for t in shapes.fans(faces):
        triangles.append([index.setdefault(tuple(map(float, p)), len(index)) for p in t])
    out = manifold3d.Manifold(manifold3d.Mesh64(numpy.array(list(index), dtype=numpy.float64),
                                                numpy.array(triangles, dtype=numpy.uint64)))
    assert out.status() == manifold3d.Error.NoError, out.status()
    return out


def centroid(manifold):
    mesh = manifold.to_mesh64()
    corners = numpy.array(mesh.vert_properties)[:, :3][numpy.array(mesh.tri_verts).astype(int)]
    middle = corners.reshape(-1, 3).mean(axis=0)
    corners = corners - middle
    six = numpy.einsum("ij,ij->i", corners[:, 0], numpy.cross(corners[:, 1], corners[:, 2]))
    return (six[:, None] * corners.sum(axis=1)).sum(axis=0) / (4 * six.sum()) + middle


def cylinder(n, radius, half, axis):
    """Along an axis, through the origin; an n-gon circumscribed by the circle."""
    turn = {0: ((0, 1, 0), math.pi / 2), 1: ((1, 0, 0), -math.pi / 2), 2: ((0, 0, 1), 0.0)}[axis]
    return shapes.moved(shapes.prism(shapes.polygon(n, radius), -half, half),
                        axis=turn[0], angle=turn[1])


def hull(rng, at, size):
    """A random convex body: the hull of points, by manifold3d; its mesh is what both are given."""
    points = [[at[k] + size * rng.uniform(-1, 1) for k in range(3)] for _ in range(12)]
    mesh = manifold3d.Manifold.hull_points(numpy.array(points)).to_mesh64()
    corners = numpy.array(mesh.vert_properties)[:, :3].tolist()
    return [[tuple(corners[int(i)]) for i in t] for t in mesh.tri_verts]


def scenes():
    """(name, bodies, volume of the union in closed form or None)"""
    box, moved = shapes.box, shapes.moved
    yield "two boxes", [box(), box((4, 5, 6), (14, 15, 16))], 2000 - 6 * 5 * 4
    yield "three boxes", [box(), box((5, 0, 0), (15, 10, 10)), box((0, 5, 0), (10, 15, 10))], \
        3000 - 500 - 500 - 250 + 250
    yield "a box in a box", [box(), box((2, 3, 4), (5, 6, 7))], 1000
    yield "a box in a box in a box", [box(), box((2, 2, 2), (8, 8, 8)), box((3, 3, 3), (5, 5, 5))], \
        1000
    yield "boxes with a face in common", [box(), box((10, 0, 0), (20, 10, 10))], 2000
    yield "boxes flush on four sides", [box(), box((5, 0, 0), (15, 10, 10))], 1500
    yield "a box twice", [box(), box()], 1000
    yield "a turned box", [box(), moved(box((-5, -5, -5), (5, 5, 5)), (5, 5, 5), 1, (1, 2, 3), 0.7)], \
        None
    for rounds in (2, 4):
        ball = shapes.icosphere(1, rounds)
        yield f"two spheres, {len(ball)} facets", [ball, moved(ball, (1, 0, 0))], None
    yield "sphere in a corner of a box", [shapes.icosphere(4, 3), box()], None
    crossing = [cylinder(96, 3, 9, k) for k in range(3)]
    yield "two cylinders", crossing[:2], None
    yield "three cylinders", crossing, None
    for seed in range(12):
        rng = random.Random(seed)
        bodies = [hull(rng, [rng.uniform(-4, 4) for _ in range(3)], rng.uniform(2, 6))
                  for _ in range(2 + seed % 4)]
        yield f"convex bodies {seed}", bodies, None


def told_error(advice):
    """The error that `check` prints beside a shared volume (m3)."""
    found = re.search(r"± ([0-9.e+-]+) m3", advice)
    return float(found[1]) if found else None


def judge(tally, program, folder, name, bodies, closed_form):
    path = f"{folder}/{name.replace(' ', '-')}.obj"
    with open(path, "wb") as f:
        f.write(shapes.obj([(f"b{i}", b) for i, b in enumerate(bodies)]))
    solids = [solid(b) for b in bodies]
    union = manifold3d.Manifold.batch_boolean(solids, manifold3d.OpType.Add)
    volume = union.volume()
    if closed_form is not None:
        tally.check(name, "manifold3d against the closed form", abs(volume - closed_form),
                    ROUNDING * closed_form)
    _, document = run(program, "weigh", path, "--unit", "mm", "--filled")
    whole = document["files"][0]["whole"]
    tally.expect(f"{name}: weighed", whole)
    if whole:
        estimate = whole.get("estimate") or {"volume_bound_m3": 0.0, "centre_bound_m": 0.0}
        tally.check(name, "volume of the union", abs(whole["volume_m3"] - volume * MM3),
                    estimate["volume_bound_m3"] + ROUNDING * volume * MM3)
        off = numpy.linalg.norm(numpy.array(whole["centroid_m"]) - centroid(union) * 1e-3)
        tally.check(name, "centroid of the union", off, estimate["centre_bound_m"] + ROUNDING * 1e-2)
        # An error figure that allows everything would prove nothing.
        tally.check(name, "error figure", estimate["volume_bound_m3"], 1e-3 * volume * MM3)
    shared(tally, program, path, name, solids)
    return volume


def shared(tally, program, path, name, solids):
    """What each pair shares: told where it is more than nothing, and nowhere else. Bodies of
    different names that lie in each other wholly have no facets that cut, and are no finding."""
    _, document = run(program, "check", path, "--unit", "mm")
    told = {}
    for f in document["files"][0]["findings"]:
        ids = re.match(r'"b(\d+)" and "b(\d+)"', f["advice"])
        if f["kind"] == "self-overlap" and ids:
            told[int(ids[1]), int(ids[2])] = f
    for i, a in enumerate(solids):
        for j in range(i + 1, len(solids)):
            common = (a ^ solids[j]).volume()
            smaller = min(a.volume(), solids[j].volume())
            f = told.pop((i, j), None)
            if f is None:
                inside = abs(common - smaller) <= ROUNDING * smaller
                tally.expect(f"{name}: {i} and {j} share {common} mm3, and nothing is said",
                             common <= ROUNDING * smaller or inside)
            else:
                error = told_error(f["advice"])
                tally.expect(f"{name}: {i} and {j}: an error figure", error is not None)
                tally.check(name, "volume that a pair shares",
                            abs(-f["volume_effect_m3"] - common * MM3),
                            (error or 0.0) + ROUNDING * smaller * MM3)
    tally.expect(f"{name}: no other pair", not told)


def limits(tally, volumes):
    """The published solids that finer meshes tend to, from the unions: two and three crossing
    cylinders (16 r^3/3 and 8 (2 - sqrt 2) r^3) and the lens of two spheres. The error of inscribed
    polygons falls with the square of their edge, and its factor here is below ten."""
    n, r, half = 96, 3.0, 9.0
    one = n / 2 * r * r * math.sin(2 * math.pi / n) * 2 * half
    pair = 2 * one - volumes["two cylinders"]
    # |A + B + C| = 3 |A| - 3 |AB| + |ABC|
    triple = volumes["three cylinders"] - 3 * one + 3 * pair
    for what, got, want in (("two crossing cylinders", pair, 144.0),
                            ("three crossing cylinders", triple, 126.529870527411)):
        tally.check(what, "limit of finer meshes", abs(got / want - 1), 10 / n ** 2)
    fine, ball = volumes["two spheres, 5120 facets"], shapes.icosphere(1, 4)
    lens = 2 * solid(ball).volume() - fine
    tally.check("lens of two spheres", "limit of finer meshes", abs(lens / 1.30899693899575 - 1),
                10 * 0.07 ** 2)


def main(program):
    tally, volumes = Tally(), {}
    with tempfile.TemporaryDirectory() as folder:
        for name, bodies, closed_form in scenes():
            volumes[name] = judge(tally, program, folder, name, bodies, closed_form)
    limits(tally, volumes)
    return tally.end()


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit(__doc__)
    sys.exit(main(sys.argv[1]))
