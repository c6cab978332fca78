//! The fragments of a layer: features cut at their stitch candidates.
//!
//! An unsplit feature is one fragment and keeps its shapes. A split feature runs along the axes; each of its
//! fragments is a set of disjoint rectangles, the slab cells of the feature between its cut lines. Cut
//! lines cross the whole width of a straight run. Where the two sides of a cut are on different masks, both
//! are drawn with half the overlap beyond the line; distances are always taken with it.

use super::Features;
use crate::geometry::{Point, Rect};
use encodings::Mask;

/// A stitch candidate.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Cut {
    /// The cut line, a rectangle of no width or no height.
    pub line: Rect,
    /// The fragments to the left (below) and to the right (above) of it. They differ.
    pub sides: [u32; 2],
}

impl Cut {
    /// What both sides of the cut cover when it is a stitch: the line, `half` of the overlap to each side.
    pub fn overlap(&self, half: i32) -> Rect {
        let Rect { min, max } = self.line;
        if min.x == max.x {
            Rect::new(min.x - half, min.y, max.x + half, max.y)
        } else {
            Rect::new(min.x, min.y - half, max.x, max.y + half)
        }
    }

    /// The middle of the cut line, rounded down to the grid.
    pub fn middle(&self) -> Point {
        let half_way = |a: i32, b: i32| a + (b - a) / 2;
        let Rect { min, max } = self.line;
        Point::new(half_way(min.x, max.x), half_way(min.y, max.y))
    }
}

/// A hard constraint: at most `most` of some cuts are stitches.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Limit {
    /// How many may be.
    pub most: u32,
    /// The cuts of one feature, ascending, by their places in [`Fragments::cuts`].
    pub cuts: Vec<u32>,
}

/// What a fragment is drawn as.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Drawing<'a> {
    /// The shapes of the layout with these numbers, ascending.
    Shapes(&'a [u32]),
    /// Rectangles, which may overlap.
    Rects(Vec<Rect>),
}

/// The fragments of all features: 4 bytes a feature, and for split layers 16 a cell and 28 a cut.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fragments {
    feature_start: Vec<u32>,
    /// Where the cells of each fragment start; empty when no feature is split.
    cell_start: Vec<u32>,
    cells: Vec<Rect>,
    cuts: Vec<Cut>,
    /// Where the cuts of each fragment start in `cuts_at`; empty when no feature is split.
    cut_start: Vec<u32>,
    cuts_at: Vec<u32>,
    limits: Vec<Limit>,
    half_overlap: i32,
}

impl Fragments {
    /// One fragment for each of `features` features.
    pub fn unsplit(features: usize) -> Fragments {
        Fragments {
            feature_start: (0..=features as u32).collect(),
            cell_start: Vec::new(),
            cells: Vec::new(),
            cuts: Vec::new(),
            cut_start: Vec::new(),
            cuts_at: Vec::new(),
            limits: Vec::new(),
            half_overlap: 0,
        }
    }

    /// How many fragments there are.
    pub fn len(&self) -> usize {
        self.feature_start.last().map_or(0, |&end| end as usize)
    }

    /// Whether there is no fragment.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// How many features there are.
    pub fn feature_count(&self) -> usize {
        self.feature_start.len() - 1
    }

    /// The fragments of a feature, in order along it.
    pub fn of_feature(&self, feature: u32) -> std::ops::Range<u32> {
        self.feature_start[feature as usize]..self.feature_start[feature as usize + 1]
    }

    /// The feature of a fragment.
    pub fn feature_of(&self, fragment: u32) -> u32 {
        self.feature_start
            .partition_point(|&start| start <= fragment) as u32
            - 1
    }

    /// The disjoint rectangles of a fragment of a split feature, overlaps not counted; none for the
    /// fragment of an unsplit feature.
    pub fn cells_of(&self, fragment: u32) -> &[Rect] {
        let fragment = fragment as usize;
        match self.cell_start.get(fragment..=fragment + 1) {
            Some(&[start, end]) => &self.cells[start as usize..end as usize],
            _ => &[],
        }
    }

    /// Whether the fragment is part of a split feature.
    pub fn is_split(&self, fragment: u32) -> bool {
        !self.cells_of(fragment).is_empty()
    }

    /// All stitch candidates, by feature and then along it.
    pub fn cuts(&self) -> &[Cut] {
        &self.cuts
    }

