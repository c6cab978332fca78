//! The search for repairs of a place: bounded, in a fixed order, each one verified by solving again with
//! it in place.
//!
//! * Each spacing of the core, released: of the movements that do it, the shortest first, the first that is
//!   verified; where there is none, both features moved by half each; where there is none either, the
//!   release alone and what is in its way.
//! * Each feature of the core, cut at one more place: the first that is verified.
//! * Where that is not enough, since the place needs several conflicts or nothing was verified: two
//!   spacings, the least that is missing first.

use super::core::Core;
use super::gap::Gap;
use super::movement;
use super::place::Spacing;
use super::repair::{Movement, Obstacle, Repair, Way, sort};
use super::site::Site;
use super::{Layer, positions};

/// The most movements verified for one spacing.
const MOST_MOVES: usize = 8;

/// The most places verified on one feature.
const MOST_POSITIONS: usize = 4;

/// The most pairs of spacings tried, and those of them whose movements are verified.
const MOST_PAIRS: usize = 64;
const MOST_MOVED_PAIRS: usize = 8;

/// Features of more neighbours are not moved: they are supply lines.
const MOST_NEIGHBOURS: usize = 32;

/// The effort for each of the three kinds, in bytes of proof.
const EFFORT: u64 = 1 << 22;

/// The largest core, in spacings, for which repairs are looked for.
const MOST_SPACINGS: usize = 64;

/// The repairs of a place, in their order.
pub fn repairs(site: &Site<'_>, core: &Core, spacings: &[Spacing]) -> Vec<Repair> {
    if spacings.len() > MOST_SPACINGS {
        return Vec::new();
    }
    let search = Search {
        site,
        closest: site
            .ground
            .subject
            .layer
            .and_then(|layer| site.closest(&layer)),
    };
    site.left.set(EFFORT);
    let mut found: Vec<Repair> = spacings
        .iter()
        .map(|spacing| search.single(spacing))
        .collect();
    site.left.set(EFFORT);
    for &feature in &site.core {
        found.extend(search.stitch(core, feature));
    }
    let is_repaired = |repair: &Repair| {
        let done = !matches!(repair.way, Way::Release(_)) || site.ground.subject.layer.is_none();
        done && repair.fewer > 0
    };
    site.left.set(EFFORT);
    if core.limit > 1 {
        found.extend(search.pair(spacings, 2));
    } else if !found.iter().any(is_repaired) {
        // Releasing more than one that is enough by itself says nothing; moving more may.
        let is_enough = found.iter().any(|repair| repair.fewer > 0);
        let pair = search.pair(spacings, 1);
        found.extend(pair.filter(|pair| !is_enough || !matches!(pair.way, Way::Release(_))));
    }
    sort(&mut found);
    found
}

struct Search<'a> {
    site: &'a Site<'a>,
    /// No movement may bring two features closer than this.
    closest: Option<Gap>,
}

