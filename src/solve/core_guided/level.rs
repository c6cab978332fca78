//! The two levels of cost, what their units are, and the relaxation of each.

use encodings::Mask;

use super::relaxation::{Relaxation, Soft};
use crate::solve::places::Places;

/// Which cost a window speaks of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Level {
    /// Units of conflict; stitches are free.
    Conflicts,
    /// Stitches; conflicts stay at their least number.
    Stitches,
}

impl Level {
    /// The units of the level at a feature.
    pub fn units_at(self, places: &Places<'_>, feature: u32) -> Vec<u32> {
        match self {
            Level::Conflicts => places.units_of_conflict(feature).collect(),
            Level::Stitches => places.stitches(feature).to_vec(),
        }
    }

    /// The features that a unit of the level joins (one, twice, for what lies within a feature).
    pub fn features_of_unit(self, places: &Places<'_>, unit: u32) -> [u32; 2] {
        match self {
            Level::Conflicts => places.features_of_unit(unit),
            Level::Stitches => {
                let stitch = places.instance.stitches()[unit as usize];
                [places.instance.feature_of(stitch.a); 2]
            }
        }
    }

    /// Whether a colouring violates a unit of the level.
    pub fn is_violated(self, places: &Places<'_>, colours: &[Mask], unit: u32) -> bool {
        match self {
            Level::Conflicts => places.is_unresolved(unit, colours),
            Level::Stitches => {
                let stitch = places.instance.stitches()[unit as usize];
                colours[stitch.a as usize] != colours[stitch.b as usize]
            }
        }
    }
}

/// The relaxations of both levels.
pub struct Relaxations {
    /// Units of conflict.
    pub conflicts: Relaxation,
    /// Stitches.
    pub stitches: Relaxation,
}

impl Relaxations {
    /// The relaxation of a level.
    pub fn at(&self, level: Level) -> &Relaxation {
        match level {
            Level::Conflicts => &self.conflicts,
            Level::Stitches => &self.stitches,
        }
    }

    /// The relaxation of a level, to change it.
    pub fn at_mut(&mut self, level: Level) -> &mut Relaxation {
        match level {
            Level::Conflicts => &mut self.conflicts,
            Level::Stitches => &mut self.stitches,
        }
    }

    /// The features that the clusters of some softs touch, ascending.
    pub fn features_of(&self, places: &Places<'_>, level: Level, softs: &[Soft]) -> Vec<u32> {
        let relaxation = self.at(level);
        let units =
            softs
                .iter()
                .flat_map(|&soft| match relaxation.cluster_of(relaxation.lead(soft)) {
                    Some(cluster) => relaxation.cluster(cluster).units.clone(),
                    None => relaxation.units_of(soft),
                });
        let mut features: Vec<u32> = units
            .flat_map(|unit| level.features_of_unit(places, unit))
            .collect();
        features.sort_unstable();
        features.dedup();
        features
    }
}
