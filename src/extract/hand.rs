//! Masks given by hand: from shapes and points to statements about features.
//!
//! A point names the feature that it lies in or on. Statements that contradict each other without any search
//! are refused here, with the points that they were made at: one feature on two masks; features that must share
//! a mask and are fixed to two, or that must differ and are one, are fixed alike, must share a mask, or
//! are more than there are masks. Sharing a mask is an equivalence, whose classes are kept by union-find
//! (Tarjan, "Efficiency of a good but not linear set union algorithm", 1975). What remains may still
//! have no colouring at all; that takes a search, and is not decided here.

mod error;

use super::owners::Owners;
use super::parts::{Part, Parts};
use crate::geometry::rtree::Visitor;
use crate::geometry::winding::encloses;
use crate::geometry::{Point, Rect};
use crate::layout::{Fragments, Layout, Rules, Shape};
use encodings::{InstanceBuilder, Mask, MaskSet, Tie};
use std::collections::{BTreeMap, BTreeSet};

pub use error::{HandError, Place};

/// What was decided by hand, about features.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct HandMasks {
    /// Features on a mask, ascending, each once.
    pub allowed: Vec<(u32, Mask)>,
    /// Sets of features that share a mask: each ascending, of two or more, in the order of the rules.
    pub same: Vec<Vec<u32>>,
    /// Sets of features on masks that are all different: likewise.
    pub different: Vec<Vec<u32>>,
    /// All of these features, ascending: they take no stitch.
    pub named: Vec<u32>,
}

/// What the rules and the fixed shapes of the layout say by hand.
///
/// # Errors
/// A point in no feature, and statements that contradict each other.
pub(super) fn resolve(
    layout: &Layout,
    rules: &Rules,
    parts: &Parts,
    owners: &Owners,
) -> Result<HandMasks, HandError> {
    let hand = &rules.hand;
    let by_points = [&hand.same, &hand.different];
    if layout.fixed.is_empty() && hand.fixed.is_empty() && by_points.iter().all(|s| s.is_empty()) {
        return Ok(HandMasks::default());
    }
    let finder = Finder {
        unit_pm: layout.unit_pm,
        parts,
        owners,
    };
    let fixed = finder.fixed(layout, rules)?;
    let same = finder.sets(&hand.same)?;
    let different = finder.sets(&hand.different)?;
    let classes = Classes::new(&fixed, &same, &different);
    let checked = Checker {
        place: &|at| finder.place(at),
        masks: rules.masks,
        of_class: classes.masks(&fixed, &|at| finder.place(at))?,
        classes: &classes,
    };
    for set in &different {
        checked.check(set)?;
    }
    Ok(HandMasks {
        allowed: fixed.iter().map(|(&f, &(mask, _))| (f, mask)).collect(),
        same: features(&same),
        different: features(&different),
        named: classes.named,
    })
}

/// Features with the points that they are named by, in the order of the rules.
type Set = Vec<(u32, Point)>;

/// Fixed features, each with its mask and where it is fixed.
type Fixed = BTreeMap<u32, (Mask, Point)>;

fn features(sets: &[Set]) -> Vec<Vec<u32>> {
    let each = |set: &Set| -> Vec<u32> {
        let set: BTreeSet<u32> = set.iter().map(|&(feature, _)| feature).collect();
        set.into_iter().collect()
    };
    let sets = sets.iter().map(each);
    sets.filter(|set| set.len() > 1).collect()
}

/// Finds features.
struct Finder<'a> {
    unit_pm: u64,
    parts: &'a Parts,
    owners: &'a Owners,
}

