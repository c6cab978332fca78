//! The surroundings of a place, and the question that every repair has to answer: with it in place, is there
//! a colouring of the whole with fewer conflicts?
//!
//! Some features around the place are coloured anew, all others keep their masks ([`super::window`]). So a
//! colouring that is found is one of the whole, whose conflicts are counted exactly: nothing is concluded from the
//! neighbourhood alone. Spacings are taken away in the instance itself. For a stitch the feature is cut and
//! the distances of its two sides taken anew ([`super::cut`]). For movements the neighbourhood is extracted
//! again, up to features so far away that nothing about those which are looked at can change ([`super::local`]).
//!
//! The units of other bounds may be violated as often as now, which is as seldom as can be; those of this one and of
//! none have to become fewer.
//!
//! Where the colouring of the certificate is not proven to be the best, the neighbourhood is first coloured as
//! well as it can be without the repair, so that only what the repair gains counts.

use std::cell::{Cell, RefCell};
use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::rc::Rc;

use super::cut::Cut;
use super::gap::{self, Gap, Region};
use super::local::Local;
use super::repair::{Movement, Obstacle};
use super::window::Window;
use super::{Bound, Layer, Subject, units};
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

/// A unit that is in no bound.
const NO_BOUND: u32 = u32::MAX;

/// What all places of a subject share.
pub struct Ground<'a> {
    /// What is explained.
    pub subject: &'a Subject<'a>,
    /// Its features and what joins them.
    pub places: &'a Places<'a>,
    /// The bound of each unit, or [`NO_BOUND`].
    bound_of: Vec<u32>,
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
        bounds: &[Bound],
        surveyor: Option<&'a Surveyor<'a>>,
        is_best: bool,
        stop: &'a Stop,
    ) -> Ground<'a> {
        let boxes = subject.layer.map_or(Vec::new(), |layer| {
            let features = &layer.extraction.features;
            let all = 0..features.len() as u32;
            all.map(|feature| features.box_of(feature)).collect()
        });
        let mut bound_of = vec![NO_BOUND; subject.instance.unit_count()];
        for (number, bound) in (0u32..).zip(bounds) {
            for &unit in &bound.units {
                bound_of[unit as usize] = number;
            }
        }
        Ground {
            subject,
            places,
            bound_of,
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
    /// The number of its bound.
    bound: u32,
    /// The core, and the features at the conflicts that its bound has now, ascending.
    seeds: Vec<u32>,
    /// The effort that is left for questions, in bytes of proof.
    pub left: Cell<u64>,
    regions: RefCell<HashMap<u32, Rc<Vec<Region>>>>,
    budgets: RefCell<HashMap<Vec<u32>, Rc<Budgets>>>,
}

/// How many units of each group may be violated.
type Budgets = BTreeMap<u32, u64>;

/// The budgets with that of one group lowered, if it is that large.
fn lowered(budgets: &Budgets, group: u32, by: u64) -> Option<Budgets> {
    let mut budgets = budgets.clone();
    let own = budgets.get_mut(&group)?;
    *own = own.checked_sub(by)?;
    Some(budgets)
}

