//! What the audit makes of a bound, against plain enumeration of the whole instance: the search for a
//! counterexample, and the canonical formula, which varisat decides.

#![allow(clippy::unwrap_used)]

mod common;

use common::{enumerate, random};
use encodings::{Instance, Mask};
use maskproof::audit::formula::canonical;
use maskproof::audit::statement::{Statement, of_conflict_bound, of_stitch_bound};
use maskproof::audit::{Problem, enumeration, graph};
use maskproof::certificate::{ConflictBound, Enumeration, Evidence, StitchBound, Unit};
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;
use varisat::{ExtendFormula, Lit, Solver};

const BY: Evidence = Evidence::Enumeration(Enumeration::Enumeration);

/// Some units of conflict, each by some of its edges.
fn some_units(instance: &Instance, rng: &mut Pcg64Mcg, share: f64) -> Vec<Unit> {
    let mut units = Vec::new();
    for pair in instance.pairs() {
        if rng.random_bool(share) {
            let mut edges = pair.to_vec();
            edges.retain(|_| rng.random_bool(0.8));
            if edges.is_empty() {
                edges.push(pair[0]);
            }
            units.push(edges);
        }
    }
    for spacings in instance.self_units() {
        if rng.random_bool(share) {
            let mut edges = spacings.to_vec();
            edges.retain(|_| rng.random_bool(0.8));
            if edges.is_empty() {
                edges.push(spacings[0]);
            }
            units.push(edges);
        }
    }
    units
}

/// Whether a colouring violates a unit, by the definitions.
fn is_violated(instance: &Instance, colouring: &[Mask], unit: &Unit) -> bool {
    let same = |&[a, b]: &[u32; 2]| colouring[a as usize] == colouring[b as usize];
    let [a, b] = unit[0];
    if instance.feature_of(a) != instance.feature_of(b) {
        return unit.iter().any(same);
    }
    unit.iter().any(|&[a, b]| {
        let mut reached = vec![false; colouring.len()];
        reached[a as usize] = true;
        for _ in 0..colouring.len() {
            for stitch in instance.stitches() {
                if same(&[stitch.a, stitch.b]) && same(&[a, stitch.a]) {
                    let either = reached[stitch.a as usize] || reached[stitch.b as usize];
                    reached[stitch.a as usize] = either;
                    reached[stitch.b as usize] = either;
                }
            }
        }
        same(&[a, b]) && !reached[b as usize]
    })
}

/// All fragments: with them all ties of the instance count.
fn everything(instance: &Instance) -> Vec<u32> {
    (0..instance.fragment_count() as u32).collect()
}

/// With fewer fragments fewer ties count, so less is refuted, and nothing that is not so.
fn is_sound(statement: &Statement, holds: bool, what: &str) {
    let refuted = enumeration::counterexample(statement).unwrap().is_none();
    assert!(holds || !refuted, "without further fragments, {what}");
    assert_eq!(!is_satisfiable(statement, &[]), refuted, "{what}");
}

fn violated(instance: &Instance, colouring: &[Mask], units: &[Unit]) -> u64 {
    units
        .iter()
        .filter(|unit| is_violated(instance, colouring, unit))
        .count() as u64
}

/// Whether the formula of a statement has a model.
fn is_satisfiable(statement: &Statement, precedence: &[u32]) -> bool {
    let formula = canonical(statement, precedence).unwrap();
    let mut solver = Solver::new();
    for clause in formula.clauses() {
        let clause: Vec<Lit> = clause
            .iter()
            .map(|&literal| Lit::from_dimacs(literal as isize))
            .collect();
        solver.add_clause(&clause);
    }
    solver.solve().unwrap()
}

/// Both ways of the audit say what plain enumeration says.
fn agree(problem: &Problem, statement: &Statement, holds: bool, rng: &mut Pcg64Mcg, what: &str) {
    let found = enumeration::counterexample(statement).unwrap();
    assert_eq!(found.is_none(), holds, "enumeration, {what}");
    assert_eq!(
        !is_satisfiable(statement, &[]),
        holds,
        "canonical formula, {what}"
    );
    let all = (1u16 << problem.masks) - 1;
    let count = statement.fragments.len() as u32;
    let free = statement.allowed.iter().all(|&set| u16::from(set) == all);
    if free && count > 0 {
        // Precedence along any list of different fragments.
        let first = rng.random_range(0..count);
        let listed: Vec<u32> = (0..count.min(u32::from(problem.masks)))
            .map(|i| (first + i) % count)
            .collect();
        assert_eq!(
            !is_satisfiable(statement, &listed),
            holds,
            "with precedence, {what}"
        );
    } else if count > 0 {
        assert!(canonical(statement, &[0]).is_err());
    }
}

