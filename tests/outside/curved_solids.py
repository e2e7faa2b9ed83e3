"""The estimate of what facets do, against solids whose curved volume another library knows.

    curved_solids.py BISMAR

Needs cadquery-ocp (the OpenCASCADE library; requirements-curved.txt). Drilled and filleted solids
are cut into facets at three tolerances each; their exact volumes, areas and centres are the
library's own integrals over the curved faces.
"""

import json
import math
import subprocess
import sys
import tempfile
from pathlib import Path

from OCP.BRep import BRep_Tool
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut, BRepAlgoAPI_Fuse
from OCP.BRepBuilderAPI import BRepBuilderAPI_Copy
from OCP.BRepFilletAPI import BRepFilletAPI_MakeFillet
from OCP.BRepGProp import BRepGProp
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepPrimAPI import (
    BRepPrimAPI_MakeBox,
    BRepPrimAPI_MakeCone,
    BRepPrimAPI_MakeCylinder,
    BRepPrimAPI_MakeSphere,
    BRepPrimAPI_MakeTorus,
)
from OCP.gp import gp_Ax2, gp_Dir, gp_Pnt
from OCP.GProp import GProp_GProps
from OCP.TopAbs import TopAbs_EDGE, TopAbs_FACE, TopAbs_REVERSED
from OCP.TopExp import TopExp_Explorer
from OCP.TopLoc import TopLoc_Location
from OCP.TopoDS import TopoDS

# Part of the facets' error that the estimate may be off by. A box with all edges rounded is the
# worst: its planes are 200 times wider than the facets beside them, and bulge by what is left.
MOST = 0.40


def axis(x, y, z, direction=(0, 0, 1)):
    return gp_Ax2(gp_Pnt(x, y, z), gp_Dir(*direction))


def cylinder(x, y, z, r, h, direction=(0, 0, 1)):
    return BRepPrimAPI_MakeCylinder(axis(x, y, z, direction), r, h).Shape()


def box(x, y, z, a, b, c):
    return BRepPrimAPI_MakeBox(gp_Pnt(x, y, z), a, b, c).Shape()


def cut(a, *tools):
    for b in tools:
        a = BRepAlgoAPI_Cut(a, b).Shape()
    return a


def fuse(a, *others):
    for b in others:
        a = BRepAlgoAPI_Fuse(a, b).Shape()
    return a


def edges(shape):
    found, explorer = [], TopExp_Explorer(shape, TopAbs_EDGE)
    while explorer.More():
        edge = TopoDS.Edge(explorer.Current())
        # Each edge comes once for every face at it.
        if not any(edge.IsSame(e) for e in found):
            found.append(edge)
        explorer.Next()
    return found


def middle(edge):
    props = GProp_GProps()
    BRepGProp.LinearProperties_s(edge, props)
    c = props.CentreOfMass()
    return c.X(), c.Y(), c.Z()


def fillet(shape, r, keep):
    make = BRepFilletAPI_MakeFillet(shape)
    for e in edges(shape):
        if keep(*middle(e)):
            make.Add(r, e)
    return make.Shape()


def solids():
    block = box(0, 0, 0, 60, 40, 20)
    yield "drilled block", cut(block, cylinder(15, 20, -1, 8, 22), cylinder(42, 20, -1, 5, 22))
    yield "box with all edges rounded", fillet(block, 3, lambda x, y, z: True)
    yield "box with upright edges rounded", fillet(block, 4, lambda x, y, z: abs(z - 10) < 1)
    pocket = fillet(box(10, 10, 8, 40, 20, 20), 4, lambda x, y, z: abs(z - 18) < 1 or z < 9)
    yield "plate with a rounded pocket", cut(block, pocket)
    flange = fuse(cylinder(0, 0, 0, 30, 6), cylinder(0, 0, 0, 12, 25))
    flange = fillet(flange, 3, lambda x, y, z: abs(z - 6) < 0.1 and math.hypot(x, y) < 20)
    bolts = [
        cylinder(22 * math.cos(a), 22 * math.sin(a), -1, 2.5, 10)
        for a in (math.tau * k / 6 for k in range(6))
    ]
    yield "flange with a bore and bolt holes", cut(flange, cylinder(0, 0, -1, 8, 40), *bolts)
    yield "tube elbow", cut(
        fuse(cylinder(0, 0, 0, 10, 30), cylinder(0, 0, 15, 10, 30, (1, 0, 0))),
        cylinder(0, 0, -1, 7, 40),
        cylinder(0, 0, 15, 7, 40, (1, 0, 0)),
    )
    yield "ball with a hole", cut(
        BRepPrimAPI_MakeSphere(axis(0, 0, 0), 20).Shape(), cylinder(0, 0, -30, 6, 60)
    )
    yield "torus", BRepPrimAPI_MakeTorus(axis(0, 0, 0), 30, 8).Shape()
    yield "countersunk plate", cut(
        box(-15, -15, 0, 30, 30, 10),
        cylinder(0, 0, -1, 4, 20),
        BRepPrimAPI_MakeCone(axis(0, 0, 6), 4, 8, 4).Shape(),
    )
    yield "cone", BRepPrimAPI_MakeCone(axis(0, 0, 0), 10, 0, 25).Shape()
    yield "plain box", block


