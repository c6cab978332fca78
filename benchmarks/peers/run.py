#!/usr/bin/env python3
"""Measures the program beside a general MaxSAT solver, on the same instances in one run.

usage: run.py [--repeat N] [--out RESULTS.md]

Needs the release build of the workspace, and the Python packages of
tests/crosscheck/requirements.txt. Writes the tables, with the machine and the versions, to
benchmarks/RESULTS.md: nothing there is typed in.

The program's time is the whole process: start, reading, all stages, every output file written. RC2's
time is the search alone, on a formula that is built before the clock starts.
"""

import argparse
import json
import os
import platform
import subprocess
import sys
import tempfile
import time
from importlib.metadata import version
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "tests/crosscheck"))

import models
import program
from pysat.examples.rc2 import RC2

MEASURE = Path(__file__).with_name("measure.py")
GENERATE = ROOT / "target/release/maskproof-generate"

# Layer, spacing in nanometres, masks: the rows of the table, without stitches.
LAYERS = [
    ("67/20", 180, 3),
    ("67/20", 250, 3),
    ("67/20", 340, 3),
    ("67/20", 250, 2),
    ("67/20", 500, 4),
    ("68/20", 500, 2),
    ("68/20", 500, 3),
    ("66/44", 400, 3),
    ("66/44", 500, 3),
    ("67/44", 600, 2),
]

# RC2 as it comes, and with the options of its entries to the MaxSAT evaluations.
PEERS = {
    "RC2": {},
    "RC2, adapt, exhaust, minimise": {"adapt": True, "exhaust": True, "minz": True},
}

# Sites in each direction of arrays without a large piece: from layout to result, sizes in turn.
LAYOUT_SITES = (224, 448, 896, 1414)

# Sites in each direction of arrays in one piece.
PIECE_SITES = (50, 100, 200)


# Name, input (the array is generated), options: what certificates are measured on.
STITCHES = "--stitch uncovered --overlap 40 --fragment-length 140 --corner 70".split()
CERTIFIED = [
    ("contact array", None, []),
    ("67/20, 250, 3", program.BLOCK, "--layer 67/20 --spacing 250 --masks 3".split()),
    ("67/20, 250, 2", program.BLOCK, "--layer 67/20 --spacing 250 --masks 2".split()),
    ("66/44, 400, 3", program.BLOCK, "--layer 66/44 --spacing 400 --masks 3".split()),
    ("67/20, 250, 3, stitches", program.BLOCK, "--layer 67/20 --spacing 250 --masks 3".split() + STITCHES),
    ("67/20, 250, 2, stitches", program.BLOCK, "--layer 67/20 --spacing 250 --masks 2".split() + STITCHES),
    ("68/20, 500, 2, stitches", program.BLOCK, "--layer 68/20 --spacing 500 --masks 2".split() + STITCHES),
    ("69/20, 400, 2, stitches", program.BLOCK, "--layer 69/20 --spacing 400 --masks 2".split() + STITCHES),
    ("wires_m2", ROOT / "tests/data/wires_m2.json", []),
    ("wires_m3", ROOT / "tests/data/wires_m3.json", []),
]


def measured(codes, *words):
    """Seconds and peak memory of one run of the program, which must end with one of `codes`."""
    done = subprocess.run(
        [sys.executable, "-S", MEASURE, program.BINARY, *map(str, words)],
        capture_output=True,
        text=True,
        check=True,
    )
    found = json.loads(done.stdout)
    if found["code"] not in codes:
        raise SystemExit(f"{words}: exit code {found['code']}\n{done.stderr}")
    return found


class Measured:
    """One run of `solve`: wall-clock seconds, peak memory in bytes, result; no certificate."""

    def __init__(self, *command):
        with tempfile.TemporaryDirectory(prefix="maskproof-bench-") as folder:
            out = Path(folder) / "out"
            options = ("--no-certificate", "--out", out)
            found = measured(program.VERDICTS, "solve", *command, *options)
            self.seconds, self.memory = found["seconds"], found["memory"]
            self.result = json.loads((out / "result.json").read_text())

    def cost(self):
        """(conflicts, stitches) as text, an interval where a bound is open."""
        bounds = (self.result[level] for level in ("conflicts", "stitches"))
        return ", ".join(
            str(b["upper"]) if b["lower"] == b["upper"] else f"{b['lower']}..{b['upper']}"
            for b in bounds
        )


