//! Certificates against plain enumeration: every bound holds, they add up to the least cost, every proof
//! is a refutation of its formula, and a formula has a model exactly where the bound is not so.
#![allow(clippy::unwrap_used, clippy::expect_used)]

mod common;
#[path = "../encodings/tests/common/dpll.rs"]
#[allow(dead_code)]
mod dpll;

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use common::enumerate::{each_colouring, keeps_ties, least};
use common::{graphs, random, rup};
use encodings::literal::Formula;
use encodings::{Instance, Lit, Mask};
use maskproof::certificate::{Certificate, Digest, Evidence, Rules, Unit, write};
use maskproof::certify::features::Features;
use maskproof::certify::statement::{Budget, Item, Statement};
use maskproof::certify::{
    self, Certified, Effort, InMemory, Subject, conflicts, formula, stitches,
};
use maskproof::merge::merge;
use maskproof::reduce::{Reductions, reduce};
use maskproof::solve::refutation::{self, Lists};
use maskproof::solve::{Choice, Limits, Scale, Stop, solve_pieces};

type Proofs = BTreeMap<String, Vec<u8>>;

/// Everything is proven, nothing enumerated.
const PROOFS_ONLY: Effort = Effort {
    colourings: 0,
    ..Effort::USUAL
};

fn certify(
    instance: &Instance,
    reductions: Reductions,
    choice: Choice,
    effort: Effort,
    stop: &Stop,
) -> (Certified, Proofs) {
    let reduced = reduce(instance, reductions).unwrap();
    let outcomes = solve_pieces(&reduced, choice, &Limits::default(), &|_| {});
    let colourings: Vec<&[Mask]> = outcomes.iter().map(|found| &found.colouring[..]).collect();
    let colouring = merge(instance, &reduced, &colourings).unwrap().colouring;
    let facts = certify::Facts {
        input: Digest::of(b""),
        rules: Rules::of_graph(instance.masks()),
        features: Vec::new(),
        split: Vec::new(),
    };
    let subject = Subject {
        instance,
        reduced: &reduced,
        outcomes: &outcomes,
        colouring: &colouring,
    };
    let store = InMemory::default();
    let certified = certify::certify(facts, &subject, &store, effort, stop, &|_, _| {}).unwrap();
    (certified, store.into_proofs())
}

fn usual(instance: &Instance, effort: Effort) -> (Certificate, Proofs) {
    let stop = Stop::default();
    let (certified, proofs) = certify(instance, Reductions::ALL, Choice::Auto, effort, &stop);
    (certified.certificate, proofs)
}

/// Whether a colouring violates a unit by the edges named: a plain look at the definitions.
fn is_violated(instance: &Instance, unit: &Unit, colours: &[Mask]) -> bool {
    unit.iter().any(|&[a, b]| {
        let same = colours[a as usize] == colours[b as usize];
        same && (instance.feature_of(a) != instance.feature_of(b)
            || !joined(instance, a, b, colours))
    })
}

fn joined(instance: &Instance, a: u32, b: u32, colours: &[Mask]) -> bool {
    let mut reached = BTreeSet::from([a]);
    loop {
        let before = reached.len();
        for stitch in instance.stitches() {
            for (from, to) in [(stitch.a, stitch.b), (stitch.b, stitch.a)] {
                if reached.contains(&from) && colours[to as usize] == colours[a as usize] {
                    reached.insert(to);
                }
            }
        }
        if reached.len() == before {
            return reached.contains(&b);
        }
    }
}

fn weight(instance: &Instance, edge: [u32; 2]) -> Option<u64> {
    let found = instance.stitches().iter().find(|s| [s.a, s.b] == edge);
    found.map(|stitch| u64::from(stitch.weight))
}

/// The number of the unit of the instance that a named unit is part of.
fn number(instance: &Instance, unit: &Unit) -> u32 {
    let holds = |edges: &[[u32; 2]]| unit.iter().all(|edge| edges.contains(edge));
    assert!(!unit.is_empty() && unit.windows(2).all(|two| two[0] < two[1]));
    if let Some(pair) = instance.pairs().position(holds) {
        return pair as u32;
    }
    let own = instance.self_units().position(holds);
    (instance.pair_count() + own.expect("a unit of the instance")) as u32
}

fn violated(instance: &Instance, units: &[Unit], colours: &[Mask]) -> u64 {
    units
        .iter()
        .filter(|unit| is_violated(instance, unit, colours))
        .count() as u64
}

