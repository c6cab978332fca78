//! The surroundings of a place, and the question that every repair has to answer: with it in place, is there
//! a colouring of the whole with fewer conflicts?
//!
//! Some features around the place are coloured anew, all others keep their masks ([`super::window`]). So a
//! colouring that is found is one of the whole, whose conflicts are counted exactly: nothing is concluded from the
//! neighbourhood alone. Spacings are taken away in the instance itself. For a stitch the feature is cut and
//! the distances of its two sides taken anew ([`super::cut`]). For movements the neighbourhood is extracted
//! again, up to features so far away that nothing about those which are looked at can change ([`super::local`]).
//!
//! Where the colouring of the certificate is not proven to be the best, the neighbourhood is first coloured as
//! well as it can be without the repair, so that only what the repair gains counts.

use std::cell::RefCell;
use std::collections::{BTreeSet, HashMap};
use std::rc::Rc;

use super::cut::Cut;
use super::gap::{self, Gap, Region};
use super::local::Local;
use super::repair::{Movement, Obstacle};
use super::window::Window;
use super::{Layer, Subject, units};
use crate::extract::survey::Surveyor;
use crate::geometry::Rect;
use crate::geometry::rtree::{PackedTree, Visitor};
use crate::solve::Stop;
use crate::solve::places::Places;

/// How many steps from the place features are coloured anew: first the fewer, then the more.
const STEPS: [usize; 2] = [1, 3];

/// Features with more neighbours than this are not gone beyond.
const MOST_NEIGHBOURS: usize = 32;

/// No more features than this are coloured anew, those of the repair itself apart.
const MOST_FREE: usize = 160;

/// What all places of a subject share.
pub struct Ground<'a> {
    /// What is explained.
    pub subject: &'a Subject<'a>,
    /// Its features and what joins them.
    pub places: &'a Places<'a>,
    /// Whether no colouring has fewer conflicts than the one given.
    pub is_best: bool,
    /// Where the features of a layer could be cut.
    pub surveyor: Option<&'a Surveyor<'a>>,
    /// The boxes of all features.
    boxes: PackedTree,
    /// When to stop.
    pub stop: &'a Stop,
}

impl<'a> Ground<'a> {
    /// Prepares what all places share.
    pub fn new(
        subject: &'a Subject<'a>,
        places: &'a Places<'a>,
        surveyor: Option<&'a Surveyor<'a>>,
        is_best: bool,
        stop: &'a Stop,
    ) -> Ground<'a> {
        let boxes = subject.layer.map_or(Vec::new(), |layer| {
            let features = &layer.extraction.features;
            let all = 0..features.len() as u32;
            all.map(|feature| features.box_of(feature)).collect()
        });
        Ground {
            subject,
            places,
            is_best,
            surveyor,
            boxes: PackedTree::new(boxes),
            stop,
        }
    }

    /// The features whose boxes share a point with `area`, ascending.
    fn near(&self, area: &Rect) -> Vec<u32> {
        let mut found = Found(Vec::new());
        self.boxes.query(area, &mut found);
        found.0
    }
}

struct Found(Vec<u32>);

impl Visitor for Found {
    fn enter(&mut self, _: usize) -> bool {
        true
    }

    fn visit(&mut self, item: u32) {
        self.0.push(item);
    }
}

/// The surroundings of one place.
pub struct Site<'a> {
    /// What all places share.
    pub ground: &'a Ground<'a>,
    /// The features of its core, ascending.
    pub core: Vec<u32>,
    regions: RefCell<HashMap<u32, Rc<Vec<Region>>>>,
    least: RefCell<HashMap<Vec<u32>, u64>>,
}

