//! Where a stitch would help, and what is in its way.
//!
//! A feature of the core is cut, in thought, at one more place of one of its runs, whatever the stitch rules
//! say. What that changes for the core depends only on which neighbours of the core each side of the cut
//! comes close to, its overlap included: so the shadows of those neighbours, their ends shifted by half the
//! overlap, cut the run into intervals, and one place of each interval is tried ("elementary intervals" of
//! the design's section 2). The place tried is the one with the least in its way. Where the overlap fits no
//! gap between neighbours, the gap is tried with the overlap that does fit.
//!
//! Each place is tried on the core alone first, with distances taken anew; what helps there is verified in the
//! neighbourhood by the caller.

use std::collections::BTreeSet;

use super::core::Core;
use super::cut::Cut;
use super::repair::{Block, Position};
use super::site::Site;
use super::window::Window;
use super::{Layer, units};
use crate::extract::runs::{End, Run};
use crate::extract::shadows::Shadow;
use crate::extract::survey::Surveyed;
use crate::geometry::Rect;
use crate::geometry::distance::squared_gap;
use crate::layout::{Policy, StitchRules};
use crate::solve::places::Places;

/// The most places tried on one feature: those nearest to its spacings in the core.
const MOST_TRIED: usize = 32;

/// The places of a feature where a cut would let the core do with one conflict fewer, those with the
/// least in their way first, each with the feature cut there.
pub fn helpful<'s>(site: &Site<'s>, core: &Core, feature: u32) -> Vec<(Position, Cut<'s>)> {
    let ground = site.ground;
    let looked = ground
        .surveyor
        .and_then(|surveyor| surveyor.look(feature).ok()?);
    let (Some(layer), Some(surveyed)) = (ground.subject.layer, looked) else {
        return Vec::new();
    };
    if super::special(layer.rules).is_some() {
        return Vec::new();
    }
    let mut tried = all(site, &layer, feature, &surveyed);
    if tried.len() > MOST_TRIED {
        let spots = spots(site, &layer, core, feature);
        let far = |at: &Position| spots.iter().map(|spot| squared_gap(spot, &at.line)).min();
        tried.sort_by_cached_key(|at| (far(at), at.line, at.overlap));
        tried.truncate(MOST_TRIED);
    }
    let cut = |at: Position| {
        let cut = Cut::new(ground.subject, feature, &surveyed, at.line, at.overlap)?;
        helps(site, core, &cut).then_some((at, cut))
    };
    let mut helpful: Vec<(Position, Cut<'s>)> = tried.into_iter().filter_map(cut).collect();
    helpful.sort_by_key(|(at, _)| {
        let short: u64 = at.blocks.iter().map(Block::short).sum();
        (short, at.blocks.len(), at.line)
    });
    helpful
}

/// For each spacing of a feature in the core the smaller one of the two boxes.
fn spots(site: &Site<'_>, layer: &Layer<'_>, core: &Core, feature: u32) -> Vec<Rect> {
    let mut spots = Vec::new();
    for &unit in &core.units {
        let ends = units::features_of(site.ground.subject.instance, unit);
        let other = ends.into_iter().find(|&end| end != feature);
        if let (true, Some(other)) = (ends.contains(&feature), other) {
            let area = |f: u32| layer.extraction.features.box_of(f);
            let mut both = [area(feature), area(other)];
            both.sort_by_key(|area| area.width() + area.height());
            spots.push(both[0]);
        }
    }
    spots
}

/// One place of each interval of each run.
fn all(site: &Site<'_>, layer: &Layer<'_>, feature: u32, surveyed: &Surveyed) -> Vec<Position> {
    let mut found = Vec::new();
    for (run, shadows) in &surveyed.runs {
        let sides = Sides {
            layer,
            feature,
            run: *run,
            shadows,
            cuts: cuts_on(layer, feature, run),
        };
        found.extend(sides.full(&site.core));
        if sides.keeps_to_gaps() {
            found.extend(sides.narrow(&site.core));
        }
    }
    found
}

/// The places of the stitch candidates that are on a run, ascending.
fn cuts_on(layer: &Layer<'_>, feature: u32, run: &Run) -> Vec<i32> {
    let fragments = &layer.extraction.fragments;
    let cuts = fragments
        .of_feature(feature)
        .flat_map(|f| fragments.cuts_of(f));
    let along = cuts.map(|cut| (run.direction.turn(cut.line).min.x, cut.line));
    let own = along.filter(|&(place, line)| run.line(place) == line);
    let places: BTreeSet<i32> = own.map(|(place, _)| place).collect();
    places.into_iter().collect()
}

/// A run with all that decides about stitches on it.
struct Sides<'a> {
    layer: &'a Layer<'a>,
    feature: u32,
    run: Run,
    /// Sorted by where they start.
    shadows: &'a [Shadow],
    /// The candidates on it, ascending.
    cuts: Vec<i32>,
}

