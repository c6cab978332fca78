//! The rules of a layer, resolved on its grid: all lengths in database units.

use super::LayerId;
use crate::geometry::Point;
use encodings::Mask;

/// The rules of one layer.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Rules {
    /// The layer to split.
    pub layer: LayerId,
    /// K, the number of masks.
    pub masks: u8,
    /// Features closer than this conflict on one mask, where nothing more special is said; at least 1.
    pub spacing: i32,
    /// Where something more special is said.
    pub spacings: Spacings,
    /// What a stitch needs.
    pub stitch: StitchRules,
    /// What was decided by hand.
    pub hand: Hand,
}

/// How far apart two places are.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum Metric {
    /// The length of the straight line between them.
    #[default]
    Euclidean,
    /// The larger one of the distances along x and along y.
    Square,
}

impl Metric {
    /// Its name in rules and results.
    pub fn name(self) -> &'static str {
        match self {
            Metric::Euclidean => "euclidean",
            Metric::Square => "square",
        }
    }
}

/// Wide features need more room.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct WideSpacing {
    /// One of the two features is at least this wide where they face each other.
    pub width: i32,
    /// They face each other over at least this length.
    pub run_length: i32,
    /// Then this is the spacing, where it is larger.
    pub spacing: i32,
}

/// Spacings that depend on what faces what. `None` stands for the plain spacing.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Spacings {
    /// How distances are taken.
    pub metric: Metric,
    /// An edge shorter than this between two convex corners is a line end; 0 where there are none.
    pub end_length: i32,
    /// Between two sides that face each other.
    pub side_to_side: Option<i32>,
    /// Between a side and a line end that face each other.
    pub side_to_end: Option<i32>,
    /// Between two line ends that face each other.
    pub end_to_end: Option<i32>,
    /// Between two convex corners that face nothing of each other.
    pub corner_to_corner: Option<i32>,
    /// Wider spacings of wide features, ascending.
    pub wide: Vec<WideSpacing>,
    /// Two features closer than this are an error of the layout, on any masks; 0 for no such rule.
    pub any_mask: i32,
}

/// Where stitch candidates are placed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Policy {
    /// Nowhere: every feature is one fragment.
    #[default]
    None,
    /// On each run of a feature that no neighbour within the spacing projects on.
    Uncovered,
    /// Wherever a stitch can make a difference.
    EveryInterval,
    /// Where a list says.
    Listed,
}

impl Policy {
    /// All of them.
    pub const ALL: [Policy; 4] = [
        Policy::None,
        Policy::Uncovered,
        Policy::EveryInterval,
        Policy::Listed,
    ];

    /// Its name in rules, options and results.
    pub fn name(self) -> &'static str {
        match self {
            Policy::None => "none",
            Policy::Uncovered => "uncovered",
            Policy::EveryInterval => "every-interval",
            Policy::Listed => "listed",
        }
    }
}

/// Shapes of another layer that stitches keep away from.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct KeepOut {
    /// The layer, such as contacts or vias.
    pub layer: LayerId,
    /// The smallest distance of a stitch's overlap from its shapes.
    pub distance: i32,
}

/// A stitch candidate of a list.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Listed {
    /// A point of the feature.
    pub feature: Point,
    /// A point of the run that the cut line goes through.
    pub at: Point,
}

/// What a stitch needs.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct StitchRules {
    /// Where candidates are placed.
    pub policy: Policy,
    /// How far the two sides of a stitch overlap: even, in database units; each side is extended by
    /// half of it.
    pub overlap: i32,
    /// The smallest length of a fragment along its run, overlaps not counted.
    pub fragment_length: i32,
    /// The smallest distance of a stitch's overlap from a corner or junction of its feature.
    pub corner: i32,
    /// The price of one stitch, at least 1.
    pub weight: u32,
    /// What stitches keep away from.
    pub keep_outs: Vec<KeepOut>,
    /// The most stitches of one feature; `None` for any number.
    pub most_per_feature: Option<u32>,
    /// The candidates of the policy `listed`.
    pub listed: Vec<Listed>,
}

impl Default for StitchRules {
    /// No stitches; the zeros and the weight of a first run.
    fn default() -> StitchRules {
        StitchRules {
            policy: Policy::None,
            overlap: 0,
            fragment_length: 0,
            corner: 0,
            weight: 1,
            keep_outs: Vec::new(),
            most_per_feature: None,
            listed: Vec::new(),
        }
    }
}

/// Masks given by hand. Features named here take no stitch.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Hand {
    /// What is drawn on these layers is part of the layer, and on this mask.
    pub fixed_layers: Vec<(LayerId, Mask)>,
    /// The feature at the point is on this mask.
    pub fixed: Vec<(Point, Mask)>,
    /// The features at these points share a mask.
    pub same: Vec<Vec<Point>>,
    /// Every two of the features at these points are on different masks.
    pub different: Vec<Vec<Point>>,
}

impl Rules {
    /// The rules of a layer with one spacing for everything, no stitches and nothing decided by hand.
    pub fn plain(layer: LayerId, masks: u8, spacing: i32) -> Rules {
        Rules {
            layer,
            masks,
            spacing,
            spacings: Spacings::default(),
            stitch: StitchRules::default(),
            hand: Hand::default(),
        }
    }

    /// Whether closer than `spacing`, by the straight line, is all that close means.
    pub fn has_one_spacing(&self) -> bool {
        let of = &self.spacings;
        let is_plain = |kind: i32| kind == self.spacing;
        of.metric == Metric::Euclidean && of.wide.is_empty() && self.kinds().all(is_plain)
    }

    /// Features that are this far apart, along an axis, are never close.
    pub fn farthest_spacing(&self) -> i32 {
        let wide = self.spacings.wide.iter().map(|row| row.spacing);
        wide.chain(self.kinds()).fold(self.spacing, i32::max)
    }

    /// The spacings by what faces what.
    fn kinds(&self) -> impl Iterator<Item = i32> + '_ {
        let of = &self.spacings;
        let kinds = [
            of.side_to_side,
            of.side_to_end,
            of.end_to_end,
            of.corner_to_corner,
        ];
        kinds.into_iter().map(|kind| kind.unwrap_or(self.spacing))
    }
}
