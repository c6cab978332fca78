#!/usr/bin/env python3
"""Conflict pairs and least conflicts of random layouts under spacings by what faces what.

Layouts are written by gdstk, unions and distances are shapely's, edges are read off the rings of the
unions, the optimum is RC2's over CaDiCaL; no stitches. `check_spacing.py COUNT` checks COUNT layouts.
"""

import random
import sys
from collections import Counter
from dataclasses import dataclass

import gdstk
import layer
import models
import program
import shapely

LAYOUTS = 300
SIZE = 60
KINDS = ("side_to_side", "side_to_end", "end_to_end", "corner_to_corner")


@dataclass(frozen=True)
class Edge:
    """A straight edge: its axis (0 along x), whether it faces up (right), its place and ends."""

    axis: int
    up: bool
    at: int
    low: int
    high: int
    convex: tuple

    def is_end(self, rules):
        return all(self.convex) and self.high - self.low < rules["end_length"]


def random_boxes(rng):
    """Wires and blocks, as (x0, y0, x1, y1)."""
    boxes = []
    for _ in range(rng.randrange(3, 14)):
        x, y = rng.randrange(SIZE), rng.randrange(SIZE)
        wire = (rng.randrange(8, 40), rng.randrange(1, 5))
        width, height = rng.choice([wire, wire[::-1], (rng.randrange(1, 14), rng.randrange(1, 14))])
        boxes.append((x, y, x + width, y + height))
    return boxes


def random_rules(rng):
    """Rules in nanometres; kinds that are not given are the plain spacing."""
    rules = {"spacing": rng.randrange(1, 9), "metric": rng.choice(["euclidean", "square"])}
    rules["end_length"] = rng.randrange(1, 9)
    rules |= {kind: rng.randrange(1, 12) for kind in KINDS if rng.random() < 0.7}
    count = rng.randrange(3)
    columns = [sorted(rng.sample(range(1, top), count)) for top in (9, 12)]
    columns.append(sorted(rng.sample(range(3, 16), count)))
    names = ("width", "run_length", "spacing")
    rules["wide"] = [dict(zip(names, row)) for row in zip(*columns)]
    return rules


def rules_file(rules, masks):
    """The rules as the program reads them."""
    length = lambda value: f'"{value} nm"'
    lines = ['layer = "1/0"', f"masks = {masks}", f"spacing = {length(rules['spacing'])}"]
    lines += ["", "[spacings]", f'metric = "{rules["metric"]}"']
    given = ("end_length", *(kind for kind in KINDS if kind in rules))
    lines += [f"{key} = {length(rules[key])}" for key in given]
    for row in rules["wide"]:
        lines += ["", "[[spacings.wide]]", *(f"{key} = {length(row[key])}" for key in row)]
    return "\n".join(lines) + "\n"


def write(path, boxes):
    """The boxes on layer 1/0, one database unit a nanometre."""
    library = gdstk.Library(unit=1e-9, precision=1e-9)
    cell = library.new_cell("top")
    cell.add(*(gdstk.rectangle(box[:2], box[2:], layer=1, datatype=0) for box in boxes))
    library.write_gds(str(path))


def corners_only(ring):
    """The vertices of a ring at which it turns."""
    points = [(round(x), round(y)) for x, y in ring.coords[:-1]]
    count = len(points)
    straight = lambda a, b, c: a[0] == b[0] == c[0] or a[1] == b[1] == c[1]
    return [
        points[i]
        for i in range(count)
        if not straight(points[i - 1], points[i], points[(i + 1) % count])
    ]


def edges_of(polygons):
    """The edges of a feature, whose polygons touch one another at corners at most."""
    polygons = [shapely.geometry.polygon.orient(polygon) for polygon in polygons]
    rings = [corners_only(r) for p in polygons for r in (p.exterior, *p.interiors)]
    # Where the outline touches itself, it has no convex corner.
    shared = {point for point, count in Counter(p for ring in rings for p in ring).items() if count > 1}
    edges = []
    for ring in rings:
        count = len(ring)

        def is_convex(i):
            (ax, ay), (bx, by), (cx, cy) = ring[i - 1], ring[i % count], ring[(i + 1) % count]
            left = (bx - ax) * (cy - by) - (by - ay) * (cx - bx) > 0
            return left and (bx, by) not in shared

        for i in range(count):
            (ax, ay), (bx, by) = ring[i], ring[(i + 1) % count]
            convex = (is_convex(i), is_convex((i + 1) % count))
            if ay == by:
                # The inside is to the left.
                axis, up, at, start, end = 0, bx < ax, ay, ax, bx
            else:
                axis, up, at, start, end = 1, by > ay, ax, ay, by
            if start > end:
                start, end, convex = end, start, convex[::-1]
            edges.append(Edge(axis, up, at, start, end, convex))
    return edges


def corners_of(edges):
    """(x, y, right, upper) of each convex corner, off the edges along x."""
    return [
        (place, edge.at, right, edge.up)
        for edge in edges
        if edge.axis == 0
        for place, right, convex in zip((edge.low, edge.high), (False, True), edge.convex)
        if convex
    ]


