//! Breaking the symmetry of interchangeable masks.
//!
//! Masks are interchangeable only where every fragment may take every mask; with fixed or restricted
//! masks neither form is sound, and [`precedence`] and [`fix_clique`] return `false` and add nothing.
//!
//! * [`precedence`]: the i-th listed fragment uses one of the first i masks. Sound whatever conflicts
//!   cost, for any list: renumber the masks of a colouring in the order of their first use along the
//!   list, which changes no cost. (The unary part of value precedence; Law and Lee, CP 2004.)
//! * [`fix_clique`]: the i-th fragment of a clique is on mask i. Sound only for pure feasibility, where
//!   the members of a clique differ in every solution: once a conflict can be paid for, the members may
//!   share a mask and the clauses cut solutions off.

use crate::colour::Colours;
use crate::literal::ClauseSink;
use crate::masks::{Mask, MaskSet};

fn interchangeable(colours: &Colours, fragments: &[u32]) -> bool {
    fragments
        .iter()
        .all(|&f| (0..colours.masks()).all(|mask| colours.lit(f, mask).is_some()))
}

/// The masks that the i-th listed fragment (from 0) may use under precedence.
pub fn precedence_set(masks: u8, i: usize) -> MaskSet {
    MaskSet::all(masks.min(i.saturating_add(1).min(u8::MAX as usize) as u8))
}

/// The i-th of `fragments` uses one of the first i masks. The whole formula must treat masks alike.
pub fn precedence(colours: &Colours, fragments: &[u32], sink: &mut impl ClauseSink) -> bool {
    if !interchangeable(colours, fragments) {
        return false;
    }
    for (i, &fragment) in fragments.iter().take(colours.masks() as usize).enumerate() {
        for mask in (i as Mask + 1)..colours.masks() {
            if let Some(lit) = colours.lit(fragment, mask) {
                sink.clause(&[!lit]);
            }
        }
    }
    true
}

/// The i-th of `clique` is on mask i. Every two of its members must be joined by a hard conflict edge,
/// there are at most K of them, and the whole formula must treat masks alike.
pub fn fix_clique(colours: &Colours, clique: &[u32], sink: &mut impl ClauseSink) -> bool {
    if !interchangeable(colours, clique) || clique.len() > colours.masks() as usize {
        return false;
    }
    for (mask, &fragment) in clique.iter().enumerate() {
        if let Some(lit) = colours.lit(fragment, mask as Mask) {
            sink.clause(&[lit]);
        }
    }
    true
}