impl Finder<'_> {
    fn place(&self, at: Point) -> Place {
        let unit_pm = self.unit_pm;
        Place { at, unit_pm }
    }

    /// The feature at a point: all parts there touch each other, so there is at most one.
    fn at(&self, point: Point) -> Result<u32, HandError> {
        let mut search = At {
            parts: self.parts,
            point,
            found: None,
        };
        let area = Rect {
            min: point,
            max: point,
        };
        self.parts.tree().query(&area, &mut search);
        match search.found {
            Some(part) => Ok(self.owners.of(part)),
            None => Err(HandError::NoFeature {
                at: self.place(point),
                near: match self.nearest(point) {
                    Some(near) => format!(": the nearest one is at {}", self.place(near)),
                    None => ", which has none".to_owned(),
                },
            }),
        }
    }

    /// A point of the layer near a point: the nearest of rectangles' points and slanted outlines' vertices.
    fn nearest(&self, point: Point) -> Option<Point> {
        let of_part = |part: u32| match self.parts.get(part) {
            Part::Rect(Rect { min, max }) => Some(Point {
                x: point.x.clamp(min.x, max.x),
                y: point.y.clamp(min.y, max.y),
            }),
            Part::Slanted(outline) => {
                let vertices = outline.points().iter().copied();
                vertices.min_by_key(|&vertex| squared_distance(vertex, point))
            }
        };
        let near = (0..self.parts.len() as u32).filter_map(of_part);
        near.min_by_key(|&near| (squared_distance(near, point), near))
    }

    fn fixed(&self, layout: &Layout, rules: &Rules) -> Result<Fixed, HandError> {
        let mut fixed = Fixed::new();
        if !layout.fixed.is_empty() {
            for part in 0..self.parts.len() as u32 {
                let shape = self.parts.shape_of(part);
                if let Ok(i) = layout.fixed.binary_search_by_key(&shape, |fixed| fixed.0) {
                    let at = corner(layout.shapes.get(shape));
                    self.fix(&mut fixed, self.owners.of(part), layout.fixed[i].1, at)?;
                }
            }
        }
        for &(at, mask) in &rules.hand.fixed {
            self.fix(&mut fixed, self.at(at)?, mask, at)?;
        }
        Ok(fixed)
    }

    fn fix(&self, fixed: &mut Fixed, feature: u32, mask: Mask, at: Point) -> Result<(), HandError> {
        let (earlier, one) = *fixed.entry(feature).or_insert((mask, at));
        if earlier == mask {
            return Ok(());
        }
        Err(HandError::TwoMasks {
            one: self.place(one),
            other: self.place(at),
            masks: [earlier, mask],
        })
    }

    fn sets(&self, sets: &[Vec<Point>]) -> Result<Vec<Set>, HandError> {
        let member = |&at: &Point| Ok((self.at(at)?, at));
        let set = |points: &Vec<Point>| points.iter().map(member).collect();
        sets.iter().map(set).collect()
    }
}

fn squared_distance(a: Point, b: Point) -> u64 {
    let square = |a: i32, b: i32| {
        let gap = i64::from(a).abs_diff(i64::from(b));
        gap * gap
    };
    square(a.x, b.x) + square(a.y, b.y)
}

/// A corner of a shape, which lies on it.
fn corner(shape: Shape<'_>) -> Point {
    match shape {
        Shape::Rect(rect) => rect.min,
        Shape::Polygon(vertices) => vertices.iter().min().copied().unwrap_or_default(),
    }
}

/// Looks for a part at a point.
struct At<'a> {
    parts: &'a Parts,
    point: Point,
    found: Option<u32>,
}

impl Visitor for At<'_> {
    fn enter(&mut self, _: usize) -> bool {
        self.found.is_none()
    }

    fn visit(&mut self, part: u32) {
        // The box of the part holds the point already.
        let holds = match self.parts.get(part) {
            Part::Rect(_) => true,
            Part::Slanted(outline) => encloses(outline.points(), self.point),
        };
        if holds {
            self.found = Some(part);
        }
    }
}

/// The features named, and which of them share a mask.
struct Classes {
    named: Vec<u32>,
    /// The first member of each one's class; both by place in `named`.
    root: Vec<usize>,
}

impl Classes {
    fn new(fixed: &Fixed, same: &[Set], different: &[Set]) -> Classes {
        let in_sets = same.iter().chain(different).flatten();
        let in_sets = in_sets.map(|&(feature, _)| feature);
        let mut named: Vec<u32> = fixed.keys().copied().chain(in_sets).collect();
        named.sort_unstable();
        named.dedup();
        let mut parent: Vec<usize> = (0..named.len()).collect();
        let at = |feature: u32| named.binary_search(&feature).unwrap_or_default();
        for set in same {
            for two in set.windows(2) {
                let one = find(&mut parent, at(two[0].0));
                let other = find(&mut parent, at(two[1].0));
                parent[one.max(other)] = one.min(other);
            }
        }
        let root = (0..named.len()).map(|i| find(&mut parent, i)).collect();
        Classes { named, root }
    }