#[test]
fn bounds_on_conflicts_as_plain_enumeration_says() {
    let mut rng = Pcg64Mcg::seed_from_u64(5);
    let mut held = [0; 2];
    for seed in 0..3_000 {
        for masks in 2..=5 {
            let instance = random::instance(masks, seed);
            let share = [0.5, 0.9, 1.0][rng.random_range(0..3)];
            let units = some_units(&instance, &mut rng, share);
            let mut least = u64::MAX;
            enumerate::each_colouring(&instance, |colouring| {
                if enumerate::keeps_ties(&instance, colouring) {
                    least = least.min(violated(&instance, colouring, &units));
                }
            });
            let limit = (least + u64::from(rng.random_bool(0.3))).max(1);
            let problem = graph::derive(&instance);
            let mut bound = ConflictBound {
                limit,
                units,
                with: Vec::new(),
                by: BY,
            };
            let holds = least >= limit;
            let what = format!("seed {seed}, {masks} masks, limit {limit}, least {least}");
            is_sound(&of_conflict_bound(&problem, &bound).unwrap(), holds, &what);
            bound.with = everything(&instance);
            let statement = of_conflict_bound(&problem, &bound).unwrap();
            held[usize::from(holds)] += 1;
            agree(&problem, &statement, holds, &mut rng, &what);
        }
    }
    assert!(held[0] > 500 && held[1] > 500, "{held:?}");
}

#[test]
fn bounds_on_stitches_as_plain_enumeration_says() {
    let mut rng = Pcg64Mcg::seed_from_u64(6);
    let mut held = [0; 2];
    for seed in 0..3_000 {
        for masks in 2..=5 {
            let instance = random::instance(masks, seed + 5_000);
            let met: Vec<ConflictBound> = (0..rng.random_range(0..3u64))
                .map(|limit| ConflictBound {
                    limit: limit + 1,
                    units: some_units(&instance, &mut rng, 0.3),
                    with: Vec::new(),
                    by: BY,
                })
                .collect();
            let resolved = some_units(&instance, &mut rng, 0.4);
            let mut stitches = instance.stitches().to_vec();
            stitches.retain(|_| rng.random_bool(0.8));
            if stitches.is_empty() {
                continue;
            }
            // The least weight of stitches; none where the facts contradict one another.
            let mut least = u64::MAX;
            enumerate::each_colouring(&instance, |colouring| {
                let facts = violated(&instance, colouring, &resolved) == 0
                    && met
                        .iter()
                        .all(|bound| violated(&instance, colouring, &bound.units) <= bound.limit);
                if facts && enumerate::keeps_ties(&instance, colouring) {
                    let cut = stitches
                        .iter()
                        .filter(|s| colouring[s.a as usize] != colouring[s.b as usize]);
                    least = least.min(cut.map(|stitch| u64::from(stitch.weight)).sum());
                }
            });
            let limit = match least {
                u64::MAX => 7,
                least => (least + u64::from(rng.random_bool(0.3))).max(1),
            };
            let problem = graph::derive(&instance);
            let mut bound = StitchBound {
                limit,
                units: stitches.iter().map(|stitch| [stitch.a, stitch.b]).collect(),
                resolved,
                met: (0..met.len() as u32).collect(),
                with: Vec::new(),
                by: BY,
            };
            let holds = least >= limit;
            let what = format!("seed {seed}, {masks} masks, limit {limit}, least {least}");
            is_sound(
                &of_stitch_bound(&problem, &met, &bound).unwrap(),
                holds,
                &what,
            );
            bound.with = everything(&instance);
            let statement = of_stitch_bound(&problem, &met, &bound).unwrap();
            held[usize::from(holds)] += 1;
            agree(&problem, &statement, holds, &mut rng, &what);
        }
    }
    assert!(held[0] > 300 && held[1] > 300, "{held:?}");
}
