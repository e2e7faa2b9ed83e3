"""Writes fixtures/ and fixtures/expected.json. Standard library only.

    python3 tests/outside/make_fixtures.py

Independent of every writer and reader of the project: the figures are closed forms, or exact
rational sums over the very numbers that are written (`exact_moments.py`); where a closed form is
known, both must agree before anything is written. The generated files are committed, since the
last bit of sine and cosine may differ between platforms.
"""
import json
import math
import pathlib
from decimal import Decimal
from fractions import Fraction

import invalid_fixtures
from exact_moments import Moments, area
from shapes import (box, f32, fans, flipped, icosphere, moved, narrowed, next_f32, normal, obj,
                    polygon, prism, stl_ascii, stl_binary, tetrahedron)

ROOT = pathlib.Path(__file__).resolve().parents[2] / "fixtures"
EXACT = "exact rational sum over the coordinates as written"
ENTRIES = []


def body(id, name, triangles, closed_form=None, shells=1, voids=0, turned=False, sound=True,
         findings=(), uncounted=False):
    """A body that is weighed. `triangles`: what bounds it; `uncounted`: their number is left open,
    where dropped or empty facets may be counted or not."""
    m = Moments(triangles)
    assert m.volume > 0, id
    if closed_form is not None:
        assert m.volume == closed_form, (id, m.volume, closed_form)
    out = {"id": id, "name": name, "triangles": None if uncounted else len(triangles),
           "shells": shells, "voids": voids, "closed": True, "sound": sound, "turned": turned,
           "volume_mm3": float(m.volume), "k_mm3": float(m.k), "diagonal_mm": m.diagonal,
           "area_mm2": area(triangles), "centroid_mm": [float(x) for x in m.centroid],
           "inertia_mm5": [[float(x) for x in row] for row in m.inertia],
           "bounds_mm": [[float(x) for x in m.low], [float(x) for x in m.high]],
           "refused": None, "findings": sorted(findings)}
    exact = str(m.volume)
    if len(exact) < 60:
        out["volume_exact_mm3"] = exact
    return out


def refused(id, name, triangles, kind, closed, open_edges=None, loops=None, shells=None,
            findings=()):
    """A body that `weigh` must refuse."""
    return {"id": id, "name": name, "triangles": triangles, "shells": shells, "voids": None,
            "closed": closed, "sound": False, "turned": None, "volume_mm3": None,
            "refused": {"kind": kind, "open_edges": open_edges, "loops": loops},
            "findings": sorted(findings)}


def finding(kind, severity, count=None):
    return {"kind": kind, "severity": severity, "count": count}


def fixture(path, data, triangles, bodies, source, check=0, weigh=0, findings=(), may=(),
            total=None, warnings=()):
    """`bodies` None: only what is left (exit codes, findings, total) is asserted."""
    target = ROOT / path
    target.parent.mkdir(parents=True, exist_ok=True)
    target.write_bytes(data)
    ENTRIES.append({"path": path, "format": target.suffix[1:].lower(), "triangles": triangles,
                    "check_exit": check, "weigh_exit": weigh, "findings": list(findings),
                    "may_find": list(may), "bodies": bodies, "total_volume_mm3": total,
                    "warnings": list(warnings), "error": None, "source": source})


def simple(path, data, triangles, name, source, closed_form=None, id=None, **more):
    stem = pathlib.Path(path).stem
    fixture(path, data, len(triangles), [body(id or name or stem, name, triangles, closed_form)],
            source, **more)


CUBE = fans(box())
V = Fraction(1000)
FORM = "closed form: edge cubed"