def median_run(repeat, *command):
    """The run of median time."""
    runs = sorted((Measured(*command) for _ in range(repeat)), key=lambda run: run.seconds)
    return runs[len(runs) // 2]


def table(head, rows):
    """A Markdown table, numbers already text."""
    lines = [head, ["---"] * len(head), *rows]
    return "\n".join("| " + " | ".join(str(cell) for cell in line) + " |" for line in lines)


def layers(repeat):
    """Whole runs on the routed block."""
    rows = []
    for layer, spacing, masks in LAYERS:
        options = ("--layer", layer, "--spacing", spacing, "--masks", masks, "--stitch", "none")
        run = median_run(repeat, program.BLOCK, *options)
        met = "yes" if run.seconds < 1 else "NO"
        rows.append([layer, spacing, masks, run.cost(), f"{run.seconds:.3f}", met])
    head = ["layer", "spacing nm", "K", "conflicts, stitches", "seconds", "under 1 s"]
    return table(head, rows)


def rc2(instance, options):
    """(seconds, (conflicts, stitches)) of one search by RC2 over CaDiCaL."""
    formula, unit = models.as_wcnf(
        instance["masks"],
        sum(instance["features"]),
        instance["pairs"],
        instance.get("stitches", []),
    )
    start = time.perf_counter()
    with RC2(formula, solver=models.SOLVER, **options) as solver:
        solver.compute()
        return time.perf_counter() - start, divmod(solver.cost, unit)


def peers(repeat, folder):
    """The program and RC2 on the abstract instances, one after the other."""
    array = folder / "contact_array.json"
    subprocess.run([GENERATE, "contact-array", array], check=True)
    instances = [
        ("contact array", array, 40),
        ("wires_m2", ROOT / "tests/data/wires_m2.json", 20),
        ("wires_m3", ROOT / "tests/data/wires_m3.json", 20),
    ]
    rows = []
    for name, path, target in instances:
        run = median_run(repeat, path)
        instance = json.loads(path.read_text())
        for peer, options in PEERS.items():
            seconds, cost = rc2(instance, options)
            ratio = seconds / run.seconds
            if run.cost() != "{}, {}".format(*cost):
                raise SystemExit(f"{name}: {run.cost()}, but {peer} finds {cost}")
            met = "yes" if ratio >= target else "NO"
            rows.append(
                [name, instance["masks"], run.cost(), f"{run.seconds:.3f}", peer]
                + [f"{seconds:.2f}", f"{ratio:.1f}", f"{target}", met]
            )
    head = ["instance", "K", "conflicts, stitches", "maskproof s", "peer", "peer s"]
    return table([*head, "ratio", "target", "met"], rows)


def certificates(repeat, folder):
    """What a certificate and its audit cost beside `solve` without them."""
    array = folder / "contact_array.json"
    rows = []
    for name, path, options in CERTIFIED:
        path = path or array
        times = {"plain": [], "certified": [], "audit": []}
        out = folder / "certified"
        for _ in range(repeat):
            # In turn, so that a busy moment of the machine does not meet one of them only.
            times["plain"].append(Measured(path, *options).seconds)
            found = measured(program.VERDICTS, "solve", path, *options, "--out", out)
            times["certified"].append(found["seconds"])
            # Accepted, or the measurement ends here.
            times["audit"].append(measured([0], "audit", out, "--input", path)["seconds"])
        plain, certified, audit = (sorted(list_)[repeat // 2] for list_ in times.values())
        size = sum(file.stat().st_size for file in (out / "certificate").rglob("*"))
        ratio = (certified - plain + audit) / plain
        row = [name, f"{plain:.3f}", f"{certified - plain:.3f}", f"{audit:.3f}", f"{ratio:.2f}"]
        rows.append([*row, "yes" if ratio <= 1 else "NO", f"{size / 1e6:.2f}"])
    head = ["layer, spacing, K; or instance", "solve s", "certificate s", "audit s"]
    return table([*head, "ratio to solve", "at most 1", "certificate MB"], rows)


def layout_growth(folder):
    """Reading, merging and reducing: arrays whose features are nearly all peeled."""
    rows = []
    for sites in LAYOUT_SITES:
        path = folder / f"layout-{sites}.gds"
        subprocess.run(
            [GENERATE, "contact-array", path, "--sites", str(sites), "--size", "40"], check=True
        )
        options = ("--layer", "1/0", "--spacing", 70, "--masks", 3, "--stitch", "none")
        run = Measured(path, *options)
        shapes = run.result["layer"]["shapes"]
        beyond = (run.memory - path.stat().st_size) / shapes
        rows.append(
            [shapes, run.result["conflict_pairs"], run.cost(), f"{run.seconds:.2f}"]
            + [f"{1e6 * run.seconds / shapes:.2f}", f"{beyond:.0f}"]
        )
        path.unlink()
    head = ["shapes", "conflict pairs", "conflicts, stitches", "seconds", "microseconds a shape"]
    return table([*head, "peak bytes a shape beyond the file"], rows)


def piece_growth(repeat, folder):
    """Least cost of one large piece: arrays of growing size, K = 4."""
    rows = []
    for sites in PIECE_SITES:
        path = folder / f"piece-{sites}.json"
        subprocess.run([GENERATE, "contact-array", path, "--sites", str(sites)], check=True)
        run = median_run(repeat, path, "--time-limit", 120)
        contacts = run.result["features"]
        row = [contacts, run.cost(), f"{run.seconds:.3f}", f"{1e6 * run.seconds / contacts:.0f}"]
        rows.append(row)
    head = ["contacts", "conflicts, stitches", "seconds", "microseconds a contact"]
    return table(head, rows)


def output_of(*command):
    """The first line that a command prints."""
    done = subprocess.run(command, capture_output=True, text=True, check=True, cwd=ROOT)
    return done.stdout.splitlines()[0] if done.stdout else ""


def machine():
    """What it ran on."""
    information = Path("/proc/cpuinfo").read_text().splitlines()
    names = {line.split(":", 1)[1].strip() for line in information if line.startswith("model name")}
    memory = os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES") / 2**30
    changed = " with changes" if output_of("git", "status", "--porcelain") else ""
    commit = output_of("git", "rev-parse", "--short=12", "HEAD") + changed
    model = ", ".join(sorted(names)) or platform.machine()
    lines = [
        f"{model}, {os.cpu_count()} cores, {memory:.0f} GiB",
        f"{platform.system()} {platform.release()}, {output_of('rustc', '--version')}",
        f"maskproof at {commit}, release profile",
        f"python-sat {version('python-sat')}: RC2 over {models.SOLVER}",
    ]
    return "".join(f"- {line}\n" for line in lines)


def load():
    """Processes wanting a core, over the last minute."""
    return f"{os.getloadavg()[0]:.1f}"


def main():
    arguments = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    arguments.add_argument("--repeat", type=int, default=3, help="runs to take the median of")
    arguments.add_argument("--out", type=Path, default=ROOT / "benchmarks/RESULTS.md")
    chosen = arguments.parse_args()
    before = load()
    with tempfile.TemporaryDirectory(prefix="maskproof-bench-") as name:
        folder = Path(name)
        sections = [
            ("Whole runs on the routed block", layers(chosen.repeat)),
            ("Beside a general MaxSAT solver", peers(chosen.repeat, folder)),
            ("Certificates and their audit", certificates(chosen.repeat, folder)),
            ("Growth: reading, merging, reducing", layout_growth(folder)),
            ("Growth: one large piece", piece_growth(chosen.repeat, folder)),
        ]
    text = HEAD.format(repeat=chosen.repeat) + machine()
    text += f"- load of the machine before and after: {before}, {load()}\n"
    for title, rows in sections:
        text += f"\n## {title}\n\n{rows}\n"
    chosen.out.write_text(text)
    print(text)


HEAD = """# Benchmark results

Written by `benchmarks/peers/run.py`; every number is measured in one run of it. Times of the program are medians
of {repeat} whole runs (start, reading, all stages, output files), without a certificate where nothing else is said; a peer's
time is its search alone. Open bounds are written as intervals.

"""

if __name__ == "__main__":
    main()
