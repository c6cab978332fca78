#!/usr/bin/env python3
"""Random instances with stitches, allowed masks, several edges to a pair, self-spacings and ties.

The program's least (conflicts, stitches) against CP-SAT on a model of the definitions, and the cost
of the colouring it wrote against a plain count.
"""

import json

import instances
import models
import program

SEEDS = 150
MASKS = (2, 3, 4, 5)


def compare(folder, masks, seed):
    """(name, reference, found) of one instance."""
    instance = instances.random_instance(masks, seed, tied=seed % 2 == 1)
    path = folder / f"{masks}-{seed}.json"
    path.write_text(json.dumps(instance))
    run = program.solve(path, folder / f"{masks}-{seed}")
    least = models.cp_sat_least(instance)
    counted = instances.cost(instance, run.colouring())
    return f"K = {masks}, seed {seed}", (least, least), (run.least(), counted)


def main():
    comparison = program.Comparison("random instances: least cost, cost of the colouring")
    cases = [(masks, seed) for masks in MASKS for seed in range(SEEDS)]
    with program.workspace() as name:
        folder = program.Path(name)
        for row in program.in_parallel(lambda case: compare(folder, *case), cases):
            comparison.add(*row)
    comparison.finish(quiet=True)


if __name__ == "__main__":
    main()