impl Search<'_> {
    /// The best repair that releases one spacing.
    fn single(&self, spacing: &Spacing) -> Repair {
        let is_alone = self.site.releases(&[spacing.unit], 1);
        let way = match (self.site.ground.subject.layer, spacing.fragments) {
            _ if is_alone.is_none() => Way::Release(Obstacle::Open),
            _ if is_alone == Some(false) => Way::Release(Obstacle::NotAlone),
            (None, _) => Way::Release(Obstacle::Graph),
            (_, Some(_)) => Way::Release(Obstacle::OneFeature),
            (Some(layer), None) => self.moved(&layer, spacing),
        };
        Repair {
            units: vec![spacing.unit],
            way,
            fewer: u64::from(is_alone == Some(true)),
        }
    }

    /// The movements that release a spacing, the shortest first.
    ///
    /// # Errors
    /// Why there is none.
    fn candidates(&self, layer: &Layer<'_>, spacing: &Spacing) -> Result<Vec<Movement>, Obstacle> {
        if let Some(obstacle) = super::special(layer.rules) {
            return Err(obstacle);
        }
        let [a, b] = spacing.features;
        let regions = spacing
            .features
            .map(|feature| self.site.regions(layer, feature));
        let (a, b) = ((a, &regions[0][..]), (b, &regions[1][..]));
        let mut found = movement::candidates(a, b, layer.rules.spacing);
        if found.is_empty() {
            return Err(Obstacle::Enclosed);
        }
        let neighbours = |feature| self.site.ground.places.neighbours(feature).len();
        found.retain(|movement| neighbours(movement.feature) <= MOST_NEIGHBOURS);
        if found.is_empty() {
            return Err(Obstacle::SupplyLine);
        }
        Ok(found)
    }

    fn moved(&self, layer: &Layer<'_>, spacing: &Spacing) -> Way {
        let mut obstacle = None;
        let singles = match self.candidates(layer, spacing) {
            Ok(found) => found,
            Err(why) => return Way::Release(why),
        };
        let halves = singles.iter().filter_map(|m| halved(m, spacing.features));
        let all: Vec<Vec<Movement>> = (singles.iter().map(|&m| vec![m])).chain(halves).collect();
        for moves in all.into_iter().take(2 * MOST_MOVES) {
            match self.verified(&moves, 1) {
                Ok(()) => return Way::Move(moves),
                Err(why) => obstacle = obstacle.or(Some(why)),
            }
        }
        Way::Release(obstacle.unwrap_or(Obstacle::Enclosed))
    }

    fn verified(&self, moves: &[Movement], by: u64) -> Result<(), Obstacle> {
        let closest = self.closest.ok_or(Obstacle::Enclosed)?;
        self.site.moves(moves, &closest, by)
    }

    /// The best place of a feature for one more stitch.
    fn stitch(&self, core: &Core, feature: u32) -> Option<Repair> {
        let places = positions::helpful(self.site, core, feature);
        let mut tried = places.into_iter().take(MOST_POSITIONS);
        let (best, _) = tried.find(|(_, cut)| self.site.stitches(cut, 1))?;
        Some(Repair {
            units: Vec::new(),
            way: Way::Stitch(best),
            fewer: 1,
        })
    }

    /// Two spacings that together leave `by` conflicts fewer: moved if that can be done, else released.
    fn pair(&self, spacings: &[Spacing], by: u64) -> Option<Repair> {
        let mut pairs: Vec<[&Spacing; 2]> = Vec::new();
        for (i, a) in spacings.iter().enumerate() {
            pairs.extend(spacings[i + 1..].iter().map(|b| [a, b]));
        }
        pairs.sort_by_key(|pair| pair.iter().map(|s| self.short(s)).sum::<i64>());
        let mut released = None;
        let mut tried = 0;
        for pair in pairs.into_iter().take(MOST_PAIRS) {
            let units = pair.map(|spacing| spacing.unit).to_vec();
            if self.site.releases(&units, by) != Some(true) {
                continue;
            }
            let repair = |way| Repair {
                units: units.clone(),
                way,
                fewer: by,
            };
            tried += 1;
            match self.moved_pair(pair, by) {
                Ok(moves) => return Some(repair(Way::Move(moves))),
                Err(why) => released = released.or_else(|| Some(repair(Way::Release(why)))),
            }
            if tried >= MOST_MOVED_PAIRS || self.site.ground.subject.layer.is_none() {
                break;
            }
        }
        released
    }

    /// How much a spacing is short of, in database units.
    fn short(&self, spacing: &Spacing) -> i64 {
        let needed = self
            .site
            .ground
            .subject
            .layer
            .map_or(0, |layer| layer.rules.spacing);
        let present = spacing.gap.map_or(0, |gap| gap.distance);
        i64::from(needed) - i64::from(present)
    }

    /// Movements that release two spacings: two candidates each are put together.
    fn moved_pair(&self, pair: [&Spacing; 2], by: u64) -> Result<Vec<Movement>, Obstacle> {
        let layer = self.site.ground.subject.layer.ok_or(Obstacle::Graph)?;
        if pair.iter().any(|spacing| spacing.fragments.is_some()) {
            return Err(Obstacle::OneFeature);
        }
        let [first, second] = pair.map(|spacing| self.candidates(&layer, spacing));
        let (first, second) = (first?, second?);
        let mut both: Vec<Vec<Movement>> = Vec::new();
        for one in first.iter().take(3) {
            both.extend(
                second
                    .iter()
                    .take(3)
                    .filter_map(|other| together(*one, *other)),
            );
        }
        both.sort_by_key(|moves| moves.iter().map(Movement::length).sum::<u64>());
        let mut obstacle = None;
        for moves in both {
            match self.verified(&moves, by) {
                Ok(()) => return Ok(moves),
                Err(why) => obstacle = obstacle.or(Some(why)),
            }
        }
        Err(obstacle.unwrap_or(Obstacle::Enclosed))
    }
}

/// The same change of distance by moving both features, in opposite directions.
fn halved(movement: &Movement, features: [u32; 2]) -> Option<Vec<Movement>> {
    let other = features.into_iter().find(|&f| f != movement.feature)?;
    let own = movement.by.map(|d| d / 2);
    let mut both = vec![
        Movement {
            feature: movement.feature,
            by: own,
        },
        Movement {
            feature: other,
            by: [own[0] - movement.by[0], own[1] - movement.by[1]],
        },
    ];
    both.sort_unstable();
    both.iter().all(|m| m.by != [0, 0]).then_some(both)
}

/// Two movements as one: of one feature along both axes, or of two.
fn together(a: Movement, b: Movement) -> Option<Vec<Movement>> {
    if a.feature != b.feature {
        let mut both = vec![a, b];
        both.sort_unstable();
        return Some(both);
    }
    let axis = |one: i32, other: i32| match (one, other) {
        (0, d) | (d, 0) => Some(d),
        _ if (one > 0) != (other > 0) => None,
        _ if one > 0 => Some(one.max(other)),
        _ => Some(one.min(other)),
    };
    let by = [axis(a.by[0], b.by[0])?, axis(a.by[1], b.by[1])?];
    Some(vec![Movement {
        feature: a.feature,
        by,
    }])
}
