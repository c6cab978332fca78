#!/usr/bin/env python3
"""Features, conflict pairs and least conflicts of layers of the routed block, recomputed live.

Reading and merging by gdstk, distances by shapely, the optimum by RC2 over CaDiCaL; no stitches.
"""

import layer
import models
import program

# Layer, datatype, same-mask spacing in nanometres, masks.
ROWS = [
    (67, 20, 180, 3),
    (67, 20, 250, 3),
    (67, 20, 340, 3),
    (67, 20, 250, 2),
    (67, 20, 500, 4),
    (68, 20, 500, 2),
    (68, 20, 500, 3),
    (69, 20, 400, 2),
    (66, 44, 400, 3),
    (66, 44, 500, 3),
    (67, 44, 600, 2),
]


def reference(shapes, spacing, masks):
    """(features, conflict pairs, least conflicts, verdict)."""
    features, pairs = layer.features_and_pairs(shapes, spacing)
    conflicts, _ = models.rc2_least(masks, features, [[pair] for pair in pairs])
    return features, len(pairs), conflicts, "not decomposable" if conflicts else "decomposable"


def found(folder, number, datatype, spacing, masks):
    """The same four from the program."""
    run = program.solve(
        program.BLOCK,
        folder / f"{number}-{datatype}-{spacing}-{masks}",
        *("--layer", f"{number}/{datatype}", "--spacing", spacing, "--masks", masks),
        *("--stitch", "none"),
    )
    conflicts, _ = run.least()
    return run.result["features"], run.result["conflict_pairs"], conflicts, run.result["verdict"]


def main():
    comparison = program.Comparison("layer, spacing, K: features, pairs, least conflicts, verdict")
    shapes = {}
    with program.workspace() as folder:
        for number, datatype, spacing, masks in ROWS:
            if (number, datatype) not in shapes:
                polygons = layer.read_polygons(program.BLOCK, number, datatype)
                shapes[number, datatype] = layer.merged(polygons)
            comparison.add(
                f"{number}/{datatype}, {spacing} nm, {masks}",
                reference(shapes[number, datatype], spacing, masks),
                found(program.Path(folder), number, datatype, spacing, masks),
            )
    comparison.finish()


if __name__ == "__main__":
    main()
