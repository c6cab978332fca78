//! What people read: the count of places first, then each place with its features, spacings and best
//! repairs.

use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::path::Path;

use super::gap::{self, Gap};
use super::place::{Feature, Place, Spacing};
use super::repair::{Block, Movement, Obstacle, Position, Repair, Way};
use super::shape::Shape;
use super::{Explanation, positions};
use crate::geometry::Rect;
use crate::layout::length::Micrometres;

/// How many places are shown unless all are asked for.
const SHOWN: usize = 5;

/// How many features, spacings and repairs of a place are listed.
const LISTED: usize = 8;
const REPAIRS: usize = 3;

/// The text, its last line ended. `file` is where all of it is.
pub fn text(explanation: &Explanation, all: bool, file: &Path) -> String {
    let writer = Writer { explanation };
    let mut text = format!("{}\n{}\n", writer.heading(), writer.sentence());
    let shown = if all { usize::MAX } else { SHOWN };
    writer.overview(&mut text);
    for place in explanation.places.iter().take(shown) {
        writer.place(place, &mut text);
    }
    let rest = explanation.places.len().saturating_sub(shown);
    if rest > 0 {
        let _ = writeln!(
            text,
            "\nand {} more, with --all or in {}",
            plural(rest, "place"),
            file.display()
        );
    }
    writer.remarks(shown, &mut text);
    let _ = writeln!(text, "\nwritten to {}", file.display());
    text
}

struct Writer<'a> {
    explanation: &'a Explanation,
}