impl<'a> Site<'a> {
    /// The surroundings of the core of a bound.
    pub fn new(ground: &'a Ground<'a>, bound: usize, units: &[u32], core: Vec<u32>) -> Site<'a> {
        let (places, colouring) = (ground.places, ground.subject.colouring);
        let violated = |unit: &&u32| places.is_unresolved(**unit, colouring);
        let now = units.iter().filter(violated);
        let ends = now.flat_map(|&unit| places.features_of_unit(unit));
        let seeds: BTreeSet<u32> = ends.chain(core.iter().copied()).collect();
        Site {
            ground,
            core,
            bound: bound as u32,
            seeds: seeds.into_iter().collect(),
            left: Cell::new(0),
            regions: RefCell::default(),
            budgets: RefCell::default(),
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

    /// The group of a unit: its bound where it is another one, else that of this place.
    fn group(&self, unit: u32) -> u32 {
        let bound = self.ground.bound_of[unit as usize];
        if bound == NO_BOUND { self.bound } else { bound }
    }

    /// How many units of each group with an end among `free` are violated; of this place's, at best.
    fn budgets(&self, free: &[u32]) -> Rc<Budgets> {
        if let Some(known) = self.budgets.borrow().get(free) {
            return Rc::clone(known);
        }
        let (places, colouring) = (self.ground.places, self.ground.subject.colouring);
        let units = free.iter().flat_map(|&f| places.units_of_conflict(f));
        let units: BTreeSet<u32> = units.collect();
        let mut budgets = Budgets::new();
        for unit in units {
            if places.is_unresolved(unit, colouring) {
                *budgets.entry(self.group(unit)).or_default() += 1;
            }
        }
        if !self.ground.is_best {
            while let Some(less) = lowered(&budgets, self.bound, 1) {
                if self.keeps_to(&less, free, &[]) != Some(true) {
                    break;
                }
                budgets = less;
            }
        }
        let budgets = Rc::new(budgets);
        let mut known = self.budgets.borrow_mut();
        known.insert(free.to_vec(), Rc::clone(&budgets));
        budgets
    }

    /// Whether the free features can be coloured within the budgets once these units are released.
    fn keeps_to(&self, budgets: &Budgets, free: &[u32], released: &[u32]) -> Option<bool> {
        let colouring = self.ground.subject.colouring;
        let window = Window {
            places: self.ground.places,
            free,
            mask: &|fragment| colouring[fragment as usize],
            released: &|unit| released.contains(&unit),
            group: &|unit| Some(self.group(unit)),
            budget: &|group| budgets.get(&group).copied().unwrap_or(0),
        };
        window.is_colourable(&self.left, self.ground.stop)
    }

    /// Whether there are `by` conflicts fewer once these units are released, whatever else they
    /// violate. `None` where that was not found out.
    pub fn releases(&self, released: &[u32], by: u64) -> Option<bool> {
        let mut found = Some(false);
        for steps in STEPS {
            let free = self.around(&self.seeds, steps);
            let budgets = lowered(&self.budgets(&free), self.bound, by);
            found = match budgets {
                None => Some(false),
                Some(budgets) => self.keeps_to(&budgets, &free, released),
            };
            if found == Some(true) {
                break;
            }
        }
        found
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
        changed.extend(&self.seeds);
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
            let free = self.around(&self.seeds, steps);
            let local = cut.problem(places, &places.around(&free, 1), &|_| true, true);
            local.is_some_and(|local| self.has_fewer(&local, &free, by))
        })
    }

    /// Whether the free features of a changed neighbourhood can be coloured with `by` conflicts fewer.
    fn has_fewer(&self, local: &Local, free: &[u32], by: u64) -> bool {
        let Some(budgets) = lowered(&self.budgets(free), self.bound, by) else {
            return false;
        };
        let places = Places::new(&local.instance);
        let is_free = |f: &u32| free.binary_search(&local.global[*f as usize]).is_ok();
        let own: Vec<u32> = (0..local.global.len() as u32).filter(is_free).collect();
        let Some(masks) = local.masks(self.ground.subject, &places, &own) else {
            return false;
        };
        // New pairs must not be violated; self-spacings count for this place.
        let group = |unit: u32| {
            let [a, b] = units::features_of(&local.instance, unit)
                .map(|feature| local.global[feature as usize]);
            if a == b {
                return Some(self.bound);
            }
            let mut near = self.ground.places.neighbours(a).iter();
            let known = near.find(|&&(other, _)| other == b);
            known.map(|&(_, pair)| self.group(pair))
        };
        let window = Window {
            places: &places,
            free: &own,
            mask: &|fragment| masks[fragment as usize],
            released: &|_| false,
            group: &group,
            budget: &|group| budgets.get(&group).copied().unwrap_or(0),
        };
        own.len() == free.len() && window.is_colourable(&self.left, self.ground.stop) == Some(true)
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
