//! Repairs: what would make a place need fewer conflicts, and what it costs.
//!
//! The order in which they are shown, and in which a designer is likely to want them:
//!
//! 1. what is verified to leave fewer conflicts comes before what is not;
//! 2. by length: how far features move, all together, or how much is missing for a legal stitch (overlap, fragment
//!    length and corner added up; 0 where only a policy or a neighbour is in the way);
//! 3. stitches before movements, one movement before two, one spacing before two;
//! 4. by the numbers of features and spacings.

use super::gap::Gap;
use crate::geometry::Rect;

/// A repair.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Repair {
    /// The units of the core that it releases, ascending; none for a stitch.
    pub units: Vec<u32>,
    /// How.
    pub way: Way,
    /// By how much it lowers the least number of conflicts, verified by solving again with it in place;
    /// 0 where that failed.
    pub fewer: u64,
}

/// How a repair is done.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Way {
    /// Features are moved, each once.
    Move(Vec<Movement>),
    /// A feature may change mask where it may not now.
    Stitch(Position),
    /// Spacings are released, and no movement does it.
    Release(Obstacle),
}

/// A feature moved along an axis, or along both.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Movement {
    /// The feature.
    pub feature: u32,
    /// By how much along x and y, in database units.
    pub by: [i32; 2],
}

impl Movement {
    /// Its length along the axes, in database units.
    pub fn length(&self) -> u64 {
        let [dx, dy] = self.by.map(|d| u64::from(d.unsigned_abs()));
        dx + dy
    }
}

/// A place where a feature may not change mask.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Position {
    /// The feature.
    pub feature: u32,
    /// The cut line.
    pub line: Rect,
    /// The overlap with which it was verified, in database units.
    pub overlap: i32,
    /// What is in the way, most important first.
    pub blocks: Vec<Block>,
}

/// What is in the way of a stitch; lengths in database units.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Block {
    /// The policy places no candidates at all.
    NoPolicy,
    /// Neighbour `feature` is closer than the spacing to this place.
    Neighbour {
        /// The neighbour.
        feature: u32,
    },
    /// The overlap does not fit the gap between the neighbours.
    Overlap {
        /// The rule.
        needed: i32,
        /// The length of the gap.
        present: i32,
    },
    /// A fragment would be shorter than allowed.
    FragmentLength {
        /// The rule.
        needed: i32,
        /// The length of the fragment.
        present: i32,
    },
    /// The overlap would come too close to a corner.
    Corner {
        /// The rule.
        needed: i32,
        /// The distance; 0 where the overlap reaches the corner.
        present: i32,
    },
    /// The policy takes one place in each gap, and this is another one.
    OtherPlace,
}

impl Block {
    /// How much is missing, in database units.
    pub fn short(&self) -> u64 {
        match *self {
            Block::Overlap { needed, present }
            | Block::FragmentLength { needed, present }
            | Block::Corner { needed, present } => u64::from(needed.abs_diff(present)),
            Block::NoPolicy | Block::Neighbour { .. } | Block::OtherPlace => 0,
        }
    }
}

/// Why no movement releases a spacing.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Obstacle {
    /// A graph has no shapes to move.
    Graph,
    /// Fragments of one feature: they have to be drawn farther apart.
    OneFeature,
    /// What distance is needed depends on what faces what, and movements are not searched for such rules.
    SeveralSpacings,
    /// The stitch policy looks beyond the neighbourhood, or masks, keep-outs or limits are given: no movement is
    /// looked for.
    SpecialRules,
    /// Without this spacing there are as many conflicts around here: others need them too.
    NotAlone,
    /// Whether anything is gained was not found out with the effort that is allowed.
    Open,
    /// No movement of one feature along an axis, up to the spacing, makes the distance large enough.
    Enclosed,
    /// What could be moved has so many neighbours that it is not: a supply line.
    SupplyLine,
    /// The shortest movement brings a feature to another one, closer than any two here are now (or on
    /// top of it).
    Blocked {
        /// The other feature.
        by: u32,
        /// How close it would come.
        gap: Gap,
    },
    /// Movements are possible, and leave as many conflicts: other spacings become too small.
    NewSpacings,
}

impl Repair {
    /// How much layout it takes, in database units: see the order above.
    pub fn length(&self) -> u64 {
        match &self.way {
            Way::Move(moves) => moves.iter().map(Movement::length).sum(),
            Way::Stitch(position) => position.blocks.iter().map(Block::short).sum(),
            Way::Release(_) => 0,
        }
    }

    fn rank(&self) -> impl Ord + use<> {
        let kind = match &self.way {
            Way::Stitch(_) => 0,
            Way::Move(moves) => moves.len(),
            Way::Release(_) => 9,
        };
        let which: Vec<(u32, [i32; 2])> = match &self.way {
            Way::Stitch(at) => vec![(at.feature, [at.line.min.x, at.line.min.y])],
            Way::Move(moves) => moves.iter().map(|m| (m.feature, m.by)).collect(),
            Way::Release(_) => Vec::new(),
        };
        let is_open = matches!(self.way, Way::Release(_));
        (
            is_open,
            self.length(),
            kind,
            self.units.len(),
            which,
            self.units.clone(),
        )
    }
}

/// Puts repairs in their order.
pub fn sort(repairs: &mut [Repair]) {
    repairs.sort_by_cached_key(|repair| (repair.fewer == 0, repair.rank()));
}
