"""A table of `bismar survey` as DuckDB reads it: python survey.py PATH/TO/bismar.

Cubes of known sides in folders, surveyed to Parquet; the total mass of each folder is asked in SQL
and compared with arithmetic done here.
"""

import json
import math
import struct
import subprocess
import sys
import tempfile
from pathlib import Path

import duckdb

DENSITY = 7850.0  # kg/m3, given to the program on the command line


def cube(side):
    p = [[side * (i >> k & 1) for k in range(3)] for i in range(8)]
    quads = [(0, 2, 3, 1), (4, 5, 7, 6), (0, 1, 5, 4), (2, 6, 7, 3), (0, 4, 6, 2), (1, 3, 7, 5)]
    faces = [f for a, b, c, d in quads for f in ((a, b, c), (a, c, d))]
    out = bytes(80) + struct.pack("<I", len(faces))
    for f in faces:
        out += struct.pack("<3f", 0, 0, 0) + b"".join(struct.pack("<3f", *p[i]) for i in f) + bytes(2)
    return out


def main(program):
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        want = {}
        for group, sides in {"frame": [10, 20, 40], "pump": [8, 5], "brackets/left": [3]}.items():
            (folder / group).mkdir(parents=True)
            for side in sides:
                (folder / group / f"cube-{side}.stl").write_bytes(cube(side))
            want[group] = DENSITY * sum((side / 1000) ** 3 for side in sides)
        (folder / "frame" / "broken.stl").write_bytes(cube(9)[:-20])
        table = folder / "table.parquet"
        subprocess.run(
            [program, "survey", ".", "-o", table, "-q", "--density", f"{DENSITY} kg/m3"],
            cwd=folder, check=True, stdout=subprocess.DEVNULL,
        )
        db = duckdb.connect()
        rows = db.execute(
            "SELECT regexp_replace(regexp_replace(path, '^\\./', ''), '/[^/]*$', '') AS folder,"
            " sum(mass_kg), count(*) FILTER (error IS NOT NULL)"
            f" FROM '{table}' GROUP BY folder ORDER BY folder"
        ).fetchall()
        got = {r[0]: r[1] for r in rows}
        assert got.keys() == want.keys(), (got, want)
        for group, mass in want.items():
            # A few roundings.
            assert math.isclose(got[group], mass, rel_tol=1e-14), (group, got[group], mass)
        assert {r[0]: r[2] for r in rows} == {"frame": 1, "pump": 0, "brackets/left": 0}
        types = dict(db.execute(f"SELECT column_name, column_type FROM (DESCRIBE SELECT * FROM '{table}')").fetchall())
        assert types["mass_kg"] == "DOUBLE" and types["path"] == "VARCHAR", types
        assert types["triangles"] == "BIGINT" and types["sound"] == "BOOLEAN", types
        pairs = db.execute(f"SELECT key, value FROM parquet_kv_metadata('{table}')").fetchall()
        about = {k.decode(): v.decode() for k, v in pairs}
        columns = json.loads(about["bismar.columns"])
        assert columns["volume_m3"]["unit"] == "m3" and columns.keys() == types.keys()
        print(f"survey: {len(types)} columns read by DuckDB, masses of {len(want)} folders agree")


if __name__ == "__main__":
    main(str(Path(sys.argv[1]).resolve()))
