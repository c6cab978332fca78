#!/usr/bin/env python3
"""Abstract inputs: the graphs of known chromatic number, and wires with stitches.

Verdicts on as many masks as the chromatic number by CaDiCaL, and on one less; least costs against RC2
where that ends soon.
"""

import json

from pysat.solvers import Solver

import instances
import models
import program

GRAPHS = sorted((program.ROOT / "tests/data/graphs").glob("*.col"))
WIRES = ("wires_s", "wires_m2")

# RC2 proves the least number of conflicts of graphs of so many edges at once.
SMALL = 75

# The verdict must be there by then; a least number of conflicts of a larger graph need not.
SECONDS = 5


def read_col(path):
    """(vertices, edges numbered from 0)."""
    lines = [line.split() for line in path.read_text().splitlines()]
    (vertices,) = [int(line[2]) for line in lines if line[0] == "p"]
    return vertices, [[int(line[1]) - 1, int(line[2]) - 1] for line in lines if line[0] == "e"]


def colourable(masks, vertices, edges):
    """Whether the graph has a colouring without conflict."""
    formula, _ = models.as_wcnf(masks, vertices, [[edge] for edge in edges])
    # All pairs are resolved, and an edge may fix two colours.
    fixed = [edges[0][0] * masks + 1, edges[0][1] * masks + 2]
    hard = [*formula.hard, *formula.soft, *([literal] for literal in fixed)]
    with Solver(models.SOLVER, bootstrap_with=hard) as solver:
        return solver.solve()


def compare_graph(comparison, folder, path):
    """A small graph on every number of masks, a larger one on just enough and one less."""
    vertices, edges = read_col(path)
    enough = next(masks for masks in range(2, 9) if colourable(masks, vertices, edges))
    small = len(edges) <= SMALL
    for masks in range(2 if small else enough - 1, enough + 1):
        name = f"{path.stem}, K = {masks}"
        run = program.solve(
            path, folder / f"{path.stem}-{masks}", "--masks", masks, "--time-limit", SECONDS
        )
        pairs = [[edge] for edge in edges]
        abstract = {"masks": masks, "features": [1] * vertices, "pairs": pairs}
        conflicts, _ = instances.cost(abstract, run.colouring())
        bounds = run.result["conflicts"]
        comparison.add(f"{name}: colouring", conflicts, bounds["upper"])
        comparison.add(f"{name}: without conflict", masks == enough, bounds["lower"] == 0)
        if small:
            comparison.add(
                f"{name}: least cost", models.rc2_least(masks, vertices, pairs), run.least()
            )


def compare_wires(comparison, folder, name):
    """The least cost of one instance of wires, and the cost of its colouring."""
    path = program.ROOT / f"tests/data/{name}.json"
    instance = json.loads(path.read_text())
    run = program.solve(path, folder / name)
    least = models.rc2_least(
        instance["masks"], sum(instance["features"]), instance["pairs"], instance["stitches"]
    )
    counted = instances.cost(instance, run.colouring())
    comparison.add(name, (least, least), (run.least(), counted))


def main():
    comparison = program.Comparison("graphs and wires")
    with program.workspace() as name:
        folder = program.Path(name)
        for path in GRAPHS:
            compare_graph(comparison, folder, path)
        for wires in WIRES:
            compare_wires(comparison, folder, wires)
    comparison.finish()


if __name__ == "__main__":
    main()