impl Writer<'_> {
    fn heading(&self) -> String {
        let heading = &self.explanation.heading;
        let masks = plural(usize::from(heading.masks), "mask");
        match &heading.layer {
            None => format!("{}: graph, {masks}", heading.input),
            Some(layer) => format!(
                "{}: layer {} of {}, {masks}, {} um apart",
                heading.input,
                layer.rules.layer,
                layer.top,
                self.um(layer.rules.spacing),
            ),
        }
    }

    fn sentence(&self) -> String {
        let conflicts = self.explanation.conflicts;
        let count = |n: u64| plural(usize::try_from(n).unwrap_or(usize::MAX), "conflict");
        match (conflicts.lower, conflicts.upper) {
            (0, 0) => "no conflict is left: there is nothing to explain".to_owned(),
            (0, upper) => format!(
                "no conflict is proven to be unavoidable ({} in the colouring found): there is nothing to explain",
                upper
            ),
            (lower, upper) => {
                let least = if conflicts.is_tight() {
                    ""
                } else {
                    "at least "
                };
                let found = if conflicts.is_tight() {
                    String::new()
                } else {
                    format!(" (the colouring found has {upper})")
                };
                format!(
                    "{least}{} cannot be avoided{found}, in {}",
                    count(lower),
                    plural(self.explanation.total, "place")
                )
            }
        }
    }

    /// How many places there are of each form.
    fn overview(&self, text: &mut String) {
        if self.explanation.places.len() < 2 {
            return;
        }
        let mut counts: BTreeMap<(bool, String), usize> = BTreeMap::new();
        for place in &self.explanation.places {
            let name = match place.shape {
                Shape::Clique => format!("{} features pairwise too close", place.features.len()),
                Shape::OddCycle(_) => "odd cycles".to_owned(),
                Shape::Wheel { .. } => "wheels".to_owned(),
                Shape::Other => "larger cores".to_owned(),
            };
            *counts
                .entry((place.shape == Shape::Other, name))
                .or_default() += 1;
        }
        text.push('\n');
        for ((_, name), count) in counts {
            let _ = writeln!(text, "{name:<32}{:>6}", grouped(count));
        }
        let verified = |place: &&Place| place.repairs.iter().any(is_ready);
        let ready = self.explanation.places.iter().filter(verified).count();
        let _ = writeln!(
            text,
            "{:<32}{:>6}",
            "places with a verified repair",
            grouped(ready)
        );
    }

    fn place(&self, place: &Place, text: &mut String) {
        let near = place
            .area()
            .map_or(String::new(), |area| format!(", near {}", self.point(area)));
        let _ = writeln!(
            text,
            "\nplace {}: {}{near}",
            place.number,
            self.found(place)
        );
        if place.core.limit > 1 {
            let _ = writeln!(text, "  needs {} conflicts", place.core.limit);
        }
        if !place.core.irreducible {
            text.push_str("  not shrunk to the end: some of it may not be needed\n");
        }
        for feature in place.features.iter().take(LISTED) {
            let _ = writeln!(
                text,
                "  feature {:>8}{}",
                feature.number,
                self.feature(feature)
            );
        }
        more(place.features.len(), LISTED, "feature", text);
        for spacing in place.spacings.iter().take(LISTED) {
            let _ = writeln!(text, "  spacing {}", self.spacing(spacing));
        }
        more(place.spacings.len(), LISTED, "spacing", text);
        self.repairs(place, text);
    }

    /// What was found.
    fn found(&self, place: &Place) -> String {
        let n = place.features.len();
        let list = |features: &[u32]| {
            let numbers: Vec<String> = features.iter().map(u32::to_string).collect();
            let shown = numbers.len().min(2 * LISTED);
            let rest = if shown < numbers.len() { ", ..." } else { "" };
            format!("{}{rest}", numbers[..shown].join(", "))
        };
        match &place.shape {
            Shape::Clique => format!("{n} features pairwise too close (a clique of {n})"),
            Shape::OddCycle(order) => {
                format!("an odd cycle of {n} features, in order {}", list(order))
            }
            Shape::Wheel { rim, hubs } => format!(
                "a wheel: {} too close to each of an odd cycle of {}, in order {}",
                features(hubs.len(), &list(hubs)),
                rim.len(),
                list(rim)
            ),
            Shape::Other => {
                let own = place.self_spacings();
                let own = if own == 0 {
                    String::new()
                } else {
                    format!(", {own} of them within a feature")
                };
                let core = format!(
                    "a core of {} and {}{own}",
                    plural(n, "feature"),
                    plural(place.spacings.len(), "spacing")
                );
                let split: Vec<u32> = place.split().map(|feature| feature.number).collect();
                match split.len() {
                    0 => core,
                    count => format!(
                        "{core}; {} with several fragments",
                        features(count, &list(&split))
                    ),
                }
            }
        }
    }

    fn feature(&self, feature: &Feature) -> String {
        let area = feature.area.map_or(String::new(), |area| {
            format!(
                "  {} to {} um",
                self.at(area.min.x, area.min.y),
                self.at(area.max.x, area.max.y)
            )
        });
        let parts = match (feature.fragments.len(), feature.of) {
            (_, 1) => String::new(),
            (count, of) => format!(", {count} of {of} fragments"),
        };
        let fixed = if feature.is_restricted {
            ", not free to take every mask"
        } else {
            ""
        };
        format!("{area}{parts}{fixed}")
    }

    fn spacing(&self, spacing: &Spacing) -> String {
        let who = names(spacing);
        let Some(gap) = spacing.gap else { return who };
        let near = self.point(gap::box_between(gap.boxes));
        if !self.has_one_spacing() {
            return format!("{who:>17}  {} um, near {near}", self.distance(&gap));
        }
        format!(
            "{who:>17}  {} um, short by {} um, near {near}",
            self.distance(&gap),
            self.short(&gap)
        )
    }

    fn repairs(&self, place: &Place, text: &mut String) {
        if place.repairs.is_empty() {
            return;
        }
        let ready: Vec<&Repair> = place.repairs.iter().filter(|r| is_ready(r)).collect();
        let shown = if ready.is_empty() {
            text.push_str("  no repair is verified; what is in the way\n");
            place.repairs.iter().take(REPAIRS).collect()
        } else {
            text.push_str("  repairs\n");
            ready
        };
        for (i, repair) in shown.iter().take(REPAIRS).enumerate() {
            let _ = writeln!(text, "    {}  {}", i + 1, self.repair(place, repair));
        }
        let rest = place.repairs.len() - shown.len().min(REPAIRS);
        if rest > 0 {
            let _ = writeln!(text, "    and {rest} more in explanation.json");
        }
    }

    fn repair(&self, place: &Place, repair: &Repair) -> String {
        let gain = if repair.fewer > 1 {
            format!(" ({} conflicts fewer)", repair.fewer)
        } else {
            String::new()
        };
        let released: Vec<String> = repair
            .units
            .iter()
            .map(|&unit| self.released(place, unit))
            .collect();
        let released = released.join(" and ");
        match &repair.way {
            Way::Move(moves) => {
                let moves: Vec<String> = moves.iter().map(|m| self.movement(m)).collect();
                format!("move {}: {released}{gain}", moves.join(" and "))
            }
            Way::Stitch(at) => format!("allow a stitch {}{gain}", self.stitch(at)),
            Way::Release(why) => format!("{released}: {}{gain}", self.obstacle(why)),
        }
    }

    /// A spacing, the distance now and the distance needed.
    fn released(&self, place: &Place, unit: u32) -> String {
        let found = place.spacings.iter().find(|spacing| spacing.unit == unit);
        let Some(spacing) = found else {
            return String::new();
        };
        let who = names(spacing);
        match (spacing.gap, &self.explanation.heading.layer) {
            (Some(gap), Some(layer)) if layer.rules.has_one_spacing() => format!(
                "{who} from {} to {} um",
                self.distance(&gap),
                self.um(layer.rules.spacing)
            ),
            _ => format!("release {who}"),
        }
    }

    fn movement(&self, movement: &Movement) -> String {
        let [dx, dy] = movement.by;
        let along = |d: i32, axis: &str| {
            let sign = if d > 0 { "+" } else { "" };
            (d != 0).then(|| format!("{sign}{} um along {axis}", self.um(d)))
        };
        let ways: Vec<String> = [along(dx, "x"), along(dy, "y")]
            .into_iter()
            .flatten()
            .collect();
        format!("{} by {}", movement.feature, ways.join(" and "))
    }

    fn stitch(&self, at: &Position) -> String {
        let blocks: Vec<String> = at.blocks.iter().map(|block| self.block(block)).collect();
        let place = self.point(positions::cover(at));
        format!("on {} at {place}: {}", at.feature, blocks.join("; "))
    }

    fn block(&self, block: &Block) -> String {
        let um = |length| self.um(length);
        match *block {
            Block::NoPolicy => "the policy none places no candidates".to_owned(),
            Block::Neighbour { feature } => format!("feature {feature} is within the spacing"),
            Block::Overlap { needed, present } => format!(
                "the overlap of {} um does not fit the gap of {} um",
                um(needed),
                um(present)
            ),
            Block::FragmentLength { needed, present } => format!(
                "a fragment of {} um is left, {} um are needed",
                um(present),
                um(needed)
            ),
            Block::Corner { needed, present } => format!(
                "{} um to the corner, {} um are needed",
                um(present),
                um(needed)
            ),
            Block::OtherPlace => "the policy takes another place of this gap".to_owned(),
        }
    }

    fn obstacle(&self, why: &Obstacle) -> String {
        match why {
            Obstacle::Graph => "enough, verified".to_owned(),
            Obstacle::OneFeature => "its two fragments have to be drawn farther apart".to_owned(),
            Obstacle::SeveralSpacings | Obstacle::SpecialRules => {
                "no movement is looked for".to_owned()
            }
            Obstacle::NotAlone => "alone it saves no conflict around here".to_owned(),
            Obstacle::Open => "too hard to tell whether it saves a conflict".to_owned(),
            Obstacle::Enclosed => "no movement of one feature along an axis is enough".to_owned(),
            Obstacle::SupplyLine => "features of so many neighbours are not moved".to_owned(),
            Obstacle::Blocked { by, gap } if gap.distance == 0 => {
                format!("a movement is blocked by feature {by}")
            }
            Obstacle::Blocked { by, gap } => format!(
                "a movement is blocked by feature {by}, then {} um away",
                self.distance(gap)
            ),
            Obstacle::NewSpacings => "every movement makes another spacing too small".to_owned(),
        }
    }

    /// What holds for all repairs, said once.
    fn remarks(&self, shown: usize, text: &mut String) {
        let places = || self.explanation.places.iter().take(shown);
        let gaps = places()
            .flat_map(|place| &place.spacings)
            .filter_map(|s| s.gap);
        let rounded = gaps.into_iter().any(|gap| !gap.is_exact);
        let repairs = || places().flat_map(|place| &place.repairs);
        let moves = repairs().any(|repair| matches!(repair.way, Way::Move(_)));
        if moves || rounded {
            text.push('\n');
        }
        if moves {
            text.push_str(
                "What stands under \"repairs\" was verified by solving again with it in place. Movements \
                 look at this\nlayer only: what a feature is connected to on others has to follow.\n",
            );
        }
        if !self.has_one_spacing() {
            text.push_str(
                "\nThe rules have several spacings: what distance is needed depends on what faces what. \
                 Distances are\nby the straight line, and neither movements nor stitches are looked for.\n",
            );
        }
        let rules = self
            .explanation
            .heading
            .layer
            .as_ref()
            .map(|layer| &layer.rules);
        if rules.and_then(super::special) == Some(Obstacle::SpecialRules) {
            text.push_str(
                "\nUnder this stitch policy, or with keep-outs, a limit of stitches or masks given by hand, neither \
                 movements\nnor further stitches are looked for.\n",
            );
        }
        if rounded {
            text.push_str("A + marks a distance rounded down.\n");
        }
    }

    /// Whether one distance is needed everywhere.
    fn has_one_spacing(&self) -> bool {
        let layer = self.explanation.heading.layer.as_ref();
        layer.is_none_or(|layer| layer.rules.has_one_spacing())
    }

    fn unit_pm(&self) -> u64 {
        self.explanation
            .heading
            .layer
            .as_ref()
            .map_or(0, |layer| layer.unit_pm)
    }

    fn um(&self, length: i32) -> Micrometres {
        Micrometres::new(length, self.unit_pm())
    }

    fn at(&self, x: i32, y: i32) -> String {
        format!("({}, {})", self.um(x), self.um(y))
    }

    /// The lower left corner of a box.
    fn point(&self, area: Rect) -> String {
        format!("{} um", self.at(area.min.x, area.min.y))
    }

    fn distance(&self, gap: &Gap) -> String {
        let mark = if gap.is_exact { "" } else { "+" };
        format!("{}{mark}", self.um(gap.distance))
    }

    fn short(&self, gap: &Gap) -> Micrometres {
        let layer = self.explanation.heading.layer.as_ref();
        self.um(layer.map_or(0, |layer| layer.rules.spacing) - gap.distance)
    }
}

/// Whether a repair can be done as it stands: in a graph, spacings can only be released.
pub fn is_ready(repair: &Repair) -> bool {
    let can = !matches!(repair.way, Way::Release(_)) || repair.way == Way::Release(Obstacle::Graph);
    can && repair.fewer > 0
}

fn names(spacing: &Spacing) -> String {
    match (spacing.features, spacing.fragments) {
        ([f, _], Some([a, b])) => format!("{f} with itself (fragments {a} and {b})"),
        ([a, b], None) => format!("{a} - {b}"),
    }
}

fn features(count: usize, list: &str) -> String {
    let ending = if count == 1 { "" } else { "s" };
    format!("feature{ending} {list}")
}

fn more(count: usize, listed: usize, noun: &str, text: &mut String) {
    if count > listed {
        let _ = writeln!(
            text,
            "  and {} more in explanation.json",
            plural(count - listed, noun)
        );
    }
}

fn plural(count: usize, noun: &str) -> String {
    let ending = if count == 1 { "" } else { "s" };
    format!("{} {noun}{ending}", grouped(count))
}

/// Digits in groups of three.
fn grouped(number: usize) -> String {
    let digits = number.to_string();
    let mut text = String::new();
    for (i, digit) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}
