//! The canonical formula of a bound, built from `certificate/format.md` clause by clause.

use super::statement::{Budget, Item, Statement};
use crate::certificate::{Edge, MOST_LITERALS};

/// Clauses, numbered from 1; literals are numbers of variables, negative where negated.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Formula {
    /// How many variables there are.
    pub variables: i32,
    literals: Vec<i32>,
    ends: Vec<u32>,
    too_large: bool,
}

impl Formula {
    /// The clauses in order.
    pub fn clauses(&self) -> impl ExactSizeIterator<Item = &[i32]> {
        (0..self.ends.len()).map(|i| {
            let start = if i == 0 { 0 } else { self.ends[i - 1] };
            &self.literals[start as usize..self.ends[i] as usize]
        })
    }

    fn fresh(&mut self) -> i32 {
        self.variables += 1;
        self.variables
    }

    /// Adds a clause of the literals that there are.
    fn clause(&mut self, literals: impl IntoIterator<Item = Option<i32>>) {
        // Beyond the limit nothing is kept: the formula is refused anyway.
        self.too_large |= self.literals.len() > MOST_LITERALS;
        if !self.too_large {
            self.literals.extend(literals.into_iter().flatten());
            self.ends.push(self.literals.len() as u32);
        }
    }
}

/// The canonical formula of a bound; `precedence` lists fragments in the bound's own numbers.
///
/// # Errors
/// Precedence where masks are not interchangeable, and formulas beyond [`MOST_LITERALS`].
pub fn canonical(statement: &Statement, precedence: &[u32]) -> Result<Formula, String> {
    let mut builder = Builder {
        formula: Formula::default(),
        masks: statement.masks as usize,
        on: Vec::new(),
    };
    builder.masks(statement)?;
    builder.precedence(statement, precedence)?;
    for item in &statement.tied {
        builder.violated(item, None);
    }
    for budget in &statement.tie_budgets {
        builder.budget(budget);
    }
    for item in &statement.resolved {
        builder.violated(item, None);
    }
    for budget in &statement.budgets {
        builder.budget(budget);
    }
    if builder.formula.too_large || builder.formula.literals.len() > MOST_LITERALS {
        return Err(format!(
            "its formula has more than {MOST_LITERALS} literals"
        ));
    }
    Ok(builder.formula)
}

struct Builder {
    formula: Formula,
    masks: usize,
    /// The variable "fragment on mask", by fragment and mask; 0 where it may not take it.
    on: Vec<i32>,
}

impl Builder {
    fn on(&self, fragment: u32, mask: usize) -> Option<i32> {
        let variable = self.on[fragment as usize * self.masks + mask];
        (variable != 0).then_some(variable)
    }

    fn off(&self, fragment: u32, mask: usize) -> Option<i32> {
        self.on(fragment, mask).map(|variable| -variable)
    }

    /// 1. Masks.
    fn masks(&mut self, statement: &Statement) -> Result<(), String> {
        if statement.allowed.len().saturating_mul(self.masks) > MOST_LITERALS {
            return Err(format!(
                "its formula has more than {MOST_LITERALS} literals"
            ));
        }
        for &allowed in &statement.allowed {
            for mask in 0..self.masks {
                let may = allowed >> mask & 1 == 1;
                let variable = if may { self.formula.fresh() } else { 0 };
                self.on.push(variable);
            }
        }
        for fragment in 0..statement.allowed.len() as u32 {
            let own: Vec<i32> = (0..self.masks)
                .filter_map(|m| self.on(fragment, m))
                .collect();
            self.formula.clause(own.iter().copied().map(Some));
            for (i, &one) in own.iter().enumerate() {
                for &other in &own[i + 1..] {
                    self.formula.clause([Some(-one), Some(-other)]);
                }
            }
        }
        Ok(())
    }

    /// 2. Precedence.
    fn precedence(&mut self, statement: &Statement, listed: &[u32]) -> Result<(), String> {
        let all = (1u16 << self.masks) - 1;
        if listed.is_empty() {
            return Ok(());
        }
        if let Some(i) = statement
            .allowed
            .iter()
            .position(|&set| u16::from(set) != all)
        {
            let fragment = statement.fragments[i];
            return Err(format!(
                "precedence, but fragment {fragment} may not take all masks"
            ));
        }
        if listed.len() > self.masks {
            return Err(format!(
                "precedence over more than {} fragments",
                self.masks
            ));
        }
        for (i, &fragment) in listed.iter().enumerate() {
            if listed[..i].contains(&fragment) {
                let fragment = statement.fragments[fragment as usize];
                return Err(format!("precedence lists fragment {fragment} twice"));
            }
            for mask in i + 1..self.masks {
                self.formula.clause([self.off(fragment, mask)]);
            }
        }
        Ok(())
    }

