"""Writes fixtures/assemblies/ and its expected.json. Standard library only.

    python3 tests/outside/make_assembly_fixtures.py

One brick, 10 x 20 x 30 mm with a corner at the origin, of 8000 kg/m3: 48 g about (5, 10, 15) mm.
Every figure below is worked out by hand from that.
"""
import json
import pathlib

from shapes import box, fans, obj, stl_binary

ROOT = pathlib.Path(__file__).resolve().parents[2] / "fixtures" / "assemblies"
ENTRIES = []

HEAD = """[assembly]
name = "test"
unit = "mm"
"""
STEEL = """[material."test steel"]
density = "8000 kg/m3"
"""
BRICK = """[[part]]
name = "brick"
mesh = "brick.stl"
material = "test steel"
"""
PLAIN = HEAD + STEEL + BRICK
G = 0.048


def entry(name, text, exit, **more):
    (ROOT / name).write_text(text, encoding="utf-8")
    out = {"path": f"assemblies/{name}", "exit": exit, "errors": [], "mass_kg": None,
           "centre_mm": None, "inertia_kg_mm2": None, "parts": None, "limits": None, "warns_of": []}
    out.update(more)
    ENTRIES.append(out)


def good(name, text, mass, centre, **more):
    entry(name, text, more.pop("exit", 0), mass_kg=mass, centre_mm=centre, **more)


def bad(name, text, *faults):
    """A fault is (kinds or None, a piece of the faulty line or None)."""
    errors = []
    for kinds, piece in faults:
        lines = [i for i, l in enumerate(text.splitlines(), 1) if piece and piece in l]
        assert len(lines) == (1 if piece else 0), (name, piece, lines)
        errors.append({"kinds": kinds, "line": [lines[0]] * 2 if lines else None})
    entry(name, text, 2, errors=errors)


def part(path, mass, basis="computed"):
    return {"path": path, "mass_kg": mass, "basis": basis}


