#!/usr/bin/env python3
"""Whole claims before VeriPB: the routed block's rows, the published graphs, cliques, random instances.

Each claim is one pseudo-Boolean problem and one proof. The crate `veripb` must verify the bounds that
result.json states; on random instances CP-SAT must find the same least cost. Last come a proof and a
conclusion that were damaged, which must be refused.
"""

import json
import subprocess
from itertools import combinations

import instances
import models
import program
import rows

# Fragments that are all close to one another, and masks.
CLIQUES = [(7, 2), (10, 3), (20, 4), (30, 5)]

# Random instances for each number of masks.
SEEDS = 20


def verdict(problem, proof):
    """What veripb says: the verified bounds as text, or that it refuses."""
    words = [program.CHECKERS / "veripb", problem, proof]
    done = subprocess.run(words, capture_output=True, text=True, check=False)
    said = [line for line in done.stdout.splitlines() if line.startswith("s ")]
    return said[0] if done.returncode == 0 and len(said) == 1 else "refused"


def objective(problem):
    """The objective of an OPB file as {name: weight}."""
    (line,) = [line for line in problem.read_text().splitlines() if line.startswith("min:")]
    words = line.split()[1:-1]
    return dict(zip(words[1::2], map(int, words[::2])))


def expected(run, weights):
    """The bounds of result.json as one objective, and how many prices there are of each kind."""
    stitches = [weight for name, weight in weights.items() if name[0] == "c"]
    conflict = sum(stitches) + 1
    if any(weight != conflict for name, weight in weights.items() if name[0] in "ps"):
        raise SystemExit("a conflict weighs something else than one more than all stitches")
    lower, upper = (
        conflict * run.result["conflicts"][end] + run.result["stitches"][end]
        for end in ("lower", "upper")
    )
    kinds = ("conflict_pairs", "self_spacing_features", "stitch_candidates")
    return [run.result[kind] for kind in kinds], f"s VERIFIED BOUNDS {lower} <= obj <= {upper}"


def claim(source, folder, options):
    """Solves and exports; (run, problem, proof)."""
    run = program.solve(source, folder / "solved", *options)
    program.export(run, source, "veripb", folder / "claim")
    files = sorted(path.name for path in (folder / "claim").iterdir())
    if files != ["claim.opb", "claim.pbp"]:
        raise SystemExit(f"{folder}: {files}")
    return run, folder / "claim/claim.opb", folder / "claim/claim.pbp"


def check_row(item):
    """(label, expected, found) of one row."""
    (label, source, options), folder = item
    run, problem, proof = claim(source, folder, options)
    weights = objective(problem)
    kinds = [sum(name[0] == kind for name in weights) for kind in "psc"]
    return label, expected(run, weights), (kinds, verdict(problem, proof))


def check_random(item):
    """(label, expected, found) of one random instance."""
    masks, seed, folder = item
    folder.mkdir()
    instance, source = instances.random_instance(masks, seed), folder / "instance.json"
    source.write_text(json.dumps(instance))
    _, problem, proof = claim(source, folder, ())
    conflicts, stitches = models.cp_sat_least(instance)
    weight = 1 + sum(weight for *_, weight in instance["stitches"])
    least = weight * conflicts + stitches
    wanted = f"s VERIFIED BOUNDS {least} <= obj <= {least}"
    return f"random, K = {masks}, seed {seed}", wanted, verdict(problem, proof)


def turan(members, masks):
    """The fewest pairs on one mask when members of a clique are spread evenly (Turan 1941)."""
    sizes = [len(range(mask, members, masks)) for mask in range(masks)]
    return sum(size * (size - 1) // 2 for size in sizes)


def check_clique(item):
    """(label, expected, found) of one complete graph."""
    members, masks, folder = item
    folder.mkdir()
    edges = [f"e {a} {b}\n" for a, b in combinations(range(1, members + 1), 2)]
    source = folder / "clique.col"
    source.write_text(f"p edge {members} {len(edges)}\n{''.join(edges)}")
    _, problem, proof = claim(source, folder, ("--masks", masks))
    least = turan(members, masks)
    wanted = f"s VERIFIED BOUNDS {least} <= obj <= {least}"
    return f"{members} all close, K = {masks}", wanted, verdict(problem, proof)


def negated(lines):
    """The lines with the first literal of one propagation negated, for each that has one."""
    for i, line in enumerate(lines):
        words = line.split()
        if words[0] == "rup" and words[1] == "1":
            name = words[2]
            words[2] = name[1:] if name[0] == "~" else f"~{name}"
            yield [*lines[:i], " ".join(words), *lines[i + 1 :]]


def raised(lines):
    """The lines with a lower bound that is one higher."""
    (at,) = [i for i, line in enumerate(lines) if line.startswith("conclusion BOUNDS")]
    words = lines[at].split()
    words[2] = str(int(words[2]) + 1)
    return [*lines[:at], " ".join(words), *lines[at + 1 :]]


def add_controls(comparison, folder):
    _, source, options = rows.graph("groetzsch", 3)
    _, problem, proof = claim(source, folder, options)
    lines, damaged = proof.read_text().splitlines(), folder / "damaged.pbp"

    def is_refused(lines):
        damaged.write_text("\n".join([*lines, ""]))
        return verdict(problem, damaged) == "refused"

    comparison.add("control: the proof itself", False, is_refused(lines))
    comparison.add("control: a literal negated", True, any(map(is_refused, negated(lines))))
    comparison.add("control: a bound raised", True, is_refused(raised(lines)))


def main():
    comparison = program.Comparison("claims: prices (pairs, self-spacings, stitches), veripb")
    with program.workspace() as name:
        folder = program.Path(name)
        jobs = [*rows.layers(), *rows.graphs()]
        items = [(job, folder / str(i)) for i, job in enumerate(jobs)]
        for row in program.in_parallel(check_row, items):
            comparison.add(*row)
        items = [(*clique, folder / "-".join(map(str, clique))) for clique in CLIQUES]
        for row in program.in_parallel(check_clique, items):
            comparison.add(*row)
        every = [(masks, seed) for masks in range(2, 6) for seed in range(SEEDS)]
        items = [(masks, seed, folder / f"random-{masks}-{seed}") for masks, seed in every]
        random = program.Comparison("random instances")
        for row in program.in_parallel(check_random, items):
            random.add(*row)
        same = sum(wanted == found for _, wanted, found in random.rows)
        comparison.add("random instances", len(every), same)
        add_controls(comparison, folder / "controls")
    comparison.finish()


if __name__ == "__main__":
    main()