impl Sides<'_> {
    fn rules(&self) -> &StitchRules {
        &self.layer.rules.stitch
    }

    /// Whether the policy keeps stitches out of the shadows of neighbours: others have no such rule, and where
    /// they place no candidate it is not for a neighbour.
    fn keeps_to_gaps(&self) -> bool {
        matches!(self.rules().policy, Policy::None | Policy::Uncovered)
    }

    /// The inner places, first and last.
    fn inner(&self) -> [i64; 2] {
        [i64::from(self.run.from) + 1, i64::from(self.run.to) - 1]
    }

    /// One place of each interval that the neighbours of the core make, with the whole overlap.
    fn full(&self, core: &[u32]) -> Vec<Position> {
        let intervals = self.intervals(core, i64::from(self.rules().overlap / 2));
        intervals
            .into_iter()
            .filter_map(|ends| self.best(ends))
            .collect()
    }

    /// The intervals of places, first and last, over which neither side of a cut comes close to another
    /// neighbour of the core, when each goes `half` beyond it.
    fn intervals(&self, core: &[u32], half: i64) -> Vec<[i64; 2]> {
        let [first, last] = self.inner();
        // The first place of each interval.
        let mut starts = BTreeSet::from([first]);
        for shadow in self.shadows {
            if core.binary_search(&shadow.feature).is_ok() {
                starts.insert(i64::from(shadow.from) - half);
                starts.insert(i64::from(shadow.to) + half + 1);
            }
        }
        if first > last {
            return Vec::new();
        }
        let starts: Vec<i64> = starts.range(first..=last).copied().collect();
        let ends = starts.iter().skip(1).map(|&next| next - 1).chain([last]);
        starts
            .iter()
            .zip(ends)
            .map(|(&from, to)| [from, to])
            .collect()
    }

    /// The place of an interval with the least in its way.
    fn best(&self, [from, to]: [i64; 2]) -> Option<Position> {
        let rules = self.rules();
        let half = i64::from(rules.overlap / 2);
        let end = |end: End| match end {
            End::Line => i64::from(rules.fragment_length).max(half).max(1),
            End::Junction => (half + i64::from(rules.corner)).max(1),
        };
        let mut places = BTreeSet::from([
            from,
            from + (to - from) / 2,
            to,
            i64::from(self.run.from) + end(self.run.ends[0]),
            i64::from(self.run.to) - end(self.run.ends[1]),
        ]);
        for cut in &self.cuts {
            let [cut, length] = [*cut, rules.fragment_length].map(i64::from);
            places.extend([cut - length, cut + length]);
        }
        for [low, high] in self.gaps() {
            let [low, high] = [i64::from(low), i64::from(high)];
            places.extend([low, low + (high - low) / 2, high]);
        }
        let within = places.range(from..=to);
        let positions =
            within.filter_map(|&place| self.position(i32::try_from(place).ok()?, rules.overlap));
        positions.min_by_key(|at| {
            let short: u64 = at.blocks.iter().map(Block::short).sum();
            (at.blocks.len(), short, at.line)
        })
    }

    /// The middle of each interval that the overlap does not fit, with one that does: of those that the
    /// neighbours of the core make without any overlap, and of the gaps between all neighbours.
    fn narrow(&self, core: &[u32]) -> Vec<Position> {
        let needed = self.rules().overlap;
        let gaps = self.gaps().into_iter().map(|gap| gap.map(i64::from));
        let mut intervals: Vec<[i64; 2]> =
            self.intervals(core, 0).into_iter().chain(gaps).collect();
        intervals.sort_unstable();
        intervals.dedup();
        let [first, last] = self.inner();
        let mut found = Vec::new();
        for [low, high] in intervals {
            let place = low + (high - low) / 2;
            if high - low >= i64::from(needed) || !(first..=last).contains(&place) {
                continue;
            }
            // Both lie within the run.
            let (place, present) = (place as i32, (high - low) as i32);
            if let Some(mut at) = self.position(place, 2 * (present / 2)) {
                let is_overlap = |block: &Block| matches!(block, Block::Overlap { .. });
                at.blocks
                    .retain(|block| !is_overlap(block) && *block != Block::OtherPlace);
                at.blocks.push(Block::Overlap { needed, present });
                found.push(at);
            }
        }
        found
    }

    /// The longest intervals of places that no shadow covers, ascending.
    fn gaps(&self) -> Vec<[i32; 2]> {
        let mut found = Vec::new();
        let mut from = self.run.from;
        for shadow in self.shadows {
            if shadow.from > from {
                found.push([from, shadow.from - 1]);
            }
            from = from.max(shadow.to.saturating_add(1));
        }
        if from <= self.run.to {
            found.push([from, self.run.to]);
        }
        found
    }

    /// A place with what is in its way; nothing where there is a candidate, or where `overlap` reaches beyond
    /// the run.
    fn position(&self, place: i32, overlap: i32) -> Option<Position> {
        let room = (place - self.run.from).min(self.run.to - place);
        if self.cuts.binary_search(&place).is_ok() || room < overlap / 2 {
            return None;
        }
        let rules = self.rules();
        let mut blocks = self.rules_broken(place);
        if !self.keeps_to_gaps() {
            let is_gap =
                |block: &Block| matches!(block, Block::Neighbour { .. } | Block::Overlap { .. });
            blocks.retain(|block| !is_gap(block));
        }
        // Why a place that breaks nothing seen here is no candidate is known for gaps without keep-outs only.
        let is_known = self.keeps_to_gaps() && rules.keep_outs.is_empty();
        if blocks.is_empty() && rules.policy != Policy::None && !is_known {
            return None;
        }
        if rules.policy == Policy::None {
            blocks.insert(0, Block::NoPolicy);
        } else if blocks.is_empty() {
            blocks.push(Block::OtherPlace);
        }
        Some(Position {
            feature: self.feature,
            line: self.run.line(place),
            overlap,
            blocks,
        })
    }

    /// The neighbours, rules and candidates that are in the way.
    fn rules_broken(&self, place: i32) -> Vec<Block> {
        let rules = self.rules();
        let half = rules.overlap / 2;
        let mut blocks = Vec::new();
        match self
            .gaps()
            .iter()
            .find(|gap| (gap[0]..=gap[1]).contains(&place))
        {
            Some([low, high]) if high - low < rules.overlap => blocks.push(Block::Overlap {
                needed: rules.overlap,
                present: high - low,
            }),
            Some(_) => {}
            None => {
                let covers = |shadow: &&Shadow| (shadow.from..=shadow.to).contains(&place);
                let over = self
                    .shadows
                    .iter()
                    .filter(covers)
                    .map(|shadow| shadow.feature);
                let over: BTreeSet<u32> = over.collect();
                blocks.extend(over.into_iter().map(|feature| Block::Neighbour { feature }));
            }
        }
        let rooms = [place - self.run.from, self.run.to - place];
        for (room, end) in rooms.into_iter().zip(self.run.ends) {
            match end {
                End::Line if room < rules.fragment_length.max(half) => {
                    blocks.push(Block::FragmentLength {
                        needed: rules.fragment_length.max(half),
                        present: room,
                    });
                }
                End::Junction if room < half.saturating_add(rules.corner) => {
                    blocks.push(Block::Corner {
                        needed: rules.corner,
                        present: (room - half).max(0),
                    });
                }
                End::Line | End::Junction => {}
            }
        }
        let to_next = self.cuts.iter().map(|cut| cut.abs_diff(place)).min();
        if let Some(length) = to_next.filter(|&l| l < rules.fragment_length.unsigned_abs()) {
            blocks.push(Block::FragmentLength {
                needed: rules.fragment_length,
                present: length as i32,
            });
        }
        blocks
    }
}

/// Whether the core does with one conflict fewer when its feature is cut there too.
fn helps(site: &Site<'_>, core: &Core, cut: &Cut<'_>) -> bool {
    let in_core = |unit: u32| core.units.binary_search(&unit).is_ok();
    let local = cut.problem(site.ground.places, &site.core, &in_core, false);
    let Some(local) = local else { return false };
    let places = Places::new(&local.instance);
    let free: Vec<u32> = (0..local.global.len() as u32).collect();
    let window = Window {
        places: &places,
        free: &free,
        mask: &|_| 0,
        released: &|_| false,
        group: &|_| Some(0),
        budget: &|_| core.limit.saturating_sub(1),
    };
    window.is_colourable(&site.left, site.ground.stop) == Some(true)
}

/// The box that is shown of a place: what both sides of the stitch would cover.
pub fn cover(at: &Position) -> Rect {
    let half = at.overlap / 2;
    let Rect { min, max } = at.line;
    if min.x == max.x {
        Rect::new(min.x - half, min.y, max.x + half, max.y)
    } else {
        Rect::new(min.x, min.y - half, max.x, max.y + half)
    }
}
