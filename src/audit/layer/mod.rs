//! From the shapes of a layer and its rules to what has to be coloured, in the numbering of a certificate.
//!
//! Of the certificate only the order of the features, and that of the fragments of each, is taken over, after it was
//! held against what the layer gives. Nothing is allocated by a number that the certificate names.
//!
//! | file | what it does |
//! |---|---|
//! | `parts` | takes the shapes apart into rectangles and slanted outlines |
//! | `strips` | cuts a region along the axes into strips of constant cross-section |
//! | `near` | finds the boxes that come within a reach of each other |
//! | `distance` | decides whether two shapes come closer than a spacing |
//! | `features` | joins what touches, and finds each feature in the certificate |
//! | `hand` | reads what was decided by hand: masks, and features that share one or differ |
//! | `keep_outs` | finds what stitches must keep away from |
//! | `ground` | holds all this together |
//! | `runs` | finds the straight runs of a feature, and what speaks against a cut on them |
//! | `policy` | tells the cuts of each stitch policy |
//! | `candidates` | places the stitch candidates of the policy `uncovered` |
//! | `cuts` | cuts the features there |
//! | `numbering` | holds the cuts against the certificate, and numbers the fragments as it does |
//! | `outline` | finds straight edges, line ends and convex corners |
//! | `facing` | decides which edges and corners come too close because of what they are |
//! | `close` | tells which fragments are close |
//! | `ties` | tells which stitches may not be together |

mod candidates;
mod close;
mod cuts;
mod distance;
mod facing;
mod features;
mod ground;
mod hand;
mod keep_outs;
mod near;
mod numbering;
mod outline;
mod parts;
mod policy;
mod runs;
mod strips;
mod ties;

use super::problem::Stitch;
use super::{Problem, Rejection, Step};
use crate::certificate::{self, Certificate};
use crate::geometry::Point;
use crate::layout::{Layout, Rules};
use cuts::Line;
use ground::Ground;
use keep_outs::KeepOuts;
use numbering::Numbering;

/// What has to be coloured: the fragments of `layout` under `rules`, numbered as in `certificate`.
///
/// # Errors
/// A rejection where the features or the stitch candidates that the certificate lists are not those of the layer, with
/// what they are; or where the rules are none, or the layer is beyond what can be derived.
pub fn derive(
    layout: &Layout,
    rules: &Rules,
    certificate: &Certificate,
) -> Result<Problem, Rejection> {
    check(rules, certificate)?;
    let is_fixed = |shape| {
        layout
            .fixed
            .binary_search_by_key(&shape, |fixed| fixed.0)
            .is_ok()
    };
    let parts = parts::of_shapes(&layout.shapes, is_fixed)?;
    let features = features::of_parts(&parts, &certificate.features)?;
    let part_of = |shape| parts.of_shape(shape);
    let by_hand = hand::decided(layout, rules, &parts.bodies, &features, part_of)?;
    let named = by_hand.named(certificate.features.len());
    let keep_outs = KeepOuts::new(layout, rules)?;
    let ground = Ground::new(rules, parts.bodies, features, named, keep_outs)?;
    let cuts = policy::cuts(&ground, &certificate.split)?;
    let objection = |feature, line| policy::objection(&ground, feature, line);
    let numbering =
        numbering::numbered(&cuts, &certificate.split, &certificate.features, objection)?;
    let Numbering { start, sides, .. } = &numbering;
    let stitches = stitches(&cuts.lines, sides, rules.stitch.weight)?;
    let mut ties = by_hand.ties(start);
    ties.extend(ties::of_cuts(&cuts.lines, sides, &rules.stitch));
    ties.sort_unstable_by(|one, other| (one.first(), one).cmp(&(other.first(), other)));
    ties.dedup();
    let count = start.last().map_or(0, |&count| count as usize);
    let mut allowed = vec![u8::MAX >> (8 - rules.masks); count];
    by_hand.limit(&mut allowed, start);
    let mut close = close::fragments(ground, &cuts, &numbering)?;
    close.retain(|edge| stitches.binary_search_by_key(edge, |s| s.ends).is_err());
    Ok(Problem {
        masks: rules.masks,
        feature_start: numbering.start,
        allowed,
        close,
        stitches,
        ties,
    })
}

/// Refuses rules that mean nothing, and a policy by another name than that of the rules.
fn check(rules: &Rules, certificate: &Certificate) -> Result<(), Rejection> {
    let (stitch, spacings) = (&rules.stitch, &rules.spacings);
    let lengths = [stitch.overlap, stitch.fragment_length, stitch.corner];
    let special = [
        spacings.side_to_side,
        spacings.side_to_end,
        spacings.end_to_end,
        spacings.corner_to_corner,
    ];
    let wide = spacings.wide.iter().map(|row| row.spacing);
    let sound = (1..=8).contains(&rules.masks)
        && lengths.iter().all(|&length| length >= 0)
        && [rules.spacing]
            .into_iter()
            .chain(special.into_iter().flatten())
            .chain(wide)
            .all(|spacing| spacing >= 1)
        && stitch.overlap % 2 == 0
        && stitch.weight >= 1;
    if !sound {
        return Err(Rejection::new(
            Step::Rules,
            "1 to 8 masks, spacings of at least 1, lengths of at least 0, an even overlap and a weight of at least 1 are needed",
        ));
    }
    let certificate::Rules::Layer(named) = &certificate.rules else {
        return Err(Rejection::new(
            Step::Rules,
            "the certificate is of a graph, the input is a layer",
        ));
    };
    let policy = stitch.policy.name();
    if named.stitch != policy {
        let named = &named.stitch;
        return Err(Rejection::new(
            Step::Stitches,
            format!("the certificate names the stitch policy {named:?}, the rules say {policy:?}"),
        ));
    }
    Ok(())
}

/// The stitch edges: cuts between the same two fragments are stitches together, and cost as much.
fn stitches(lines: &[Line], sides: &[[u32; 2]], weight: u32) -> Result<Vec<Stitch>, Rejection> {
    let ends = |&[a, b]: &[u32; 2]| [a.min(b), a.max(b)];
    let mut all: Vec<([u32; 2], &Line)> = sides.iter().map(ends).zip(lines).collect();
    all.sort_unstable();
    let same = all.chunk_by(|one, other| one.0 == other.0);
    same.map(|same| {
        let (ends, line) = same[0];
        let sum = u32::try_from(same.len()).ok().and_then(|count| weight.checked_mul(count));
        let weight = sum.ok_or_else(|| {
            let Point { x, y } = line.line.min;
            let count = same.len();
            Rejection::new(
                Step::Stitches,
                format!("the cut at ({x}, {y}) is one of {count} between two fragments: their weights add up to more than 2^32 - 1"),
            )
        })?;
        Ok(Stitch { ends, weight })
    })
    .collect()
}