def write_good():
    good("plain.toml", PLAIN, G, [5, 10, 15], parts=[part("brick", G)],
         inertia_kg_mm2=[G * 1300 / 12, G * 1000 / 12, G * 500 / 12])
    document = {"assembly": {"name": "test", "unit": "mm"},
                "material": {"test steel": {"density": "8000 kg/m3"}},
                "part": [{"name": "brick", "mesh": "brick.stl", "material": "test steel"}]}
    good("plain.json", json.dumps(document, indent=1) + "\n", G, [5, 10, 15],
         parts=[part("brick", G)])
    good("density-g-per-cm3.toml", PLAIN.replace("8000 kg/m3", "8 g/cm^3"), G, [5, 10, 15])
    good("density-with-tolerance.toml", PLAIN.replace("8000 kg/m3", "8000 kg/m3 ± 1 %"), G,
         [5, 10, 15])
    good("unit-inch.toml", PLAIN.replace('"mm"', '"in"'), G * 25.4 ** 3,
         [5 * 25.4, 10 * 25.4, 15 * 25.4])
    good("mirror.toml", PLAIN + 'mirror = "x"\nat = [100, 0, 0]\n', G, [95, 10, 15])
    good("mirror-by-normal.toml", PLAIN + "mirror = [0, 2, 0]\n", G, [5, -10, 15])
    turn = 'turn = { axis = [0, 0, 1], angle = "90 deg" }\n'
    good("turn.toml", PLAIN + turn, G, [-10, 5, 15],
         inertia_kg_mm2=[G * 1000 / 12, G * 1300 / 12, G * 500 / 12])
    good("mirror-then-turn-then-at.toml", PLAIN + 'at = [100, 0, 0]\n' + turn + 'mirror = "x"\n',
         G, [90, -5, 15])
    good("places.toml", PLAIN + "places = [[0, 0, 0], [30, 0, 0], [0, 60, 0]]\n", 3 * G,
         [15, 30, 15], parts=[part("brick", G), part("brick#2", G), part("brick#3", G)])
    item = '[[item]]\nname = "bolt"\nmass = "250 g"\nat = [4, 5, 6]\n'
    good("count.toml", HEAD + item + "count = 3\n", 0.75, [4, 5, 6],
         parts=[part("bolt", 0.25, "stated"), part("bolt#2", 0.25, "stated"),
                part("bolt#3", 0.25, "stated")], inertia_kg_mm2=[0, 0, 0])
    shapes = "".join(f'[[item]]\nname = "{n}"\nmass = "12 kg"\n{s}\n' for n, s in (
        ("point", ""), ("box", "box = [1, 2, 3]"), ("ball", "sphere = 5"),
        ("rod", "cylinder = { radius = 2, height = 6 }"),
        ("given", 'inertia = { xx = "3 kg mm2", yy = "4 kg mm2", zz = "5 kg mm2", xy = 0, xz = 0, '
                  'yz = 0 }')))
    shapes = shapes.replace("xy = 0, xz = 0, yz = 0", 'xy = "0 kg mm2", xz = "0 kg mm2", '
                            'yz = "0 kg mm2"')
    good("item-shapes.toml", HEAD + shapes, 60.0, [0, 0, 0],
         inertia_kg_mm2=[13 + 120 + 48 + 3, 10 + 120 + 48 + 4, 5 + 120 + 24 + 5])
    good("length-with-unit.toml", HEAD + item.replace("[4, 5, 6]", '["1 cm", "0.1 m", "1 in"]'),
         0.25, [10, 100, 25.4])
    indent = BRICK.replace("[[part]]", "[[group.group.part]]") + "at = [1, 0, 0]\n"
    good("nested-groups.toml", HEAD + STEEL + '[[group]]\nname = "outer"\nat = [100, 0, 0]\n'
         + turn + '[[group.group]]\nname = "inner"\nat = [0, 50, 0]\n' + indent, G,
         # brick (6, 10, 15) -> inner (6, 60, 15) -> turned (-60, 6, 15) -> (40, 6, 15)
         [40, 6, 15], parts=[part("outer/inner/brick", G)])
    good("include.toml", HEAD + '[[group]]\nname = "left"\ninclude = "sub/sub.toml"\n'
         'at = [0, 100, 0]\n[[group]]\nname = "right"\ninclude = "sub/sub.toml"\nat = [0, -100, 0]\n',
         2 * G, [5, 10, 15], parts=[part("left/brick", G), part("right/brick", G)])
    (ROOT / "sub").mkdir(exist_ok=True)
    (ROOT / "sub" / "sub.toml").write_text(PLAIN.replace("brick.stl", "../brick.stl"))
    good("measured.toml", PLAIN + 'measured = "60 g ± 1 g"\n', 0.060, [5, 10, 15],
         parts=[part("brick", 0.060, "measured")],
         inertia_kg_mm2=[0.06 * 1300 / 12, 0.06 * 1000 / 12, 0.06 * 500 / 12])
    two = ('[[assign]]\nbody = "blo*"\nmaterial = "test steel"\n'
           '[[assign]]\nbody = "*"\nmaterial = "test foam"\n')
    parts = "".join(f'[[part]]\nname = "{n}"\nmesh = "pair.obj#{n}"\n' for n in ("block", "slab"))
    foam = '[material."test foam"]\ndensity = "100 kg/m3"\n'
    good("assign-first-match.toml", HEAD + two + STEEL + foam + parts, 0.008 + 0.0002, None,
         parts=[part("block", 0.008), part("slab", 0.0002)])
    good("assign-part-overrides.toml",
         HEAD + two + STEEL + foam + parts + 'material = "test steel"\n', 0.008 + 0.016, None,
         parts=[part("block", 0.008), part("slab", 0.016)])
    good("assign-by-part.toml", HEAD + STEEL + foam + parts
         + '[[assign]]\npart = "slab"\nmaterial = "test foam"\n'
         + '[[assign]]\npart = "block"\nmaterial = "test steel"\n', 0.008 + 0.0002, None)
    table = PLAIN.replace('material = "test steel"', 'material = "AL-6061"')
    good("material-case-blind.toml", table, 6e-6 * 2700, [5, 10, 15])
    good("body-in-no-part.toml", HEAD + STEEL + BRICK.replace("brick.stl", "pair.obj#block"),
         0.008, [5, 5, 5], warns_of=["slab"])
    kilo = '[[item]]\nname = "lump"\nmass = "2 kg"\nat = [8, 0, 0]\n'
    limit = '[[limit]]\nname = "load"\nmass = {{ to = "{} kg" }}\n'
    verdict = lambda name, quantity, v: {"name": name, "quantity": quantity, "verdict": v}
    good("limit-holds.toml", HEAD + kilo + limit.format(3), 2.0, [8, 0, 0],
         limits=[verdict("load", "mass", "holds")])
    good("limit-equal-holds.toml", HEAD + kilo + limit.format(2), 2.0, [8, 0, 0],
         limits=[verdict("load", "mass", "holds")])
    good("limit-broken.toml", HEAD + kilo + limit.format(1), 2.0, [8, 0, 0], exit=1,
         limits=[verdict("load", "mass", "broken")])
    good("limit-two-quantities.toml", HEAD + kilo + '[[limit]]\nname = "both"\n'
         'mass = { to = "3 kg" }\ncentre.x = { from = -5, to = 5 }\n', 2.0, [8, 0, 0], exit=1,
         limits=[verdict("both", "mass", "holds"), verdict("both", "centre.x", "broken")])
    good("limit-unnamed.toml", HEAD + kilo + '[[limit]]\ncentre.x = { to = 9 }\n', 2.0, [8, 0, 0],
         limits=[verdict("centre.x", "centre.x", "holds")])
    feet = "".join(f'[[support]]\nname = "{n}"\nat = {at}\n' for n, at in
                   [("front", [200, 0, 0]), ("left", [-200, 150, 0]), ("right", [-200, -150, 0])])
    hang = "[hang]\nhook = [0, 0, 500]\n" + "".join(
        f'[[hang.line]]\nname = "{n}"\nat = {at}\n' for n, at in
        [("fore", [180, 0, 100]), ("aft", [-180, 0, 100])])
    ballast = '[[ballast]]\nname = "tail"\nat = [-200, 0, 20]\nmost = "5 kg"\nunit = "0.25 kg"\n'
    good("stands-and-hangs.toml",
         HEAD + '[[item]]\nname = "load"\nmass = "10 kg"\nat = [60, 0, 80]\n' + feet + hang + ballast
         + '[[limit]]\nname = "fore and aft"\ncentre.x = { to = 50 }\n'
         + '[[limit]]\nname = "slope"\ntip = { from = "20 deg" }\n', 10.0, [60, 0, 80], exit=1,
         limits=[verdict("fore and aft", "centre.x", "broken"), verdict("slope", "tip", "holds")])
    expect = 'expect = {{ volume = "{} cm3 ± 1 %", mass = "48 g", size = [10, 20, {}] }}\n'
    good("expect-met.toml", PLAIN + expect.format(6.05, 30), G, [5, 10, 15])
    good("expect-volume-deviates.toml", PLAIN + expect.format(7, 30), G, [5, 10, 15], exit=1)
    good("expect-size-deviates.toml", PLAIN + expect.format(6, 31), G, [5, 10, 15], exit=1)
    good("expect-default-tolerance.toml", PLAIN + 'expect = { volume = "6.01 cm3" }\n', G,
         [5, 10, 15], exit=1)


