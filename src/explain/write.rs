//! `explanation.json`: everything that is known of each place, for tools. One place a line; lengths in
//! micrometres as exact decimals. `explanation.md` describes each member.

use std::io::{self, Write};

use serde::Serialize;

use super::gap::{self, Gap};
use super::place::{Feature, Place, Spacing};
use super::repair::{Block, Movement, Obstacle, Position, Repair, Way};
use super::shape::Shape;
use super::text::is_ready;
use super::{Explanation, Heading, positions};
use crate::formats::document::Document;
use crate::geometry::Rect;
use crate::layout::length::Micrometres;

/// The version of the format; it changes when a member changes its meaning or goes away.
const VERSION: u32 = 1;

type Box = [Micrometres; 4];

#[derive(Serialize)]
struct Limits {
    lower: u64,
    upper: u64,
}

#[derive(Serialize)]
struct LayerMember<'a> {
    top: &'a str,
    layer: String,
    unit_pm: u64,
    spacing_um: Micrometres,
}

#[derive(Serialize)]
struct PlaceMember {
    place: usize,
    limit: u64,
    found: &'static str,
    irreducible: bool,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    cycle: Vec<u32>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    hubs: Vec<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    at_um: Option<Box>,
    features: Vec<FeatureMember>,
    spacings: Vec<SpacingMember>,
    repairs: Vec<RepairMember>,
}

#[derive(Serialize)]
struct FeatureMember {
    feature: u32,
    #[serde(skip_serializing_if = "Option::is_none")]
    box_um: Option<Box>,
    fragments: Vec<u32>,
    fragments_in_all: u32,
    every_mask: bool,
}

#[derive(Serialize)]
struct SpacingMember {
    kind: &'static str,
    features: [u32; 2],
    #[serde(skip_serializing_if = "Option::is_none")]
    fragments: Option<[u32; 2]>,
    #[serde(flatten)]
    gap: Option<GapMember>,
}

#[derive(Serialize)]
struct GapMember {
    distance_um: Micrometres,
    exact: bool,
    #[serde(skip_serializing_if = "Option::is_none")]
    needed_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Option::is_none")]
    short_um: Option<Micrometres>,
    near_um: Box,
    boxes_um: [Box; 2],
}

#[derive(Serialize)]
struct RepairMember {
    kind: &'static str,
    verified: bool,
    conflicts_fewer: u64,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    spacings: Vec<usize>,
    #[serde(skip_serializing_if = "Option::is_none")]
    length_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    movements: Vec<MovementMember>,
    #[serde(skip_serializing_if = "Option::is_none")]
    stitch: Option<StitchMember>,
    #[serde(skip_serializing_if = "Option::is_none")]
    obstacle: Option<ObstacleMember>,
}

#[derive(Serialize)]
struct MovementMember {
    feature: u32,
    by_um: [Micrometres; 2],
}

#[derive(Serialize)]
struct StitchMember {
    feature: u32,
    line_um: Box,
    overlap_um: Micrometres,
    cover_um: Box,
    in_the_way: Vec<BlockMember>,
}

#[derive(Serialize)]
struct BlockMember {
    what: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    feature: Option<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    needed_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Option::is_none")]
    present_um: Option<Micrometres>,
}

#[derive(Serialize)]
struct ObstacleMember {
    what: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    feature: Option<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    distance_um: Option<Micrometres>,
}

/// Writes an explanation: the same one gives the same bytes.
///
/// # Errors
/// Those of the writer. It should be buffered.
pub fn write(explanation: &Explanation, out: &mut impl Write) -> io::Result<()> {
    let heading = &explanation.heading;
    let units = Units::of(heading);
    let mut document = Document::open(out)?;
    document.member("format", "maskproof-explanation")?;
    document.member("version", VERSION)?;
    document.member("input", &heading.input)?;
    document.member("masks", heading.masks)?;
    if let Some(layer) = &heading.layer {
        let member = LayerMember {
            top: &layer.top,
            layer: layer.rules.layer.to_string(),
            unit_pm: layer.unit_pm,
            spacing_um: units.length(layer.rules.spacing),
        };
        document.member("layer", member)?;
    }
    let conflicts = Limits {
        lower: explanation.conflicts.lower,
        upper: explanation.conflicts.upper,
    };
    document.member("conflicts", conflicts)?;
    document.member("place_count", explanation.total)?;
    document.list(
        "places",
        explanation.places.iter().map(|place| units.place(place)),
    )?;
    document.close()
}

/// How lengths are written.
struct Units {
    unit_pm: u64,
    /// The spacing that is needed everywhere, if there is one.
    spacing: Option<i32>,
}

impl Units {
    fn of(heading: &Heading) -> Units {
        let layer = heading.layer.as_ref();
        Units {
            unit_pm: layer.map_or(0, |layer| layer.unit_pm),
            spacing: layer
                .filter(|layer| layer.rules.has_one_spacing())
                .map(|layer| layer.rules.spacing),
        }
    }

    fn length(&self, length: i32) -> Micrometres {
        Micrometres::new(length, self.unit_pm)
    }

    fn corners(&self, Rect { min, max }: Rect) -> Box {
        [min.x, min.y, max.x, max.y].map(|x| self.length(x))
    }

