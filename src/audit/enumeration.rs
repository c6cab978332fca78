//! Evidence by enumeration: every colouring of a bound's fragments is tried.
//!
//! Depth first, fragments in breadth-first order from the one with the most company; a branch ends where
//! something is violated beyond its budget, since violations of what is coloured stay. Where every fragment may take every
//! mask, a fragment takes at most one mask beyond those in use before it: renaming masks in the order of
//! their first use changes no violation (value precedence; Law and Lee, CP 2004). Not by recursion,
//! since fragments that may take one mask only do not count, and there can be many.

use encodings::Mask;

use super::statement::{Budget, Item, Statement};
use crate::certificate::MOST_COLOURINGS;

/// A colouring that the bound says does not exist, by the bound's own numbers, if there is one.
///
/// # Errors
/// More than [`MOST_COLOURINGS`] colourings.
pub fn counterexample(statement: &Statement) -> Result<Option<Vec<Mask>>, String> {
    if colourings(statement).is_none_or(|count| count > MOST_COLOURINGS) {
        let count = statement.fragments.len();
        return Err(format!(
            "evidence by enumeration, but {count} fragments have more than {MOST_COLOURINGS} colourings"
        ));
    }
    Ok(Search::new(statement).run())
}

/// How many colourings there are to try; `None` where a number of 64 bits does not hold it.
pub fn colourings(statement: &Statement) -> Option<u64> {
    let masks = u32::from(statement.masks);
    let free = are_interchangeable(statement);
    (1u64..)
        .zip(&statement.allowed)
        .try_fold(1u64, |product, (i, allowed)| {
            let choices = if free {
                i.min(u64::from(masks))
            } else {
                u64::from(allowed.count_ones())
            };
            product.checked_mul(choices)
        })
}

fn are_interchangeable(statement: &Statement) -> bool {
    let all = (1u16 << statement.masks) - 1;
    statement.allowed.iter().all(|&set| u16::from(set) == all)
}

/// What is told, and its price: a budget and a weight, or none for what must not be violated.
type Told<'a> = (&'a Item, Option<(usize, u64)>);

struct Search<'a> {
    statement: &'a Statement,
    order: Vec<u32>,
    /// What can be told once the fragment at this place of the order is coloured.
    told: Vec<Vec<Told<'a>>>,
    free: bool,
    masks: Vec<Mask>,
    budgets: Vec<&'a Budget>,
    spent: Vec<u64>,
    /// What the colouring of each place has spent.
    payments: Vec<Vec<(usize, u64)>>,
}

impl<'a> Search<'a> {
    fn new(statement: &'a Statement) -> Search<'a> {
        let order = breadth_first(statement);
        let budgets: Vec<&'a Budget> = budgets(statement).collect();
        let mut place = vec![0; order.len()];
        for (at, &fragment) in order.iter().enumerate() {
            place[fragment as usize] = at;
        }
        let mut told = vec![Vec::new(); order.len()];
        let mut tell = |item: &'a Item, price| {
            let mut last = 0;
            item.each_fragment(&mut |fragment| last = last.max(place[fragment as usize]));
            told[last].push((item, price));
        };
        for item in statement.tied.iter().chain(&statement.resolved) {
            tell(item, None);
        }
        for (number, budget) in budgets.iter().enumerate() {
            for (item, weight) in &budget.items {
                tell(item, Some((number, *weight)));
            }
        }
        Search {
            statement,
            told,
            free: are_interchangeable(statement),
            masks: vec![0; order.len()],
            spent: vec![0; budgets.len()],
            budgets,
            payments: vec![Vec::new(); order.len()],
            order,
        }
    }

    fn run(mut self) -> Option<Vec<Mask>> {
        // For each place so far: the next mask to try, and how many masks are in use before it.
        let mut open: Vec<(Mask, Mask)> = vec![(0, 0)];
        loop {
            let at = open.len() - 1;
            if at == self.order.len() {
                return Some(self.masks);
            }
            self.refund(at);
            let (next, used) = open[at];
            let Some(mask) = self.mask_from(at, next, used) else {
                open.pop();
                if open.is_empty() {
                    return None;
                }
                continue;
            };
            open[at].0 = mask + 1;
            self.masks[self.order[at] as usize] = mask;
            if self.pay(at) {
                open.push((0, used.max(mask + 1)));
            }
        }
    }