def readers():
    """One sound cube each, written the ways that exporters write."""
    simple("cube-binary.stl", stl_binary(CUBE), CUBE, None, FORM, V)
    simple("cube-header-says-solid.stl", stl_binary(CUBE, b"solid cube, yet binary"), CUBE, None,
           FORM, V)
    simple("cube-ascii.stl", stl_ascii(CUBE, "cube"), CUBE, "cube", FORM, V)
    simple("cube-ascii-crlf.stl", stl_ascii(CUBE, "cube", "\r\n"), CUBE, "cube", FORM, V)
    simple("cube-ascii-tabs.stl", stl_ascii(CUBE, "cube", indent="\t"), CUBE, "cube", FORM, V)
    upper = stl_ascii(CUBE, "Cube").replace(b"Cube", b"@").upper().replace(b"@", b"Cube")
    simple("cube-ascii-upper-case.stl", upper, CUBE, "Cube", FORM, V)
    simple("cube-ascii-no-name.stl", stl_ascii(CUBE), CUBE, None, FORM, V)
    bare = stl_ascii(CUBE, "cube").rsplit(b"endsolid", 1)[0]
    simple("cube-ascii-no-endsolid.stl", bare, CUBE, "cube", FORM, V, may=["missing-endsolid"])
    two = fans(box((20, 0, 0), (40, 20, 20)))
    fixture("two-solids-ascii.stl", stl_ascii(CUBE, "small cube") + stl_ascii(two, "big cube"), 24,
            [body("small cube", "small cube", CUBE, V), body("big cube", "big cube", two, 8 * V)],
            FORM)
    fixture("same-name-twice-ascii.stl", stl_ascii(CUBE, "cube") + stl_ascii(two, "cube"), 24,
            [body("cube", "cube", CUBE, V), body("cube/2", "cube", two, 8 * V)], FORM)
    fixture("two-bodies-binary.stl", stl_binary(CUBE + two), 24,
            [body("two-bodies-binary", None, CUBE, V), body("two-bodies-binary/2", None, two, 8 * V)],
            FORM)
    simple("cube.obj", obj([("cube", box())]), CUBE, "cube", FORM, V)
    simple("cube-no-name.obj", obj([(None, box())]), CUBE, None, FORM, V)
    vertices = [p for f in (box()[0], box()[1]) for p in f]
    head = "".join(f"v {p[0]} {p[1]} {p[2]}\n" for p in vertices)
    negative = [[vertices.index(p) - len(vertices) for p in f] for f in box()]
    text = head + "o cube\n" + "".join("f " + " ".join(map(str, f)) + "\n" for f in negative)
    simple("cube-negative-indices.obj", text.encode(), CUBE, "cube", FORM, V)
    odd = "# a cube, its lines broken\r\nmtllib none.mtl\r\no cube\r\ns off\r\n"
    odd += "".join(f"v {p[0]} \\\r\n  {p[1]} {p[2]} # corner\r\n" for p in vertices)
    odd += "vt 0 0\r\nvn 0 0 1\r\n"
    for i, f in enumerate(box()):
        w = [str(vertices.index(p) + 1) + ("/1/1", "//1", "/1", "")[i % 4] for p in f]
        odd += f"f {w[0]} {w[1]} \\\r\n {w[2]} {w[3]}\r\n"
    simple("cube-continuations-comments.obj", odd.encode(), CUBE, "cube", FORM, V)
    fixture("names-usemtl-only.obj",
            obj([("Steel plate", box()), ("Rubber", box((20, 0, 0), (40, 20, 20)))], "usemtl"), 24,
            [body("Steel plate", "Steel plate", CUBE, V), body("Rubber", "Rubber", two, 8 * V)],
            FORM)
    mixed = obj([("left", box()), ("right", box((20, 0, 0), (40, 20, 20)))])
    mixed = mixed.replace(b"o left\n", b"o left\ng ignored one\nusemtl steel\n")
    mixed = mixed.replace(b"o right\n", b"o right\ng ignored two\nusemtl steel\n")
    fixture("names-o-and-g-mixed.obj", mixed, 24,
            [body("left", "left", CUBE, V), body("right", "right", two, 8 * V)],
            FORM + "; `o` wins over `g` and `usemtl`")
    name = "Düsenhalter links № 2"
    simple("name with spaces – ünïcode.obj", obj([(name, box())]), CUBE, name, FORM, V)
    name = "red \x1b[31mname"
    simple("name-escape-sequence.obj", obj([(name, box())], "g"), CUBE, name, FORM, V)
    plus, minus = (("0", "0.0", "0.0e0"), ("-0", "-0.0", "-0.0e0"))
    signed = stl_ascii(CUBE, "cube").decode().splitlines()
    for i, line in enumerate(signed):
        if "vertex" in line:
            words = ["vertex"] + [(minus if i % 2 else plus)[(i + k) % 3] if w == "0" else w
                                  for k, w in enumerate(line.split()[1:])]
            signed[i] = " ".join(words)
    simple("minus-zero-ascii.stl", ("\n".join(signed) + "\n").encode(), CUBE, "cube", FORM, V)
    signs = [[tuple(-0.0 if x == 0 and (i + j) % 2 else float(x) for x in p)
              for j, p in enumerate(t)] for i, t in enumerate(CUBE)]
    simple("minus-zero-binary.stl", stl_binary(signs), CUBE, None, FORM, V)