/// Checks everything but the evidence by trying all colourings.
fn check_bounds(instance: &Instance, certificate: &Certificate) {
    let mut taken = BTreeSet::new();
    for bound in &certificate.conflict_bounds {
        assert!(bound.limit > 0);
        for unit in &bound.units {
            assert!(
                taken.insert(number(instance, unit)),
                "{unit:?} is in two bounds"
            );
        }
        let mut fewest = u64::MAX;
        each_colouring(instance, |c| {
            if keeps_ties(instance, c) {
                fewest = fewest.min(violated(instance, &bound.units, c))
            }
        });
        assert!(fewest >= bound.limit, "{bound:?}: {fewest}");
    }
    let mut cut = BTreeSet::new();
    for bound in &certificate.stitch_bounds {
        assert!(bound.limit > 0);
        assert!(bound.units.iter().all(|edge| cut.insert(*edge)));
        let resolved = bound.resolved.iter().map(|unit| number(instance, unit));
        assert!(resolved.into_iter().all(|unit| !taken.contains(&unit)));
        let mut fewest = u64::MAX;
        each_colouring(instance, |colours| {
            let met = bound.met.iter().all(|&met| {
                let bound = &certificate.conflict_bounds[met as usize];
                violated(instance, &bound.units, colours) <= bound.limit
            });
            let legal = keeps_ties(instance, colours);
            if legal && met && violated(instance, &bound.resolved, colours) == 0 {
                let is_cut = |e: &&[u32; 2]| colours[e[0] as usize] != colours[e[1] as usize];
                let cut = bound.units.iter().filter(is_cut);
                fewest = fewest.min(cut.map(|&e| weight(instance, e).unwrap()).sum());
            }
        });
        assert!(fewest >= bound.limit, "{bound:?}: {fewest}");
    }
}

/// The statements that the bounds deny, each with its evidence.
fn statements<'a>(
    instance: &Instance,
    certificate: &'a Certificate,
) -> Vec<(Statement, &'a Evidence)> {
    let conflict_bounds = certificate.conflict_bounds.iter();
    let first = conflict_bounds.map(|b| {
        let statement = Statement {
            with: b.with.clone(),
            ..conflicts::statement(&b.units, b.limit)
        };
        (statement, &b.by)
    });
    let second = certificate.stitch_bounds.iter().map(|bound| {
        let met = bound.met.iter().map(|&met| {
            let bound = &certificate.conflict_bounds[met as usize];
            stitches::met_budget(&bound.units, bound.limit)
        });
        let items = bound.units.iter().map(|&ends| Item::Stitch {
            ends,
            weight: weight(instance, ends).unwrap(),
        });
        let own = Budget {
            items: items.collect(),
            most: bound.limit - 1,
        };
        let statement = Statement {
            resolved: bound.resolved.clone(),
            budgets: met.chain([own]).collect(),
            with: bound.with.clone(),
        };
        (statement, &bound.by)
    });
    first.chain(second).collect()
}

fn canonical(features: &Features<'_>, statement: &Statement, precedence: &[u32]) -> Lists {
    let fragments = statement.fragments(features);
    formula::canonical(features, &fragments, statement, precedence)
        .unwrap()
        .0
}

/// Replays every proof and walks along every cycle; returns how many proofs there are.
fn check_evidence(instance: &Instance, certificate: &Certificate, proofs: &Proofs) -> usize {
    let features = Features::new(instance);
    let mut count = 0;
    for (statement, by) in statements(instance, certificate) {
        match by {
            Evidence::Enumeration(_) => {}
            Evidence::Cycle { cycle } => check_cycle(instance, &statement, cycle),
            Evidence::Clique { clique } => check_clique(instance, &statement, clique),
            Evidence::Proof { proof, precedence } => {
                count += 1;
                let formula = canonical(&features, &statement, precedence);
                let formula: Vec<Vec<i32>> = formula.iter().map(<[i32]>::to_vec).collect();
                let text = std::str::from_utf8(&proofs[proof]).unwrap();
                rup::check(&formula, text).unwrap();
            }
        }
    }
    assert_eq!(count, proofs.len());
    count
}

