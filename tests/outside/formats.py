"""PLY, OFF, glTF and 3MF against trimesh (PyPI) as a second reader and writer.

    python3 -m venv .venv && .venv/bin/pip install -r tests/outside/requirements.txt
    .venv/bin/python tests/outside/formats.py target/release/bismar

Each shape is written in every format, by trimesh except text PLY, and read by both: the triangles must be as many,
and volume, area and box agree to the rounding of trimesh's own sums. Then the program writes each as
3MF, and trimesh reads that: vertices, triangles, volume and box must be those of the shape, with
names and units kept.
"""
import pathlib
import sys
import tempfile

import numpy
import trimesh

from running import Tally, fixtures, run

EPS = float(numpy.finfo(float).eps)
METRES = {"mm": 1e-3, "cm": 1e-2, "m": 1.0, "in": 0.0254, "ft": 0.3048}
# As trimesh calls them, with what the writer is told; coordinates of glTF and of binary PLY are
# 32-bit floats, and so are the shapes here, so that all formats hold the same numbers. The names of
# units are those of the 3MF specification.
WRITERS = {
    "little.ply": {"file_type": "ply", "encoding": "binary"},
    "text.ply": {"file_type": "text"},
    "shape.off": {"file_type": "off"},
    "shape.glb": {"file_type": "glb"},
    "shape.gltf": {"file_type": "gltf"},
    "shape.3mf": {"file_type": "3mf"},
}


def shapes():
    """Closed meshes, far and near, with coordinates that 32-bit floats hold."""
    made = {
        "box": trimesh.creation.box((600, 400, 80)),
        "wheel": trimesh.creation.cylinder(radius=150, height=90, sections=48),
        "ring": trimesh.creation.annulus(r_min=10, r_max=17.5, height=5),
        "ball": trimesh.creation.icosphere(subdivisions=3, radius=15),
        "bent": trimesh.creation.torus(major_radius=40, minor_radius=7),
    }
    made["wheel"].apply_translation((1234.5, -987.25, 310))
    for path, entry in fixtures():
        # Of fixtures one body each, sound and unnamed: welding is then the same on both sides.
        bodies = entry["bodies"]
        if path.suffix == ".stl" and len(bodies) == 1 and not (
                bodies[0]["turned"] or bodies[0]["findings"]) and "no-endsolid" not in path.name:
            made[path.stem] = trimesh.load(path, force="mesh", process=False)
    for name, mesh in made.items():
        narrow = numpy.asarray(mesh.vertices, dtype=numpy.float32).astype(float)
        # Corners that share a place share a vertex.
        vertices, index = numpy.unique(narrow + 0.0, axis=0, return_inverse=True)
        faces = index.reshape(-1)[mesh.faces]
        yield name, trimesh.Trimesh(vertices, faces, process=False)


def off(mesh):
    """An OFF with every digit; trimesh writes a fixed number of decimals."""
    rows = [f"{x!r} {y!r} {z!r}" for x, y, z in mesh.vertices.tolist()]
    rows += [f"3 {a} {b} {c}" for a, b, c in mesh.faces.tolist()]
    return "\n".join([f"OFF {len(mesh.vertices)} {len(mesh.faces)} 0", *rows, ""])


def text_ply(mesh):
    """A text PLY of doubles with every digit; trimesh writes ten and says that they are floats."""
    head = ["ply", "format ascii 1.0", f"element vertex {len(mesh.vertices)}"]
    head += [f"property double {axis}" for axis in "xyz"]
    head += [f"element face {len(mesh.faces)}", "property list uchar int vertex_indices"]
    return "\n".join(head + ["end_header"] + off(mesh).split("\n")[1:])


def compare(tally, what, mesh, got, metres):
    """One file entry of `weigh` against the mesh that it was written from."""
    corners = numpy.asarray(mesh.triangles)
    bound = float(numpy.linalg.norm(corners, axis=2).prod(axis=1).sum() / 6)
    tally.expect(f"{what}: {got['triangles']} triangles", got["triangles"] == len(mesh.faces))
    body = got["whole"]
    tally.expect(f"{what} is weighed", body is not None)
    if body is None:
        return
    tally.check(what, "volume", abs(body["volume_m3"] - float(mesh.volume) * metres ** 3),
                64 * EPS * bound * metres ** 3)
    far = float(numpy.abs(corners).max())
    tally.check(what, "area", abs(body["area_m2"] - float(mesh.area) * metres ** 2),
                (1e-12 * float(mesh.area) + 32 * EPS * far ** 2 * len(corners)) * metres ** 2)
    box = numpy.abs(numpy.array(got["bodies"][0]["bounds_m"]) - numpy.array(mesh.bounds) * metres)
    tally.check(what, "box", box.max(), 4 * EPS * far * metres)


