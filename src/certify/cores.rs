//! What a refutation needs: the parts of a statement that cannot all bind, as few as a little work finds.
//!
//! The guarded formula is solved under the assumption that every part binds; the solver names suspects,
//! which are left out one after the other as long as the rest stays refuted (Bakker, Dikker, Tempelman and
//! Wognum, IJCAI 1993). Where we differ: runs of parts are left out of long lists first, the effort is
//! limited in bytes of the solver's proof, and only what was assumed alone and refuted counts
//! ([`crate::solve::backend`] says why).

use rustc_hash::{FxHashMap, FxHashSet};

use encodings::{ClauseSink, Lit};

use super::features::Features;
use super::formula::{Formula, Part, Sink};
use super::precedence;
use super::statement::{Budget, Item, Statement};
use crate::certificate::Unit;
use crate::solve::backend::{Answer, SatBackend, Varisat};

/// What became of the question.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Needed {
    /// These parts cannot all bind.
    Parts(FxHashSet<Part>),
    /// All of them can.
    Satisfiable,
    /// The effort was spent.
    Stopped,
}

/// Leaving out may take this many bytes of proof, or twice what the first refutation took.
const LEAST_EFFORT: u64 = 1 << 16;

/// A list longer than this loses whole runs first.
const LONG: usize = 16;

/// Parts of a statement that cannot all bind, found with at most `most` bytes of proof. Where there is a
/// choice, budgets are left out first, then resolved units in their order.
pub fn needed(features: &Features<'_>, statement: &Statement, most: u64) -> Needed {
    let fragments = statement.fragments(features);
    let listed = precedence::choose(features, &fragments, statement);
    let mut formula = Formula::new(features, &fragments, true, Clauses(Varisat::limited(most)));
    formula.write(statement, &listed);
    if !formula.fits() {
        return Needed::Stopped;
    }
    let guards = std::mem::take(&mut formula.guards);
    let keep = |&(guard, part): &(i32, Part)| Some((!Lit::from_dimacs(guard)?, part));
    let mut guards: Vec<(Lit, Part)> = guards.iter().filter_map(keep).collect();
    guards.sort_by_key(|&(_, part)| dearness(part));
    let mut search = Search {
        solver: formula.into_sink().0,
        refuted: guards.iter().map(|&(lit, _)| lit).collect(),
    };
    match search.run() {
        Answer::Satisfiable => Needed::Satisfiable,
        Answer::Stopped => Needed::Stopped,
        Answer::Unsatisfiable(core) => {
            let part: FxHashMap<Lit, Part> = guards.into_iter().collect();
            Needed::Parts(
                core.iter()
                    .filter_map(|lit| part.get(lit).copied())
                    .collect(),
            )
        }
    }
}

/// What to leave out first: a budget brings all of a bound's fragments along.
fn dearness(part: Part) -> u32 {
    match part {
        Part::Budget(_) => 0,
        Part::Resolved(..) => 1,
        Part::Unpaid(..) => 2,
    }
}

/// The clauses of a formula on their way into a solver.
struct Clauses(Varisat);

impl Sink for Clauses {
    fn clause(&mut self, literals: &[i32]) {
        let lits: Vec<Lit> = literals
            .iter()
            .filter_map(|&l| Lit::from_dimacs(l))
            .collect();
        self.0.clause(&lits);
    }
}

struct Search {
    solver: Varisat,
    /// The last list that was assumed alone and refuted.
    refuted: Vec<Lit>,
}

impl Search {
    /// Refutes all parts, then fewer.
    fn run(&mut self) -> Answer {
        let suspects = match self.solver.solve(&self.refuted) {
            Answer::Unsatisfiable(suspects) => suspects,
            other => return other,
        };
        let until = self.solver.effort() + (2 * self.solver.effort()).max(LEAST_EFFORT);
        let list = self.within(&self.refuted, &suspects);
        self.leave_out(list, until);
        Answer::Unsatisfiable(std::mem::take(&mut self.refuted))
    }

    /// The suspects in the order of a list.
    fn within(&self, list: &[Lit], suspects: &[Lit]) -> Vec<Lit> {
        let suspects: FxHashSet<Lit> = suspects.iter().copied().collect();
        let kept = list.iter().copied();
        kept.filter(|lit| suspects.contains(lit)).collect()
    }

    fn leave_out(&mut self, mut list: Vec<Lit>, until: u64) {
        // The suspects are a hint: they count once they are refuted alone.
        if !self.try_list(&mut list) {
            list = self.refuted.clone();
        }
        let mut run = if list.len() > LONG { list.len() / 4 } else { 1 };
        loop {
            let mut at = 0;
            while at < list.len() {
                if self.solver.effort() > until {
                    return;
                }
                let end = (at + run).min(list.len());
                let mut fewer = list.clone();
                fewer.drain(at..end);
                let before: FxHashSet<Lit> = list[..at].iter().copied().collect();
                if self.try_list(&mut fewer) {
                    at = fewer.iter().filter(|lit| before.contains(lit)).count();
                    list = fewer;
                } else {
                    at = end;
                }
            }
            if run == 1 {
                return;
            }
            run = (run / 4).max(1);
        }
    }

    /// Assumes a list alone; where it is refuted, the suspects among it are tried in its stead.
    fn try_list(&mut self, list: &mut Vec<Lit>) -> bool {
        let mut refuted = false;
        while let Answer::Unsatisfiable(suspects) = self.solver.solve(list) {
            refuted = true;
            self.refuted.clone_from(list);
            let fewer = self.within(list, &suspects);
            if fewer.len() == list.len() {
                return true;
            }
            *list = fewer;
        }
        if refuted {
            list.clone_from(&self.refuted);
        }
        refuted
    }
}

/// The statement of the needed parts only. Where `whole` is set, a unit of which an edge is needed keeps
/// all of them. The last budget is the bound's own: it stays.
pub fn reduced(statement: &Statement, needed: &FxHashSet<Part>, whole: bool) -> Statement {
    let units = (0..).zip(&statement.resolved);
    let resolved = units.filter_map(|(i, unit)| {
        kept_edges(unit, false, |edge| {
            needed.contains(&Part::Resolved(i, edge))
        })
    });
    let own = statement.budgets.len().saturating_sub(1) as u32;
    let budgets = (0..).zip(&statement.budgets);
    let budgets = budgets.filter_map(|(i, budget)| {
        let items = (0..).zip(&budget.items);
        let items = items.filter_map(|(j, item)| {
            kept_item(item, budget.most, whole, |edge| {
                needed.contains(&Part::Unpaid(i, j, edge))
            })
        });
        (i == own || needed.contains(&Part::Budget(i))).then(|| Budget {
            items: items.collect(),
            most: budget.most,
        })
    });
    Statement {
        resolved: resolved.collect(),
        budgets: budgets.collect(),
        with: statement.with.clone(),
    }
}

fn kept_edges(unit: &Unit, whole: bool, needed: impl Fn(u32) -> bool) -> Option<Unit> {
    let edges = (0..).zip(unit);
    let kept: Unit = edges.filter(|&(i, _)| needed(i)).map(|(_, &e)| e).collect();
    match kept.is_empty() {
        true => None,
        false if whole => Some(unit.clone()),
        false => Some(kept),
    }
}

fn kept_item(item: &Item, most: u64, whole: bool, needed: impl Fn(u32) -> bool) -> Option<Item> {
    if item.weight() <= most {
        return Some(item.clone());
    }
    match item {
        Item::Conflict(unit) => kept_edges(unit, whole, needed).map(Item::Conflict),
        Item::Stitch { .. } => needed(0).then(|| item.clone()),
    }
}