fn check_cycle(instance: &Instance, statement: &Statement, cycle: &[u32]) {
    assert_eq!(instance.masks(), 2);
    let own = statement.budgets.last().unwrap();
    assert!(own.items.iter().all(|item| item.weight() > own.most));
    let mut odd = false;
    for (i, &a) in cycle.iter().enumerate() {
        let b = cycle[(i + 1) % cycle.len()];
        let edge = [a.min(b), a.max(b)];
        let of_item = |item: &Item| matches!(item, Item::Conflict(u) if u.contains(&edge));
        let differ = statement.resolved.iter().any(|unit| unit.contains(&edge))
            || own.items.iter().any(of_item);
        if differ && instance.feature_of(a) != instance.feature_of(b) {
            odd = !odd;
        } else {
            let agree = |item: &Item| matches!(item, Item::Stitch { ends, .. } if *ends == edge);
            assert!(own.items.iter().any(agree), "{edge:?} is no step");
        }
    }
    assert!(odd);
}

/// All ways to spread the members over the masks, by numbers.
fn fewest_in_clique(members: u64, masks: u8) -> u64 {
    let within = |n: u64| n * n.saturating_sub(1) / 2;
    match masks {
        1 => within(members),
        _ => (0..=members)
            .map(|first| within(first) + fewest_in_clique(members - first, masks - 1))
            .min()
            .unwrap(),
    }
}

fn check_clique(instance: &Instance, statement: &Statement, clique: &[u32]) {
    let own = statement.budgets.last().unwrap();
    for (i, &a) in clique.iter().enumerate() {
        for &b in &clique[..i] {
            let edge = [a.min(b), a.max(b)];
            let joins = |item: &Item| matches!(item, Item::Conflict(u) if u.contains(&edge));
            assert!(
                own.items.iter().any(joins) && instance.feature_of(a) != instance.feature_of(b)
            );
        }
    }
    assert!(fewest_in_clique(clique.len() as u64, instance.masks()) > own.most);
}

#[test]
fn bounds_of_random_instances_hold_and_add_up() {
    let choices = [
        (Reductions::ALL, Choice::Auto),
        (Reductions::NONE, Choice::CoreGuided(Scale::TINY)),
        (Reductions::ALL, Choice::CoreGuided(Scale::USUAL)),
        (Reductions::NONE, Choice::Enumeration),
    ];
    let (mut proven, mut stitched) = (0, 0);
    for masks in 2..=5 {
        for seed in 0..4000 {
            let instance = random::instance(masks, seed);
            let (reductions, choice) = choices[seed as usize % choices.len()];
            let effort = if seed % 3 == 0 {
                PROOFS_ONLY
            } else {
                Effort::USUAL
            };
            let stop = Stop::default();
            let (certified, proofs) = certify(&instance, reductions, choice, effort, &stop);
            let certificate = &certified.certificate;
            let (conflicts, stitches) = (certificate.conflicts, certificate.stitches);
            let expected = least(&instance);
            let lower = (conflicts.lower, stitches.lower);
            assert_eq!(lower, expected, "masks {masks}, seed {seed}");
            assert_eq!((conflicts.upper, stitches.upper), expected);
            let limits = certificate.conflict_bounds.iter().map(|bound| bound.limit);
            assert_eq!(limits.sum::<u64>(), lower.0);
            let limits = certificate.stitch_bounds.iter().map(|bound| bound.limit);
            assert_eq!(limits.sum::<u64>(), lower.1);
            let pieces = certified.pieces.iter();
            let sums = pieces.fold((0, 0), |sum, own| (sum.0 + own[0], sum.1 + own[1]));
            assert_eq!(sums, lower);
            check_bounds(&instance, certificate);
            proven += check_evidence(&instance, certificate, &proofs);
            stitched += certificate.stitch_bounds.len();
        }
    }
    assert!(
        proven > 300 && stitched > 300,
        "{proven} proofs, {stitched} stitch bounds"
    );
}

