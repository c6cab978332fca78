//! Plain 0-1 enumeration of an [`AssignmentModel`]: depth first over the variables; a row that cannot
//! be met any more ends a branch, a row with one way left to be met fixes its variables, and a branch
//! whose objective is no better than the best point found ends too.

use encodings::assignment_ilp::{AssignmentModel, Row, Sense};

/// The two objectives, compared lexicographically.
pub type Value = (i64, i64);

/// A point and its value.
pub type Optimum = (Value, Vec<bool>);

struct Search<'a> {
    model: &'a AssignmentModel,
    rows_of: Vec<Vec<usize>>,
    in_objective: Vec<bool>,
    value: Vec<Option<bool>>,
    trail: Vec<usize>,
    best: Option<Optimum>,
}

fn row_holds(row: &Row, point: &[bool]) -> bool {
    let sum: i64 = row
        .terms
        .iter()
        .filter(|&&(variable, _)| point[variable as usize])
        .map(|&(_, coefficient)| coefficient)
        .sum();
    match row.sense {
        Sense::AtLeast => sum >= row.right,
        Sense::Equal => sum == row.right,
    }
}

/// Whether the point meets every row.
pub fn feasible(model: &AssignmentModel, point: &[bool]) -> bool {
    point.len() == model.variables as usize && model.rows.iter().all(|row| row_holds(row, point))
}

impl Search<'_> {
    /// The objectives of the variables set so far: a lower limit, as no coefficient is negative.
    fn objective(&self) -> Value {
        let sum = |terms: &[(u32, i64)]| {
            terms
                .iter()
                .filter(|&&(variable, _)| self.value[variable as usize] == Some(true))
                .map(|&(_, coefficient)| coefficient)
                .sum()
        };
        (sum(&self.model.conflicts), sum(&self.model.stitches))
    }

    fn set(&mut self, variable: usize, value: bool) {
        self.value[variable] = Some(value);
        self.trail.push(variable);
    }

    fn undo(&mut self, length: usize) {
        for variable in self.trail.drain(length..) {
            self.value[variable] = None;
        }
    }

    /// Sets what "`sign` x row >= `sign` x right" forces; false where it cannot be met.
    fn force(&mut self, row: &Row, sign: i64) -> bool {
        let most: i64 = row
            .terms
            .iter()
            .map(|&(variable, c)| match self.value[variable as usize] {
                Some(true) => sign * c,
                Some(false) => 0,
                None => (sign * c).max(0),
            })
            .sum();
        let slack = most - sign * row.right;
        for &(variable, c) in &row.terms {
            let variable = variable as usize;
            if slack >= 0 && self.value[variable].is_none() && c.abs() > slack {
                self.set(variable, sign * c > 0);
            }
        }
        slack >= 0
    }

    /// Looks at the rows of the variables set from place `next` of the trail on.
    fn propagate(&mut self, mut next: usize) -> bool {
        let model = self.model;
        while next < self.trail.len() {
            let variable = self.trail[next];
            next += 1;
            for i in 0..self.rows_of[variable].len() {
                let row = &model.rows[self.rows_of[variable][i]];
                if !self.force(row, 1) || row.sense == Sense::Equal && !self.force(row, -1) {
                    return false;
                }
            }
        }
        self.best
            .as_ref()
            .is_none_or(|(best, _)| self.objective() < *best)
    }

    fn search(&mut self) {
        let Some(variable) = self.value.iter().position(Option::is_none) else {
            let point = self.value.iter().map(|&value| value == Some(true));
            self.best = Some((self.objective(), point.collect()));
            return;
        };
        // Cheap points first, so that the bound cuts early.
        let first = !self.in_objective[variable];
        for value in [first, !first] {
            let length = self.trail.len();
            self.set(variable, value);
            if self.propagate(length) {
                self.search();
            }
            self.undo(length);
        }
    }
}

/// The best point in which `fixed` hold; `None` where no point meets every row.
pub fn least(model: &AssignmentModel, fixed: &[(u32, bool)]) -> Option<Optimum> {
    let mut search = Search {
        model,
        rows_of: vec![Vec::new(); model.variables as usize],
        in_objective: vec![false; model.variables as usize],
        value: vec![None; model.variables as usize],
        trail: Vec::new(),
        best: None,
    };
    for (i, row) in model.rows.iter().enumerate() {
        for &(variable, _) in &row.terms {
            search.rows_of[variable as usize].push(i);
        }
        // Rows of one variable fix it from the start.
        if !search.force(row, 1) || row.sense == Sense::Equal && !search.force(row, -1) {
            return None;
        }
    }
    for &(variable, _) in model.conflicts.iter().chain(&model.stitches) {
        search.in_objective[variable as usize] = true;
    }
    for &(variable, value) in fixed {
        match search.value[variable as usize] {
            None => search.set(variable as usize, value),
            Some(set) if set != value => return None,
            Some(_) => {}
        }
    }
    if search.propagate(0) {
        search.search();
    }
    search.best
}