    /// "Not violated, or the price."
    fn violated(&mut self, item: &Item, price: Option<i32>) {
        match item {
            Item::Pair(edges) => {
                for &[a, b] in edges {
                    self.not_both([a, b], [], price);
                }
            }
            Item::Stitch([a, b]) => {
                for mask in 0..self.masks {
                    for [from, to] in [[*a, *b], [*b, *a]] {
                        if let Some(off) = self.off(from, mask) {
                            let to = self.on(to, mask);
                            self.formula.clause([Some(off), to, price]);
                        }
                    }
                }
            }
            Item::Own(items) => items.iter().for_each(|item| self.violated(item, price)),
            Item::Path {
                ends: [a, b],
                inner,
            } => {
                for mask in 0..self.masks {
                    if let (Some(a), Some(b)) = (self.off(*a, mask), self.off(*b, mask)) {
                        for &fragment in inner {
                            let on = self.on(fragment, mask);
                            self.formula.clause([Some(a), Some(b), on, price]);
                        }
                    }
                }
            }
            Item::Mesh {
                ends,
                fragments,
                stitches,
            } => {
                let reached = self.reached(ends[0], ends[1], fragments, stitches);
                self.not_both(*ends, [reached], price);
            }
        }
    }

    /// For each mask that both may take: not both on it, or one of the others.
    fn not_both<const N: usize>(
        &mut self,
        [a, b]: Edge,
        others: [Option<i32>; N],
        price: Option<i32>,
    ) {
        for mask in 0..self.masks {
            if let (Some(a), Some(b)) = (self.off(a, mask), self.off(b, mask)) {
                let rest = others.into_iter().chain([price]);
                self.formula
                    .clause([Some(a), Some(b)].into_iter().chain(rest));
            }
        }
    }

    /// "b is reached from a on its mask", where a path of stitch edges may go several ways.
    fn reached(&mut self, a: u32, b: u32, fragments: &[u32], stitches: &[Edge]) -> Option<i32> {
        let place = |fragment: u32| fragments.partition_point(|&f| f < fragment);
        let mut near: Vec<Vec<usize>> = vec![Vec::new(); fragments.len()];
        for &[f, g] in stitches {
            near[place(f)].push(place(g));
            near[place(g)].push(place(f));
        }
        for (fragment, near) in near.iter_mut().enumerate() {
            near.push(fragment);
            near.sort_unstable();
        }
        let start = place(a);
        let mut before: Vec<Option<i32>> = vec![None; fragments.len()];
        for _ in 1..fragments.len() {
            if self.formula.too_large {
                return None;
            }
            let mut now = vec![None; fragments.len()];
            for (at, &fragment) in fragments.iter().enumerate() {
                let next_to_start = near[at].contains(&start);
                let ways: Vec<i32> = near[at].iter().filter_map(|&way| before[way]).collect();
                if at == start || (ways.is_empty() && !next_to_start) {
                    continue;
                }
                let reached = self.formula.fresh();
                now[at] = Some(reached);
                if !next_to_start {
                    let ways = ways.into_iter().map(Some);
                    self.formula
                        .clause([Some(-reached)].into_iter().chain(ways));
                }
                for mask in 0..self.masks {
                    if let Some(off) = self.off(a, mask) {
                        let on = self.on(fragment, mask);
                        self.formula.clause([Some(-reached), Some(off), on]);
                    }
                }
            }
            before = now;
        }
        before[place(b)]
    }

    /// Items of a total weight of at most the budget.
    fn budget(&mut self, budget: &Budget) {
        let mut prices = Vec::new();
        for (item, weight) in &budget.items {
            if *weight > budget.most {
                self.violated(item, None);
            } else {
                let price = self.formula.fresh();
                prices.push((*weight, price));
                self.violated(item, Some(price));
            }
        }
        let total: u128 = prices.iter().map(|&(weight, _)| u128::from(weight)).sum();
        if total > u128::from(budget.most) {
            self.count(&prices, budget.most);
        }
    }

    /// The outputs of a counter: values, ascending, each with its literal.
    fn count(&mut self, inputs: &[(u64, i32)], most: u64) -> Vec<(u64, i32)> {
        if inputs.len() < 2 {
            return inputs.to_vec();
        }
        let (left, right) = inputs.split_at(inputs.len() / 2);
        let left = self.count(left, most);
        let right = self.count(right, most);
        // Each of the two and none: a value of 0 without a literal.
        let nothing = |of: &[(u64, i32)]| -> Vec<(u64, Option<i32>)> {
            let some = of.iter().map(|&(value, output)| (value, Some(output)));
            [(0, None)].into_iter().chain(some).collect()
        };
        let (left, right) = (nothing(&left), nothing(&right));
        let size = left.len().saturating_mul(right.len());
        if size.saturating_add(self.formula.literals.len()) > MOST_LITERALS {
            self.formula.too_large = true;
            return Vec::new();
        }
        let sums = left
            .iter()
            .flat_map(|&(x, _)| right.iter().map(move |&(y, _)| x.checked_add(y)));
        let mut values: Vec<u64> = sums
            .flatten()
            .filter(|&value| value > 0 && value <= most)
            .collect();
        values.sort_unstable();
        values.dedup();
        let outputs: Vec<(u64, i32)> = values
            .into_iter()
            .map(|value| (value, self.formula.fresh()))
            .collect();
        for &(x, of_left) in &left {
            for &(y, of_right) in &right {
                if of_left.is_none() && of_right.is_none() {
                    continue;
                }
                let sum = x.checked_add(y).filter(|&sum| sum <= most);
                let output = sum.and_then(|sum| {
                    let found = outputs.binary_search_by_key(&sum, |&(value, _)| value);
                    found.ok().map(|at| outputs[at].1)
                });
                let not = |literal: Option<i32>| literal.map(|literal| -literal);
                self.formula.clause([not(of_left), not(of_right), output]);
            }
        }
        outputs
    }
}

