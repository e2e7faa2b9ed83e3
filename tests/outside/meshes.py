"""Plain readers of STL and OBJ for the outside checks (standard library only).

`read(path)` gives [(name or None, triangles)], in file order, as the project names bodies: `o`,
else `g`, else `usemtl`; the `solid` name. Polygons become fans, whose signed sums are exact for
flat ones. These readers trust their input: broken files are not what they are for.
"""
import pathlib
import re
import struct


def read(path):
    data = pathlib.Path(path).read_bytes()
    if str(path).lower().endswith(".obj"):
        return _obj(data.decode("utf-8"))
    count = struct.unpack_from("<I", data, 80)[0] if len(data) >= 84 else -1
    if len(data) == 84 + 50 * count:
        floats = [struct.unpack_from("<9f", data, 84 + 50 * i + 12) for i in range(count)]
        return [(None, [[f[0:3], f[3:6], f[6:9]] for f in floats])]
    return _ascii(data.decode("utf-8"))


def _ascii(text):
    out, corners = [], []
    for line in text.splitlines():
        words = line.split()
        if not words:
            continue
        if words[0].lower() == "solid":
            name = line.strip()[5:].strip()
            out.append((name or None, []))
        elif words[0].lower() == "vertex":
            corners.append(tuple(float(w) for w in words[1:4]))
            if len(corners) == 3:
                out[-1][1].append(corners)
                corners = []
    return _merged(out)


def _obj(text):
    text = re.sub(r"\\\r?\n", " ", text)
    words = {line.split(maxsplit=1)[0] for line in text.splitlines() if line.strip()}
    naming = next((w for w in ("o", "g", "usemtl") if w in words), None)
    vertices, out, name = [], [], None
    for line in text.splitlines():
        head, _, rest = line.strip().partition(" ")
        if head == naming:
            name = rest.strip() or None
        elif head == "v":
            vertices.append(tuple(float(w) for w in rest.split()[:3]))
        elif head == "f":
            ids = [int(w.split("/")[0]) for w in rest.split("#")[0].split()]
            p = [vertices[i - 1 if i > 0 else i] for i in ids]
            if len(p) >= 3:
                out.append((name, [[p[0], p[i], p[i + 1]] for i in range(1, len(p) - 1)]))
    return _merged(out)


def _merged(pieces):
    names = {}
    for name, triangles in pieces:
        names.setdefault(name, []).extend(triangles)
    return list(names.items())
