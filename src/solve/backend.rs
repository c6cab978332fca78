//! The SAT solver behind the search: a small trait, and varisat behind it.
//!
//! varisat has no call to interrupt it. It stops, though, when its proof writer fails: so a writer that
//! keeps nothing and fails once the stop sign is up serves as the interrupt. Such a solver is spent and
//! answers [`Answer::Stopped`] ever after. varisat writes its proof through a buffer of some kilobytes, which
//! its search fills in a few milliseconds.
//!
//! varisat's failed cores can lack members: where an assumption is false at level 0, its analysis of
//! failed assumptions leaves a mark on the variable behind; once the number of that variable is used
//! again, a later analysis stops short (seen with version 0.2.2, in 2 of 50,000 small instances; verdicts were
//! right in all). So a core is a hint here: whoever relies on it has it refuted on its own first, and
//! [`SatBackend::renew`] starts over where it is not.

use std::cell::Cell;
use std::io;
use std::rc::Rc;

use varisat::{ExtendFormula, ProofFormat, Solver};

use encodings::{ClauseSink, Lit, VarAllocator};

use super::limits::Stop;

/// What a call of the solver found.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Answer {
    /// A model exists; ask [`SatBackend::model`].
    Satisfiable,
    /// None exists under the assumptions; these of them may suffice for that.
    Unsatisfiable(Vec<Lit>),
    /// The stop sign went up first.
    Stopped,
}

/// An incremental SAT solver.
pub trait SatBackend: ClauseSink + VarAllocator {
    /// Solves under assumptions.
    fn solve(&mut self, assumptions: &[Lit]) -> Answer;

    /// The last model, after [`Answer::Satisfiable`].
    fn model(&self) -> Model;

    /// Starts over with the same formula and nothing learnt.
    fn renew(&mut self);

    /// How much work was done so far, in bytes of proof: the same on every run, unlike time.
    fn effort(&self) -> u64;
}

/// An assignment of variables.
#[derive(Clone, Debug, Default)]
pub struct Model {
    holds: Vec<bool>,
}

impl Model {
    /// Whether the literal holds.
    pub fn holds(&self, lit: Lit) -> bool {
        let positive = self
            .holds
            .get(lit.variable() as usize)
            .copied()
            .unwrap_or(false);
        positive == lit.is_positive()
    }
}

/// varisat as a backend.
pub struct Varisat {
    solver: Solver<'static>,
    variables: u32,
    /// The clauses, each after its length.
    clauses: Vec<i32>,
    stop: Stop,
    most: u64,
    effort: Rc<Cell<u64>>,
    spent: bool,
}

impl Varisat {
    /// An empty formula.
    pub fn new(stop: &Stop) -> Varisat {
        Varisat::bounded(stop, u64::MAX)
    }

    /// An empty formula, and nothing stops the search but its effort, in bytes of proof.
    pub fn limited(most: u64) -> Varisat {
        Varisat::bounded(&Stop::default(), most)
    }

    /// An empty formula; the stop sign stops the search, and so does its effort, in bytes of proof: at the
    /// same point of every run.
    pub fn bounded(stop: &Stop, most: u64) -> Varisat {
        let effort = Rc::default();
        let solver = interruptible(stop, most, &effort);
        Varisat {
            solver,
            variables: 0,
            clauses: Vec::new(),
            stop: stop.clone(),
            most,
            effort,
            spent: false,
        }
    }
}

fn interruptible(stop: &Stop, most: u64, effort: &Rc<Cell<u64>>) -> Solver<'static> {
    let mut solver = Solver::new();
    let interrupt = Interrupt {
        stop: stop.clone(),
        most,
        effort: Rc::clone(effort),
    };
    solver.write_proof(interrupt, ProofFormat::Varisat);
    solver
}

/// A proof writer that counts instead of keeping, and fails once the stop sign is up.
struct Interrupt {
    stop: Stop,
    most: u64,
    effort: Rc<Cell<u64>>,
}

impl io::Write for Interrupt {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if self.stop.now() || self.effort.get() > self.most {
            return Err(io::Error::other("stopped"));
        }
        self.effort.set(self.effort.get() + bytes.len() as u64);
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

fn to_varisat(lit: Lit) -> varisat::Lit {
    varisat::Lit::from_dimacs(lit.dimacs() as isize)
}

impl ClauseSink for Varisat {
    fn clause(&mut self, literals: &[Lit]) {
        self.clauses.push(literals.len() as i32);
        self.clauses.extend(literals.iter().map(|lit| lit.dimacs()));
        add(&mut self.solver, literals.iter().map(|lit| lit.dimacs()));
    }
}

fn add(solver: &mut Solver<'static>, dimacs: impl Iterator<Item = i32>) {
    let mut few = [varisat::Lit::from_dimacs(1); 8];
    let mut many = Vec::new();
    let mut count = 0;
    for number in dimacs {
        let lit = varisat::Lit::from_dimacs(number as isize);
        match few.get_mut(count) {
            Some(place) => *place = lit,
            None => {
                if many.is_empty() {
                    many.extend(few);
                }
                many.push(lit);
            }
        }
        count += 1;
    }
    solver.add_clause(if many.is_empty() {
        &few[..count]
    } else {
        &many
    });
}

impl VarAllocator for Varisat {
    fn fresh(&mut self) -> Lit {
        let lit = Lit::after(self.variables);
        self.variables += 1;
        lit
    }
}

impl SatBackend for Varisat {
    fn solve(&mut self, assumptions: &[Lit]) -> Answer {
        if self.spent || self.stop.now() {
            return Answer::Stopped;
        }
        let assumptions: Vec<varisat::Lit> =
            assumptions.iter().map(|&lit| to_varisat(lit)).collect();
        self.solver.assume(&assumptions);
        match self.solver.solve() {
            Ok(true) => Answer::Satisfiable,
            Ok(false) => {
                let core = self.solver.failed_core().unwrap_or(&[]);
                let dimacs = |lit: &varisat::Lit| Lit::from_dimacs(lit.to_dimacs() as i32);
                Answer::Unsatisfiable(core.iter().filter_map(dimacs).collect())
            }
            Err(_) => {
                self.spent = true;
                Answer::Stopped
            }
        }
    }

    fn model(&self) -> Model {
        let mut holds = vec![false; self.variables as usize + 1];
        for lit in self.solver.model().unwrap_or_default() {
            if let Some(at) = holds.get_mut(lit.var().to_dimacs() as usize) {
                *at = lit.is_positive();
            }
        }
        Model { holds }
    }

    fn renew(&mut self) {
        self.solver = interruptible(&self.stop, self.most, &self.effort);
        let mut rest = self.clauses.as_slice();
        while let Some((&length, behind)) = rest.split_first() {
            let (clause, behind) = behind.split_at((length as usize).min(behind.len()));
            add(&mut self.solver, clause.iter().copied());
            rest = behind;
        }
    }

    fn effort(&self) -> u64 {
        self.effort.get()
    }
}
