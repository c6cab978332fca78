//! Which edges and corners of features come too close because of what they are: sides, line ends, wide features, corners.
//!
//! Two edges along one axis face each other where each is on the outside of the other, over a length that both go along. The value for their
//! kinds decides, or a row of the table of wide features: where one of them is wide over the run length, all along the other, and the gap is less than the
//! row's spacing, they are too close along what is wide. Two convex corners, each in the outward quarter of the other, are too close when their distance is
//! less than the value for corners. All of it is asked of parts of edges: those within a fragment, or within a run.

use super::distance::Within;
use super::near;
use super::outline::{Edge, Outlines};
use crate::audit::Rejection;
use crate::geometry::Rect;
use crate::layout::{Rules, WideSpacing};

/// The spacings, each with its value.
#[derive(Clone, Debug)]
pub(super) struct Values {
    /// Whatever the two are, where neither has a slanted edge.
    pub(super) least: Within,
    /// Where one of them has.
    pub(super) slanted: Within,
    /// Of two edges that face each other, by how many of them are line ends.
    edges: [i32; 3],
    corners: Within,
    wide: Vec<WideSpacing>,
}

impl Values {
    pub(super) fn new(rules: &Rules) -> Values {
        let spacings = &rules.spacings;
        let or_plain = |value: Option<i32>| value.unwrap_or(rules.spacing);
        let within = |spacing| Within {
            spacing,
            metric: spacings.metric,
        };
        let edges = [
            spacings.side_to_side,
            spacings.side_to_end,
            spacings.end_to_end,
        ]
        .map(or_plain);
        let corners = or_plain(spacings.corner_to_corner);
        let least = edges.into_iter().fold(corners, i32::min);
        Values {
            least: within(least),
            slanted: within(rules.spacing),
            edges,
            corners: within(corners),
            wide: spacings.wide.clone(),
        }
    }

    /// Whether a distance is all that matters, whatever is so far apart.
    pub(super) fn are_plain(&self) -> bool {
        let least = self.least.spacing;
        self.reach_of_edges() <= least && self.corners.spacing <= least
    }

    fn reach_of_edges(&self) -> i32 {
        let wide = self.wide.iter().map(|row| row.spacing);
        self.edges.into_iter().chain(wide).fold(0, i32::max)
    }

    /// The first and the last place of those along which two edges are too close, where each is taken as far as `parts` says.
    fn faced(&self, edges: [&Edge; 2], parts: [[i32; 2]; 2]) -> Option<[i32; 2]> {
        let [lower, upper] = match edges[0].faces_up {
            true => edges,
            false => [edges[1], edges[0]],
        };
        let gap = i64::from(upper.at) - i64::from(lower.at);
        let is_facing = lower.faces_up && !upper.faces_up && lower.upright == upper.upright;
        let joint = overlap(parts);
        if !is_facing || gap < 0 || joint[0] >= joint[1] {
            return None;
        }
        let line_ends = edges.iter().filter(|edge| edge.is_end).count();
        if gap < i64::from(self.edges[line_ends]) {
            return Some(joint);
        }
        let whole = overlap(edges.map(|edge| edge.ends));
        let rows = (self.wide.iter().enumerate()).filter(|(_, row)| gap < row.spacing.into());
        let wide = rows.flat_map(|(number, row)| {
            let is_wide =
                move |edge: &&Edge| edge.wide_length(number, whole) >= row.run_length.into();
            let edges = edges.into_iter().filter(is_wide);
            edges.filter_map(move |edge| edge.wide_places(number, joint))
        });
        wide.reduce(|one, other| [one[0].min(other[0]), one[1].max(other[1])])
    }
}

fn overlap([[a, b], [c, d]]: [[i32; 2]; 2]) -> [i32; 2] {
    [a.max(c), b.min(d)]
}

/// A part of a feature: a rectangle of the fragment, or of the run, of that number.
#[derive(Clone, Copy, Debug)]
pub(super) struct Region {
    pub(super) feature: u32,
    pub(super) owner: u32,
    pub(super) rect: Rect,
}

/// An edge from one place along to another, as part of a fragment or of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Part {
    pub(super) owner: u32,
    pub(super) edge: u32,
    pub(super) ends: [i32; 2],
}

/// A corner, as part of a fragment or of a run.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Tip {
    pub(super) owner: u32,
    pub(super) corner: u32,
}