def truth(shape):
    volume, area = GProp_GProps(), GProp_GProps()
    BRepGProp.VolumeProperties_s(shape, volume, 1e-9)
    BRepGProp.SurfaceProperties_s(shape, area, 1e-9)
    c = volume.CentreOfMass()
    return volume.Mass(), area.Mass(), (c.X(), c.Y(), c.Z())


def write_obj(shape, deflection, angle, path):
    """Facets of all faces; points are written as text that reads back to the same double."""
    shape = BRepBuilderAPI_Copy(shape, True, False).Shape()
    BRepMesh_IncrementalMesh(shape, deflection, False, angle, False)
    lines, count = [], 0
    explorer = TopExp_Explorer(shape, TopAbs_FACE)
    while explorer.More():
        face = TopoDS.Face(explorer.Current())
        where = TopLoc_Location()
        mesh = BRep_Tool.Triangulation_s(face, where)
        turn = where.Transformation()
        for i in range(1, mesh.NbNodes() + 1):
            p = mesh.Node(i).Transformed(turn)
            # Points of an edge come out of both faces' triangulations alike but for the last bits.
            lines.append("v " + " ".join(repr(round(x, 9) + 0.0) for x in (p.X(), p.Y(), p.Z())))
        for i in range(1, mesh.NbTriangles() + 1):
            a, b, c = (count + k for k in mesh.Triangle(i).Get())
            if face.Orientation() == TopAbs_REVERSED:
                b, c = c, b
            lines.append(f"f {a} {b} {c}")
        count += mesh.NbNodes()
        explorer.Next()
    path.write_text("\n".join(lines) + "\n")


def weigh(program, path):
    command = [program, "weigh", "--json", "--unit", "m", "--crease", "35", str(path)]
    run = subprocess.run(command, capture_output=True, text=True, check=False)
    (body,) = json.loads(run.stdout)["files"][0]["bodies"]
    if body["refused"]:
        raise SystemExit(f"{path}: {body['refused']}")
    return body


def main(program):
    faults, seen = [], 0
    with tempfile.TemporaryDirectory() as folder:
        for name, shape in solids():
            volume, area, centre = truth(shape)
            for angle in (math.radians(20), math.radians(12), math.radians(6)):
                path = Path(folder) / "solid.obj"
                write_obj(shape, 1.0 if angle > 0.3 else 0.05, angle, path)
                body = weigh(program, path)
                f = body["facets"]
                size = -f["convex_m3"] + f["concave_m3"]
                off = body["volume_m3"] - volume
                miss = abs(f["volume_error_m3"] - off)
                label = f"{name}, {math.degrees(angle):.0f}°"
                seen += 1
                part = miss / size if size else 0.0
                moved = [a - b for a, b in zip(body["centroid_m"], centre)]
                print(
                    f"{label:45} {body['triangles']:6} triangles  volume {100 * off / volume:+.4f} %"
                    f"  estimate {100 * f['volume_error_m3'] / volume:+.4f} %  missed {100 * part:.1f} %"
                    f"  doubt {100 * f['volume_doubt_m3'] / size if size else 0:.1f} %"
                    f"  area {body['area_m2'] - area:+.3f} estimate {f['area_error_m2']:+.3f}"
                    f"  centre {math.dist(moved, (0, 0, 0)):.1e} left {math.dist(moved, f['centre_error_m']):.1e}"
                )
                if size == 0.0:
                    if abs(off) > 1e-9 * volume:
                        faults.append(f"{label}: off by {off}, nothing estimated")
                    continue
                if part > MOST:
                    faults.append(f"{label}: missed by {100 * part:.1f} % of what was added")
                if angle < 0.3 and miss > f["volume_doubt_m3"]:
                    faults.append(f"{label}: missed by more than its doubt")
    for fault in faults:
        print("FAULT", fault)
    print(f"{seen} cuts, {len(faults)} faults")
    return 1 if faults or not seen else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1]))
