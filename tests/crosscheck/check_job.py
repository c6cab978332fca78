#!/usr/bin/env python3
"""usage: check_job.py EXIT_CODE COMMAND

Holds the exit code of a `maskproof solve ... --out DIR` command against DIR/result.json: a proven
verdict, closed bounds, and every member that the format promises.
"""

import json
import shlex
import sys
from pathlib import Path

import program

COUNTS = ("masks", "features", "fragments", "conflict_pairs", "stitch_candidates")


def main():
    code, words = int(sys.argv[1]), shlex.split(sys.argv[2])
    folder = Path(words[words.index("--out") + 1])
    comparison = program.Comparison(f"{folder}, exit code {code}")
    result = json.loads((folder / "result.json").read_text())
    comparison.add("format", ("maskproof-result", 1), (result["format"], result["version"]))
    comparison.add("verdict", program.VERDICTS.get(code, "no verdict"), result["verdict"])
    for level in ("conflicts", "stitches"):
        comparison.add(level, result[level]["lower"], result[level]["upper"])
    proven = "not decomposable" if result["conflicts"]["lower"] else "decomposable"
    comparison.add("what the bounds prove", proven, result["verdict"])
    for name in COUNTS:
        comparison.add(name, True, isinstance(result[name], int) and result[name] >= 0)
    for name in ("coloured.gds", "pieces.csv", "timings.json"):
        comparison.add(name, True, (folder / name).stat().st_size > 0)
    comparison.finish()


if __name__ == "__main__":
    main()