def solids():
    """Sound solids whose figures are known in closed form, or exactly."""
    # Tonon 2004, J. Math. Stat. 1(1):8-11, vertices; the volume and tensor recomputed exactly.
    p = [(8.33220, -11.86875, 0.93355), (0.75523, 5.0, 16.37072), (52.61236, 5.0, -5.38580),
         (2.0, 5.0, 3.0)]
    faces = tetrahedron(*p)
    if Moments(fans(faces)).volume < 0:
        faces = flipped(faces)
    m = Moments(faces)
    assert abs(float(m.volume) - 1873.2333642164654) < 1e-9
    assert abs(float(m.inertia[0][1]) + 11996.20139323) < 1e-7
    simple("tonon-tetrahedron.obj", obj([("tetrahedron", faces)]), faces, "tetrahedron",
           "Tonon 2004; " + EXACT)
    far = [[tuple(float(10**6 + Decimal(repr(x))) for x in q) for q in f] for f in faces]
    assert abs(float(Moments(far).volume) / float(m.volume) - 1) < 1e-8
    simple("tonon-moved-by-1e6.obj", obj([("tetrahedron", far)]), far, "tetrahedron",
           "Tonon 2004, each coordinate plus 1e6 in decimals; " + EXACT)
    t = fans(prism([(0, 0), (3, 0), (0, 4)], 0, 5))
    assert Moments(t).inertia[0][1] == 10 and Moments(t).inertia[0][0] == Fraction(535, 6)
    simple("prism-3-4-5.obj", obj([("prism", prism([(0, 0), (3, 0), (0, 4)], 0, 5))]), t, "prism",
           "closed form: V = abc/2, tensor xy = +mab/36 = +10", Fraction(30))
    t = tetrahedron((0, 0, 0), (5, 0, 0), (0, 4, 0), (0, 0, 3))
    assert Moments(t).inertia[0][1] == Fraction(5, 2)
    simple("corner-tetrahedron-5-4-3.stl", stl_binary(t), t, None,
           "closed form: V = abc/6, tensor xy = +mab/80 = +5/2", Fraction(10))
    for n in (12, 64):
        faces = prism(polygon(n, 3.0), 0, 5)
        v = n / 2 * math.sin(2 * math.pi / n) * 9 * 5
        assert abs(float(Moments(fans(faces)).volume) / v - 1) < 1e-14
        simple(f"prism-{n}-gon.obj", obj([("prism", faces)]), fans(faces), "prism",
               "closed form of the polygon: n/2 sin(2 pi/n) R^2 h; " + EXACT)
    c = [(0, 0), (30, 0), (30, 30), (20, 30), (20, 10), (10, 10), (10, 30), (0, 30)]
    faces = prism(c[2:] + c[:2], 0, 5)
    # For area and K the ends are cut into rectangles: a fan's triangles would overlap.
    ends = [[(x, y, z) for x, y in (q if z else q[::-1])] for z in (0, 5) for q in (
        [(0, 0), (30, 0), (30, 10), (0, 10)], [(0, 10), (10, 10), (10, 30), (0, 30)],
        [(20, 10), (30, 10), (30, 30), (20, 30)])]
    simple("polygon-concave.obj", obj([("channel", faces)]), fans(faces[2:] + ends), "channel",
           "closed form: (30*30 - 10*20) * 5; a fan from the first corner leaves the outline",
           Fraction(3500))
    outer, inner = box(), flipped(box((2, 2, 2), (8, 8, 8)))
    t = fans(outer + inner)
    fixture("void.stl", stl_binary(t), 24,
            [body("void", None, t, V - 216, shells=2, voids=1)], "closed form: 10^3 - 6^3")
    core = fans(box((4, 4, 4), (6, 6, 6)))
    fixture("nested-three-levels.obj",
            obj([("nest", outer + inner + box((4, 4, 4), (6, 6, 6)))]), 36,
            [body("nest", "nest", t, V - 216, shells=2, voids=1), body("nest/2", "nest", core, 8)],
            "closed form: 10^3 - 6^3 and 2^3")
    # A skin of R/10^4: K is about 6700 times the volume.
    ball = icosphere(1000.0, 2)
    skin = ball + flipped(moved(ball, scale=0.9999))
    assert Moments(skin).condition > 3000
    fixture("thin-hollow-sphere.obj", obj([("skin", skin)]), len(skin),
            [body("skin", "skin", skin, shells=2, voids=1)], EXACT)
    plate = moved(fans(box((-500, -500, 0), (500, 500, 0.1))), (30, 40, 50), 1, (1, 2, 3), 0.7)
    simple("thin-plate-turned.obj", obj([("plate", plate)]), plate, "plate",
           EXACT + "; 1000 x 1000 x 0.1 before turning")
    narrow = narrowed(plate)
    simple("thin-plate-turned.stl", stl_binary(plate), narrow, None,
           EXACT + " after rounding to 32 bits")
    rod = moved(fans(prism(polygon(6, 0.5), 0, 2000)), (7, -3, 11), 1, (3, -1, 2), 1.1)
    simple("long-thin-rod.obj", obj([("rod", rod)]), rod, "rod", EXACT)
    away = moved(fans(box((-1, -2, -3), (1, 2, 3))), (6e6, -7e6, 5e6), 1, (1, 1, 2), 0.4)
    simple("far-from-origin.obj", obj([("brick", away)]), away, "brick",
           EXACT + "; 1e6 of its sizes from the origin")


