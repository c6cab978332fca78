//! A plain solver of clauses: unit propagation, then a branch (Davis, Logemann and Loveland, "A machine
//! program for theorem-proving", 1962). It learns nothing, watches nothing and is easy to read.

use encodings::literal::{Formula, Lit};

/// The solver of one formula, to be asked any number of times.
pub struct Dpll<'a> {
    clauses: &'a [Vec<Lit>],
    /// By literal: the clauses that it is in.
    places: Vec<Vec<u32>>,
    /// By variable, from 1; place 0 is unused.
    value: Vec<Option<bool>>,
    /// The literals made true, in order.
    trail: Vec<Lit>,
}

/// What a look at one clause shows.
enum Clause {
    Satisfied,
    Falsified,
    /// The first open literal, and whether it is the only one.
    Open(Lit, bool),
}

fn code(lit: Lit) -> usize {
    lit.variable() as usize * 2 + usize::from(lit.is_positive())
}

impl<'a> Dpll<'a> {
    pub fn new(formula: &'a Formula) -> Dpll<'a> {
        let variables = formula.variables as usize + 1;
        let mut places = vec![Vec::new(); variables * 2];
        for (i, clause) in formula.clauses.iter().enumerate() {
            for &lit in clause {
                places[code(lit)].push(i as u32);
            }
        }
        Dpll {
            clauses: &formula.clauses,
            places,
            value: vec![None; variables],
            trail: Vec::new(),
        }
    }

    /// Whether the formula has a model in which `fixed` hold.
    pub fn satisfiable(&mut self, fixed: &[Lit]) -> bool {
        let start = self.start(fixed);
        let yes = start && self.search(0);
        self.undo(0);
        yes
    }

    /// How many models the formula has, over all its variables.
    pub fn models(&mut self) -> u64 {
        let count = if self.start(&[]) { self.count(0) } else { 0 };
        self.undo(0);
        count
    }

    /// Makes `fixed` and the clauses of one literal true, and all that follows.
    fn start(&mut self, fixed: &[Lit]) -> bool {
        let clauses = self.clauses;
        let units = clauses.iter().filter(|clause| clause.len() == 1).flatten();
        !clauses.iter().any(Vec::is_empty)
            && units.chain(fixed).all(|&lit| self.assign(lit))
            && self.propagate(0)
    }

    fn holds(&self, lit: Lit) -> Option<bool> {
        self.value[lit.variable() as usize].map(|value| value == lit.is_positive())
    }

    /// Makes a literal true; false where it is false already.
    fn assign(&mut self, lit: Lit) -> bool {
        if self.holds(lit).is_none() {
            self.value[lit.variable() as usize] = Some(lit.is_positive());
            self.trail.push(lit);
        }
        self.holds(lit) == Some(true)
    }

    fn undo(&mut self, length: usize) {
        for lit in self.trail.drain(length..) {
            self.value[lit.variable() as usize] = None;
        }
    }

    fn look(&self, clause: &[Lit]) -> Clause {
        let mut open = None;
        for &lit in clause {
            match (self.holds(lit), open) {
                (Some(true), _) => return Clause::Satisfied,
                (Some(false), _) => {}
                (None, None) => open = Some((lit, true)),
                (None, Some((first, _))) => open = Some((first, false)),
            }
        }
        open.map_or(Clause::Falsified, |(lit, only)| Clause::Open(lit, only))
    }

    /// Looks at the clauses that the literals made true from place `next` of the trail on have made
    /// shorter; false at a falsified one.
    fn propagate(&mut self, mut next: usize) -> bool {
        let clauses = self.clauses;
        while next < self.trail.len() {
            let shorter = code(!self.trail[next]);
            next += 1;
            for i in 0..self.places[shorter].len() {
                let clause = self.places[shorter][i] as usize;
                match self.look(&clauses[clause]) {
                    Clause::Falsified => return false,
                    Clause::Open(lit, true) => {
                        self.assign(lit);
                    }
                    _ => {}
                }
            }
        }
        true
    }

    /// The first clause from `from` on that is not satisfied, and an open literal of it.
    fn first_open(&self, from: usize) -> Option<(usize, Lit)> {
        (from..self.clauses.len()).find_map(|i| match self.look(&self.clauses[i]) {
            Clause::Open(lit, _) => Some((i, lit)),
            _ => None,
        })
    }

    /// The clauses before `from` are satisfied.
    fn search(&mut self, from: usize) -> bool {
        let Some((from, lit)) = self.first_open(from) else {
            return true;
        };
        [lit, !lit].into_iter().any(|lit| {
            let length = self.trail.len();
            self.assign(lit);
            let yes = self.propagate(length) && self.search(from);
            self.undo(length);
            yes
        })
    }

    fn count(&mut self, from: usize) -> u64 {
        let Some((from, lit)) = self.first_open(from) else {
            return 1 << (self.value.len() - 1 - self.trail.len());
        };
        let mut count = 0;
        for lit in [lit, !lit] {
            let length = self.trail.len();
            self.assign(lit);
            if self.propagate(length) {
                count += self.count(from);
            }
            self.undo(length);
        }
        count
    }
}

/// Whether the formula has a model in which `fixed` hold.
pub fn satisfiable(formula: &Formula, fixed: &[Lit]) -> bool {
    Dpll::new(formula).satisfiable(fixed)
}