    /// The stitch candidates at a fragment.
    pub fn cuts_of(&self, fragment: u32) -> impl Iterator<Item = &Cut> {
        let fragment = fragment as usize;
        let at = match self.cut_start.get(fragment..=fragment + 1) {
            Some(&[start, end]) => &self.cuts_at[start as usize..end as usize],
            _ => &[],
        };
        at.iter().map(|&cut| &self.cuts[cut as usize])
    }

    /// The hard constraints of stitches, by feature.
    pub fn limits(&self) -> &[Limit] {
        &self.limits
    }

    /// Half the overlap of a stitch, in database units.
    pub fn half_overlap(&self) -> i32 {
        self.half_overlap
    }

    /// The rectangles that distances of a fragment of a split feature are taken from: its cells, and the
    /// overlaps of all its cuts.
    pub fn reach_of(&self, fragment: u32) -> impl Iterator<Item = Rect> {
        let overlaps = self
            .cuts_of(fragment)
            .map(|cut| cut.overlap(self.half_overlap));
        self.cells_of(fragment).iter().copied().chain(overlaps)
    }

    /// What a fragment is drawn as under a colouring (a mask a fragment): its shapes, or its cells and the
    /// overlaps of those of its cuts whose sides differ.
    pub fn drawing<'a>(
        &self,
        features: &'a Features,
        fragment: u32,
        colouring: &[Mask],
    ) -> Drawing<'a> {
        if !self.is_split(fragment) {
            return Drawing::Shapes(features.shapes_of(self.feature_of(fragment)));
        }
        let stitches = self.cuts_of(fragment).filter(|cut| {
            let [a, b] = cut.sides.map(|side| colouring.get(side as usize));
            a != b
        });
        let overlaps = stitches.map(|cut| cut.overlap(self.half_overlap));
        Drawing::Rects(
            self.cells_of(fragment)
                .iter()
                .copied()
                .chain(overlaps)
                .collect(),
        )
    }
}

/// Collects [`Fragments`] feature by feature.
#[derive(Clone, Debug)]
pub struct FragmentsBuilder {
    built: Fragments,
    /// The first cut of the feature added last.
    first_cut: u32,
}

impl FragmentsBuilder {
    /// No features yet; each side of a stitch goes `half_overlap` beyond its line.
    pub fn new(half_overlap: i32) -> FragmentsBuilder {
        let mut built = Fragments::unsplit(0);
        built.cell_start.push(0);
        built.half_overlap = half_overlap;
        FragmentsBuilder {
            built,
            first_cut: 0,
        }
    }

    /// Adds an unsplit feature.
    pub fn unsplit(&mut self) {
        self.split([[]], []);
    }

    /// Adds a split feature: the cells of each of its fragments, and its cuts with sides numbered from 0 in
    /// the feature.
    pub fn split<Cells: IntoIterator<Item = Rect>>(
        &mut self,
        fragments: impl IntoIterator<Item = Cells>,
        cuts: impl IntoIterator<Item = Cut>,
    ) {
        let built = &mut self.built;
        let first = built.len() as u32;
        for cells in fragments {
            built.cells.extend(cells);
            built.cell_start.push(built.cells.len() as u32);
        }
        built.feature_start.push(built.cell_start.len() as u32 - 1);
        self.first_cut = built.cuts.len() as u32;
        built.cuts.extend(cuts.into_iter().map(|cut| Cut {
            line: cut.line,
            sides: cut.sides.map(|side| first + side),
        }));
    }

    /// Adds limits of the feature added last, with cuts numbered from 0 in it.
    pub fn limit(&mut self, limits: impl IntoIterator<Item = Limit>) {
        let first = self.first_cut;
        self.built
            .limits
            .extend(limits.into_iter().map(|limit| Limit {
                most: limit.most,
                cuts: limit.cuts.into_iter().map(|cut| first + cut).collect(),
            }));
    }

    /// The fragments of all features added.
    pub fn build(self) -> Fragments {
        let mut built = self.built;
        if built.cuts.is_empty() {
            built.cell_start = Vec::new();
            return built;
        }
        let mut sides: Vec<(u32, u32)> = (0u32..)
            .zip(&built.cuts)
            .flat_map(|(i, cut)| cut.sides.map(|side| (side, i)))
            .collect();
        sides.sort_unstable();
        let starts = 0..=built.len() as u32;
        built.cut_start = starts
            .map(|fragment| sides.partition_point(|&(side, _)| side < fragment) as u32)
            .collect();
        built.cuts_at = sides.into_iter().map(|(_, cut)| cut).collect();
        built
    }
}
