//! A core in the words of the user: its features and spacings, with coordinates where there is a
//! layout.

use encodings::{Instance, MaskSet};

use super::core::Core;
use super::gap::{self, Gap, Region};
use super::repair::Repair;
use super::shape::{self, Shape};
use super::{Subject, units};
use crate::geometry::Rect;

/// A place that needs conflicts.
#[derive(Clone, Debug)]
pub struct Place {
    /// Its number, from 1: that of its bound in the certificate, counted from 1.
    pub number: usize,
    /// Its irreducible core.
    pub core: Core,
    /// What the core looks like.
    pub shape: Shape,
    /// The features of the core, ascending.
    pub features: Vec<Feature>,
    /// The spacings of the core, in the order of its units.
    pub spacings: Vec<Spacing>,
    /// What would make it need fewer conflicts, in the order of [`super::repair`].
    pub repairs: Vec<Repair>,
}

/// A feature of a core.
#[derive(Clone, Debug)]
pub struct Feature {
    /// Its number.
    pub number: u32,
    /// Its fragments that take part, numbered from 0 within it.
    pub fragments: Vec<u32>,
    /// How many fragments it has.
    pub of: u32,
    /// The box around it; nothing for graphs.
    pub area: Option<Rect>,
    /// Whether some of its fragments that take part may not take every mask.
    pub is_restricted: bool,
}

/// A spacing of a core.
#[derive(Clone, Debug)]
pub struct Spacing {
    /// Its unit of conflict.
    pub unit: u32,
    /// The two features, smaller one first; the same one twice for a self-spacing.
    pub features: [u32; 2],
    /// The two fragments of a self-spacing, numbered from 0 within the feature.
    pub fragments: Option<[u32; 2]>,
    /// How far the two are apart; nothing for graphs.
    pub gap: Option<Gap>,
}

impl Place {
    /// The box around all spacings, or nothing for graphs.
    pub fn area(&self) -> Option<Rect> {
        let gaps = self.spacings.iter().filter_map(|spacing| spacing.gap);
        let boxes = gaps.map(|gap| gap::box_between(gap.boxes));
        boxes.reduce(|all, one| all.union(&one))
    }

    /// The features that take part with several fragments, ascending.
    pub fn split(&self) -> impl Iterator<Item = &Feature> {
        self.features.iter().filter(|f| f.fragments.len() > 1)
    }

    /// How many of its spacings are self-spacings.
    pub fn self_spacings(&self) -> usize {
        let own = |spacing: &&Spacing| spacing.fragments.is_some();
        self.spacings.iter().filter(own).count()
    }
}

/// Describes a core.
pub(super) fn of(subject: &Subject<'_>, number: usize, core: Core) -> Place {
    let instance = subject.instance;
    let features = units::features(instance, &core.units);
    Place {
        number,
        shape: shape::of(instance, &core),
        features: (features.into_iter())
            .map(|feature| of_feature(subject, &core, feature))
            .collect(),
        spacings: (core.units.iter())
            .map(|&unit| of_unit(subject, unit))
            .collect(),
        repairs: Vec::new(),
        core,
    }
}

fn of_feature(subject: &Subject<'_>, core: &Core, feature: u32) -> Feature {
    let instance = subject.instance;
    let own = instance.fragments_of(feature);
    let mut fragments: Vec<u32> = (core.edges.iter().flatten().flatten())
        .copied()
        .filter(|fragment| own.contains(fragment))
        .collect();
    fragments.sort_unstable();
    fragments.dedup();
    let all = MaskSet::all(instance.masks());
    Feature {
        number: feature,
        is_restricted: fragments.iter().any(|&f| instance.allowed(f) != all),
        fragments: fragments.iter().map(|f| f - own.start).collect(),
        of: own.len() as u32,
        area: (subject.layer).map(|layer| layer.extraction.features.box_of(feature)),
    }
}

fn of_unit(subject: &Subject<'_>, unit: u32) -> Spacing {
    let instance = subject.instance;
    let (fragments, gap) = closest(subject, unit);
    Spacing {
        unit,
        features: units::features_of(instance, unit),
        fragments,
        gap,
    }
}

/// The closest two features or fragments of a unit: how far they are apart, and for self-spacings the two
/// fragments, numbered within the feature.
fn closest(subject: &Subject<'_>, unit: u32) -> (Option<[u32; 2]>, Option<Gap>) {
    let instance = subject.instance;
    let gap = |regions: [Vec<Region>; 2]| {
        let rules = subject.layer?.rules;
        // What is close along the axes may be farther apart by the straight line, by less than twice as much.
        let below = match rules.has_one_spacing() {
            true => rules.spacing,
            false => rules.farthest_spacing().saturating_mul(2),
        };
        gap::between(&regions[0], &regions[1], below)
    };
    let Some(layer) = subject.layer else {
        let edge = units::edges(instance, unit)[0];
        return (own_fragments(instance, unit, edge), None);
    };
    if !units::is_self_spacing(instance, unit) {
        let features = units::features_of(instance, unit);
        let regions = features.map(|feature| gap::of_feature(&layer, feature));
        return (None, gap(regions));
    }
    let mut best: Option<([u32; 2], Option<Gap>)> = None;
    for &edge in units::edges(instance, unit) {
        let found = gap(edge.map(|fragment| gap::of_fragment(&layer, fragment)));
        let is_less = match (&best, &found) {
            (None, _) | (Some((_, None)), Some(_)) => true,
            (Some((_, Some(before))), Some(now)) => now.is_less(before),
            _ => false,
        };
        if is_less {
            best = Some((edge, found));
        }
    }
    let edge = best.and_then(|(edge, _)| own_fragments(instance, unit, edge));
    (edge, best.and_then(|(_, gap)| gap))
}

/// The fragments of a self-spacing, numbered within the feature.
fn own_fragments(instance: &Instance, unit: u32, edge: [u32; 2]) -> Option<[u32; 2]> {
    let [feature, _] = units::features_of(instance, unit);
    let first = instance.fragments_of(feature).start;
    units::is_self_spacing(instance, unit).then(|| edge.map(|fragment| fragment - first))
}
