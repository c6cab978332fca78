#!/usr/bin/env python3
"""The coloured layout itself: what gdstk and shapely see in coloured.gds.

The masks together are the layer; every other layer is as it was; the places where two masks overlap
are the stitches; and the pairs of features too close on one mask are the conflicts reported.
"""

from itertools import combinations

import gdstk
import numpy as np
import shapely

import layer
import program

# Layer, datatype, same-mask spacing in nanometres, masks, options that place stitches.
UNCOVERED = ("--stitch", "uncovered", "--overlap", 40)
STITCHES = (*UNCOVERED, "--fragment-length", 100, "--corner", 40)
METAL_2 = (*UNCOVERED, "--fragment-length", 140, "--corner", 70)
EVERYWHERE = ("--stitch", "every-interval", *METAL_2[2:])
ROWS = [
    (67, 20, 250, 3, ("--stitch", "none")),
    (67, 20, 340, 3, STITCHES),
    (67, 20, 250, 2, STITCHES),
    (68, 20, 500, 2, STITCHES),
    (69, 20, 400, 2, METAL_2),
    (69, 20, 500, 2, METAL_2),
    (66, 44, 500, 3, ("--stitch", "none")),
    (67, 20, 250, 3, EVERYWHERE),
    (67, 20, 250, 2, EVERYWHERE),
    (68, 20, 500, 3, EVERYWHERE),
    (68, 20, 500, 2, EVERYWHERE),
    (69, 20, 400, 2, EVERYWHERE),
]


def datatype_of(mask):
    """The datatype that a mask is drawn on."""
    return 100 + mask


def area_of(polygons):
    """The area of a union, in square nanometres."""
    return round(sum(part.area() for part in layer.combined(polygons, [], "or")))


def parts_of(polygons):
    """The connected parts of a union, each one shapely geometry."""
    shapes = layer.merged(polygons)
    if not len(shapes):
        return shapes
    near, distance = layer.close(shapes, 1)
    part = np.array(layer.components(len(shapes), near[distance == 0]))
    return np.array(
        [shapely.MultiPolygon(list(shapes[part == i])) for i in range(part.max() + 1)], dtype=object
    )


def owners(parts, features):
    """The feature that each part lies in."""
    inside = shapely.STRtree(features).query(
        np.array([shapely.Point(part.geoms[0].exterior.coords[0]) for part in parts], dtype=object),
        predicate="dwithin",
        distance=0.25,
    )
    owner = {}
    for part, feature in inside.T:
        owner.setdefault(part, []).append(feature)
    if len(owner) != len(parts) or any(len(found) != 1 for found in owner.values()):
        raise SystemExit("a drawn part lies in no feature, or in several")
    return [owner[part][0] for part in range(len(parts))]


def too_close(parts, features, spacing):
    """(pairs of features, whether a feature comes too close to itself) on one mask."""
    if not len(parts):
        return set(), False
    owner = owners(parts, features)
    near, _ = layer.close(parts, spacing)
    pairs = {tuple(sorted((owner[a], owner[b]))) for a, b in near}
    return {pair for pair in pairs if pair[0] != pair[1]}, any(a == b for a, b in pairs)


def other_layers(path, but):
    """Every polygon of every other layer, as text."""
    (top,) = gdstk.read_gds(str(path)).top_level()
    return sorted(
        (polygon.layer, polygon.datatype, polygon.points.tobytes())
        for polygon in top.get_polygons()
        if (polygon.layer, polygon.datatype) not in but
    )


def compare(comparison, folder, number, datatype, spacing, masks, stitch):
    label = f"{number}/{datatype}, {spacing} nm, K = {masks}, {stitch[1]}"
    run = program.solve(
        program.BLOCK,
        folder / str(len(comparison.rows)),
        *("--layer", f"{number}/{datatype}", "--spacing", spacing, "--masks", masks, *stitch),
    )
    drawn = run.folder / "coloured.gds"
    on_mask = [
        layer.read_polygons(drawn, number, datatype_of(mask)) for mask in range(1, masks + 1)
    ]
    original = layer.read_polygons(program.BLOCK, number, datatype)
    together = [polygon for polygons in on_mask for polygon in polygons]
    # Two sets are equal exactly if each has the area of their union.
    areas = [area_of(polygons) for polygons in (together, original + together)]
    comparison.add(f"{label}: area, alone and with the layer", [area_of(original)] * 2, areas)

    new = {(number, datatype_of(mask)) for mask in range(1, masks + 1)}
    kept = other_layers(drawn, new) == other_layers(program.BLOCK, ())
    comparison.add(f"{label}: everything else kept", True, kept)

    features = parts_of(original)
    pairs, itself = set(), False
    for polygons in on_mask:
        close, own = too_close(parts_of(polygons), features, spacing)
        pairs, itself = pairs | close, itself or own
    unresolved = run.result["unresolved"]
    kinds = [conflict["kind"] for conflict in unresolved]
    comparison.add(f"{label}: conflict pairs", len(pairs), kinds.count("conflict pair"))
    comparison.add(f"{label}: self-spacing", itself, "self-spacing" in kinds)
    comparison.add(f"{label}: conflicts", len(kinds), run.result["conflicts"]["upper"])

    overlaps = sum(
        len(parts_of(layer.combined(one, other, "and"))) for one, other in combinations(on_mask, 2)
    )
    comparison.add(f"{label}: stitches", overlaps, len(run.result["stitched"]))
    comparison.add(f"{label}: stitch cost", overlaps, run.result["stitches"]["upper"])


def main():
    comparison = program.Comparison("coloured.gds")
    with program.workspace() as name:
        for row in ROWS:
            compare(comparison, program.Path(name), *row)
    comparison.finish()


if __name__ == "__main__":
    main()
