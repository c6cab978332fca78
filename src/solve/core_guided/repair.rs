//! Repair: turns a colouring that breaks few of the active softs into one that keeps them all, place by
//! place, without a model of the whole piece.
//!
//! Around a broken soft, a window is solved anew while everything beyond it stays as it is: a ring of
//! neighbours, what ties bind to it, and the rest of the clusters that reach in, is part of the formula with its masks fixed.
//! The formula keeps every soft that held there and the broken ones that the window can change.
//!
//! Lemma. Where the formula has a model, taking its masks inside the window keeps every soft that held:
//! one with a unit inside is in the formula, one without does not change. At the level of stitches the
//! same holds for what the first level made hard. So the number of broken softs falls with each repair,
//! and at none the colouring is optimal at its level ([`super::relaxation`]). (A large neighbourhood
//! search, Shaw 1998, whose moves are exact.)
//!
//! A single call on a piece of 57,000 fragments took 70 s to find a model where the tiles together took
//! 5 s to find all cores; repairs grow with the number of broken softs only.

use std::collections::BTreeMap;

use encodings::Mask;

use super::level::{Level, Relaxations};
use super::relaxation::Soft;
use super::window::Window;
use crate::solve::backend::Answer;
use crate::solve::limits::Stop;
use crate::solve::places::Places;

/// How far around a broken soft the window reaches, try by try.
const STEPS: [usize; 4] = [2, 4, 7, 11];

/// Windows of more features than this are left to a search for cores.
const MOST_FEATURES: usize = 4000;

/// So many places that cannot be mended are enough to search for cores at before going on.
const MOST_LEFT: usize = 4;

/// A colouring under repair.
pub struct Repair<'a> {
    /// The piece.
    pub places: &'a Places<'a>,
    /// The level whose softs are to be kept.
    pub level: Level,
    /// Both relaxations.
    pub relaxations: &'a Relaxations,
    /// The colouring.
    pub colours: Vec<Mask>,
    /// When to stop.
    pub stop: &'a Stop,
}

impl Repair<'_> {
    /// Mends as far as windows can; returns softs that stay broken, not more than [`MOST_LEFT`].
    pub fn mend(&mut self) -> Vec<Soft> {
        let active = self.relaxations.at(self.level).weights.active();
        let mut broken = self.broken_among(active);
        let mut left = 0;
        broken.retain(|&soft| {
            let stays = left < MOST_LEFT && !self.mend_one(soft);
            left += usize::from(stays);
            stays
        });
        broken
    }

    /// Tries windows of growing size around a soft; says whether it holds in the end.
    fn mend_one(&mut self, soft: Soft) -> bool {
        if self.broken_among([soft].into_iter()).is_empty() {
            return true;
        }
        let core = self
            .relaxations
            .features_of(self.places, self.level, &[soft]);
        for steps in STEPS {
            let free = self.places.around(&core, steps);
            if free.len() > MOST_FEATURES || self.stop.now() {
                return false;
            }
            if self.solve_anew(&free) {
                return true;
            }
        }
        false
    }

    /// Solves the window of `free` features anew, with the rest as it is.
    fn solve_anew(&mut self, free: &[u32]) -> bool {
        let is_free = |feature: u32| free.binary_search(&feature).is_ok();
        let features = self.reach(free);
        let mut window = Window::new(
            self.places,
            &features,
            self.level,
            self.relaxations,
            &self.colours,
            self.stop,
        );
        window.fix(&self.colours, |feature| !is_free(feature));
        let relaxation = self.relaxations.at(self.level);
        let broken = self.broken_among(window.weights.active());
        let kept: Vec<Soft> = window
            .weights
            .active()
            .filter(|soft| broken.binary_search(soft).is_err() || self.touches(*soft, is_free))
            .collect();
        if window.solve(relaxation, &kept) != Answer::Satisfiable {
            return false;
        }
        let mut masks = window.masks().into_iter();
        for &feature in &features {
            for fragment in self.places.instance.fragments_of(feature) {
                if let Some(mask) = masks.next()
                    && is_free(feature)
                {
                    self.colours[fragment as usize] = mask;
                }
            }
        }
        true
    }

    /// The free features, their neighbours, and all features of the clusters that reach into them.
    fn reach(&self, free: &[u32]) -> Vec<u32> {
        let mut features = self.places.around(free, 1);
        features.extend(self.places.tied_to(free));
        let levels = match self.level {
            Level::Conflicts => &[Level::Conflicts][..],
            Level::Stitches => &[Level::Conflicts, Level::Stitches][..],
        };
        for &level in levels {
            let relaxation = self.relaxations.at(level);
            let mut clusters: Vec<u32> = free
                .iter()
                .flat_map(|&feature| level.units_at(self.places, feature))
                .filter_map(|unit| relaxation.cluster_of(unit))
                .collect();
            clusters.sort_unstable();
            clusters.dedup();
            for cluster in clusters {
                for &unit in &relaxation.cluster(cluster).units {
                    features.extend(level.features_of_unit(self.places, unit));
                }
            }
        }
        features.sort_unstable();
        features.dedup();
        features
    }

    fn touches(&self, soft: Soft, is_free: impl Fn(u32) -> bool) -> bool {
        let units = self.relaxations.at(self.level).units_of(soft);
        let mut features = units
            .into_iter()
            .flat_map(|unit| self.level.features_of_unit(self.places, unit));
        features.any(is_free)
    }

    /// The broken ones among some softs, ascending as they come.
    fn broken_among(&self, softs: impl Iterator<Item = Soft>) -> Vec<Soft> {
        let violated = |unit: u32| self.level.is_violated(self.places, &self.colours, unit);
        let relaxation = self.relaxations.at(self.level);
        let mut known = BTreeMap::new();
        softs
            .filter(|&soft| relaxation.is_broken(soft, &violated, &mut known))
            .collect()
    }
}
