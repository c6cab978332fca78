//! Refutations with hints: varisat solves a formula while its own checker watches, and the checker's
//! events become a proof.
//!
//! Clauses of the formula are numbered from 1 in the order in which they were given, whatever varisat makes
//! of them (duplicates and tautologies keep their numbers), and derived clauses from there on. varisat's
//! ready-made LRAT writer numbers otherwise: where unsatisfiability shows while clauses are loaded (`1; 2 3;
//! -1; 4 5; -4 5`), it stops counting and gives a number of the formula's to a derived clause.
//!
//! The effort is limited in numbers recorded (literals and hints), which are the same on every run, and
//! by the stop sign once a little effort was spent: a processor that fails stops the solver.

use std::mem::take;

use varisat::checker::{CheckedProofStep, CheckerData, ProofProcessor};
use varisat::{ExtendFormula, Solver};

use super::limits::Stop;

/// How much work a refutation may be, in numbers recorded.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Effort {
    /// Never more than this.
    pub most: usize,
    /// The stop sign is looked at after this only: what is easily shown is shown even then.
    pub sure: usize,
}

impl Effort {
    /// About ten seconds, and some hundredths of a second.
    pub const USUAL: Effort = Effort {
        most: 1 << 25,
        sure: 1 << 17,
    };
}

/// How a refutation ended.
#[derive(Debug)]
pub enum Refutation {
    /// The formula has no model.
    Proof(Steps),
    /// It has one.
    Satisfiable,
    /// The effort was spent or the stop sign went up.
    Stopped,
}

/// Lists of numbers, one after the other.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Lists {
    ends: Vec<usize>,
    items: Vec<i32>,
}

impl Lists {
    /// Adds a list.
    pub fn push(&mut self, items: impl IntoIterator<Item = i32>) {
        self.items.extend(items);
        self.ends.push(self.items.len());
    }

    /// How many lists there are.
    pub fn len(&self) -> usize {
        self.ends.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.ends.is_empty()
    }

    /// How many numbers there are in all.
    pub fn number_count(&self) -> usize {
        self.items.len()
    }

    /// One list; an empty one beyond the last.
    pub fn get(&self, at: usize) -> &[i32] {
        let Some(&end) = self.ends.get(at) else {
            return &[];
        };
        let start = at.checked_sub(1).map_or(0, |before| self.ends[before]);
        &self.items[start..end]
    }

    /// All lists in order.
    pub fn iter(&self) -> impl Iterator<Item = &[i32]> {
        (0..self.len()).map(|at| self.get(at))
    }
}

/// A refutation, ending with the empty clause: derived clauses in order, each with its hints.
///
/// The formula's N clauses are numbered from 1; derived clause i (from 0) has the number N + 1 + i.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Steps {
    /// The literals of each derived clause, in DIMACS numbers.
    pub clauses: Lists,
    /// The numbers of the clauses that propagate, in order; the last one is falsified.
    pub hints: Lists,
}

/// Refutes the conjunction of `clauses` (DIMACS numbers).
pub fn refute(clauses: &Lists, effort: Effort, stop: &Stop) -> Refutation {
    let mut recorder = Recorder::new(clauses.len(), effort, stop);
    if let Some(empty) = clauses.iter().position(<[i32]>::is_empty) {
        // Nothing is left to derive, but a proof ends with an empty clause of its own.
        recorder.derive(&[], &[empty as i32 + 1]);
        return Refutation::Proof(recorder.steps);
    }
    let answer = {
        let mut solver = Solver::new();
        solver.add_proof_processor(&mut recorder);
        let mut literals = Vec::new();
        for clause in clauses.iter() {
            literals.clear();
            let lits = clause.iter().map(|&lit| lit as isize);
            literals.extend(lits.map(varisat::Lit::from_dimacs));
            solver.add_clause(&literals);
        }
        solver.solve()
    };
    match answer {
        Ok(true) => Refutation::Satisfiable,
        Ok(false) if recorder.done => Refutation::Proof(take(&mut recorder.steps)),
        _ => Refutation::Stopped,
    }
}

/// Turns the checker's events into steps.
struct Recorder<'a> {
    /// How many clauses the formula has.
    given: usize,
    /// How many of them have come by.
    arrived: usize,
    /// Our number of each of the checker's.
    number: Vec<i32>,
    steps: Steps,
    /// The empty clause is derived.
    done: bool,
    effort: Effort,
    stop: &'a Stop,
    buffer: (Vec<i32>, Vec<i32>),
}