#[cfg(test)]
impl Formula {
    /// A formula of these clauses, for tests.
    pub(super) fn of(clauses: &[&[i32]]) -> Formula {
        let mut formula = Formula::default();
        for clause in clauses {
            let largest = clause.iter().map(|literal| literal.abs()).max();
            formula.variables = formula.variables.max(largest.unwrap_or(0));
            formula.clause(clause.iter().copied().map(Some));
        }
        formula
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn clauses(formula: &Formula) -> Vec<Vec<i32>> {
        formula.clauses().map(<[i32]>::to_vec).collect()
    }

    fn statement(count: u32, items: Vec<(Item, u64)>, most: u64) -> Statement {
        Statement {
            masks: 2,
            fragments: (0..count).collect(),
            allowed: vec![3; count as usize],
            tied: Vec::new(),
            tie_budgets: Vec::new(),
            resolved: Vec::new(),
            budgets: vec![Budget { items, most }],
        }
    }

    /// Worked out by hand from the page: a triangle on two masks, no conflict allowed.
    #[test]
    fn a_triangle_clause_by_clause() {
        let pair = |a, b| (Item::Pair(vec![[a, b]]), 1);
        let triangle = statement(3, vec![pair(0, 1), pair(0, 2), pair(1, 2)], 0);
        let formula = canonical(&triangle, &[2]).unwrap_or_default();
        let expected: [&[i32]; 13] = [
            &[1, 2],
            &[-1, -2],
            &[3, 4],
            &[-3, -4],
            &[5, 6],
            &[-5, -6],
            &[-6],
            &[-1, -3],
            &[-2, -4],
            &[-1, -5],
            &[-2, -6],
            &[-3, -5],
            &[-4, -6],
        ];
        assert_eq!(clauses(&formula), expected);
        assert_eq!(formula.variables, 6);
    }

    /// And with one conflict allowed: prices 7, 8, 9; the counter's right node counts 8 and 9.
    #[test]
    fn a_budget_counts_its_prices() {
        let pair = |a, b| (Item::Pair(vec![[a, b]]), 1);
        let triangle = statement(3, vec![pair(0, 1), pair(0, 2), pair(1, 2)], 1);
        let formula = canonical(&triangle, &[]).unwrap_or_default();
        let all = clauses(&formula);
        let expected: [&[i32]; 12] = [
            &[-1, -3, 7],
            &[-2, -4, 7],
            &[-1, -5, 8],
            &[-2, -6, 8],
            &[-3, -5, 9],
            &[-4, -6, 9],
            &[-9, 10],
            &[-8, 10],
            &[-8, -9],
            &[-10, 11],
            &[-7, 11],
            &[-7, -10],
        ];
        assert_eq!(all[6..], expected);
    }

    /// Weights 2 and 3 with a budget of 4: the values 2 and 3, and never both.
    #[test]
    fn weights_are_added_up() {
        let stitches = vec![
            (Item::Stitch([0, 1]), 2),
            (Item::Stitch([1, 2]), 3),
            (Item::Stitch([0, 2]), 9),
        ];
        let all = clauses(&canonical(&statement(3, stitches, 4), &[]).unwrap_or_default());
        let expected: [&[i32]; 15] = [
            &[-1, 3, 7],
            &[-3, 1, 7],
            &[-2, 4, 7],
            &[-4, 2, 7],
            &[-3, 5, 8],
            &[-5, 3, 8],
            &[-4, 6, 8],
            &[-6, 4, 8],
            &[-1, 5],
            &[-5, 1],
            &[-2, 6],
            &[-6, 2],
            &[-8, 10],
            &[-7, 9],
            &[-7, -8],
        ];
        assert_eq!(all[6..], expected);
    }

    #[test]
    fn formulas_beyond_the_limit_are_refused() {
        let many: Vec<(Item, u64)> = (0..40_000).map(|i| (Item::Stitch([i, i + 1]), 1)).collect();
        assert!(canonical(&statement(40_001, many, 20_000), &[]).is_err());
    }
}
