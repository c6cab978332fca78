#!/usr/bin/env python3
"""Certificates before other checkers: every bound of the routed block and of the published graphs.

The formula of each bound must be unsatisfiable for CaDiCaL, its DRAT proof verified by the crate
`rate`, and its LRAT proof by the few lines below. Equal formulas with equal proofs are checked once.
Last come proofs and formulas that were damaged: each checker must refuse them.
"""

import json
import subprocess

from pysat.solvers import Solver

import models
import program
import rows


def read_cnf(path):
    """The clauses of a DIMACS file, and its text without comments."""
    lines = [line for line in path.read_text().splitlines() if not line.startswith("c")]
    clauses = [[int(word) for word in line.split()[:-1]] for line in lines[1:]]
    if lines[0].split()[:2] != ["p", "cnf"] or int(lines[0].split()[3]) != len(clauses):
        raise SystemExit(f"{path}: its head is another one's")
    return clauses, "\n".join(lines)


def is_unsatisfiable(clauses):
    with Solver(models.SOLVER, bootstrap_with=clauses) as solver:
        return not solver.solve()


def is_refuted(clauses, lrat):
    """Whether LRAT text refutes the clauses: each hint in turn is unit, the last one false."""
    known = dict(enumerate(clauses, 1))
    for line in lrat.splitlines():
        words = line.split()
        if words[1] == "d":
            for name in words[2:-1]:
                del known[int(name)]
            continue
        end = words.index("0")
        clause, hints = [int(word) for word in words[1:end]], words[end + 1 : -1]
        true = {-literal for literal in clause}
        for hint in hints:
            rest = [literal for literal in known[int(hint)] if -literal not in true]
            if len(rest) > 1 or not rest:
                break
            true.add(rest[0])
        if hints[-1] != hint or rest:
            return False
        known[int(words[0])] = clause
        if not clause:
            return True
    return False


def rate_verifies(cnf, drat):
    done = subprocess.run(
        [program.CHECKERS / "rate", cnf, drat], capture_output=True, text=True, check=False
    )
    verdicts = [line for line in done.stdout.splitlines() if line.startswith("s ")]
    if verdicts not in (["s VERIFIED"], ["s NOT VERIFIED"]):
        raise SystemExit(f"rate {cnf} {drat}: {verdicts}\n{done.stdout}{done.stderr}")
    return verdicts == ["s VERIFIED"]


def bounds_of(folder):
    """The names of the bounds that a certificate lists."""
    listed = json.loads((folder / "certificate/certificate.json").read_text())
    members = (("conflicts", "conflict_bounds"), ("stitches", "stitch_bounds"))
    return [f"{level}-{i}" for level, member in members for i in range(len(listed[member]))]


def exported(row, folder):
    """Solves and exports one row; (bounds, folder of LRAT, folder of DRAT)."""
    _, source, options = row
    run = program.solve(source, folder / "solved", *options)
    names = bounds_of(run.folder)
    for form in ("lrat", "drat"):
        program.export(run, source, form, folder / form)
        files = sorted(path.name for path in (folder / form).iterdir())
        if files != sorted(f"{name}.{end}" for name in names for end in ("cnf", form)):
            raise SystemExit(f"{folder / form}: other files than {len(names)} bounds have")
    return names, folder / "lrat", folder / "drat"


class Checked:
    """Which pairs of formula and proof were seen, and what was found of them."""

    def __init__(self):
        self.found = {}

    def bound(self, name, lrat, drat):
        """(unsatisfiable, LRAT accepted, DRAT verified) of one bound."""
        cnf = drat / f"{name}.cnf"
        clauses, text = read_cnf(cnf)
        proofs = [(at / f"{name}.{at.name}").read_text() for at in (lrat, drat)]
        key = (text, *proofs)
        if key not in self.found:
            same = (lrat / cnf.name).read_text() == cnf.read_text()
            self.found[key] = (
                is_unsatisfiable(clauses),
                same and is_refuted(clauses, proofs[0]),
                rate_verifies(cnf, drat / f"{name}.drat"),
            )
        return self.found[key]


def flipped(text, numbered):
    """The text with the first literal of one line negated, for each line that has one."""
    lines = text.splitlines()
    for i, line in enumerate(lines):
        words = line.split()
        if words[numbered] not in ("0", "d"):
            words[numbered] = str(-int(words[numbered]))
            yield "\n".join([*lines[:i], " ".join(words), *lines[i + 1 :], ""])


def add_controls(comparison, folder):
    """A critical graph without one of its fragments, and proofs with a literal negated."""
    _, lrat, drat = exported(rows.graph("groetzsch", 3), folder)
    name = "conflicts-0"
    clauses, _ = read_cnf(drat / f"{name}.cnf")
    comparison.add("control: a clause left out", False, is_unsatisfiable(clauses[1:]))
    damaged = flipped((lrat / f"{name}.lrat").read_text(), 1)
    refused = [not is_refuted(clauses, text) for text in damaged]
    comparison.add("control: LRAT with a literal negated", True, any(refused))
    damaged = folder / "damaged.drat"
    refused = []
    for text in flipped((drat / f"{name}.drat").read_text(), 0):
        damaged.write_text(text)
        refused.append(not rate_verifies(drat / f"{name}.cnf", damaged))
    comparison.add("control: DRAT with a literal negated", True, any(refused))


def main():
    comparison = program.Comparison("bounds: unsatisfiable, LRAT accepted, DRAT verified by rate")
    checked, total = Checked(), 0

    def check(item):
        (label, *_), folder = item[1], program.Path(name) / str(item[0])
        names, lrat, drat = exported(item[1], folder)
        found = [checked.bound(bound, lrat, drat) for bound in names]
        return label, len(names), tuple(map(sum, zip(*found))) or (0, 0, 0)

    with program.workspace() as name:
        jobs = [*rows.layers(), *rows.graphs()]
        for label, bounds, found in program.in_parallel(check, list(enumerate(jobs))):
            comparison.add(label, (bounds,) * 3, found)
            total += bounds
        add_controls(comparison, program.Path(name) / "controls")
    print(f"{total} bounds, {len(checked.found)} of them different")
    comparison.add("any bounds", True, total > 0)
    comparison.finish()


if __name__ == "__main__":
    main()