def reading(tally, program, name, mesh, folder):
    """What trimesh writes, read by the program."""
    for file, how in WRITERS.items():
        path = folder / f"{name}-{file}"
        if how["file_type"] == "gltf":
            # Several files: the scene, and its buffers beside it.
            for part, data in mesh.export(file_type="gltf").items():
                (folder / part).write_bytes(data)
            (folder / "model.gltf").rename(path)
        elif how["file_type"] == "3mf":
            scene = trimesh.Scene()
            scene.add_geometry(mesh, node_name=name, geom_name=name)
            path.write_bytes(trimesh.exchange.export.export_scene(scene, None, "3mf"))
        elif how["file_type"] == "text":
            path.write_text(text_ply(mesh), encoding="utf-8")
        else:
            data = mesh.export(**how)
            path.write_bytes(data if isinstance(data, bytes) else data.encode())
        second = trimesh.load(path, force="mesh", process=False)
        _, document = run(program, "weigh", path)
        got = document.get("files", [{}])[0]
        error = got.get("error") or document.get("error")
        tally.expect(f"{path.name}: {error}", not error)
        if error:
            continue
        # Units: metres by the specification of glTF, millimetres by that of 3MF.
        stated = {"gltf": "m", "glb": "m", "3mf": "mm"}.get(how["file_type"])
        tally.expect(f"{path.name}: unit {got['unit']}", got["unit"] == (stated or "mm"))
        tally.expect(f"{path.name}: assumed", got["unit_assumed"] == (stated is None))
        # OFF is written with fewer digits than the shape has: there the file is the measure.
        rounded = how["file_type"] == "off"
        compare(tally, path.name, second if rounded else mesh, got, METRES[got["unit"]])
        tally.expect(f"{path.name}: faces by trimesh", len(second.faces) == got["triangles"])
        tally.expect(f"{path.name}: vertices by trimesh",
                     len(numpy.unique(second.vertices, axis=0)) == len(mesh.vertices))


def writing(tally, program, name, mesh, folder):
    """What the program writes, read by trimesh."""
    source, path = folder / f"{name}.off", folder / f"{name} written.3mf"
    source.write_text(off(mesh), encoding="utf-8")
    for unit in ("mm", "in"):
        _, document = run(program, "check", source, "--unit", unit, "--write", path)
        tally.expect(f"{path.name} is written", document["files"][0]["copied"]["written"])
        back = trimesh.load(path, process=False)
        tally.expect(f"{path.name}: unit {back.units}", back.units == {
            "mm": "millimeter", "in": "inch"}[unit])
        back = back.to_geometry()
        tally.expect(f"{path.name}: vertices", len(back.vertices) == len(mesh.vertices))
        tally.expect(f"{path.name}: faces", len(back.faces) == len(mesh.faces))
        tally.expect(f"{path.name}: the same corners",
                     numpy.array_equal(back.triangles, mesh.triangles))


def scene(tally, program, folder):
    """Instances under nodes, one of them mirrored, as glTF and as 3MF: names and total volume."""
    wheel = trimesh.creation.cylinder(radius=0.5, height=0.25, sections=32)
    wheel.vertices = numpy.asarray(wheel.vertices, dtype=numpy.float32).astype(float)
    made = trimesh.Scene()
    turn = trimesh.transformations.rotation_matrix(0.7, (1, 2, 3), (4, 5, 6))
    mirror = numpy.diag((-2.0, 1.0, 1.0, 1.0))
    made.add_geometry(wheel, node_name="fore", geom_name="wheel", transform=turn)
    made.add_geometry(wheel, node_name="aft", geom_name="wheel", transform=mirror)
    path = folder / "scene.glb"
    path.write_bytes(made.export(file_type="glb"))
    _, document = run(program, "weigh", path)
    bodies = {b["name"]: b for b in document["files"][0]["bodies"]}
    tally.expect(f"scene.glb: bodies {sorted(bodies)}", {"fore", "aft"} <= bodies.keys())
    volume = float(wheel.volume)
    for name, times in (("fore", 1), ("aft", 2)):
        # Node matrices are written with all digits; the turn rounds corners by an ulp of 12.
        tally.check(f"scene.glb#{name}", "volume of an instance",
                    abs(bodies[name]["volume_m3"] - times * volume), 1e-13)
        tally.expect(f"scene.glb#{name} is not turned", not bodies[name]["turned"])
    want = trimesh.load(path).to_geometry().bounds
    got = numpy.array([b["bounds_m"] for b in bodies.values()])
    off = max(abs(got[:, 0].min(axis=0) - want[0]).max(), abs(got[:, 1].max(axis=0) - want[1]).max())
    tally.check("scene.glb", "box of the scene", off, 1e-12)


def main(program):
    tally = Tally()
    with tempfile.TemporaryDirectory() as folder:
        folder = pathlib.Path(folder)
        for name, mesh in shapes():
            reading(tally, program, name, mesh, folder)
            writing(tally, program, name, mesh, folder)
        scene(tally, program, folder)
    return tally.end()


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit(__doc__)
    sys.exit(main(sys.argv[1]))
