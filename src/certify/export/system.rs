//! The refutation of one bound within the whole problem: clauses of the problem, counters, and steps.
//!
//! Masks are not renamed here: that is sound for one bound alone, and not for several that share fragments.
//! Variables are numbered anew from 1, since a solver does not like large numbers.

use rustc_hash::FxHashMap;

use super::bounds::Bound;
use super::counter::{Builder, Counter, Step, Weighed};
use super::opb::Problem;
use super::{EFFORT, ExportError};
use crate::certify::lrat;
use crate::solve::Stop;
use crate::solve::refutation::{self, Lists, Steps};

/// Why a clause holds.
pub enum Reason {
    /// It is one of the problem's, or follows from it at once.
    Given(u64),
    /// A unit of conflict that is resolved, by its price in the problem.
    Resolved(i32),
    /// An item that the bound's own budget cannot pay.
    Unaffordable,
    /// A clause of a counter.
    Counted(usize, Step),
}

/// The refutation of a bound.
pub struct Refutation {
    /// The names of its variables.
    pub names: Vec<String>,
    /// The prices of the bound's own budget, with their weights.
    pub own: Vec<Weighed>,
    /// The clauses that are not derived, in the order of the numbering.
    pub clauses: Lists,
    /// Why each holds.
    pub reasons: Vec<Reason>,
    /// The counters.
    pub counters: Vec<Counter>,
    /// The prices of each budget of the statement.
    pub budgets: Vec<Vec<i32>>,
    /// The steps.
    pub steps: Steps,
}

struct Maker<'a> {
    problem: &'a Problem<'a>,
    prefix: String,
    names: Vec<String>,
    own_number: FxHashMap<i32, i32>,
    clauses: Lists,
    reasons: Vec<Reason>,
    counters: Vec<Counter>,
}

impl Maker<'_> {
    /// The own number of a variable of the problem.
    fn own(&mut self, variable: i32) -> i32 {
        let next = self.names.len() as i32 + 1;
        let number = *self.own_number.entry(variable).or_insert(next);
        if number == next {
            self.names.push(self.problem.name(variable).to_owned());
        }
        number
    }

    fn clause(&mut self, literals: &[i32], reason: Reason) {
        let own: Vec<i32> = literals
            .iter()
            .map(|&literal| self.own(literal.abs()) * literal.signum())
            .collect();
        self.clauses.push(own);
        self.reasons.push(reason);
    }

    fn fragment(&mut self, fragment: u32) {
        let [some, one] = Problem::one_mask(fragment);
        let masks: Vec<i32> = self.problem.masks_of(fragment).collect();
        self.clause(&masks, Reason::Given(some));
        for (i, &a) in masks.iter().enumerate() {
            for &b in &masks[i + 1..] {
                self.clause(&[-a, -b], Reason::Given(one));
            }
        }
    }

    /// The clauses of some edges of a unit or of a stitch; returns its price in the problem.
    fn item(&mut self, edges: &[[u32; 2]]) -> i32 {
        let problem = self.problem;
        for &edge in edges {
            for (number, clause) in problem.clauses_of(edge) {
                self.clause(clause, Reason::Given(number));
            }
        }
        problem.price(edges)
    }

    fn counter(&mut self, budget: usize, items: Vec<Weighed>, most: u64) {
        let (prefix, names) = (&self.prefix, &mut self.names);
        let mut fresh = || {
            let number = names.len() as i32 + 1;
            names.push(format!("t{prefix}_{number}"));
            number
        };
        let all = 0..items.len();
        let mut builder = Builder {
            counter: Counter {
                budget,
                items,
                nodes: Vec::new(),
            },
            steps: Vec::new(),
            most,
            fresh: &mut fresh,
        };
        builder.build(all);
        let Builder { counter, steps, .. } = builder;
        for step in steps {
            self.clauses.push(step.literals());
            self.reasons
                .push(Reason::Counted(self.counters.len(), step));
        }
        self.counters.push(counter);
    }
}

/// Refutes a bound. `prefix` makes the names of its counters its own.
///
/// # Errors
/// No refutation was found.
pub fn refute(
    problem: &Problem<'_>,
    bound: &Bound<'_>,
    prefix: String,
) -> Result<Refutation, ExportError> {
    let mut maker = Maker {
        problem,
        prefix,
        names: Vec::new(),
        own_number: FxHashMap::default(),
        clauses: Lists::default(),
        reasons: Vec::new(),
        counters: Vec::new(),
    };
    for &fragment in &bound.fragments {
        maker.fragment(fragment);
    }
    for unit in &bound.statement.resolved {
        let price = maker.item(unit);
        maker.clause(&[-price], Reason::Resolved(price));
    }
    let (mut own, mut budgets) = (Vec::new(), Vec::new());
    for (i, budget) in bound.statement.budgets.iter().enumerate() {
        let mut affordable = Vec::new();
        own.clear();
        for item in &budget.items {
            let price = maker.item(item.edges());
            let weighed = (maker.own(price), item.weight());
            own.push(weighed);
            if item.weight() <= budget.most {
                affordable.push(weighed);
            } else {
                maker.clause(&[-price], Reason::Unaffordable);
            }
        }
        budgets.push(own.iter().map(|&(price, _)| price).collect());
        if affordable.iter().map(|&(_, weight)| weight).sum::<u64>() > budget.most {
            maker.counter(i, affordable, budget.most);
        }
    }
    let steps = match refutation::refute(&maker.clauses, EFFORT, &Stop::default()) {
        refutation::Refutation::Proof(steps) => lrat::trim(&maker.clauses, &steps).ok(),
        refutation::Refutation::Satisfiable | refutation::Refutation::Stopped => None,
    };
    let steps = steps.ok_or_else(|| ExportError::NotRefuted(bound.name.clone()))?;
    Ok(Refutation {
        names: maker.names,
        own,
        clauses: maker.clauses,
        reasons: maker.reasons,
        counters: maker.counters,
        budgets,
        steps,
    })
}