    /// The first mask from `next` on that the fragment at a place may take.
    fn mask_from(&self, at: usize, next: Mask, used: Mask) -> Option<Mask> {
        let end = if self.free {
            self.statement.masks.min(used + 1)
        } else {
            self.statement.masks
        };
        let allowed = self.statement.allowed[self.order[at] as usize];
        (next..end).find(|&mask| allowed >> mask & 1 == 1)
    }

    fn refund(&mut self, at: usize) {
        for (budget, weight) in self.payments[at].drain(..) {
            self.spent[budget] -= weight;
        }
    }

    /// Pays for what the fragment at a place decides; says whether the budgets allow it.
    fn pay(&mut self, at: usize) -> bool {
        for &(item, price) in &self.told[at] {
            if !item.is_violated(&self.masks) {
                continue;
            }
            let Some((budget, weight)) = price else {
                return false;
            };
            match self.spent[budget].checked_add(weight) {
                Some(sum) if sum <= self.budgets[budget].most => {
                    self.spent[budget] = sum;
                    self.payments[at].push((budget, weight));
                }
                _ => return false,
            }
        }
        true
    }
}

/// The budgets of a statement, those of ties last.
fn budgets(statement: &Statement) -> impl Iterator<Item = &Budget> {
    statement.budgets.iter().chain(&statement.tie_budgets)
}

/// Items with those that some of them consist of.
fn flat<'a>(items: impl Iterator<Item = &'a Item>) -> impl Iterator<Item = &'a Item> {
    items.flat_map(|item| match item {
        Item::Own(parts) => parts.as_slice(),
        _ => std::slice::from_ref(item),
    })
}

/// The fragments in breadth-first order over what joins them, from the one with the most company on.
fn breadth_first(statement: &Statement) -> Vec<u32> {
    let count = statement.fragments.len();
    let mut near: Vec<Vec<u32>> = vec![Vec::new(); count];
    let priced = budgets(statement).flat_map(|budget| budget.items.iter().map(|(i, _)| i));
    let hard = statement.tied.iter().chain(&statement.resolved);
    for item in flat(hard.chain(priced)) {
        let mut join = |a: u32, b: u32| {
            near[a as usize].push(b);
            near[b as usize].push(a);
        };
        match item {
            Item::Own(_) => {}
            Item::Pair(edges) => edges.iter().for_each(|&[a, b]| join(a, b)),
            Item::Stitch([a, b]) => join(*a, *b),
            Item::Path { ends, inner } => inner.iter().for_each(|&f| join(f, ends[0])),
            Item::Mesh {
                ends, fragments, ..
            } => {
                let others = fragments.iter().filter(|&&f| f != ends[0]);
                others.for_each(|&f| join(f, ends[0]));
            }
        }
        if let Item::Path { ends: [a, b], .. } = item {
            join(*a, *b);
        }
    }
    let mut starts: Vec<u32> = (0..count as u32).collect();
    starts.sort_by_key(|&fragment| std::cmp::Reverse(near[fragment as usize].len()));
    let mut order = Vec::with_capacity(count);
    let mut seen = vec![false; count];
    for start in starts {
        let mut next = order.len();
        if !std::mem::replace(&mut seen[start as usize], true) {
            order.push(start);
        }
        while let Some(&at) = order.get(next) {
            next += 1;
            for &other in &near[at as usize] {
                if !std::mem::replace(&mut seen[other as usize], true) {
                    order.push(other);
                }
            }
        }
    }
    // Those without a choice first: behind others they would be tried over and over.
    order.sort_by_key(|&fragment| statement.allowed[fragment as usize].count_ones() > 1);
    order
}
