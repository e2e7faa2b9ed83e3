"""Files that cannot be read: each with the kind of its error and where it stands."""
import io
import struct
import zipfile

from shapes import box, obj, stl_ascii, stl_binary


def write(root, cube):
    """Writes fixtures/invalid/ and returns the entries of expected.json."""
    entries = []

    def bad(name, data, kinds, line=None, byte=None):
        """`line`: where the fault stands (or [first, last]); `byte`: [first, last] offsets that name it."""
        path = root / "invalid" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        if data is not None:
            path.write_bytes(data)
        entries.append({"path": f"invalid/{name}", "check_exit": 2, "weigh_exit": 2,
                        "error": {"kinds": kinds, "line": [line, line] if isinstance(line, int) else line,
                                  "byte": byte},
                        "source": "counted by hand"})

    whole = stl_binary(cube)
    cut = whole[:-70]
    bad("truncated-binary.stl", cut, ["truncated"], byte=[80, len(cut)])
    bad("count-too-small-binary.stl", stl_binary(cube, count=10), ["count-mismatch"],
        byte=[80, len(whole)])
    bad("count-too-large-binary.stl", stl_binary(cube, count=4_000_000_000),
        ["truncated", "count-mismatch"], byte=[80, len(whole)])
    bad("count-zero-binary.stl", stl_binary([]), ["empty"])
    bad("header-cut.stl", whole[:60], ["truncated", "unknown-format"])
    # Facet 3 (from 0), its second corner's y: 84 + 3 * 50 + 12 + 12 + 4.
    at = 84 + 3 * 50
    for word, value in (("nan", float("nan")), ("infinity", float("inf"))):
        data = bytearray(whole)
        struct.pack_into("<f", data, at + 12 + 12 + 4, value)
        bad(f"{word}-binary.stl", bytes(data), ["not-finite"], byte=[at, at + 49])
    bad("empty-file.stl", b"", ["empty"])
    bad("empty-file.obj", b"", ["empty"])
    text = stl_ascii(cube, "cube").decode().splitlines()

    def with_line(number, replacement):
        lines = list(text)
        lines[number - 1] = replacement
        return ("\n".join(lines) + "\n").encode()
    # Line 1 is `solid`; a facet takes 7 lines; its first vertex is its third.
    bad("nan-ascii.stl", with_line(4, "      vertex nan 0 0"), ["not-finite"], line=4)
    bad("infinity-ascii.stl", with_line(11, "      vertex 0 inf 0"), ["not-finite"], line=11)
    bad("overflow-ascii.stl", with_line(11, "      vertex 0 1e999 0"), ["not-finite"], line=11)
    bad("word-for-number-ascii.stl", with_line(12, "      vertex 0 ten 0"), ["bad-number"], line=12)
    bad("two-coordinates-ascii.stl", with_line(13, "      vertex 0 10"), ["bad-number"],
        # The third number is missed where line 13 ends, or where line 14 has a word instead.
        line=[13, 14])
    head = "\n".join(text[:10]) + "\n      vertex 10.0 -1.2e"
    bad("cut-mid-number-ascii.stl", head.encode(), ["truncated", "bad-number"], line=11)
    head = "\n".join(text[:13])
    bad("cut-mid-facet-ascii.stl", head.encode(), ["truncated"], line=13)
    bad("no-facets-ascii.stl", b"solid nothing\nendsolid nothing\n", ["empty"])
    bad("text-of-another-kind.stl",
        b"Dear workshop,\nthe drawing follows by post.\nPlease keep the bracket.\n",
        ["unknown-format"])
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_STORED) as z:
        z.writestr(zipfile.ZipInfo("cube.stl", (2020, 1, 1, 0, 0, 0)), whole)
    bad("zip-called-stl.stl", packed.getvalue(), ["unknown-format"])
    cube_obj = obj([("cube", box())]).decode()
    lines = cube_obj.splitlines()
    last = len(lines) + 1
    bad("bad-index.obj", (cube_obj + "f 1 2 99\n").encode(), ["bad-index"], line=last)
    bad("bad-index-negative.obj", (cube_obj + "f -1 -2 -9\n").encode(), ["bad-index"], line=last)
    bad("zero-index.obj", (cube_obj + "f 0 1 2\n").encode(), ["bad-index"], line=last)
    bad("word-for-index.obj", (cube_obj + "f 1 two 3\n").encode(), ["bad-number", "bad-index"],
        line=last)
    lines[2] = "v 0.0 ten 0.0"
    bad("word-for-number.obj", ("\n".join(lines) + "\n").encode(), ["bad-number"], line=3)
    lines[2] = "v 0.0 nan 0.0"
    bad("nan.obj", ("\n".join(lines) + "\n").encode(), ["not-finite"], line=3)
    lines[2] = "v 0.0 1e999 0.0"
    bad("overflow.obj", ("\n".join(lines) + "\n").encode(), ["not-finite"], line=3)
    lines[2] = "v 0.0 10.0"
    bad("two-coordinates.obj", ("\n".join(lines) + "\n").encode(), ["bad-number"], line=3)
    bad("vertices-only.obj", b"v 0 0 0\nv 1 0 0\nv 0 1 0\n", ["empty"])
    folder = root / "invalid" / "folder-without-meshes"
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "readme.txt").write_text("No mesh is in this folder.\n")
    bad("folder-without-meshes", None, ["empty", "not-found"])
    bad("no-such-file.stl", None, ["not-found"])
    return entries
