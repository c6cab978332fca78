"""Runs the program under test and reads what it wrote; prints tables of what was compared."""

import json
import os
import subprocess
import sys
import tempfile
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
BINARY = Path(os.environ.get("MASKPROOF", ROOT / "target/release/maskproof"))
# Checkers of proofs, in the folder that `.ci/run` installs them into.
CHECKERS = Path(os.environ.get("CHECKERS", "")) / "bin"
BLOCK = ROOT / "tests/data/routed_sky130.gds"

# What the exit code says, in the words of result.json.
VERDICTS = {0: "decomposable", 1: "not decomposable", 4: "undecided"}


@dataclass
class Run:
    """What one run left behind."""

    folder: Path
    result: dict

    def least(self):
        """(conflicts, stitches), where proven; else the bounds as text."""
        bounds = [self.result[level] for level in ("conflicts", "stitches")]
        if any(bound["lower"] != bound["upper"] for bound in bounds):
            return " ".join(f"{bound['lower']}..{bound['upper']}" for bound in bounds)
        return tuple(bound["upper"] for bound in bounds)

    def colouring(self):
        """The mask of each fragment, 1..K (graphs only)."""
        return json.loads((self.folder / "colouring.json").read_text())["colours"]


def solve(source, folder, *options):
    """Solves `source` into `folder`, checks that exit code and verdict agree."""
    command = [BINARY, "solve", source, "--out", folder, *options]
    words = [str(word) for word in command]
    done = subprocess.run(words, capture_output=True, text=True, check=False)
    if done.returncode not in VERDICTS:
        raise SystemExit(f"{command}: exit code {done.returncode}\n{done.stderr}")
    result = json.loads((Path(folder) / "result.json").read_text())
    if result["verdict"] != VERDICTS[done.returncode]:
        raise SystemExit(f"{command}: exit code {done.returncode}, but {result['verdict']}")
    return Run(Path(folder), result)


def export(run, source, form, folder):
    """Exports the certificate of a run; an error unless it is accepted and written."""
    command = [BINARY, "certificate", "export", run.folder, "--input", source]
    words = [str(word) for word in [*command, "--format", form, "--out", folder]]
    done = subprocess.run(words, capture_output=True, text=True, check=False)
    if done.returncode:
        raise SystemExit(f"{words}: exit code {done.returncode}\n{done.stdout}{done.stderr}")


def workspace():
    """A temporary folder that goes away with the process."""
    return tempfile.TemporaryDirectory(prefix="maskproof-crosscheck-")


def in_parallel(work, items):
    """`work` on every item, on all cores, results in order."""
    with ThreadPoolExecutor(os.cpu_count()) as pool:
        return list(pool.map(work, items))


class Comparison:
    """Collects rows of (name, expected, found) and ends the script by their equality."""

    def __init__(self, title):
        self.title, self.rows = title, []

    def add(self, name, expected, found):
        self.rows.append((str(name), str(expected), str(found)))

    def finish(self, quiet=False):
        """Prints the table (with `quiet`, the rows that differ) and exits."""
        wrong = [row for row in self.rows if row[1] != row[2]]
        head = ("", "reference", "maskproof")
        shown = [head, *(wrong if quiet else self.rows)]
        widths = [max(len(row[column]) for row in shown) for column in range(3)]
        print(self.title)
        if shown[1:]:
            for row in shown:
                mark = "  DIFFERENT" if row in wrong else ""
                print("  " + "  ".join(map(str.ljust, row, widths)).rstrip() + mark)
        print(f"{len(self.rows)} compared, {len(wrong)} different")
        sys.exit(1 if wrong or not self.rows else 0)
