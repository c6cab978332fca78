//! A feature cut at one more place, and what that changes: the fragment that is divided, and the units of
//! conflict at it. All other fragments, of this feature and of others, stay as they are.
//!
//! Both sides of the new cut are extended by half of its overlap, which stays on the run; so they cover nothing
//! that the divided fragment did not, and can only be close to what that was close to.

use encodings::{Instance, InstanceBuilder};

use super::gap::{self, Region};
use super::local::Local;
use super::{Layer, Subject};
use crate::extract::cutting::{Candidate, Cutting, Split, cut};
use crate::extract::survey::Surveyed;
use crate::geometry::Rect;
use crate::solve::places::Places;

/// A feature with one more cut.
pub struct Cut<'a> {
    subject: &'a Subject<'a>,
    layer: Layer<'a>,
    feature: u32,
    split: Split,
    line: Rect,
    overlap: i32,
    /// For each of its fragments the one of the whole that is the same; two have none.
    same: Vec<Option<u32>>,
    /// The fragment of the whole that is divided.
    divided: u32,
}

impl<'a> Cut<'a> {
    /// Cuts `feature` at `line` too. `None` where that separates nothing.
    pub fn new(
        subject: &'a Subject<'a>,
        feature: u32,
        surveyed: &Surveyed,
        line: Rect,
        overlap: i32,
    ) -> Option<Cut<'a>> {
        let layer = subject.layer?;
        let fragments = &layer.extraction.fragments;
        let own = fragments.of_feature(feature);
        let mut lines: Vec<Rect> = own
            .clone()
            .flat_map(|fragment| fragments.cuts_of(fragment))
            .map(|cut| cut.line)
            .chain([line])
            .collect();
        lines.sort_unstable();
        lines.dedup();
        let mut candidates = Vec::with_capacity(lines.len());
        for &(run, _) in &surveyed.runs {
            let area = run.direction.turn(run.along());
            for line in lines.iter().filter(|line| area.covers(line)) {
                let place = run.direction.turn(*line).min.x;
                if run.line(place) == *line && run.from < place && place < run.to {
                    candidates.push(Candidate { run, place });
                }
            }
        }
        let Cutting::Split(split) = cut(&surveyed.cells, &candidates) else {
            return None;
        };
        let same: Vec<Option<u32>> = (split.fragments.iter())
            .map(|cells| own.clone().find(|&f| fragments.cells_of(f) == &cells[..]))
            .collect();
        let mut gone = own.filter(|&fragment| !same.contains(&Some(fragment)));
        let divided = gone.next()?;
        let is_one_in_two = gone.next().is_none()
            && same.iter().filter(|same| same.is_none()).count() == 2
            && split.cuts.iter().any(|cut| cut.line == line);
        is_one_in_two.then_some(Cut {
            subject,
            layer,
            feature,
            split,
            line,
            overlap,
            same,
            divided,
        })
    }

    /// The problem of some features, ascending, this one among them: all units between them that `kept`
    /// names, and self-spacings that are new where `with_new` says so.
    pub fn problem(
        &self,
        places: &Places<'_>,
        features: &[u32],
        kept: &dyn Fn(u32) -> bool,
        with_new: bool,
    ) -> Option<Local> {
        let instance = self.subject.instance;
        let mut builder = InstanceBuilder::new(instance.masks());
        let mut whole = Vec::new();
        let mut first = Vec::with_capacity(features.len());
        for &feature in features {
            first.push(whole.len() as u32);
            if feature == self.feature {
                whole.extend(&self.same);
            } else {
                whole.extend(instance.fragments_of(feature).map(Some));
            }
            builder.feature(whole.len() as u32 - first[first.len() - 1]);
        }
        for (local, fragment) in (0u32..).zip(&whole) {
            builder.allow(local, instance.allowed(fragment.unwrap_or(self.divided)));
        }
        let numbering = Numbering {
            instance,
            features,
            first: &first,
            cut: self,
        };
        for &feature in features {
            self.units_of(places, feature, &numbering, kept, &mut builder);
        }
        self.own(places, &numbering, kept, with_new, &mut builder);
        Some(Local {
            instance: builder.build().ok()?,
            global: features.to_vec(),
            whole,
        })
    }

    /// The pairs of a feature with larger ones, and what is within it unless it is the one that is cut.
    fn units_of(
        &self,
        places: &Places<'_>,
        feature: u32,
        numbering: &Numbering<'_>,
        kept: &dyn Fn(u32) -> bool,
        builder: &mut InstanceBuilder,
    ) {
        let instance = self.subject.instance;
        for &(other, pair) in places.neighbours(feature) {
            if other < feature || numbering.place(other).is_none() || !kept(pair) {
                continue;
            }
            let edges = instance.pair(pair).iter();
            let edges: Vec<[u32; 2]> = edges
                .flat_map(|&edge| self.edges(numbering, edge))
                .collect();
            if !edges.is_empty() {
                builder.pair(edges);
            }
        }
        if feature == self.feature {
            return;
        }
        for &i in places.stitches(feature) {
            let stitch = instance.stitches()[i as usize];
            if let (Some(a), Some(b)) = (numbering.of(stitch.a), numbering.of(stitch.b)) {
                builder.stitch(a, b, stitch.weight);
            }
        }
        for edge in places.self_spacings(feature) {
            let is_kept = places.self_unit(feature).is_some_and(kept);
            if let ([Some(a), Some(b)], true) = (edge.map(|f| numbering.of(f)), is_kept) {
                builder.self_spacing(a, b);
            }
        }
    }

    /// What becomes of a fragment edge.
    fn edges(&self, numbering: &Numbering<'_>, [a, b]: [u32; 2]) -> Vec<[u32; 2]> {
        let other = match self.divided {
            f if f == a => b,
            f if f == b => a,
            _ => {
                let both = numbering.of(a).zip(numbering.of(b));
                return both.into_iter().map(|(a, b)| [a, b]).collect();
            }
        };
        let other_regions = self.regions_of(other);
        let Some(other) = numbering.of(other) else {
            return Vec::new();
        };
        let sides = self
            .sides()
            .filter(|&side| self.is_close(side, &other_regions));
        sides
            .filter_map(|side| Some([numbering.own(side)?, other]))
            .collect()
    }

    /// The stitch edges and self-spacings of the feature.
    fn own(
        &self,
        places: &Places<'_>,
        numbering: &Numbering<'_>,
        kept: &dyn Fn(u32) -> bool,
        with_new: bool,
        builder: &mut InstanceBuilder,
    ) {
        let mut stitches: Vec<[u32; 2]> = (self.split.cuts.iter())
            .map(|cut| {
                [
                    cut.sides[0].min(cut.sides[1]),
                    cut.sides[0].max(cut.sides[1]),
                ]
            })
            .collect();
        stitches.sort_unstable();
        stitches.dedup();
        for ends in &stitches {
            if let [Some(a), Some(b)] = ends.map(|side| numbering.own(side)) {
                builder.stitch(a, b, 1);
            }
        }
        let instance = self.subject.instance;
        if places.self_unit(self.feature).is_some_and(kept) {
            for &edge in places.self_spacings(self.feature) {
                for [a, b] in self.edges(numbering, edge) {
                    builder.self_spacing(a, b);
                }
            }
        }
        if !with_new {
            return;
        }
        // What a stitch edge joined to the divided fragment is joined to one of its parts now.
        for &i in places.stitches(self.feature) {
            let stitch = instance.stitches()[i as usize];
            let other = match self.divided {
                f if f == stitch.a => stitch.b,
                f if f == stitch.b => stitch.a,
                _ => continue,
            };
            let Some(there) = self.same.iter().position(|&same| same == Some(other)) else {
                continue;
            };
            let regions = self.regions_of(other);
            for side in self.sides() {
                let there = there as u32;
                let ends = [side.min(there), side.max(there)];
                if stitches.binary_search(&ends).is_err()
                    && self.is_close(side, &regions)
                    && let [Some(a), Some(b)] = ends.map(|side| numbering.own(side))
                {
                    builder.self_spacing(a, b);
                }
            }
        }
    }

    /// The two parts of the divided fragment, numbered within the feature.
    fn sides(&self) -> impl Iterator<Item = u32> + '_ {
        (0u32..)
            .zip(&self.same)
            .filter(|(_, same)| same.is_none())
            .map(|(side, _)| side)
    }

    fn regions_of(&self, fragment: u32) -> Vec<Region> {
        gap::of_fragment(&self.layer, fragment)
    }

    fn is_close(&self, side: u32, other: &[Region]) -> bool {
        let half = self.layer.extraction.fragments.half_overlap();
        let overlaps = self
            .split
            .cuts
            .iter()
            .filter(|cut| cut.sides.contains(&side));
        let overlaps = overlaps.map(|cut| {
            let is_new = cut.line == self.line;
            cut.overlap(if is_new { self.overlap / 2 } else { half })
        });
        let cells = self
            .split
            .fragments
            .get(side as usize)
            .into_iter()
            .flatten();
        let regions: Vec<Region> = cells.copied().chain(overlaps).map(Region::Rect).collect();
        gap::between(&regions, other, self.layer.rules.spacing).is_some()
    }
}

/// Fragments of the whole in the numbers of the problem.
struct Numbering<'a> {
    instance: &'a Instance,
    features: &'a [u32],
    first: &'a [u32],
    cut: &'a Cut<'a>,
}

impl Numbering<'_> {
    fn place(&self, feature: u32) -> Option<usize> {
        self.features.binary_search(&feature).ok()
    }

    /// A fragment of the whole; none for the one that is divided.
    fn of(&self, fragment: u32) -> Option<u32> {
        let feature = self.instance.feature_of(fragment);
        let first = self.first[self.place(feature)?];
        if feature != self.cut.feature {
            return Some(first + fragment - self.instance.fragments_of(feature).start);
        }
        let within = self
            .cut
            .same
            .iter()
            .position(|&same| same == Some(fragment))?;
        Some(first + within as u32)
    }

    /// A fragment of the feature that is cut, by its number within it.
    fn own(&self, within: u32) -> Option<u32> {
        Some(self.first[self.place(self.cut.feature)?] + within)
    }
}
