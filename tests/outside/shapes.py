"""Shapes as polygons with outward counter-clockwise corners, and plain writers (mm)."""
import math
import struct


def f32(x):
    return struct.unpack("<f", struct.pack("<f", x))[0]


def next_f32(x):
    """The next 32-bit float above a positive x."""
    return struct.unpack("<f", struct.pack("<I", struct.unpack("<I", struct.pack("<f", x))[0] + 1))[0]


def box(low=(0, 0, 0), high=(10, 10, 10)):
    """Six quadrilaterals: bottom, top, front (-y), right (+x), back, left."""
    (x0, y0, z0), (x1, y1, z1) = low, high
    p = [(x0, y0, z0), (x1, y0, z0), (x1, y1, z0), (x0, y1, z0),
         (x0, y0, z1), (x1, y0, z1), (x1, y1, z1), (x0, y1, z1)]
    return [[p[i] for i in f] for f in
            ((0, 3, 2, 1), (4, 5, 6, 7), (0, 1, 5, 4), (1, 2, 6, 5), (2, 3, 7, 6), (3, 0, 4, 7))]


def prism(outline, low, high):
    """A vertical prism on a counter-clockwise outline; the end faces stay polygons."""
    n = len(outline)
    faces = [[(x, y, low) for x, y in reversed(outline)], [(x, y, high) for x, y in outline]]
    for i in range(n):
        (x, y), (u, v) = outline[i], outline[(i + 1) % n]
        faces.append([(x, y, low), (u, v, low), (u, v, high), (x, y, high)])
    return faces


def polygon(n, radius):
    return [(radius * math.cos(2 * math.pi * i / n), radius * math.sin(2 * math.pi * i / n))
            for i in range(n)]


def tetrahedron(a, b, c, d):
    return [[a, c, b], [a, b, d], [b, c, d], [c, a, d]]


def icosphere(radius, rounds):
    """A subdivided icosahedron (20 * 4**rounds triangles)."""
    g = (1 + math.sqrt(5)) / 2
    p = [(-1, g, 0), (1, g, 0), (-1, -g, 0), (1, -g, 0), (0, -1, g), (0, 1, g),
         (0, -1, -g), (0, 1, -g), (g, 0, -1), (g, 0, 1), (-g, 0, -1), (-g, 0, 1)]
    faces = ((0, 11, 5), (0, 5, 1), (0, 1, 7), (0, 7, 10), (0, 10, 11), (1, 5, 9), (5, 11, 4),
             (11, 10, 2), (10, 7, 6), (7, 1, 8), (3, 9, 4), (3, 4, 2), (3, 2, 6), (3, 6, 8),
             (3, 8, 9), (4, 9, 5), (2, 4, 11), (6, 2, 10), (8, 6, 7), (9, 8, 1))

    def unit(q):
        length = math.sqrt(sum(x * x for x in q))
        return tuple(x / length for x in q)
    out = [[unit(p[i]) for i in f] for f in faces]
    for _ in range(rounds):
        finer = []
        for a, b, c in out:
            ab, bc, ca = (unit([(x + y) / 2 for x, y in zip(*e)]) for e in ((a, b), (b, c), (c, a)))
            finer += [[a, ab, ca], [ab, b, bc], [ca, bc, c], [ab, bc, ca]]
        out = finer
    return [[tuple(radius * x for x in q) for q in f] for f in out]


def moved(faces, by=(0, 0, 0), scale=1, axis=None, angle=0.0):
    """Scaled, turned about an axis (Rodrigues), then shifted."""
    def one(p):
        p = [scale * x for x in p]
        if axis:
            length = math.sqrt(sum(x * x for x in axis))
            k = [x / length for x in axis]
            c, s = math.cos(angle), math.sin(angle)
            dot = sum(x * y for x, y in zip(k, p))
            across = (k[1] * p[2] - k[2] * p[1], k[2] * p[0] - k[0] * p[2], k[0] * p[1] - k[1] * p[0])
            p = [p[i] * c + across[i] * s + k[i] * dot * (1 - c) for i in range(3)]
        return tuple(p[i] + by[i] for i in range(3))
    return [[one(p) for p in f] for f in faces]


def flipped(faces):
    return [f[::-1] for f in faces]


def fans(faces):
    """Triangles of each polygon, from its first corner (for volumes any flat polygon will do)."""
    return [[f[0], f[i], f[i + 1]] for f in faces for i in range(1, len(f) - 1)]


def normal(t):
    """The direction that the corners turn about, not of unit length."""
    u, v = ([t[i][k] - t[0][k] for k in range(3)] for i in (1, 2))
    return tuple(u[(k + 1) % 3] * v[(k + 2) % 3] - u[(k + 2) % 3] * v[(k + 1) % 3] for k in range(3))


def narrowed(triangles):
    """What a binary STL holds of the coordinates."""
    return [[tuple(f32(x) for x in p) for p in t] for t in triangles]


def stl_binary(triangles, header=b"made by hand", count=None, normals=None):
    out = header.ljust(80, b" ") + struct.pack("<I", len(triangles) if count is None else count)
    for i, t in enumerate(triangles):
        normal = normals[i] if normals else (0, 0, 0)
        out += struct.pack("<12fH", *normal, *(x for p in t for x in p), 0)
    return out


def stl_ascii(triangles, name="", end="\n", indent="  "):
    lines = [f"solid {name}".rstrip()]
    for t in triangles:
        lines += [f"{indent}facet normal 0 0 0", f"{indent * 2}outer loop"]
        lines += [f"{indent * 3}vertex {p[0]!r} {p[1]!r} {p[2]!r}" for p in t]
        lines += [f"{indent * 2}endloop", f"{indent}endfacet"]
    lines.append(f"endsolid {name}".rstrip())
    return (end.join(lines) + end).encode()


def obj(groups, word="o"):
    """`groups`: (name or None, faces). Equal points of the whole file share one vertex."""
    index, lines, faces_out = {}, [], []
    for name, faces in groups:
        if name is not None:
            faces_out.append(f"{word} {name}")
        for f in faces:
            ids = []
            for p in f:
                key = tuple(float(x) for x in p)
                if key not in index:
                    index[key] = len(index) + 1
                    lines.append("v " + " ".join(repr(x) for x in key))
                ids.append(str(index[key]))
            faces_out.append("f " + " ".join(ids))
    return ("\n".join(lines + faces_out) + "\n").encode()