/// The statement of some units and stitches of an instance, some resolved, some in a budget.
fn some_statement(instance: &Instance, seed: u64) -> Statement {
    let bits = |i: u64| {
        (seed + 1)
            .wrapping_mul(0x9e37_79b9_7f4a_7c15)
            .rotate_left(i as u32 * 7 % 64)
    };
    let features = Features::new(instance);
    let mut units: Vec<Unit> = (0..instance.unit_count() as u32)
        .map(|unit| conflicts::unit(&features, unit))
        .collect();
    for (i, unit) in (0..).zip(&mut units) {
        // Only some of its edges.
        let kept = unit.len().min(1 + bits(i) as usize % 3);
        unit.truncate(kept);
    }
    let mut parts: [Vec<Unit>; 3] = Default::default();
    for (i, unit) in (20..).zip(units) {
        parts[bits(i) as usize % 3].push(unit);
    }
    let [resolved, met, own] = parts;
    let budget = |items: Vec<Item>, most| Budget { items, most };
    let conflicts = |units: Vec<Unit>| units.into_iter().map(Item::Conflict).collect();
    let stitches = instance.stitches().iter().map(|stitch| Item::Stitch {
        ends: [stitch.a, stitch.b],
        weight: u64::from(stitch.weight),
    });
    let last = if seed.is_multiple_of(2) {
        budget(stitches.collect(), bits(50) % 4)
    } else {
        budget(conflicts(own), bits(50) % 3)
    };
    Statement {
        resolved: if seed.is_multiple_of(5) {
            Vec::new()
        } else {
            resolved
        },
        budgets: vec![budget(conflicts(met), 1 + bits(51) % 2), last],
        // With all fragments, all ties count.
        with: (0..instance.fragment_count() as u32).collect(),
    }
}

fn is_true(instance: &Instance, statement: &Statement, colours: &[Mask]) -> bool {
    let is_over = |item: &&Item| match item {
        Item::Conflict(unit) => is_violated(instance, unit, colours),
        Item::Stitch { ends: [a, b], .. } => colours[*a as usize] != colours[*b as usize],
    };
    let keeps = |budget: &Budget| {
        let paid: u64 = budget.items.iter().filter(is_over).map(Item::weight).sum();
        paid <= budget.most
    };
    keeps_ties(instance, colours)
        && violated(instance, &statement.resolved, colours) == 0
        && statement.budgets.iter().all(keeps)
}

#[test]
fn formulas_have_models_exactly_where_statements_can_be_true() {
    let mut answers = [0; 2];
    for masks in 2..=5 {
        for seed in 0..4000 {
            let instance = random::instance(masks, seed);
            let features = Features::new(&instance);
            let statement = some_statement(&instance, seed);
            let fragments = statement.fragments(&features);
            let precedence = certify::precedence::choose(&features, &fragments, &statement);
            let mut expected = false;
            each_colouring(&instance, |c| expected |= is_true(&instance, &statement, c));
            answers[usize::from(expected)] += 1;
            for listed in [&[][..], &precedence] {
                let lists = canonical(&features, &statement, listed);
                let mut formula = Formula::default();
                for clause in lists.iter() {
                    let most = clause
                        .iter()
                        .map(|lit| lit.unsigned_abs())
                        .max()
                        .unwrap_or(0);
                    formula.variables = formula.variables.max(most);
                    let lits = clause.iter().map(|&lit| Lit::from_dimacs(lit).unwrap());
                    formula.clauses.push(lits.collect());
                }
                let found = dpll::satisfiable(&formula, &[]);
                assert_eq!(found, expected, "masks {masks}, seed {seed}: {statement:?}");
            }
            let refuted = certify::enumeration::refutes(&features, &fragments, &statement);
            assert_eq!(
                refuted, !expected,
                "enumeration: masks {masks}, seed {seed}"
            );
        }
    }
    assert!(answers.into_iter().all(|count| count > 1500), "{answers:?}");
}

/// Chromatic numbers: Mycielski's construction adds one to that of its graph; Kneser's graph K(n, k) has n - 2k + 2
/// (Lovasz 1978); Chvatal's graph and Moser's spindle have 4; odd wheels 4. With one mask less there is a conflict.
#[test]
fn published_graphs_are_certified_by_proofs() {
    let graphs = [
        (graphs::myciel(3), 4),
        (graphs::myciel(4), 5),
        (graphs::kneser(5, 2), 3),
        (graphs::kneser(6, 2), 4),
        (graphs::chvatal(), 4),
        (graphs::moser_spindle(), 4),
        (graphs::wheel(7), 4),
    ];
    let mut proofs_in_all = 0;
    for (graph, chromatic) in graphs {
        for masks in 2..=chromatic {
            let instance = graph.instance(masks);
            let (certificate, proofs) = usual(&instance, PROOFS_ONLY);
            assert!(certificate.conflicts.is_tight());
            assert_eq!(certificate.conflicts.lower == 0, masks == chromatic);
            proofs_in_all += check_evidence(&instance, &certificate, &proofs);
        }
    }
    assert!(proofs_in_all > 10);
}