def touching():
    """Bodies that share edges, corners or faces."""
    other = fans(box((10, 10, 0), (20, 20, 10)))
    fixture("cubes-touching-along-an-edge.stl", stl_binary(CUBE + other), 24,
            [body("cubes-touching-along-an-edge", None, CUBE, V),
             body("cubes-touching-along-an-edge/2", None, other, V)], FORM,
            findings=[finding("non-manifold-edge", "notes", 1)], may=["non-manifold-vertex"])
    other = fans(box((10, 10, 10), (20, 20, 20)))
    fixture("cubes-touching-at-a-corner.stl", stl_binary(CUBE + other), 24,
            [body("cubes-touching-at-a-corner", None, CUBE, V),
             body("cubes-touching-at-a-corner/2", None, other, V)], FORM,
            findings=[finding("non-manifold-vertex", "notes", 1)])
    other = fans(box((10, 0, 0), (20, 10, 10)))
    # The left cube's right face is split along the other diagonal, so that the facets coincide.
    right = box((10, 0, 0), (20, 10, 10))
    shared = [t[::-1] for t in fans([right[5]])]
    left = fans([f for f in box() if f != box()[3]]) + shared
    both = left + other
    fixture("coincident-faces.stl", stl_binary(both), 24, None,
            "closed form: two cubes; the coincident pair of faces adds nothing", check=1,
            findings=[finding("duplicate", "doubts")],
            may=["non-manifold-edge", "non-manifold-vertex"], total=2000.0)
    fixture("coincident-faces-two-names.obj",
            obj([("left", box()), ("right", box((10, 0, 0), (20, 10, 10)))]), 24,
            [body("left", "left", CUBE, V), body("right", "right", other, V)],
            FORM + "; names are welded apart")
    pieces = [("red", [box()[0], box()[2]]), ("green", [box()[1], box()[3]]),
              ("blue", [box()[4], box()[5]])]
    order = fans([f for _, fs in pieces for f in fs])
    fixture("split-by-colour.obj", obj(pieces, "g"), 12, [body("red", "red", order, V,
            findings=["name-split"])], FORM + "; the pieces close together",
            findings=[finding("name-split", "notes")])


