//! Literals, and the two things an encoder needs from its caller: a sink for clauses and a source of
//! fresh variables.

use std::num::NonZeroI32;

/// A literal, numbered as in DIMACS: variable v is v, its negation -v, and variables start at 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Lit(NonZeroI32);

impl Lit {
    /// The literal with this DIMACS number; `None` for 0.
    pub fn from_dimacs(number: i32) -> Option<Lit> {
        NonZeroI32::new(number).map(Lit)
    }

    /// The positive literal of the variable after `count` others.
    pub fn after(count: u32) -> Lit {
        // One more than a count is not zero, and 2^31 variables would need more memory than there is.
        Lit(NonZeroI32::new((count + 1) as i32).unwrap_or(NonZeroI32::MAX))
    }

    /// The DIMACS number.
    pub fn dimacs(self) -> i32 {
        self.0.get()
    }

    /// The variable, from 1.
    pub fn variable(self) -> u32 {
        self.0.get().unsigned_abs()
    }

    /// Whether the literal is a variable, not a negation.
    pub fn is_positive(self) -> bool {
        self.0.get() > 0
    }
}

impl std::ops::Not for Lit {
    type Output = Lit;
    fn not(self) -> Lit {
        Lit(-self.0)
    }
}

/// Takes the clauses of an encoding.
pub trait ClauseSink {
    /// Adds one clause.
    fn clause(&mut self, literals: &[Lit]);
}

/// Gives out variables that nothing else uses.
pub trait VarAllocator {
    /// The positive literal of a fresh variable.
    fn fresh(&mut self) -> Lit;
}

/// A formula in memory: the plainest sink and allocator.
#[derive(Clone, Debug, Default)]
pub struct Formula {
    /// How many variables are in use.
    pub variables: u32,
    /// The clauses in the order of their arrival.
    pub clauses: Vec<Vec<Lit>>,
}

impl ClauseSink for Formula {
    fn clause(&mut self, literals: &[Lit]) {
        self.clauses.push(literals.to_vec());
    }
}

impl VarAllocator for Formula {
    fn fresh(&mut self) -> Lit {
        let lit = Lit::after(self.variables);
        self.variables += 1;
        lit
    }
}

#[cfg(test)]
impl Formula {
    /// Whether some assignment of the variables satisfies every clause, tried one after the other.
    pub(crate) fn satisfiable_with(&self, fixed: &[Lit]) -> bool {
        assert!(
            self.variables <= 24,
            "plain enumeration of {} variables",
            self.variables
        );
        (0..1u32 << self.variables).any(|bits| {
            let holds = |lit: &Lit| (bits >> (lit.variable() - 1) & 1 == 1) == lit.is_positive();
            fixed.iter().all(holds) && self.clauses.iter().all(|clause| clause.iter().any(holds))
        })
    }
}