    fn place(&self, place: &Place) -> PlaceMember {
        let (found, cycle, hubs) = match &place.shape {
            Shape::Clique => ("clique", Vec::new(), Vec::new()),
            Shape::OddCycle(order) => ("odd cycle", order.clone(), Vec::new()),
            Shape::Wheel { rim, hubs } => ("wheel", rim.clone(), hubs.clone()),
            Shape::Other => ("core", Vec::new(), Vec::new()),
        };
        PlaceMember {
            place: place.number,
            limit: place.core.limit,
            found,
            irreducible: place.core.irreducible,
            cycle,
            hubs,
            at_um: place.area().map(|area| self.corners(area)),
            features: place.features.iter().map(|f| self.feature(f)).collect(),
            spacings: place.spacings.iter().map(|s| self.spacing(s)).collect(),
            repairs: place
                .repairs
                .iter()
                .map(|r| self.repair(place, r))
                .collect(),
        }
    }

    fn feature(&self, feature: &Feature) -> FeatureMember {
        FeatureMember {
            feature: feature.number,
            box_um: feature.area.map(|area| self.corners(area)),
            fragments: feature.fragments.clone(),
            fragments_in_all: feature.of,
            every_mask: !feature.is_restricted,
        }
    }

    fn spacing(&self, spacing: &Spacing) -> SpacingMember {
        SpacingMember {
            kind: match spacing.fragments {
                Some(_) => "self-spacing",
                None => "conflict pair",
            },
            features: spacing.features,
            fragments: spacing.fragments,
            gap: spacing.gap.map(|gap| self.gap(&gap)),
        }
    }

    fn gap(&self, gap: &Gap) -> GapMember {
        GapMember {
            distance_um: self.length(gap.distance),
            exact: gap.is_exact,
            needed_um: self.spacing.map(|needed| self.length(needed)),
            short_um: (self.spacing).map(|needed| self.length(needed - gap.distance)),
            near_um: self.corners(gap::box_between(gap.boxes)),
            boxes_um: gap.boxes.map(|area| self.corners(area)),
        }
    }

    fn repair(&self, place: &Place, repair: &Repair) -> RepairMember {
        let index = |unit: &u32| place.spacings.iter().position(|s| s.unit == *unit);
        let length = i32::try_from(repair.length()).unwrap_or(i32::MAX);
        let mut member = RepairMember {
            kind: "release",
            verified: is_ready(repair),
            conflicts_fewer: repair.fewer,
            spacings: repair.units.iter().filter_map(index).collect(),
            length_um: Some(self.length(length)),
            movements: Vec::new(),
            stitch: None,
            obstacle: None,
        };
        match &repair.way {
            Way::Move(moves) => {
                member.kind = "movement";
                member.movements = moves.iter().map(|m| self.movement(m)).collect();
            }
            Way::Stitch(at) => {
                member.kind = "stitch";
                member.stitch = Some(self.stitch(at));
            }
            Way::Release(why) => {
                member.length_um = None;
                member.obstacle = self.obstacle(why);
            }
        }
        member
    }

    fn movement(&self, movement: &Movement) -> MovementMember {
        MovementMember {
            feature: movement.feature,
            by_um: movement.by.map(|d| self.length(d)),
        }
    }

    fn stitch(&self, at: &Position) -> StitchMember {
        StitchMember {
            feature: at.feature,
            line_um: self.corners(at.line),
            overlap_um: self.length(at.overlap),
            cover_um: self.corners(positions::cover(at)),
            in_the_way: at.blocks.iter().map(|block| self.block(block)).collect(),
        }
    }

    fn block(&self, block: &Block) -> BlockMember {
        let plain = |what| BlockMember {
            what,
            feature: None,
            needed_um: None,
            present_um: None,
        };
        let lengths = |what, needed, present| BlockMember {
            needed_um: Some(self.length(needed)),
            present_um: Some(self.length(present)),
            ..plain(what)
        };
        match *block {
            Block::NoPolicy => plain("no policy"),
            Block::OtherPlace => plain("other place"),
            Block::Neighbour { feature } => BlockMember {
                feature: Some(feature),
                ..plain("neighbour")
            },
            Block::Overlap { needed, present } => lengths("overlap", needed, present),
            Block::FragmentLength { needed, present } => {
                lengths("fragment length", needed, present)
            }
            Block::Corner { needed, present } => lengths("corner", needed, present),
        }
    }

    fn obstacle(&self, why: &Obstacle) -> Option<ObstacleMember> {
        let plain = |what| ObstacleMember {
            what,
            feature: None,
            distance_um: None,
        };
        Some(match why {
            Obstacle::Graph => return None,
            Obstacle::OneFeature => plain("one feature"),
            Obstacle::SeveralSpacings => plain("several spacings"),
            Obstacle::SpecialRules => plain("special rules"),
            Obstacle::NotAlone => plain("not alone"),
            Obstacle::Enclosed => plain("enclosed"),
            Obstacle::Open => plain("open"),
            Obstacle::SupplyLine => plain("supply line"),
            Obstacle::NewSpacings => plain("new spacings"),
            Obstacle::Blocked { by, gap } => ObstacleMember {
                what: "blocked",
                feature: Some(*by),
                distance_um: Some(self.length(gap.distance)),
            },
        })
    }
}