impl<'a> Recorder<'a> {
    fn new(given: usize, effort: Effort, stop: &'a Stop) -> Recorder<'a> {
        Recorder {
            given,
            arrived: 0,
            number: Vec::new(),
            steps: Steps::default(),
            done: false,
            effort,
            stop,
            buffer: Default::default(),
        }
    }

    /// Notes that the checker calls a clause `id`, and we `number`.
    fn name(&mut self, id: u64, number: usize) {
        let id = id as usize;
        if self.number.len() <= id {
            self.number.resize(id + 1, 0);
        }
        self.number[id] = number as i32;
    }

    fn arrive(&mut self, id: u64) {
        self.arrived += 1;
        self.name(id, self.arrived);
    }

    fn derive(&mut self, clause: &[i32], hints: &[i32]) {
        self.steps.clauses.push(clause.iter().copied());
        self.steps.hints.push(hints.iter().copied());
        self.done |= clause.is_empty();
    }

    fn spent(&self) -> usize {
        self.steps.clauses.number_count() + self.steps.hints.number_count()
    }

    fn must_stop(&self) -> bool {
        let spent = self.spent();
        spent > self.effort.most || spent > self.effort.sure && self.stop.now()
    }
}

impl ProofProcessor for Recorder<'_> {
    fn process_step(
        &mut self,
        step: &CheckedProofStep,
        data: CheckerData,
    ) -> Result<(), anyhow::Error> {
        match *step {
            CheckedProofStep::AddClause { id, .. }
            | CheckedProofStep::DuplicatedClause { id, .. }
            | CheckedProofStep::TautologicalClause { id, .. } => self.arrive(id),
            CheckedProofStep::AtClause {
                id,
                clause,
                propagations,
                ..
            } if !self.done => {
                let (mut literals, mut hints) = take(&mut self.buffer);
                literals.clear();
                for lit in clause {
                    let Some(user) = data.user_from_proof_var(lit.var()) else {
                        anyhow::bail!("a derived clause has a variable of the solver's own");
                    };
                    literals.push(user.lit(lit.is_positive()).to_dimacs() as i32);
                }
                hints.clear();
                for &hint in propagations {
                    match self.number.get(hint as usize) {
                        Some(&number) if number > 0 => hints.push(number),
                        _ => anyhow::bail!("a hint names no clause"),
                    }
                }
                self.derive(&literals, &hints);
                self.name(id, self.given + self.steps.clauses.len());
                self.buffer = (literals, hints);
            }
            // Deletions need not be followed: what is not deleted may stay. A clause made irredundant
            // keeps its number.
            _ => {}
        }
        if self.must_stop() {
            anyhow::bail!("the effort is spent");
        }
        Ok(())
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    fn lists(clauses: &[&[i32]]) -> Lists {
        let mut lists = Lists::default();
        for clause in clauses {
            lists.push(clause.iter().copied());
        }
        lists
    }

    fn steps(clauses: &[&[i32]]) -> Steps {
        match refute(&lists(clauses), Effort::USUAL, &Stop::default()) {
            Refutation::Proof(steps) => steps,
            other => panic!("{clauses:?}: {other:?}"),
        }
    }

    /// The units 1 and 3 contradict one another before clauses 4 and 5 are there.
    #[test]
    fn clauses_that_come_after_the_contradiction_keep_their_numbers() {
        let steps = steps(&[&[1], &[2, 3], &[-1], &[4, 5], &[-4, 5]]);
        assert_eq!(steps.clauses, lists(&[&[]]));
        assert_eq!(steps.hints, lists(&[&[1, 3]]));
    }

    #[test]
    fn an_empty_clause_of_the_formula_is_its_own_reason() {
        let steps = steps(&[&[1, 2], &[], &[3]]);
        assert_eq!(
            (steps.clauses, steps.hints),
            (lists(&[&[]]), lists(&[&[2]]))
        );
    }

    #[test]
    fn limits_stop_and_models_are_no_refutations() {
        let formula = lists(&[&[1, 2], &[-1, 2], &[1, -2], &[-1, -2]]);
        let none = Effort { most: 0, sure: 0 };
        let stopped = refute(&formula, none, &Stop::default());
        assert!(matches!(stopped, Refutation::Stopped));
        let satisfiable = refute(&lists(&[&[1, 2]]), Effort::USUAL, &Stop::default());
        assert!(matches!(satisfiable, Refutation::Satisfiable));
    }
}
