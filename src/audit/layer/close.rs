//! Which fragments are close.
//!
//! Two fragments are where a rectangle or outline of the one comes closer to one of the other than the least spacing. Where the rules
//! tell more apart, two more searches add the fragments whose edges or corners come too close because of what they are. A feature with
//! slanted edges keeps the plain spacing from everything, and has part in the first search only.

use super::cuts::Cuts;
use super::distance::{Bodies, RECT};
use super::facing::{Facing, Part, Region, Tip};
use super::ground::Ground;
use super::near;
use super::numbering::Numbering;
use super::runs::widened;
use crate::audit::Rejection;

/// The close fragments, smaller one first, sorted, each once.
pub(super) fn fragments(
    ground: Ground,
    cuts: &Cuts,
    numbering: &Numbering,
) -> Result<Vec<[u32; 2]>, Rejection> {
    let (reach, half) = (ground.reach(), ground.rules.stitch.overlap / 2);
    let Ground {
        values,
        bodies,
        features,
        slanted,
        facing,
        ..
    } = ground;
    let by_kind = match &facing {
        Some(facing) => by_kind(facing, cuts, numbering, half)?,
        None => Vec::new(),
    };
    drop(facing);
    let (bodies, fragments) = self::reach(bodies, &features, cuts, numbering, half);
    // Where that makes a difference; features with slanted edges are not cut.
    let mut is_slanted: Vec<bool> = Vec::new();
    if values.slanted.spacing != values.least.spacing {
        is_slanted.resize(
            numbering.start.last().map_or(0, |&count| count as usize),
            false,
        );
        let firsts = numbering.start.iter().zip(slanted);
        firsts.for_each(|(&first, slanted)| is_slanted[first as usize] = slanted);
    }
    let keeps_plain = |fragment: &u32| is_slanted.get(*fragment as usize) == Some(&true);
    let close = |a, b| {
        let edge = [fragments[a as usize], fragments[b as usize]];
        let within = match edge.iter().any(keeps_plain) {
            true => values.slanted,
            false => values.least,
        };
        bodies.closer(a, b, within).then_some(ordered(edge))
    };
    let mut found = near::pairs(&bodies.boxes, &fragments, reach - 1, close)?;
    if !by_kind.is_empty() {
        found.extend(by_kind);
        found.sort_unstable();
        found.dedup();
    }
    Ok(found)
}

fn ordered([a, b]: [u32; 2]) -> [u32; 2] {
    [a.min(b), a.max(b)]
}

/// The fragments that are close because of the kinds of their edges and corners, in any order.
fn by_kind(
    facing: &Facing,
    cuts: &Cuts,
    numbering: &Numbering,
    half: i32,
) -> Result<Vec<[u32; 2]>, Rejection> {
    let pieces = cuts.pieces.iter().zip(&numbering.of_piece);
    let pieces = pieces.map(|(piece, &owner)| Region {
        feature: piece.feature,
        owner,
        rect: piece.rect,
    });
    let lines = cuts.lines.iter().zip(&numbering.sides);
    let overlaps = lines.flat_map(|(line, sides)| {
        sides.map(|owner| Region {
            feature: line.feature,
            owner,
            rect: widened(line.line, half),
        })
    });
    let regions: Vec<Region> = pieces.chain(overlaps).collect();
    let (mut parts, mut tips) = facing.within(&regions)?;
    let first = |feature: u32| numbering.start[feature as usize];
    let is_whole = |feature: u32| numbering.start[feature as usize + 1] - first(feature) == 1;
    let edges = (0..).zip(&facing.outlines.edges);
    parts.extend(
        edges
            .filter(|(_, edge)| is_whole(edge.feature))
            .map(|(number, edge)| Part {
                owner: first(edge.feature),
                edge: number,
                ends: edge.ends,
            }),
    );
    let corners = (0..).zip(&facing.outlines.corners);
    tips.extend(
        corners
            .filter(|(_, corner)| is_whole(corner.feature))
            .map(|(number, corner)| Tip {
                owner: first(corner.feature),
                corner: number,
            }),
    );
    let labels: Vec<u32> = parts.iter().map(|part| part.owner).collect();
    let pick = |a: u32, b: u32, _| Some(ordered([a, b].map(|i| parts[i as usize].owner)));
    let mut found = facing.parts(&parts, &labels, pick)?;
    let labels: Vec<u32> = tips.iter().map(|tip| tip.owner).collect();
    let pick = |a: u32, b: u32| Some(ordered([a, b].map(|i| tips[i as usize].owner)));
    found.extend(facing.tips(&tips, &labels, pick)?);
    Ok(found)
}

/// What distances of fragments are taken of, and the fragment of each: the parts of features that are whole; and of the
/// others the pieces, and of each cut what both sides cover beyond it.
fn reach(
    mut bodies: Bodies,
    features: &[u32],
    cuts: &Cuts,
    numbering: &Numbering,
    half: i32,
) -> (Bodies, Vec<u32>) {
    let start = &numbering.start;
    let first = |&feature: &u32| start[feature as usize];
    if cuts.lines.is_empty() {
        return (bodies, features.iter().map(first).collect());
    }
    let is_whole = |feature: u32| start[feature as usize + 1] - start[feature as usize] == 1;
    let whole: Vec<bool> = features.iter().map(|&feature| is_whole(feature)).collect();
    let (mut of_boxes, mut of_outlines) = (whole.iter(), whole.iter());
    bodies.boxes.retain(|_| of_boxes.next() == Some(&true));
    bodies.outline.retain(|_| of_outlines.next() == Some(&true));
    let kept = features.iter().filter(|&&feature| is_whole(feature));
    let mut fragments: Vec<u32> = kept.map(first).collect();
    bodies
        .boxes
        .extend(cuts.pieces.iter().map(|piece| piece.rect));
    fragments.extend(&numbering.of_piece);
    for (line, sides) in cuts.lines.iter().zip(&numbering.sides) {
        bodies.boxes.extend([widened(line.line, half); 2]);
        fragments.extend(sides);
    }
    bodies.outline.resize(bodies.boxes.len(), RECT);
    (bodies, fragments)
}
