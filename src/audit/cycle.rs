//! Evidence by an odd cycle, for two masks.
//!
//! Going around a closed walk, a colour changes at each conflict edge whose ends differ and stays at each
//! stitch edge whose ends agree. An odd number of changes does not come back to the colour that it left
//! with. (Koenig: a graph is bipartite exactly when it has no odd cycle.)

use super::statement::{Item, Statement};

/// Checks that a closed walk, in the bound's own numbers, refutes the statement.
///
/// # Errors
/// Why it does not.
pub fn check(statement: &Statement, cycle: &[u32]) -> Result<(), String> {
    if statement.masks != 2 {
        return Err(format!(
            "evidence by a cycle, but {} masks",
            statement.masks
        ));
    }
    // What costs more than its budget must not be violated, nor must what is resolved.
    let dear = statement.budgets.iter().flat_map(|budget| {
        let items = budget.items.iter();
        items
            .filter(|(_, weight)| *weight > budget.most)
            .map(|(item, _)| item)
    });
    let (mut differ, mut agree) = (Vec::new(), Vec::new());
    for item in statement.resolved.iter().chain(dear) {
        match item {
            Item::Pair(edges) => differ.extend(edges.iter().copied()),
            Item::Stitch(ends) => agree.push(*ends),
            Item::Own(_) | Item::Path { .. } | Item::Mesh { .. } => {}
        }
    }
    differ.sort_unstable();
    agree.sort_unstable();
    let mut changes = 0u64;
    for (i, &from) in cycle.iter().enumerate() {
        let to = cycle.get(i + 1).or(cycle.first()).copied().unwrap_or(from);
        let edge = [from.min(to), from.max(to)];
        if differ.binary_search(&edge).is_ok() {
            changes += 1;
        } else if agree.binary_search(&edge).is_err() {
            let [a, b] = edge.map(|own| statement.fragments[own as usize]);
            return Err(format!(
                "the cycle goes from fragment {a} to {b}, which no hard edge joins"
            ));
        }
    }
    if changes.is_multiple_of(2) {
        return Err(format!(
            "the cycle changes colour {changes} times, which is even"
        ));
    }
    Ok(())
}
