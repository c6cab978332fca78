//! Trimming a refutation, and its text in LRAT.
//!
//! Backwards from the empty clause only what is reached through hints stays (Goldberg and Novikov,
//! "Verification of proofs of unsatisfiability for CNF formulas", DATE 2003). Where we differ: each step that is
//! reached is replayed, and of its hints only those stay whose literals take part in the contradiction; so
//! the replay is a check as well, and a step that does not hold ends trimming.

use std::io::{self, Write};

use crate::solve::refutation::{Lists, Steps};

/// A step that does not follow from its hints: an error of this program or of the solver.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Unsound;

/// Keeps of a refutation of `formula` what its empty clause needs, numbered anew.
///
/// # Errors
/// A step that does not hold, or no empty clause.
pub fn trim(formula: &Lists, steps: &Steps) -> Result<Steps, Unsound> {
    let empty = (0..steps.clauses.len()).find(|&i| steps.clauses.get(i).is_empty());
    let last = empty.ok_or(Unsound)?;
    let mut replay = Replay::new(formula, steps);
    let mut used: Vec<Option<Vec<i32>>> = vec![None; last + 1];
    let mut needed = vec![false; last + 1];
    needed[last] = true;
    for step in (0..=last).rev().filter(|&step| step <= last) {
        if !needed[step] {
            continue;
        }
        let hints = replay.hints(step)?;
        for &hint in &hints {
            if let Some(derived) = derived(formula, hint) {
                *needed.get_mut(derived).ok_or(Unsound)? = true;
            }
        }
        used[step] = Some(hints);
    }
    Ok(renumber(formula, steps, used))
}

/// The step behind a clause number, if it is not of the formula.
fn derived(formula: &Lists, number: i32) -> Option<usize> {
    (number as usize).checked_sub(formula.len() + 1)
}

fn renumber(formula: &Lists, steps: &Steps, used: Vec<Option<Vec<i32>>>) -> Steps {
    let mut number = vec![0; used.len()];
    let mut trimmed = Steps::default();
    for (step, hints) in used.into_iter().enumerate() {
        let Some(hints) = hints else { continue };
        trimmed
            .clauses
            .push(steps.clauses.get(step).iter().copied());
        trimmed.hints.push(
            hints
                .into_iter()
                .map(|hint| derived(formula, hint).map_or(hint, |before| number[before])),
        );
        number[step] = (formula.len() + trimmed.clauses.len()) as i32;
    }
    trimmed
}

/// Replays steps by their hints.
struct Replay<'a> {
    formula: &'a Lists,
    steps: &'a Steps,
    /// By variable: the place in `reasons` of the hint that set it, or of the step itself, and its value.
    value: Vec<Option<(bool, usize)>>,
    set: Vec<i32>,
}

/// In the place of a hint: the literal is one of the step's own.
const OWN: usize = usize::MAX;

impl<'a> Replay<'a> {
    fn new(formula: &'a Lists, steps: &'a Steps) -> Replay<'a> {
        let clauses = formula.iter().chain(steps.clauses.iter());
        let most = clauses.flatten().map(|lit| lit.unsigned_abs()).max();
        Replay {
            formula,
            steps,
            value: vec![None; most.unwrap_or(0) as usize + 1],
            set: Vec::new(),
        }
    }

    fn clause(&self, number: i32) -> &'a [i32] {
        match derived(self.formula, number) {
            Some(step) => self.steps.clauses.get(step),
            None => self.formula.get(number as usize - 1),
        }
    }

    fn is_false(&self, lit: i32) -> Option<usize> {
        let (value, place) = self.value[lit.unsigned_abs() as usize]?;
        (value != (lit > 0)).then_some(place)
    }

    fn make_true(&mut self, lit: i32, place: usize) {
        self.value[lit.unsigned_abs() as usize] = Some((lit > 0, place));
        self.set.push(lit);
    }

    /// The hints of a step that its contradiction needs, in order.
    fn hints(&mut self, step: usize) -> Result<Vec<i32>, Unsound> {
        let steps = self.steps;
        let (clause, hints) = (steps.clauses.get(step), steps.hints.get(step));
        let found = self.contradiction(step, clause, hints);
        for lit in std::mem::take(&mut self.set) {
            self.value[lit.unsigned_abs() as usize] = None;
        }
        found
    }

    fn contradiction(
        &mut self,
        step: usize,
        clause: &[i32],
        hints: &[i32],
    ) -> Result<Vec<i32>, Unsound> {
        for &lit in clause {
            if self.is_false(lit).is_none() {
                self.make_true(-lit, OWN);
            }
        }
        for (place, &hint) in hints.iter().enumerate() {
            if derived(self.formula, hint).is_some_and(|before| before >= step) {
                return Err(Unsound);
            }
            let mut open = self
                .clause(hint)
                .iter()
                .filter(|&&l| self.is_false(l).is_none());
            match (open.next(), open.next()) {
                (None, _) => return Ok(self.analyse(place, hints)),
                (Some(&lit), None) if self.value[lit.unsigned_abs() as usize].is_none() => {
                    self.make_true(lit, place);
                }
                // True already, or not unit: the hint gives nothing.
                _ => {}
            }
        }
        Err(Unsound)
    }

    /// The hints behind the contradiction in the hint at `last`.
    fn analyse(&self, last: usize, hints: &[i32]) -> Vec<i32> {
        let mut kept = vec![false; last + 1];
        kept[last] = true;
        for place in (0..=last).rev() {
            if kept[place] {
                for &lit in self.clause(hints[place]) {
                    if let Some(before) = self.is_false(lit).filter(|&before| before != OWN) {
                        kept[before] = true;
                    }
                }
            }
        }
        let places = (0..=last).filter(|&place| kept[place]);
        places.map(|place| hints[place]).collect()
    }
}

/// Writes a refutation of a formula of `given` clauses.
///
/// # Errors
/// Those of the writer.
pub fn write(given: usize, steps: &Steps, out: &mut dyn Write) -> io::Result<()> {
    for (i, (clause, hints)) in steps.clauses.iter().zip(steps.hints.iter()).enumerate() {
        write!(out, "{}", given + 1 + i)?;
        for list in [clause, hints] {
            for number in list {
                write!(out, " {number}")?;
            }
            out.write_all(b" 0")?;
        }
        out.write_all(b"\n")?;
    }
    Ok(())
}
