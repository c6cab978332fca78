//! Cliques: where every two of some fragments conflict, so many pairs share a mask whatever the colouring.
//!
//! Turan, "On an extremal problem in graph theory" (1941): a clique spread over K masks leaves the fewest pairs on one
//! mask when it is spread evenly.

use std::collections::BTreeSet;

use super::features::Features;
use super::statement::{Item, Statement, is_self_spacing};
use crate::certificate::Edge;

/// All fragments of the own units of a statement, where every two of them are joined and Turan's theorem refutes it.
pub fn of(features: &Features<'_>, statement: &Statement) -> Option<Vec<u32>> {
    let own = statement.budgets.last()?;
    let mut edges = BTreeSet::new();
    for item in &own.items {
        match item {
            Item::Conflict(unit) if unit.len() == 1 => edges.insert(unit[0]),
            _ => return None,
        };
    }
    let members: BTreeSet<u32> = edges.iter().flatten().copied().collect();
    let count = members.len() as u64;
    let is_whole = edges.len() as u64 == count * count.saturating_sub(1) / 2;
    let joins = |&edge: &Edge| !is_self_spacing(features, edge);
    if !is_whole || !edges.iter().all(joins) {
        return None;
    }
    let masks = u64::from(features.instance.masks());
    (turan(count, masks) > own.most).then(|| members.into_iter().collect())
}

/// The fewest pairs on one mask each when the members of a clique are spread over the masks.
fn turan(members: u64, masks: u64) -> u64 {
    let (each, more) = (members / masks, members % masks);
    let within = |n: u64| n * n.saturating_sub(1) / 2;
    more * within(each + 1) + (masks - more) * within(each)
}
