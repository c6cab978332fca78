//! Conflict edges and stitch edges as clauses over colour literals.
//!
//! A unit of conflict (a pair, however many edges it has) is paid for by one literal `unless`, which
//! all its edges share; without one the edge is hard.

use crate::colour::Colours;
use crate::literal::{ClauseSink, Lit};

/// The fragments `a` and `b` are on different masks, unless the literal holds.
pub fn separate(
    colours: &Colours,
    [a, b]: [u32; 2],
    unless: Option<Lit>,
    sink: &mut impl ClauseSink,
) {
    for mask in 0..colours.masks() {
        if let (Some(a), Some(b)) = (colours.lit(a, mask), colours.lit(b, mask)) {
            match unless {
                Some(unless) => sink.clause(&[!a, !b, unless]),
                None => sink.clause(&[!a, !b]),
            }
        }
    }
}

/// The fragments `a` and `b` are on one mask, unless the literal holds. One direction: the literal may
/// hold where they are on one mask.
pub fn join(colours: &Colours, [a, b]: [u32; 2], unless: Lit, sink: &mut impl ClauseSink) {
    for mask in 0..colours.masks() {
        implies(
            colours.lit(a, mask),
            colours.lit(b, mask),
            Some(unless),
            sink,
        );
        implies(
            colours.lit(b, mask),
            colours.lit(a, mask),
            Some(unless),
            sink,
        );
    }
}

/// The fragments `a` and `b` are on one mask, always.
pub fn unite(colours: &Colours, [a, b]: [u32; 2], sink: &mut impl ClauseSink) {
    for mask in 0..colours.masks() {
        implies(colours.lit(a, mask), colours.lit(b, mask), None, sink);
        implies(colours.lit(b, mask), colours.lit(a, mask), None, sink);
    }
}

fn implies(from: Option<Lit>, to: Option<Lit>, unless: Option<Lit>, sink: &mut impl ClauseSink) {
    let Some(from) = from else { return };
    match (to, unless) {
        (Some(to), Some(unless)) => sink.clause(&[!from, to, unless]),
        (Some(to), None) => sink.clause(&[!from, to]),
        (None, Some(unless)) => sink.clause(&[!from, unless]),
        (None, None) => sink.clause(&[!from]),
    }
}
