//! The SAT solver behind the search: a small trait, and varisat behind it.
//!
//! varisat has no call to interrupt it. It stops, though, when its proof writer fails: so a writer that
//! keeps nothing and fails once the stop sign is up serves as the interrupt. Such a solver is spent and
//! answers [`Answer::Stopped`] ever after. varisat writes its proof through a buffer of some kilobytes, which
//! its search fills in a few milliseconds.

use std::io;

use varisat::{ExtendFormula, ProofFormat, Solver};

use encodings::{ClauseSink, Lit, VarAllocator};

use super::limits::Stop;

/// What a call of the solver found.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Answer {
    /// A model exists; ask [`SatBackend::model`].
    Satisfiable,
    /// None exists under the assumptions; these of them suffice for that.
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
    stop: Stop,
    spent: bool,
}

impl Varisat {
    /// An empty formula.
    pub fn new(stop: &Stop) -> Varisat {
        let mut solver = Solver::new();
        solver.write_proof(Interrupt(stop.clone()), ProofFormat::Varisat);
        Varisat {
            solver,
            variables: 0,
            stop: stop.clone(),
            spent: false,
        }
    }
}

/// A proof writer that keeps nothing and fails once the stop sign is up.
struct Interrupt(Stop);

impl io::Write for Interrupt {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if self.0.now() {
            Err(io::Error::other("stopped"))
        } else {
            Ok(bytes.len())
        }
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
        let mut few = [to_varisat(Lit::after(0)); 8];
        if let Some(few) = few.get_mut(..literals.len()) {
            for (to, &from) in few.iter_mut().zip(literals) {
                *to = to_varisat(from);
            }
            self.solver.add_clause(few);
        } else {
            let many: Vec<varisat::Lit> = literals.iter().map(|&lit| to_varisat(lit)).collect();
            self.solver.add_clause(&many);
        }
    }
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
}
