//! Puts the instance together.
//!
//! Several cuts between the same two fragments, as of a ring cut twice, are stitches or not together: they
//! become one stitch edge whose weight is the sum. Close fragments of one feature are a self-spacing
//! unless a stitch edge joins them. A limit of the fragments becomes a tie in which each stitch edge counts as often
//! as it has cuts in the limit. The areas of fragments are those of their cells: overlaps, which only stitches that
//! are used print, are not counted, and the areas of a feature's fragments add up to its own.

use super::ExtractError;
use super::hand::HandMasks;
use crate::layout::{Cut, Fragments, Limit};
use encodings::{Instance, InstanceBuilder, Stitch, Tie};

/// The instance of the fragments with the given areas, the given close fragments, sorted, and what was
/// decided by hand; each stitch costs `weight`.
pub(super) fn assemble(
    masks: u8,
    weight: u32,
    fragments: &Fragments,
    areas: &[u64],
    close: Vec<[u32; 2]>,
    hand: &HandMasks,
) -> Result<Instance, ExtractError> {
    let mut builder = InstanceBuilder::new(masks);
    for feature in 0..fragments.feature_count() as u32 {
        builder.feature(fragments.of_feature(feature).len() as u32);
    }
    for (fragment, &area) in (0u32..).zip(areas) {
        builder.area(fragment, area);
    }
    hand.tell(fragments, &mut builder);
    if fragments.cuts().is_empty() {
        for edge in close {
            builder.pair([edge]);
        }
        return Ok(builder.build()?);
    }
    let stitches = stitch_edges(fragments, weight)?;
    for &([a, b], weight) in &stitches {
        builder.stitch(a, b, weight);
    }
    for limit in fragments.limits() {
        builder.tie(tie(fragments, limit));
    }
    let mut edges = Vec::with_capacity(close.len());
    for [a, b] in close {
        let features = [fragments.feature_of(a), fragments.feature_of(b)];
        if features[0] != features[1] {
            edges.push((features, [a, b]));
        } else if stitches.binary_search_by_key(&[a, b], |s| s.0).is_err() {
            builder.self_spacing(a, b);
        }
    }
    edges.sort_unstable();
    for pair in edges.chunk_by(|one, other| one.0 == other.0) {
        builder.pair(pair.iter().map(|&(_, edge)| edge));
    }
    Ok(builder.build()?)
}

/// A limit as a tie: more cuts than it allows are needed to break it, so it has as many.
fn tie(fragments: &Fragments, limit: &Limit) -> Tie {
    let cuts = limit
        .cuts
        .iter()
        .filter_map(|&cut| fragments.cuts().get(cut as usize));
    let mut ends: Vec<[u32; 2]> = cuts.map(smaller_first).collect();
    ends.sort_unstable();
    let stitch = |same: &[[u32; 2]]| Stitch {
        a: same[0][0],
        b: same[0][1],
        weight: same.len() as u32,
    };
    Tie::AtMost {
        most: limit.most,
        stitches: ends
            .chunk_by(|one, other| one == other)
            .map(stitch)
            .collect(),
    }
}

fn smaller_first(cut: &Cut) -> [u32; 2] {
    let [a, b] = cut.sides;
    [a.min(b), a.max(b)]
}

/// The stitch edges, smaller fragment first, ascending, with their weights.
fn stitch_edges(fragments: &Fragments, weight: u32) -> Result<Vec<([u32; 2], u32)>, ExtractError> {
    let mut cuts: Vec<([u32; 2], &Cut)> = fragments
        .cuts()
        .iter()
        .map(|cut| (smaller_first(cut), cut))
        .collect();
    cuts.sort_unstable();
    (cuts.chunk_by(|one, other| one.0 == other.0))
        .map(|same| {
            let (ends, cut) = same[0];
            let sum = weight.checked_mul(same.len() as u32);
            let at = cut.middle();
            let sum = sum.ok_or(ExtractError::StitchWeight { x: at.x, y: at.y })?;
            Ok((ends, sum))
        })
        .collect()
}