def defects():
    """What must be found, and what must not be weighed."""
    n = 16
    pipe = fans(prism([tuple(map(f32, p)) for p in polygon(n, 5.0)], 0, 40)[2:])
    fixture("pipe-without-ends.stl", stl_binary(pipe), 2 * n,
            [refused("pipe-without-ends", None, 2 * n, "not-closed", False, 2 * n, 2, 1, ["hole"])],
            "counted by hand: two rings of n edges", 1, 1, [finding("hole", "blocks", 2)])
    fixture("hole-one-facet-missing.stl", stl_binary(CUBE[:-1]), 11,
            [refused("hole-one-facet-missing", None, 11, "not-closed", False, 3, 1, 1, ["hole"])],
            "counted by hand", 1, 1, [finding("hole", "blocks", 1)])
    turned = CUBE[:4] + [CUBE[4][::-1]] + CUBE[5:]
    fixture("winding-one-facet-flipped.stl", stl_binary(turned), 12,
            [refused("winding-one-facet-flipped", None, 12, "not-closed", False, 6, None, None,
                     ["winding-conflict"])],
            "counted by hand: three edges, each of imbalance 2", 1, 1,
            [finding("winding-conflict", "blocks", 3)])
    inverse = fans(flipped(box()))
    fixture("inside-out.stl", stl_binary(inverse), 12,
            [body("inside-out", None, CUBE, V, turned=True, sound=False, findings=["inside-out"])],
            FORM, 1, 0, [finding("inside-out", "doubts", 1)])
    outward = fans(box() + box((2, 2, 2), (8, 8, 8)))
    fixture("nested-solid.stl", stl_binary(outward), 24, None,
            "1000 with the inner cube as a void 784, summed 1216: no one volume", 1, 1,
            [finding("nested-solid", "doubts", 1)])
    fixture("duplicate-mesh-written-twice.stl", stl_binary(CUBE + CUBE), 24,
            [body("duplicate-mesh-written-twice", None, CUBE, V, sound=False,
                  findings=["duplicate"], uncounted=True)],
            FORM + "; every facet twice, same-facing", 1, 0,
            [finding("duplicate", "doubts", 12)])
    fixture("duplicate-one-facet-doubled.stl", stl_binary(CUBE + CUBE[3:4]), 13,
            [body("duplicate-one-facet-doubled", None, CUBE, V, sound=False,
                  findings=["duplicate"], uncounted=True)], FORM + "; the rest closes", 1, 0,
            [finding("duplicate", "doubts", 1)])
    pair = [CUBE[0], CUBE[0][::-1]]
    fixture("opposed-pair-only.stl", stl_binary(pair), 2, [],
            "a shell of nothing but opposed facets is no body", 1, 1,
            [finding("duplicate", "doubts")])
    stray = moved(pair, (30, 0, 0))
    fixture("opposed-pair-beside-a-cube.stl", stl_binary(CUBE + stray), 14, None,
            FORM + "; the pair adds nothing", 1, 0, [finding("duplicate", "doubts")],
            total=1000.0)
    step = next_f32(5.0)
    assert step != 5.0
    halves = [[f for f in box((0, 0, 0), (5, 10, 10)) if f != box((0, 0, 0), (5, 10, 10))[3]],
              [f for f in box((step, 0, 0), (10, 10, 10)) if f != box((step, 0, 0), (10, 10, 10))[5]]]
    crack = fans(halves[0] + halves[1])
    fixture("crack-one-ulp.stl", stl_binary(crack), 20, None,
            "counted by hand: two rings of four edges, one ulp (2^-21 mm) apart", 1, 1,
            [finding("crack", "blocks", 1)])
    a, b = (0, 0, 0), (10, 0, 0)
    fixture("degenerate-two-corners-alike.stl", stl_binary(CUBE + [[a, b, b]]), 13,
            [body("degenerate-two-corners-alike", None, CUBE, V, findings=["degenerate"],
                  uncounted=True)], FORM + "; a facet without area adds nothing", 0, 0,
            [finding("degenerate", "notes", 1)], may=["duplicate", "non-manifold-edge"])
    # Front faces meet the edge a-b at its middle, the bottom does not; a flat facet fills between.
    m = (5, 0, 0)
    front = [[a, m, (0, 0, 10)], [m, (10, 0, 10), (0, 0, 10)], [m, b, (10, 0, 10)]]
    filled = [t for t in CUBE if t not in fans([box()[2]])] + front + [[a, b, m]]
    fixture("degenerate-sliver.stl", stl_binary(filled), 14,
            [body("degenerate-sliver", None, filled, V, findings=["degenerate"], uncounted=True)],
            FORM + "; three corners on one line", 0, 0, [finding("degenerate", "notes", 1)])
    gap = filled[:-1]
    fixture("t-junction.stl", stl_binary(gap), 13, None,
            "as degenerate-sliver without the sliver: three open edges on one line", 1, 1,
            [finding("t-junction", "blocks", 1)])
    wide = [[f for f in box((0, 0, 0), (5, 10, 10)) if f != box((0, 0, 0), (5, 10, 10))[3]],
            [f for f in box((5, 0, 0), (10, 10, 10)) if f != box((5, 0, 0), (10, 10, 10))[5]]]
    lip = lambda q: (5.25, q[1], q[2]) if q[0] == 5 else q
    fixture("gap-too-wide-for-a-crack.obj",
            obj([("box", wide[0] + [[lip(q) for q in f] for f in wide[1]])]), 20, None,
            "counted by hand: two rings of four edges, a fortieth of the size apart", 1, 1,
            [finding("hole", "blocks")])
    tears = wide[0][:-1] + [[(5 + 2.0**-9, q[1], q[2]) if q[0] == 5 else q for q in f] for f in wide[1]]
    fixture("crack-and-hole.obj", obj([("box", tears)]), 18, None,
            "counted by hand: a ring of four edges 1/512 mm apart, and the left face missing", 1, 1,
            [finding("crack", "blocks", 1), finding("hole", "blocks", 1)])
    slit = [list(t) for t in CUBE[1:]]
    slit[0][0] = (slit[0][0][0] + 2.0**-9, *slit[0][0][1:])
    fixture("slit-into-a-hole.obj", obj([("box", slit)]), 11, None,
            "counted by hand: a facet missing, and its neighbour torn by 1/512 mm at a corner of both",
            1, 1, [finding("crack", "blocks", 1), finding("hole", "blocks", 1)])
    two = [t for t in filled[:-1] if t not in front]
    third, fifth = (3, 0, 0), (8, 0, 0)
    front = [[a, third, (0, 0, 10)], [third, fifth, (0, 0, 10)], [fifth, (10, 0, 10), (0, 0, 10)],
             [fifth, b, (10, 0, 10)]]
    fixture("t-junctions-two-on-an-edge.stl", stl_binary(two + front), len(two) + 4, None,
            "counted by hand: two vertices on one edge", 1, 1, [finding("t-junction", "blocks", 2)])
    normals = [normal(t) for t in CUBE]
    fixture("facet-normals-agree.stl", stl_binary(CUBE, normals=normals), 12,
            [body("facet-normals-agree", None, CUBE, V)], FORM)
    normals[2:4] = [tuple(-x for x in n) for n in normals[2:4]]
    fixture("facet-normals-two-turned.stl", stl_binary(CUBE, normals=normals), 12,
            [body("facet-normals-two-turned", None, CUBE, V, findings=["facet-normal-disagrees"])],
            FORM + "; the corners are believed", findings=[finding("facet-normal-disagrees", "notes", 2)])
    spike = tetrahedron((20, 0, 0), (20.001, 0, 0), (20, 0.001, 0), (20, 0, 0.001))
    fixture("stray-fragment.obj", obj([("part", box() + spike)]), 16,
            [body("part", "part", CUBE, V),
             body("part/2", "part", spike, findings=["tiny-shell"])], FORM,
            findings=[finding("tiny-shell", "notes", 1)])
    small = fans(box((0, 0, 0), (2.0**-4, 2.0**-4, 2.0**-4)))
    fixture("unit-is-likely-metres.stl", stl_binary(small), 12,
            [body("unit-is-likely-metres", None, small, Fraction(1, 4096))],
            "closed form; 1/16 mm is no part, 1/16 m is one",
            findings=[finding("unit-suspect", "notes", 1)])
    warped = box()
    lift = lambda q: (10, 10, 11) if q == (10, 10, 10) else q
    warped = [[lift(q) for q in f] for f in warped]
    fixture("warped-polygon.obj", obj([("lid", warped)]), 12, None,
            "closed forms: 1000 + 50/3 or 1000 + 100/3, by the diagonal of the lid", 1, 0,
            [finding("warped-polygon", "doubts", 1)])
    ENTRIES[-1]["total_volume_range_mm3"] = [1000 + 50 / 3, 1000 + 100 / 3]
    few = obj([("cube", box())]) + b"f 1 2\n"
    simple("face-of-two-corners.obj", few, CUBE, "cube", FORM + "; the face of two is ignored", V)


def main():
    ROOT.mkdir(exist_ok=True)
    readers()
    solids()
    touching()
    defects()
    ENTRIES.extend(invalid_fixtures.write(ROOT, CUBE))
    ENTRIES.sort(key=lambda e: e["path"])
    text = json.dumps({"fixtures": ENTRIES}, indent=1, ensure_ascii=True)
    (ROOT / "expected.json").write_text(text + "\n", encoding="utf-8")
    print(len(ENTRIES), "fixtures")


if __name__ == "__main__":
    main()
