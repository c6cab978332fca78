"""Features and conflict pairs of one layer of a GDSII file, by general libraries.

gdstk reads, flattens and merges; shapely measures. Coordinates are whole nanometres held in doubles,
so a squared distance between corners is exact and its root correctly rounded: the strict comparison
with a whole spacing is exact for Manhattan shapes.
"""

import gdstk
import numpy as np
import shapely


def read_polygons(path, layer, datatype):
    """The polygons of a layer of the only top cell, flattened, in whole nanometres."""
    library = gdstk.read_gds(str(path))
    (top,) = library.top_level()
    scale = library.unit / 1e-9
    polygons = top.get_polygons(layer=layer, datatype=datatype)
    return [gdstk.Polygon(np.rint(polygon.points * scale)) for polygon in polygons]


def combined(first, second, operation):
    """The polygons of `first OPERATION second`: or, and, xor, not."""
    return gdstk.boolean(first, second, operation, precision=1e-3)


def merged(polygons):
    """The union of polygons, as shapely polygons that may still touch at corners."""
    parts = combined(polygons, [], "or")
    return np.array([shapely.Polygon(np.rint(part.points)) for part in parts], dtype=object)


def components(count, joined):
    """The component of each of `count` things, numbered by their first members."""
    parent = list(range(count))

    def root(at):
        while parent[at] != at:
            parent[at] = parent[parent[at]]
            at = parent[at]
        return at

    for a, b in joined:
        parent[max(root(a), root(b))] = min(root(a), root(b))
    roots = [root(at) for at in range(count)]
    number = {at: i for i, at in enumerate(sorted(set(roots)))}
    return [number[at] for at in roots]


def close(shapes, spacing):
    """The pairs of shapes, smaller first, nearer than `spacing`, and their distances."""
    tree = shapely.STRtree(shapes)
    a, b = tree.query(shapes, predicate="dwithin", distance=spacing)
    keep = a < b
    a, b = a[keep], b[keep]
    distance = shapely.distance(shapes[a], shapes[b])
    keep = distance < spacing
    return np.stack([a[keep], b[keep]], axis=1), distance[keep]


def features_and_pairs(shapes, spacing):
    """The number of features, and the pairs of features nearer than `spacing`."""
    near, distance = close(shapes, spacing)
    feature = components(len(shapes), near[distance == 0])
    pairs = {tuple(sorted((feature[a], feature[b]))) for a, b in near}
    return max(feature) + 1, sorted(pair for pair in pairs if pair[0] != pair[1])
