"""Runs the program under test and finds the files to run it on."""
import json
import pathlib
import subprocess

REPOSITORY = pathlib.Path(__file__).resolve().parents[2]
FIXTURES = REPOSITORY / "fixtures"
ROVER = REPOSITORY / "demo-data" / "rover"


def run(program, *arguments):
    """(exit code, parsed JSON) of one run with `--json`."""
    done = subprocess.run([program, *map(str, arguments), "--json"], capture_output=True,
                          timeout=60, check=False)
    try:
        return done.returncode, json.loads(done.stdout)
    except ValueError:
        raise SystemExit(f"{' '.join(map(str, arguments))}: no JSON on standard output\n"
                         + done.stderr.decode(errors="replace")) from None


def weighed(program, paths):
    """{path: file entry of the JSON} of one `weigh` over many files."""
    _, document = run(program, "weigh", *paths)
    return {pathlib.Path(f["path"]): f for f in document["files"]}


def fixtures():
    """Entries of expected.json whose bodies are all weighed, with absolute paths."""
    entries = json.loads((FIXTURES / "expected.json").read_text(encoding="utf-8"))["fixtures"]
    for e in entries:
        bodies = e.get("bodies")
        if bodies and all(b["volume_mm3"] is not None for b in bodies):
            yield FIXTURES / e["path"], e


def rover_meshes():
    return sorted(p for p in ROVER.iterdir() if p.suffix in (".stl", ".obj"))


class Tally:
    """Counts comparisons, prints the failures, gives the exit code."""

    def __init__(self):
        self.done, self.failed, self.worst = 0, 0, {}

    def check(self, what, kind, difference, allowed):
        self.done += 1
        ratio = float(difference) / float(allowed) if allowed else (float(difference) and 1e300)
        if not ratio <= 1:
            self.failed += 1
            print(f"FAIL {what}: {kind} differs by {float(difference):.3e}, "
                  f"allowed {float(allowed):.3e}")
        if ratio > self.worst.get(kind, (0, ""))[0]:
            self.worst[kind] = (ratio, what)

    def expect(self, what, truth):
        self.done += 1
        if not truth:
            self.failed += 1
            print("FAIL", what)

    def end(self):
        for kind, (ratio, what) in self.worst.items():
            print(f"worst {kind}: {ratio:.2g} of what is allowed ({what})")
        print(f"{self.done} comparisons, {self.failed} failed")
        # Nothing compared is a failure too.
        return 1 if self.failed or not self.done else 0
