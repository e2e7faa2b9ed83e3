"""The program's figures against trimesh (PyPI), and its roll-up against one written apart.

    python3 -m venv .venv && .venv/bin/pip install -r tests/outside/requirements.txt
    .venv/bin/python tests/outside/second_opinion.py target/release/bismar

trimesh sums in f64 about the file's origin, so what it can be held to is the rounding of its own
sum: with B = sum |a||b||c| / 6 over the triangles' corners and R the farthest corner, a few eps of
B, B R and B R^2 for the integrals of 1, x and x x^T. Where that leaves it no digits (a body far from
the origin) the comparison would prove nothing, and is skipped by name. STL coordinates are the
file's own 32-bit floats on both sides: nothing is lost in reading them.
"""
import json
import pathlib
import shutil
import sys
import tempfile

import numpy
import trimesh

from meshes import read
from rollup import roll_up
from running import FIXTURES, ROVER, Tally, fixtures, rover_meshes, run, weighed

EPS = float(numpy.finfo(float).eps)
# trimesh's polynomials take about ten operations a triangle and then a sum.
SLACK = 32 * EPS
MM = 1e-3


def integration(tally, what, triangles, got, polygons):
    """Volume, centroid and inertia of one body; returns False where trimesh keeps no digits."""
    corners = numpy.array(triangles, dtype=float)
    size = numpy.linalg.norm(corners, axis=2)
    bound, far = float(size.prod(axis=1).sum() / 6), float(size.max())
    mesh = trimesh.Trimesh(corners.reshape(-1, 3), numpy.arange(corners.size // 3).reshape(-1, 3),
                           process=False)
    figures = mesh.mass_properties
    volume = float(figures.volume)
    if SLACK * bound * far ** 2 > 1e-6 * float(numpy.linalg.norm(figures.inertia)):
        return False
    tally.check(what, "volume", abs(got["volume_m3"] - volume * MM ** 3), SLACK * bound * MM ** 3)
    off = numpy.abs(numpy.array(got["centroid_m"]) - numpy.array(figures.center_mass) * MM).max()
    tally.check(what, "centroid", off, 2 * SLACK * bound * far / abs(volume) * MM)
    off = numpy.abs(numpy.array(got["volume_inertia_m5"]) - numpy.array(figures.inertia) * MM ** 5)
    tally.check(what, "inertia", off.max(), 6 * SLACK * bound * far ** 2 * MM ** 5)
    # Lengths lose digits by the corner's distance, not the edge's. The readers here cut polygons as
    # fans, whose triangles overlap where a polygon is concave: their area is then the larger one,
    # while signed sums stay right. So an area may be below theirs only where the closed surface
    # itself has a larger polygon than a triangle or a quadrilateral.
    slack = 1e-12 * float(mesh.area) * MM ** 2 + SLACK * far ** 2 * len(triangles) * MM ** 2
    over = got["area_m2"] - float(mesh.area) * MM ** 2
    tally.check(what, "area", max(over, 0) if polygons else abs(over), slack)
    return True


def reading(tally, path, bodies):
    """The whole file as trimesh itself reads it: its volume is the sum of the bodies'."""
    mesh = trimesh.load(path, force="mesh", process=False)
    size = numpy.linalg.norm(mesh.triangles, axis=2)
    bound = float(size.prod(axis=1).sum() / 6)
    got = sum(b["volume_m3"] for b in bodies)
    tally.check(f"{path.name} as read by trimesh", "volume of the file",
                abs(got - float(mesh.volume) * MM ** 3), 2 * SLACK * bound * MM ** 3)


# What trimesh's readers do not take, or read otherwise; found by running them.
UNREAD = {
    "cube-ascii-no-endsolid.stl": "its reader needs the word endsolid",
    "cube-continuations-comments.obj": "its reader takes no line continuations",
}


def meshes(tally, program):
    skipped = []
    entries = {p: e for p, e in fixtures()}
    plain = {p: e for p, e in entries.items()
             if not any(b["turned"] or b["findings"] for b in e["bodies"])
             and len({b["name"] for b in e["bodies"]}) == len(e["bodies"])}
    paths = list(plain) + rover_meshes()
    answers = weighed(program, paths)
    for path in paths:
        bodies = {b["name"]: b for b in answers[path]["bodies"]}
        judged = True
        # More than four corners on a face line.
        polygons = path.suffix == ".obj" and any(
            line.startswith("f ") and len(line.split()) > 5
            for line in path.read_text(encoding="utf-8").splitlines())
        for name, triangles in read(path):
            what = f"{path.name}#{name}"
            tally.expect(what + " is there", name in bodies)
            if name in bodies and not integration(
                    tally, what, triangles, bodies[name], polygons):
                skipped.append(path.name)
                judged = False
        if path.name in UNREAD:
            skipped.append(f"{path.name} ({UNREAD[path.name]})")
        elif judged:
            reading(tally, path, answers[path]["bodies"])
    print("not judged by trimesh:", ", ".join(skipped) or "none")


def as_solid(folder):
    """A copy of the rover in which nothing is printed: the roll-up knows solids alone."""
    shutil.copytree(ROVER, folder)
    lines = (folder / "rover.toml").read_text(encoding="utf-8").splitlines(keepends=True)
    kept = [line for line in lines if not line.strip().startswith("made =")]
    assert len(kept) == len(lines) - 1
    (folder / "rover.toml").write_text("".join(kept), encoding="utf-8")


def prism_print(triangles, wall, skin, infill):
    """Printed volume of a prism along y with convex loops: by Steiner's formulas, the outline
    loses w P - w^2 sum tan(half the turn) and each hole gains w P + pi w^2."""
    corners = numpy.array(triangles, dtype=float)
    low, high = corners[..., 1].min(), corners[..., 1].max()
    lid = corners[(corners[..., 1] == high).all(axis=1)][..., [2, 0]]
    edges = {(tuple(t[i]), tuple(t[(i + 1) % 3])) for t in lid for i in range(3)}
    follows = {a: b for a, b in edges if (b, a) not in edges}
    area = core = 0.0
    while follows:
        loop = [next(iter(follows))]
        while loop[-1] in follows:
            loop.append(follows.pop(loop[-1]))
        p = numpy.array(loop[:-1])
        step = numpy.roll(p, -1, axis=0) - p
        length = numpy.hypot(*step.T)
        signed = numpy.sum(p[:, 0] * step[:, 1] - p[:, 1] * step[:, 0]) / 2
        before = numpy.roll(step, 1, axis=0)
        turn = numpy.arctan2(before[:, 0] * step[:, 1] - before[:, 1] * step[:, 0],
                             (before * step).sum(axis=1))
        assert (turn * signed >= -1e-12).all(), "a loop that is not convex"
        corner = numpy.tan(turn / 2).sum() if signed > 0 else numpy.pi
        area += signed
        core += signed - wall * length.sum() + (wall ** 2 * corner if signed > 0
                                                else -wall ** 2 * corner)
    return area * (high - low) - (1 - infill) * core * (high - low - 2 * skin)


def assemblies(tally, program):
    """Sums of a few dozen positive terms in f64: 1e-12 is far above their rounding."""
    entries = json.loads((FIXTURES / "assemblies" / "expected.json").read_text())["assemblies"]
    readable = [FIXTURES / e["path"] for e in entries if e["mass_kg"] is not None
                and e["path"].endswith(".toml")
                # Not worked out by the roll-up: includes, and inertia given by hand.
                and not e["path"].endswith(("include.toml", "item-shapes.toml"))]
    solid = pathlib.Path(tempfile.mkdtemp()) / "rover"
    as_solid(solid)
    exit_code, document = run(program, "balance", ROVER / "rover.toml")
    tally.expect("the rover with printed brackets: exit 0", exit_code == 0)
    bracket = next(p for p in document["parts"] if "bracket" in p["path"])
    mine = prism_print(read(ROVER / "nozzle-bracket.stl")[0][1], 1.2, 0.8, 0.25) * 1e-9 * 1270
    # Sectors around the corners of holes keep their area; the rest is rounding.
    tally.check("rover.toml", "mass of a print", abs(bracket["mass_kg"] - mine), 1e-9 * mine)
    for path in [solid / "rover.toml", *readable]:
        exit_code, document = run(program, "balance", path)
        tally.expect(f"{path.name} is answered", document.get("total"))
        if not document.get("total"):
            continue
        if path.name == "rover.toml":
            tally.expect("rover.toml: exit 0", exit_code == 0)
        mine, total = roll_up(path), document["total"]
        tally.check(path.name, "mass", abs(total["mass_kg"] - mine["mass_kg"]),
                    1e-12 * mine["mass_kg"])
        off = numpy.abs(numpy.subtract(total["centre_of_mass_m"], mine["centre_of_mass_m"])).max()
        tally.check(path.name, "centre of mass", off, 1e-12)
        off = numpy.abs(numpy.subtract(total["inertia_kg_m2"], mine["inertia_kg_m2"])).max()
        # Things in one point leave rounding alone: of a millimetre's moment of inertia, at least.
        least = mine["mass_kg"] * 1e-6
        tally.check(path.name, "inertia of the whole", off,
                    1e-12 * max(float(numpy.linalg.norm(mine["inertia_kg_m2"])), least))
        parts = {p["path"]: p["mass_kg"] for p in document["parts"]}
        tally.expect(f"{path.name}: parts {sorted(parts)}", parts.keys() == mine["parts"].keys())
        for name in parts.keys() & mine["parts"].keys():
            tally.check(f"{path.name}: {name}", "mass of a part",
                        abs(parts[name] - mine["parts"][name]), 1e-12 * mine["parts"][name])


def main(program):
    tally = Tally()
    meshes(tally, program)
    assemblies(tally, program)
    return tally.end()


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit(__doc__)
    sys.exit(main(sys.argv[1]))
