"""Least costs by general solvers, straight from the definitions.

RC2 over CaDiCaL (python-sat) serves where there are many conflict pairs, CP-SAT (OR-tools) where an
instance has everything an instance may have: allowed masks, several edges to a pair, self-spacings.
"""

from itertools import count as counter
from itertools import pairwise

import instances
from ortools.sat.python import cp_model
from pysat.examples.rc2 import RC2
from pysat.formula import WCNF

SOLVER = "cadical153"


def as_wcnf(masks, fragments, pairs, stitches=()):
    """The weighted formula: every fragment has a mask; a unit of conflict outweighs all stitches."""
    formula, fresh = WCNF(), counter(1)
    on = [[next(fresh) for _ in range(masks)] for _ in range(fragments)]
    unit = sum(weight for _, _, weight in stitches) + 1
    for row in on:
        formula.append(row)
        for i, first in enumerate(row):
            for second in row[i + 1 :]:
                formula.append([-first, -second])
    for edges in pairs:
        paid = next(fresh)
        formula.append([-paid], weight=unit)
        for a, b in edges:
            for mask in range(masks):
                formula.append([-on[a][mask], -on[b][mask], paid])
    for a, b, weight in stitches:
        paid = next(fresh)
        formula.append([-paid], weight=weight)
        for mask in range(masks):
            formula.append([-on[a][mask], on[b][mask], paid])
            formula.append([on[a][mask], -on[b][mask], paid])
    return formula, unit


def rc2_least(masks, fragments, pairs, stitches=()):
    """(conflicts, stitches), least in that order."""
    formula, unit = as_wcnf(masks, fragments, pairs, stitches)
    with RC2(formula, solver=SOLVER) as solver:
        solver.compute()
        return divmod(solver.cost, unit)


def simple_paths(neighbours, start, end):
    """Every path without repetition from start to end, as a list of fragments."""
    paths, stack = [], [[start]]
    while stack:
        path = stack.pop()
        if path[-1] == end:
            paths.append(path)
            continue
        stack.extend([*path, n] for n in neighbours.get(path[-1], ()) if n not in path)
    return paths


def cp_sat_least(instance):
    """(conflicts, stitches) of instance JSON, least in that order."""
    masks, fragments = instance["masks"], sum(instance["features"])
    stitches = instance.get("stitches", [])
    model = cp_model.CpModel()
    on = [[model.new_bool_var("") for _ in range(masks)] for _ in range(fragments)]
    for row in on:
        model.add_exactly_one(row)
    for fragment, allowed in instance.get("allowed", []):
        model.add_bool_or([on[fragment][mask - 1] for mask in allowed])

    def shared(a, b):
        """A variable that is true exactly if a and b share a mask."""
        same = model.new_bool_var("")
        for mask in range(masks):
            model.add_bool_or([~on[a][mask], ~on[b][mask], same])
            model.add_bool_or([~same, ~on[a][mask], on[b][mask]])
        return same

    conflicts = []
    for edges in instance["pairs"]:
        unresolved = model.new_bool_var("")
        for a, b in edges:
            model.add_implication(shared(a, b), unresolved)
        conflicts.append(unresolved)
    neighbours = {}
    for a, b, _ in stitches:
        neighbours.setdefault(a, []).append(b)
        neighbours.setdefault(b, []).append(a)
    of_feature = {}
    for a, b in instance.get("self_spacings", []):
        # One unit of conflict for all self-spacings of a feature.
        feature = instances.feature_of(instance, a)
        violated = of_feature.setdefault(feature, model.new_bool_var(""))
        joined = []
        for path in simple_paths(neighbours, a, b):
            whole = model.new_bool_var("")
            for one, next_one in pairwise(path):
                model.add_implication(whole, shared(one, next_one))
            joined.append(whole)
        model.add_bool_or([~shared(a, b), violated, *joined])
    conflicts.extend(of_feature.values())
    for a, b in instance.get("same", []):
        model.add(shared(a, b) == 1)
    for a, b in instance.get("different", []):
        model.add(shared(a, b) == 0)
    for most, edges in instance.get("at_most", []):
        model.add(sum(weight * (1 - shared(a, b)) for a, b, weight in edges) <= most)
    paid = [(shared(a, b), weight) for a, b, weight in stitches]
    stitch_cost = sum(weight * (1 - same) for same, weight in paid)
    unit = sum(weight for _, weight in paid) + 1
    model.minimize(unit * sum(conflicts) + stitch_cost)
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.random_seed = 1
    if solver.solve(model) != cp_model.OPTIMAL:
        raise RuntimeError(f"CP-SAT: {solver.status_name()}")
    return divmod(round(solver.objective_value), unit)