fn wires(name: &str) -> Instance {
    let path = format!("{}/tests/data/{name}.json", env!("CARGO_MANIFEST_DIR"));
    let bytes = std::fs::read(path).unwrap();
    maskproof::formats::instance_json::read(&bytes[..], name, None).unwrap()
}

/// Least costs by RC2 over CaDiCaL: `tests/wires.rs`.
#[test]
fn wires_are_certified_with_the_same_bytes_on_one_thread_and_three() {
    for (name, least) in [("wires_s", (118, 13)), ("wires_m2", (451, 52))] {
        let instance = wires(name);
        let run = |threads: usize| {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build();
            pool.unwrap().install(|| usual(&instance, Effort::USUAL))
        };
        let (certificate, proofs) = run(1);
        let text = |certificate: &Certificate| {
            let mut out = Vec::new();
            write::write(certificate, &mut out).unwrap();
            out
        };
        let (other, other_proofs) = run(3);
        assert!(
            text(&certificate) == text(&other) && proofs == other_proofs,
            "{name}"
        );
        let found = (certificate.conflicts.lower, certificate.stitches.lower);
        assert_eq!(found, least, "{name}");
        assert!(check_evidence(&instance, &certificate, &proofs) > 0);
    }
}

#[test]
fn what_cannot_be_proven_is_not_claimed() {
    let none = Effort {
        colourings: 0,
        refutation: refutation::Effort { most: 0, sure: 0 },
    };
    let instance = graphs::myciel(4).instance(4);
    // A million colourings may be tried all the same, but these are more.
    let (certificate, proofs) = usual(&instance, none);
    assert_eq!(
        (certificate.conflicts.lower, certificate.conflicts.upper),
        (0, 1)
    );
    assert!(certificate.conflict_bounds.is_empty() && certificate.stitch_bounds.is_empty());
    assert!(proofs.is_empty());
}

/// The stop sign ends what is dear only.
#[test]
fn what_is_easy_is_proven_after_the_stop() {
    let limits = Limits {
        cancel: Arc::new(AtomicBool::new(false)),
        ..Limits::default()
    };
    let stop = limits.for_run();
    limits.cancel.store(true, Ordering::SeqCst);
    for seed in 0..200 {
        let instance = random::instance(3, seed);
        let usual = (Reductions::ALL, Choice::Auto);
        let (certified, proofs) = certify(&instance, usual.0, usual.1, PROOFS_ONLY, &stop);
        let certificate = certified.certificate;
        let lower = (certificate.conflicts.lower, certificate.stitches.lower);
        assert_eq!(lower, least(&instance));
        check_evidence(&instance, &certificate, &proofs);
    }
}

/// A refutation of a pigeonhole formula that the solver needs to search for.
#[test]
fn trimmed_proofs_are_shorter_and_hold() {
    let (pigeons, holes) = (7, 6);
    let var = |pigeon: i32, hole: i32| pigeon * holes + hole + 1;
    let mut formula = Lists::default();
    for pigeon in 0..pigeons {
        formula.push((0..holes).map(|hole| var(pigeon, hole)));
    }
    for hole in 0..holes {
        for a in 0..pigeons {
            for b in a + 1..pigeons {
                formula.push([-var(a, hole), -var(b, hole)]);
            }
        }
    }
    let refuted = refutation::refute(&formula, refutation::Effort::USUAL, &Stop::default());
    let refutation::Refutation::Proof(steps) = refuted else {
        panic!("no refutation");
    };
    let trimmed = certify::lrat::trim(&formula, &steps).unwrap();
    assert!(trimmed.clauses.len() < steps.clauses.len());
    let clauses: Vec<Vec<i32>> = formula.iter().map(<[i32]>::to_vec).collect();
    for steps in [&steps, &trimmed] {
        let mut text = Vec::new();
        certify::lrat::write(formula.len(), steps, &mut text).unwrap();
        let text = String::from_utf8(text).unwrap();
        if std::ptr::eq(steps, &trimmed) {
            rup::check(&clauses, &text).unwrap();
        }
    }
    // A step whose hints do not do is found out.
    let mut broken = steps.clone();
    broken.hints = Lists::default();
    for hints in steps.hints.iter() {
        broken.hints.push(hints.iter().skip(1).copied());
    }
    assert!(certify::lrat::trim(&formula, &broken).is_err());
}