class Feature:
    """What is compared of a feature."""

    def __init__(self, boxes):
        self.boxes = boxes
        self.area = shapely.union_all([shapely.box(*box) for box in boxes])
        self.edges = edges_of(getattr(self.area, "geoms", [self.area]))
        self.corners = corners_of(self.edges)

    def shallow(self, edge, width):
        """The stretches of an edge behind which the feature is less than `width` deep."""
        behind = sorted((edge.at, edge.at - width if edge.up else edge.at + width))
        strip = [edge.low, behind[0], edge.high, behind[1]]
        if edge.axis:
            strip = [behind[0], edge.low, behind[1], edge.high]
        missing = shapely.box(*strip).difference(self.area)
        parts = [part for part in getattr(missing, "geoms", [missing]) if part.area > 0]
        return [(part.bounds[edge.axis], part.bounds[edge.axis + 2]) for part in parts]

    def wide_length(self, edge, low, high, width):
        """How long the feature is at least `width` deep between two places of an edge."""
        cuts = [shapely.LineString([(a, 0), (b, 0)]) for a, b in self.shallow(edge, width)]
        line = shapely.LineString([(low, 0), (high, 0)])
        return round(line.difference(shapely.union_all(cuts)).length)


def features_of(boxes):
    """Boxes that touch are one feature."""
    areas = [shapely.box(*box) for box in boxes]
    joined = [
        (a, b) for b in range(len(boxes)) for a in range(b) if areas[a].intersects(areas[b])
    ]
    numbers = layer.components(len(boxes), joined)
    return [
        Feature([box for box, number in zip(boxes, numbers) if number == feature])
        for feature in range(max(numbers) + 1)
    ]


def square_distance(f, g):
    """The distance of two features in the square metric, box by box."""
    gap = lambda a, b, axis: max(a[axis] - b[axis + 2], b[axis] - a[axis + 2], 0)
    return min(max(gap(a, b, 0), gap(a, b, 1)) for a in f.boxes for b in g.boxes)


def face_too_closely(f, g, rules, kinds):
    """Whether edges of two features face each other, too close by their kinds or by a wide row."""
    for e in f.edges:
        for d in g.edges:
            low, high = max(e.low, d.low), min(e.high, d.high)
            if e.axis != d.axis or e.up == d.up or low >= high:
                continue
            gap = d.at - e.at if e.up else e.at - d.at
            if gap < 0:
                continue
            if gap < kinds[e.is_end(rules) + d.is_end(rules)]:
                return True
            for row in rules["wide"]:
                near = gap < row["spacing"]
                for feature, edge in ((f, e), (g, d)):
                    if near and feature.wide_length(edge, low, high, row["width"]) >= row["run_length"]:
                        return True
    return False


def turned_too_closely(f, g, rules, spacing):
    """Whether convex corners of two features are turned to each other, too close."""
    for x, y, right, upper in f.corners:
        for u, v, left, lower in g.corners:
            dx, dy = (u - x if right else x - u), (v - y if upper else y - v)
            if (left, lower) != (not right, not upper) or min(dx, dy) < 0 or dx == dy == 0:
                continue
            square = rules["metric"] == "square"
            if max(dx, dy) < spacing if square else dx * dx + dy * dy < spacing * spacing:
                return True
    return False


def are_close(f, g, rules):
    """Whether two features are close."""
    sides, mixed, ends, corner = (rules.get(kind, rules["spacing"]) for kind in KINDS)
    square = rules["metric"] == "square"
    distance = square_distance(f, g) if square else shapely.distance(f.area, g.area)
    if distance < min(sides, mixed, ends, corner):
        return True
    facing = face_too_closely(f, g, rules, (sides, mixed, ends))
    return facing or turned_too_closely(f, g, rules, corner)


def reference(boxes, rules, masks):
    """(features, conflict pairs, least conflicts)."""
    features = features_of(boxes)
    count = len(features)
    pairs = [
        (a, b) for b in range(count) for a in range(b) if are_close(features[a], features[b], rules)
    ]
    conflicts, _ = models.rc2_least(masks, count, [[pair] for pair in pairs])
    return count, len(pairs), conflicts


def found(folder, boxes, rules, masks):
    """The same three from the program."""
    folder.mkdir()
    source, file = folder / "layout.gds", folder / "rules.toml"
    write(source, boxes)
    file.write_text(rules_file(rules, masks))
    run = program.solve(source, folder / "out", "--rules", file)
    return run.result["features"], run.result["conflict_pairs"], run.least()[0]


def main():
    count = int(sys.argv[1]) if len(sys.argv) > 1 else LAYOUTS
    rng = random.Random(71)
    comparison = program.Comparison("random layouts: features, pairs, least conflicts")
    with program.workspace() as folder:
        for number in range(count):
            boxes, rules = random_boxes(rng), random_rules(rng)
            masks = rng.choice([2, 3])
            comparison.add(
                f"layout {number}: {rules}",
                reference(boxes, rules, masks),
                found(program.Path(folder) / str(number), boxes, rules, masks),
            )
    comparison.finish(quiet=True)


if __name__ == "__main__":
    main()
