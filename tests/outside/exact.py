"""The program's figures against exact rational arithmetic, to its stated promise.

    python3 tests/outside/exact.py target/release/bismar

The promise: |dV| <= 1e-13 K, with K the sum of the absolute signed tetrahedra about the middle of
the bounding box; centroid within 1e-13 of the box diagonal times the condition K/|V|, or 4 ulp of
the coordinate, whichever is larger; inertia within 1e-13 of its Frobenius norm times the condition.
Every closed fixture and every mesh of the demo is tested. Standard library only.
"""
import math
import sys
from fractions import Fraction

from exact_moments import Moments
from meshes import read
from running import Tally, fixtures, rover_meshes, weighed

MM = Fraction(1, 1000)


def compare(tally, what, got, m, fanned=False):
    k, condition = m.k * MM ** 3, m.condition
    tally.check(what, "volume", abs(Fraction(got["volume_m3"]) - m.volume * MM ** 3), k * Fraction(1e-13))
    for i, axis in enumerate("xyz"):
        exact = m.centroid[i] * MM
        allowed = max(1e-13 * m.diagonal * 1e-3 * condition, 4 * math.ulp(float(exact)))
        tally.check(what, f"centroid {axis}", abs(Fraction(got["centroid_m"][i]) - exact), allowed)
    exact = [[x * MM ** 5 for x in row] for row in m.inertia]
    norm = math.sqrt(sum(float(x) ** 2 for row in exact for x in row))
    worst = max(abs(Fraction(got["volume_inertia_m5"][i][j]) - exact[i][j])
                for i in range(3) for j in range(3))
    tally.check(what, "inertia", worst, 1e-13 * norm * condition)
    # K itself is a float sum of as many terms. Only where larger polygons are cut into fans here,
    # whose triangles may overlap, is the K of the program's own triangles allowed to be smaller.
    off = got["condition"] / condition - 1
    tally.check(what, "condition", max(0, off) if fanned else abs(off), 1e-9)
    tally.check(what, "condition's least", max(0, 1 - got["condition"]), 1e-9)


def has_polygons(path):
    """Whether a face of an OBJ has more than four corners."""
    return str(path).endswith(".obj") and any(
        line.startswith("f ") and len(line.split()) > 5
        for line in path.read_text(encoding="utf-8").splitlines())


class Recorded:
    """The exact figures of a fixture's body, as recorded when it was written (rounded once)."""

    def __init__(self, entry):
        self.volume = Fraction(entry.get("volume_exact_mm3") or entry["volume_mm3"])
        self.k = Fraction(entry["k_mm3"])
        self.condition = float(self.k / self.volume)
        self.diagonal = entry["diagonal_mm"]
        self.centroid = [Fraction(x) for x in entry["centroid_mm"]]
        self.inertia = [[Fraction(x) for x in row] for row in entry["inertia_mm5"]]


def main(program):
    tally = Tally()
    entries = list(fixtures())
    answers = weighed(program, [p for p, _ in entries])
    for path, entry in entries:
        got = {b["id"]: b for b in answers[path]["bodies"]}
        named = {b["name"] for b in entry["bodies"]}
        # One body a name, nothing dropped or turned: the file itself is summed again.
        plain = len(named) == len(entry["bodies"]) and not any(
            b["turned"] or b["findings"] for b in entry["bodies"])
        solids = dict(read(path)) if plain else {}
        for body in entry["bodies"]:
            what = f"{path.name}#{body['id']}"
            tally.expect(what + " is there", body["id"] in got)
            if body["id"] not in got:
                continue
            if plain:
                compare(tally, what, got[body["id"]], Moments(solids[body["name"]]), has_polygons(path))
            compare(tally, what + " (as recorded)", got[body["id"]], Recorded(body))
    answers = weighed(program, rover_meshes())
    for path, answer in answers.items():
        solids = read(path)
        tally.expect(f"{path.name}: a body a name", len(solids) == len(answer["bodies"]))
        for (name, triangles), body in zip(solids, answer["bodies"]):
            tally.expect(f"{path.name}: {body['name']} is {name}", body["name"] == name)
            compare(tally, f"{path.name}#{body['id']}", body, Moments(triangles), has_polygons(path))
    return tally.end()


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit(__doc__)
    sys.exit(main(sys.argv[1]))
