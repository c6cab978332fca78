//! Evidence by a clique.
//!
//! Of n fragments, every two joined by a conflict edge, those on one mask leave every pair among them
//! violated. With n = qK + r that is least where the masks are used evenly: r masks for q + 1 fragments, K - r
//! for q (P. Turan, 1941: the edges that a graph without K + 1 mutually joined vertices must lack). Every two are of
//! different features, so each pair is a unit of its own.

use super::statement::{Item, Statement};

/// Checks that a clique, in the bound's own numbers, refutes the statement.
///
/// # Errors
/// Why it does not.
pub fn check(statement: &Statement, clique: &[u32]) -> Result<(), String> {
    let Some(own) = statement.budgets.last() else {
        return Err("evidence by a clique, but no units".to_owned());
    };
    let mut edges = Vec::new();
    for (item, _) in &own.items {
        if let Item::Pair(of_pair) = item {
            edges.extend_from_slice(of_pair);
        }
    }
    edges.sort_unstable();
    for (i, &a) in clique.iter().enumerate() {
        for &b in &clique[i + 1..] {
            if edges.binary_search(&[a.min(b), a.max(b)]).is_err() {
                let [a, b] = [a, b].map(|own| statement.fragments[own as usize]);
                return Err(format!(
                    "the clique holds fragments {a} and {b}, which no unit joins"
                ));
            }
        }
    }
    let least = least_violated(clique.len() as u128, u128::from(statement.masks));
    if least > u128::from(own.most) {
        return Ok(());
    }
    Err(format!(
        "a clique of {} fragments leaves {least} conflicts at least, no more",
        clique.len()
    ))
}

/// The fewest pairs on one mask each when `members` fragments are spread over `masks`.
fn least_violated(members: u128, masks: u128) -> u128 {
    let (each, more) = (members / masks, members % masks);
    more * (each + 1) * each / 2 + (masks - more) * each * each.saturating_sub(1) / 2
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against every way to spread members over masks.
    #[test]
    fn an_even_spread_is_best() {
        fn best(members: u128, masks: u128) -> u128 {
            match masks {
                1 => members * members.saturating_sub(1) / 2,
                _ => (0..=members)
                    .map(|n| n * n.saturating_sub(1) / 2 + best(members - n, masks - 1))
                    .min()
                    .unwrap_or(0),
            }
        }
        for masks in 1..=5 {
            for members in 0..=14 {
                assert_eq!(least_violated(members, masks), best(members, masks));
            }
        }
    }
}