    /// The class of a named feature.
    fn of(&self, feature: u32) -> usize {
        self.root[self.named.binary_search(&feature).unwrap_or_default()]
    }

    /// The mask of each class with a fixed feature, by its root, and where that is fixed.
    fn masks(
        &self,
        fixed: &Fixed,
        place: &dyn Fn(Point) -> Place,
    ) -> Result<BTreeMap<usize, Mask>, HandError> {
        let mut found: BTreeMap<usize, (Mask, Point)> = BTreeMap::new();
        for (&feature, &(mask, at)) in fixed {
            let (earlier, one) = *found.entry(self.of(feature)).or_insert((mask, at));
            if earlier != mask {
                return Err(HandError::SharedOnTwo {
                    one: place(one),
                    other: place(at),
                    masks: [earlier, mask],
                });
            }
        }
        Ok(found
            .into_iter()
            .map(|(root, (mask, _))| (root, mask))
            .collect())
    }
}

/// The root of a class; the way there is halved.
fn find(parent: &mut [usize], mut at: usize) -> usize {
    while parent[at] != at {
        parent[at] = parent[parent[at]];
        at = parent[at];
    }
    at
}

/// Checks sets of features that must differ.
struct Checker<'a> {
    place: &'a dyn Fn(Point) -> Place,
    masks: u8,
    of_class: BTreeMap<usize, Mask>,
    classes: &'a Classes,
}

impl Checker<'_> {
    fn check(&self, set: &Set) -> Result<(), HandError> {
        let place = |at| (self.place)(at);
        // The first member of each class, and the first one on each mask.
        let mut by_class: BTreeMap<usize, (u32, Point)> = BTreeMap::new();
        let mut by_mask: BTreeMap<Mask, Point> = BTreeMap::new();
        for &(feature, at) in set {
            let class = self.classes.of(feature);
            if let Some((earlier, one)) = by_class.insert(class, (feature, at)) {
                let (one, other) = (place(one), place(at));
                return Err(match earlier == feature {
                    true => HandError::DifferentIsOne { one, other },
                    false => HandError::SharedAndDifferent { one, other },
                });
            }
            let Some(&mask) = self.of_class.get(&class) else {
                continue;
            };
            if let Some(one) = by_mask.insert(mask, at) {
                let (one, other) = (place(one), place(at));
                return Err(HandError::DifferentOnOne { one, other, mask });
            }
        }
        match set.first() {
            Some(&(_, first)) if set.len() > usize::from(self.masks) => {
                Err(HandError::TooManyDifferent {
                    first: place(first),
                    count: set.len(),
                    masks: self.masks,
                })
            }
            _ => Ok(()),
        }
    }
}

impl HandMasks {
    /// Whether a feature was decided by hand.
    pub fn names(&self, feature: u32) -> bool {
        self.named.binary_search(&feature).is_ok()
    }

    /// Says all of it to an instance of the fragments: a set that shares a mask is a chain of ties, one that
    /// differs a tie for every two. Ties are ascending, each once.
    pub(super) fn tell(&self, fragments: &Fragments, builder: &mut InstanceBuilder) {
        for &(feature, mask) in &self.allowed {
            for fragment in fragments.of_feature(feature) {
                builder.allow(fragment, MaskSet::only(mask));
            }
        }
        // Features named by hand take no stitch: they are one fragment each.
        let fragment = |feature: u32| fragments.of_feature(feature).start;
        let mut ties = BTreeSet::new();
        for set in &self.same {
            for two in set.windows(2) {
                ties.insert(Tie::Same([fragment(two[0]), fragment(two[1])]));
            }
        }
        for set in &self.different {
            for (i, &one) in set.iter().enumerate() {
                for &other in &set[i + 1..] {
                    ties.insert(Tie::Different([fragment(one), fragment(other)]));
                }
            }
        }
        for tie in ties {
            builder.tie(tie);
        }
    }
}