def write_bad():
    bad("unknown-key.toml", PLAIN + "att = [1, 2, 3]\n", (["unknown-key"], "att ="))
    bad("unknown-table.toml", PLAIN + '[[limitt]]\nname = "x"\n', (["unknown-key"], "[[limitt]]"))
    bad("unit-missing.toml", PLAIN.replace('unit = "mm"\n', ""), (["unit"], None))
    bad("unit-unknown.toml", PLAIN.replace('"mm"', '"furlong"'), (["unit"], 'unit = "furlong"'))
    bad("density-without-unit.toml", PLAIN.replace("8000 kg/m3", "8000"), (["unit"], '"8000"'))
    bad("density-bare-number.toml", PLAIN.replace('"8000 kg/m3"', "8000"), (["unit"], "= 8000"))
    item = '[[item]]\nname = "bolt"\nmass = {}\n'
    bad("mass-without-unit.toml", HEAD + item.format(4.12), (["unit"], "mass = 4.12"))
    bad("mass-is-a-length.toml", HEAD + item.format('"4 mm"'), (["unit"], 'mass = "4 mm"'))
    bad("angle-without-unit.toml", PLAIN + "turn = { axis = [0, 0, 1], angle = 90 }\n",
        (["unit"], "angle = 90"))
    bad("number-malformed.toml", HEAD + item.format('"4..1 kg"'), (["bad-number"], "4..1"))
    bad("unknown-material.toml", PLAIN.replace('material = "test steel"', 'material = "test steal"'),
        (["unknown-name"], "test steal"))
    bad("part-without-material.toml", PLAIN.replace('material = "test steel"\n', ""),
        (["unknown-name"], None))
    bad("body-not-found.toml", PLAIN.replace("brick.stl", "pair.obj#blok"),
        (["unknown-name", "not-found"], "#blok"))
    bad("mesh-not-found.toml", PLAIN.replace("brick.stl", "brik.stl"), (["not-found"], "brik.stl"))
    bad("mesh-not-closed.toml", PLAIN.replace("brick.stl", "../hole-one-facet-missing.stl"),
        (["not-closed"], None))
    bad("two-limits-one-name.toml", PLAIN + '[[limit]]\nname = "a"\nmass = { to = "1 kg" }\n'
        '[[limit]]\nname = "a"\ncentre.x = { to = 1 }\n', (["ambiguous-name"], None))
    bad("name-split-two-materials.toml", HEAD + STEEL
        + '[[assign]]\nbody = "red"\nmaterial = "test steel"\n'
        + '[[assign]]\nbody = "green"\nmaterial = "water"\n'
        + '[[assign]]\nbody = "blue"\nmaterial = "water"\n'
        + '[[part]]\nname = "all"\nmesh = "../split-by-colour.obj"\n', (["ambiguous-name"], None))
    given = 'inertia = {{ xx = "1 kg m2", yy = "1 kg m2", zz = "{} kg m2", xy = "0 kg m2", ' \
            'xz = "0 kg m2", yz = "0 kg m2" }}\n'
    bad("impossible-inertia.toml", HEAD + item.format('"4 kg"') + given.format(2.5),
        (["impossible-inertia"], "2.5 kg m2"))
    ring = HEAD + '[[group]]\nname = "again"\ninclude = "{}"\n'
    bad("cycle-with-itself.toml", ring.format("cycle-with-itself.toml"), (["cycle"], None))
    bad("cycle-of-two.toml", ring.format("sub/cycle-back.toml"), (["cycle"], None))
    (ROOT / "sub" / "cycle-back.toml").write_text(ring.format("../cycle-of-two.toml"))
    bad("include-not-found.toml", ring.format("no-such.toml"), (["not-found"], None))
    bad("several-faults.toml", PLAIN.replace("8000 kg/m3", "8000") + "att = [1, 2, 3]\n",
        (["unit"], '"8000"'), (["unknown-key"], "att ="))
    bad("syntax-error.toml", PLAIN + "at = [1, 2\n", (None, None))


def main():
    ROOT.mkdir(parents=True, exist_ok=True)
    brick = fans(box((0, 0, 0), (10, 20, 30)))
    (ROOT / "brick.stl").write_bytes(stl_binary(brick))
    pair = [("block", box()), ("slab", box((20, 0, 0), (40, 20, 5)))]
    (ROOT / "pair.obj").write_bytes(obj(pair))
    write_good()
    write_bad()
    ENTRIES.sort(key=lambda e: e["path"])
    text = json.dumps({"assemblies": ENTRIES}, indent=1)
    (ROOT / "expected.json").write_text(text + "\n", encoding="utf-8")
    print(len(ENTRIES), "assemblies")


if __name__ == "__main__":
    main()
