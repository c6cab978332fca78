#!/usr/bin/env python3
"""Convert an instance of random wires (lines `c a b p` and `s a b`) to instance JSON, version 1.

usage: convert_wires.py WIRES.txt MASKS OUT.json

A line `c a b p` is a fragment edge between fragments a and b of conflict pair p; a line `s a b` is a
stitch edge of weight 1. Features are the connected components of the stitch edges; their fragments
must be numbered without gaps, which is checked and not mended. Pairs keep their order.
"""

import json
import sys
from pathlib import Path


def read_wires(text):
    """The edges of each pair, and the stitch edges."""
    pairs, stitches = {}, []
    for number, line in enumerate(text.splitlines(), 1):
        match line.split():
            case ["c", a, b, pair]:
                pairs.setdefault(int(pair), []).append([int(a), int(b)])
            case ["s", a, b]:
                stitches.append([int(a), int(b)])
            case _:
                raise SystemExit(f"line {number}: neither `c a b p` nor `s a b`: {line!r}")
    if sorted(pairs) != list(range(len(pairs))):
        raise SystemExit("the pairs are not numbered 0, 1, ...")
    return [pairs[pair] for pair in range(len(pairs))], stitches


def feature_sizes(pairs, stitches):
    """The number of fragments of each feature, in order."""
    used = [end for edges in [*pairs, stitches] for edge in edges for end in edge]
    count = max(used) + 1
    parent = list(range(count))

    def root(at):
        while parent[at] != at:
            parent[at] = parent[parent[at]]
            at = parent[at]
        return at

    for a, b in stitches:
        parent[max(root(a), root(b))] = min(root(a), root(b))
    sizes, roots = [], []
    for fragment in range(count):
        if roots and root(fragment) == roots[-1]:
            sizes[-1] += 1
        elif root(fragment) == fragment:
            roots.append(fragment)
            sizes.append(1)
        else:
            raise SystemExit(f"fragment {fragment} is apart from the others of its feature")
    return sizes


def convert(text, masks):
    """The instance as a value."""
    pairs, stitches = read_wires(text)
    return {
        "format": "maskproof-instance",
        "version": 1,
        "masks": masks,
        "features": feature_sizes(pairs, stitches),
        "pairs": pairs,
        "stitches": [[a, b, 1] for a, b in stitches],
    }


def write(instance, path):
    """One key a line, without blanks: the files are large."""
    lines = (
        f"{json.dumps(key)}:{json.dumps(value, separators=(',', ':'))}"
        for key, value in instance.items()
    )
    Path(path).write_text("{" + ",\n ".join(lines) + "}\n")


if __name__ == "__main__":
    if len(sys.argv) != 4:
        raise SystemExit(__doc__)
    source, masks, target = sys.argv[1:]
    write(convert(Path(source).read_text(), int(masks)), target)