/// Outlines, and how near they may come.
#[derive(Debug)]
pub(super) struct Facing {
    pub(super) outlines: Outlines,
    pub(super) values: Values,
}

impl Facing {
    /// What of the edges and corners is in the regions, which are closed: edges over a positive length.
    pub(super) fn within(&self, regions: &[Region]) -> Result<(Vec<Part>, Vec<Tip>), Rejection> {
        let edges = &self.outlines.edges;
        let boxes = edges.iter().map(|edge| edge.part(edge.ends));
        let parts = in_regions(boxes, regions, |number, region| {
            let edge = &edges[number as usize];
            let area = super::runs::mirrored(region.rect, edge.upright);
            let ends = overlap([edge.ends, [area.min.x, area.max.x]]);
            (edge.feature == region.feature && ends[0] < ends[1]).then_some(Part {
                owner: region.owner,
                edge: number,
                ends,
            })
        })?;
        let corners = &self.outlines.corners;
        let points = corners.iter().map(|corner| Rect {
            min: corner.at,
            max: corner.at,
        });
        let tips = in_regions(points, regions, |corner, region| {
            let own = corners[corner as usize].feature == region.feature;
            let owner = region.owner;
            own.then_some(Tip { owner, corner })
        })?;
        Ok((parts, tips))
    }

    /// What `pick` makes of each two parts of different labels that are too close, and of the places between which they are.
    pub(super) fn parts<T: Ord + Send>(
        &self,
        parts: &[Part],
        labels: &[u32],
        pick: impl Fn(u32, u32, [i32; 2]) -> Option<T> + Sync,
    ) -> Result<Vec<T>, Rejection> {
        let edge = |part: &Part| &self.outlines.edges[part.edge as usize];
        let boxes: Vec<Rect> = parts
            .iter()
            .map(|part| edge(part).part(part.ends))
            .collect();
        let close = |a: u32, b: u32| {
            let both = [a, b].map(|i| &parts[i as usize]);
            let places = self
                .values
                .faced(both.map(edge), both.map(|part| part.ends))?;
            pick(a, b, places)
        };
        near::pairs(
            &boxes,
            labels,
            (self.values.reach_of_edges() - 1).max(0),
            close,
        )
    }

    /// What `pick` makes of each two corners of different labels that are too close.
    pub(super) fn tips<T: Ord + Send>(
        &self,
        tips: &[Tip],
        labels: &[u32],
        pick: impl Fn(u32, u32) -> Option<T> + Sync,
    ) -> Result<Vec<T>, Rejection> {
        let corner = |tip: &Tip| &self.outlines.corners[tip.corner as usize];
        let boxes: Vec<Rect> = tips
            .iter()
            .map(|tip| Rect {
                min: corner(tip).at,
                max: corner(tip).at,
            })
            .collect();
        let close = |a: u32, b: u32| {
            let [one, other] = [a, b].map(|i| corner(&tips[i as usize]));
            let outwards = |from: i32, to: i32, up: bool| {
                let by = i128::from(to) - i128::from(from);
                if up { by } else { -by }
            };
            let away = [
                outwards(one.at.x, other.at.x, one.is_right),
                outwards(one.at.y, other.at.y, one.is_upper),
            ];
            let opposite = one.is_right != other.is_right && one.is_upper != other.is_upper;
            let turned = opposite && away.iter().all(|&by| by >= 0) && away != [0, 0];
            (turned && self.values.corners.holds(away))
                .then(|| pick(a, b))
                .flatten()
        };
        near::pairs(
            &boxes,
            labels,
            (self.values.corners.spacing - 1).max(0),
            close,
        )
    }
}

/// What `pick` makes of each box and region that have a point in common.
fn in_regions<T: Ord + Send>(
    boxes: impl Iterator<Item = Rect>,
    regions: &[Region],
    pick: impl Fn(u32, &Region) -> Option<T> + Sync,
) -> Result<Vec<T>, Rejection> {
    let mut all: Vec<Rect> = boxes.collect();
    let count = all.len() as u32;
    all.extend(regions.iter().map(|region| region.rect));
    let labels: Vec<u32> = (0..all.len() as u32)
        .map(|i| u32::from(i < count))
        .collect();
    near::pairs(&all, &labels, 0, |item, region| {
        pick(item, &regions[(region - count) as usize])
    })
}
