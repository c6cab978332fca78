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
//! | `runs` | finds the straight runs of a feature, and what speaks against a cut on them |
//! | `candidates` | places the stitch candidates of the policy `uncovered` |
//! | `cuts` | cuts the features there |
//! | `numbering` | holds the cuts against the certificate, and numbers the fragments as it does |

mod candidates;
mod cuts;
mod distance;
mod features;
mod near;
mod numbering;
mod parts;
mod runs;
mod strips;

use super::problem::Stitch;
use super::{Problem, Rejection, Step};
use crate::certificate::{self, Certificate};
use crate::geometry::{Point, Rect};
use crate::layout::{Layout, Policy, Rules};
use cuts::{Cuts, Line};
use distance::{Bodies, RECT};
use numbering::Numbering;

/// What has to be coloured: the fragments of `layout` under `rules`, numbered as in `certificate`. Each may take every mask.
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
    let parts = parts::of_shapes(&layout.shapes)?;
    let features = features::of_parts(&parts, &certificate.features)?;
    let bodies = parts.bodies;
    let cuts = match rules.stitch.policy {
        Policy::None => Cuts::default(),
        Policy::Uncovered => cuts::uncovered(&bodies, &features, rules)?,
        Policy::EveryInterval | Policy::Listed => {
            return Err(Rejection::new(
                Step::Rules,
                "this policy cannot be audited yet",
            ));
        }
    };
    let objection = |feature, line| objection(&bodies, &features, rules, feature, line);
    let listed = &certificate.split;
    let numbering = numbering::numbered(&cuts, listed, &certificate.features, objection)?;
    let stitches = stitches(&cuts.lines, &numbering.sides, rules.stitch.weight)?;
    let (bodies, fragments) = reach(
        bodies,
        &features,
        &cuts,
        &numbering,
        rules.stitch.overlap / 2,
    );
    let close = |a, b| {
        let edge = [fragments[a as usize], fragments[b as usize]];
        let [one, other] = [edge[0].min(edge[1]), edge[0].max(edge[1])];
        bodies.closer(a, b, rules.spacing).then_some([one, other])
    };
    let mut close = near::pairs(&bodies.boxes, &fragments, rules.spacing - 1, close)?;
    close.retain(|edge| stitches.binary_search_by_key(edge, |s| s.ends).is_err());
    let count = numbering.start.last().map_or(0, |&count| count as usize);
    Ok(Problem {
        masks: rules.masks,
        feature_start: numbering.start,
        allowed: vec![u8::MAX >> (8 - rules.masks); count],
        close,
        stitches,
        ties: Vec::new(),
    })
}

/// Refuses rules that mean nothing, and a policy by another name than that of the rules.
fn check(rules: &Rules, certificate: &Certificate) -> Result<(), Rejection> {
    let stitch = &rules.stitch;
    let lengths = [stitch.overlap, stitch.fragment_length, stitch.corner];
    let sound = (1..=8).contains(&rules.masks)
        && rules.spacing >= 1
        && lengths.iter().all(|&length| length >= 0)
        && stitch.overlap % 2 == 0
        && stitch.weight >= 1;
    if !sound {
        return Err(Rejection::new(
            Step::Rules,
            "1 to 8 masks, a spacing of at least 1, lengths of at least 0, an even overlap and a weight of at least 1 are needed",
        ));
    }
    let certificate::Rules::Layer(named) = &certificate.rules else {
        return Err(Rejection::new(
            Step::Rules,
            "the certificate is of a graph, the input is a layer",
        ));
    };
    let policy = match stitch.policy {
        Policy::None => "none",
        Policy::Uncovered => "uncovered",
        Policy::EveryInterval => "every-interval",
        Policy::Listed => "listed",
    };
    if named.stitch != policy {
        let named = &named.stitch;
        return Err(Rejection::new(
            Step::Stitches,
            format!("the certificate names the stitch policy {named:?}, the rules say {policy:?}"),
        ));
    }
    Ok(())
}

/// Why a line of a feature is no stitch candidate.
fn objection(
    bodies: &Bodies,
    features: &[u32],
    rules: &Rules,
    feature: u32,
    [x0, y0, x1, y1]: [i32; 4],
) -> String {
    if rules.stitch.policy == Policy::None {
        return "the policy none places no candidates".to_owned();
    }
    let own = (0..features.len() as u32).filter(|&body| features[body as usize] == feature);
    let rect = |body: u32| bodies.is_rect(body).then(|| bodies.boxes[body as usize]);
    let Some(rects) = own.map(rect).collect::<Option<Vec<Rect>>>() else {
        return "the feature has slanted edges".to_owned();
    };
    let line = Rect {
        min: Point::new(x0, y0),
        max: Point::new(x1, y1),
    };
    let runs = runs::of_feature(feature, &rects).map_or(Vec::new(), |found| found.1);
    let across = runs.iter().find_map(|run| Some((run, run.place_of(line)?)));
    match across {
        None => "it does not cross a straight run from one side to the other".to_owned(),
        Some((run, place)) => run.objection(place, &rules.stitch).unwrap_or_else(|| {
            let Rect { min, max } = run.area();
            format!(
                "the policy places none there on the run from ({}, {}) to ({}, {}), or it separates nothing",
                min.x, min.y, max.x, max.y
            )
        }),
    }
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
        let Rect { min, max } = line.line;
        let [dx, dy] = if min.x == max.x { [half, 0] } else { [0, half] };
        let wide = Rect::new(min.x - dx, min.y - dy, max.x + dx, max.y + dy);
        bodies.boxes.extend([wide; 2]);
        fragments.extend(sides);
    }
    bodies.outline.resize(bodies.boxes.len(), RECT);
    (bodies, fragments)
}