impl<'a> Site<'a> {
    /// The surroundings of some features, ascending.
    pub fn new(ground: &'a Ground<'a>, core: Vec<u32>) -> Site<'a> {
        Site {
            ground,
            core,
            regions: RefCell::default(),
            least: RefCell::default(),
        }
    }

    /// What a feature covers.
    pub fn regions(&self, layer: &Layer<'_>, feature: u32) -> Rc<Vec<Region>> {
        let mut known = self.regions.borrow_mut();
        let regions = known
            .entry(feature)
            .or_insert_with(|| Rc::new(gap::of_feature(layer, feature)));
        Rc::clone(regions)
    }

    /// Some features and those around them, ascending.
    fn around(&self, features: &[u32], steps: usize) -> Vec<u32> {
        let places = self.ground.places;
        let mut found: BTreeSet<u32> = features.iter().copied().collect();
        let most = MOST_FREE.max(found.len());
        let mut edge: Vec<u32> = found.iter().copied().collect();
        for _ in 0..steps {
            let mut next = Vec::new();
            for feature in edge {
                let near = places.neighbours(feature);
                if near.len() > MOST_NEIGHBOURS {
                    continue;
                }
                for &(other, _) in near {
                    if found.len() < most && found.insert(other) {
                        next.push(other);
                    }
                }
            }
            edge = next;
        }
        found.into_iter().collect()
    }

    /// How many units with an end among `free` are violated, at best.
    fn least(&self, free: &[u32]) -> u64 {
        if let Some(&least) = self.least.borrow().get(free) {
            return least;
        }
        let (places, colouring) = (self.ground.places, self.ground.subject.colouring);
        let units = free.iter().flat_map(|&f| places.units_of_conflict(f));
        let units: BTreeSet<u32> = units.collect();
        let violated = |unit: &&u32| places.is_unresolved(**unit, colouring);
        let mut least = units.iter().filter(violated).count() as u64;
        if !self.ground.is_best {
            while least > 0 && self.can_do_with(free, &[], least - 1) {
                least -= 1;
            }
        }
        self.least.borrow_mut().insert(free.to_vec(), least);
        least
    }

    /// Whether the free features can be coloured with so many conflicts once these units are released.
    fn can_do_with(&self, free: &[u32], released: &[u32], most: u64) -> bool {
        let colouring = self.ground.subject.colouring;
        let window = Window {
            places: self.ground.places,
            free,
            mask: &|fragment| colouring[fragment as usize],
            released: &|unit| released.contains(&unit),
            strict: &|_| false,
        };
        window.can_do_with(most, self.ground.stop) == Some(true)
    }

    /// Whether there are `by` conflicts fewer once these units are released, whatever else they
    /// violate.
    pub fn releases(&self, released: &[u32], by: u64) -> bool {
        STEPS.iter().any(|&steps| {
            let free = self.around(&self.core, steps);
            let most = self.least(&free).checked_sub(by);
            most.is_some_and(|most| self.can_do_with(&free, released, most))
        })
    }

    /// Whether there are `by` conflicts fewer once the features are moved; none may come closer to another one
    /// than `closest`, and none of the spacings that are new may be violated.
    ///
    /// # Errors
    /// Why not.
    pub fn moves(&self, moves: &[Movement], closest: &Gap, by: u64) -> Result<(), Obstacle> {
        let layer = self.ground.subject.layer.ok_or(Obstacle::Graph)?;
        let mut changed: Vec<u32> = moves.iter().map(|m| m.feature).collect();
        for movement in moves {
            let near = self.ground.places.neighbours(movement.feature);
            changed.extend(near.iter().map(|&(other, _)| other));
            changed.extend(self.met(&layer, moves, movement, closest)?);
        }
        changed.extend(&self.core);
        let works = STEPS.iter().any(|&steps| {
            let free = self.around(&changed, steps);
            // Two steps: those around the free ones have all their neighbours, and are cut as now.
            let local = Local::moved(&layer, &self.ground.places.around(&free, 2), moves);
            local.is_some_and(|local| self.has_fewer(&local, &free, by))
        });
        if works {
            Ok(())
        } else {
            Err(Obstacle::NewSpacings)
        }
    }

    /// The features that a moved one is closer to than the spacing.
    fn met(
        &self,
        layer: &Layer<'_>,
        moves: &[Movement],
        movement: &Movement,
        closest: &Gap,
    ) -> Result<Vec<u32>, Obstacle> {
        let place = |feature: u32| -> Option<Vec<Region>> {
            let own = moves.iter().find(|m| m.feature == feature);
            let by = own.map_or([0, 0], |m| m.by);
            let regions = self.regions(layer, feature);
            regions.iter().map(|region| region.moved(by)).collect()
        };
        let moved = place(movement.feature).ok_or(Obstacle::Enclosed)?;
        let boxes = moved.iter().map(Region::bounds);
        let area = boxes.reduce(|all, one| all.union(&one)).unwrap_or_default();
        // Others may move towards it.
        let most = moves.iter().map(Movement::length).max().unwrap_or(0);
        let reach = area
            .grown(layer.rules.spacing)
            .grown(i32::try_from(most).unwrap_or(i32::MAX));
        let mut met = Vec::new();
        let mut blocked: Option<(Gap, u32)> = None;
        for other in self.ground.near(&reach) {
            if other == movement.feature {
                continue;
            }
            let there = place(other).ok_or(Obstacle::Enclosed)?;
            let Some(gap) = gap::between(&moved, &there, layer.rules.spacing) else {
                continue;
            };
            met.push(other);
            let nearer = blocked.is_none_or(|(least, _)| gap.is_less(&least));
            if (gap.is_less(closest) || gap.distance == 0) && nearer {
                blocked = Some((gap, other));
            }
        }
        match blocked {
            Some((gap, by)) => Err(Obstacle::Blocked { by, gap }),
            None => Ok(met),
        }
    }

    /// Whether there are `by` conflicts fewer once a feature can change mask at one more place.
    pub fn stitches(&self, cut: &Cut<'_>, by: u64) -> bool {
        let places = self.ground.places;
        STEPS.iter().any(|&steps| {
            let free = self.around(&self.core, steps);
            let local = cut.problem(places, &places.around(&free, 1), &|_| true, true);
            local.is_some_and(|local| self.has_fewer(&local, &free, by))
        })
    }

    /// Whether the free features of a changed neighbourhood can be coloured with `by` conflicts fewer.
    fn has_fewer(&self, local: &Local, free: &[u32], by: u64) -> bool {
        let Some(most) = self.least(free).checked_sub(by) else {
            return false;
        };
        let subject = self.ground.subject;
        let places = Places::new(&local.instance);
        let mut own: Vec<u32> = (0..local.global.len() as u32)
            .filter(|&f| free.binary_search(&local.global[f as usize]).is_ok())
            .collect();
        own.sort_unstable();
        let Some(masks) = local.masks(subject, &places, &own) else {
            return false;
        };
        let joined = |unit: u32| {
            let [a, b] = units::features_of(&local.instance, unit)
                .map(|feature| local.global[feature as usize]);
            a == b || (self.ground.places.neighbours(a).iter()).any(|&(other, _)| other == b)
        };
        let window = Window {
            places: &places,
            free: &own,
            mask: &|fragment| masks[fragment as usize],
            released: &|_| false,
            strict: &|unit| !joined(unit),
        };
        own.len() == free.len() && window.can_do_with(most, self.ground.stop) == Some(true)
    }

    /// The smallest distance between two features around the core, which no movement may go below: what
    /// stands for the layer's own least distance.
    pub fn closest(&self, layer: &Layer<'_>) -> Option<Gap> {
        let places = self.ground.places;
        let mut least: Option<Gap> = None;
        for feature in self.around(&self.core, 1) {
            let own = self.regions(layer, feature);
            for &(other, _) in places.neighbours(feature) {
                if other < feature && places.neighbours(other).len() <= MOST_NEIGHBOURS {
                    continue;
                }
                let gap = gap::between(&own, &self.regions(layer, other), layer.rules.spacing);
                least = match (least, gap) {
                    (Some(least), Some(gap)) if !gap.is_less(&least) => Some(least),
                    (least, None) => least,
                    (_, gap) => gap,
                };
            }
        }
        least
    }
}
