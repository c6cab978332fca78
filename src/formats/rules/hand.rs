//! Masks given by hand: which features are on a mask, share one, or must not.
//!
//! Features are named by points, or by labels that stand on them. Labels become their points, so that
//! whoever reads the rules later needs no texts.

use super::layers::mask;
use super::resolve::point_on_grid;
use super::{Given, Problem, Sources, first_given};
use crate::formats::error::{FormatError, Position};
use crate::formats::gdsii::Label;
use crate::formats::length::Coordinate;
use crate::formats::nearest::shown;
use crate::geometry::Point;
use crate::layout::{Hand, LayerId};
use encodings::Mask;
use std::collections::BTreeMap;

/// A point in the coordinates of the top cell.
pub type RawPoint = Given<[Coordinate; 2]>;

/// What is fixed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum FixedBy {
    /// All that is drawn on a layer.
    Layer(Given<LayerId>),
    /// The features at points.
    Points(Vec<RawPoint>),
}

/// Features on a mask.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RawFixed {
    /// The mask, from 1.
    pub mask: Given<u64>,
    /// Which features.
    pub by: FixedBy,
}

/// A set of features; or several of them, one for each text of a layer.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum RawSet {
    /// The features at points.
    Points(Vec<RawPoint>),
    /// The features at labels.
    Labels(Box<RawLabels>),
}

/// Labels that name features.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RawLabels {
    /// Their layer and texttype.
    pub layer: Given<LayerId>,
    /// What they say; without it, equal texts are a set each.
    pub text: Option<Given<String>>,
}

/// Masks by hand, as given.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct RawHand {
    /// Features on a mask.
    pub fixed: Vec<Given<RawFixed>>,
    /// Features that share a mask.
    pub same: Vec<Given<RawSet>>,
    /// Features on masks that are all different.
    pub different: Vec<Given<RawSet>>,
}

impl RawHand {
    pub(super) fn overridden_by(self, other: RawHand) -> RawHand {
        RawHand {
            fixed: first_given(other.fixed, self.fixed),
            same: first_given(other.same, self.same),
            different: first_given(other.different, self.different),
        }
    }

    /// Where the first of them is given.
    pub(super) fn first(&self) -> Option<Position> {
        let fixed = self.fixed.first().map(|given| &given.position);
        let sets = self.same.first().or(self.different.first());
        fixed.or(sets.map(|given| &given.position)).cloned()
    }

    /// On the grid, with the layers that are fixed.
    pub(super) fn resolve(
        &self,
        fixed_layers: Vec<(LayerId, Mask)>,
        masks: u8,
        sources: &Sources<'_>,
    ) -> Result<Hand, FormatError> {
        let mut fixed = Vec::new();
        for given in &self.fixed {
            let mask = mask(&given.value.mask, masks)?;
            if let FixedBy::Points(points) = &given.value.by {
                for point in points {
                    fixed.push((point_on_grid(point, sources.unit_pm)?, mask));
                }
            }
        }
        Ok(Hand {
            fixed_layers,
            fixed,
            same: sets(&self.same, sources)?,
            different: sets(&self.different, sources)?,
        })
    }
}

fn sets(given: &[Given<RawSet>], sources: &Sources<'_>) -> Result<Vec<Vec<Point>>, FormatError> {
    let mut sets = Vec::new();
    for set in given {
        match &set.value {
            RawSet::Points(points) => {
                let on_grid = points
                    .iter()
                    .map(|point| point_on_grid(point, sources.unit_pm));
                let points: Vec<Point> = on_grid.collect::<Result<_, _>>()?;
                if points.len() < 2 {
                    return Err(set.wrong(few(points.len(), "point")));
                }
                sets.push(points);
            }
            RawSet::Labels(named) => {
                let text = named.text.as_ref();
                sets.extend(of_labels(&named.layer, text, sources.labels)?);
            }
        }
    }
    Ok(sets)
}

fn few(count: usize, noun: &str) -> Problem {
    let s = if count == 1 { "" } else { "s" };
    Problem::FewMembers(format!("{count} {noun}{s}"))
}

/// The sets of equal labels on a layer, by their texts; of one text where it is given.
fn of_labels(
    layer: &Given<LayerId>,
    text: Option<&Given<String>>,
    labels: &[Label],
) -> Result<Vec<Vec<Point>>, FormatError> {
    let mut by_text: BTreeMap<&str, Vec<Point>> = BTreeMap::new();
    for label in labels.iter().filter(|label| label.layer == layer.value) {
        by_text.entry(&label.text).or_default().push(label.at);
    }
    let wrong = |problem| match text {
        Some(text) => text.wrong(problem),
        None => layer.wrong(problem),
    };
    if let Some(text) = text {
        let Some(points) = by_text.remove(text.value.as_str()) else {
            return Err(wrong(Problem::NoText {
                text: shown(&text.value),
                layer: layer.value,
                present: listed(by_text.keys().copied()),
            }));
        };
        by_text = BTreeMap::from([(text.value.as_str(), points)]);
    }
    for (text, points) in &by_text {
        if points.len() < 2 {
            let noun = format!("label {} on layer {}", shown(text), layer.value);
            return Err(wrong(few(points.len(), &noun)));
        }
    }
    Ok(by_text.into_values().collect())
}

/// Texts in quotes, cut where there are too many to read.
fn listed<'a>(texts: impl ExactSizeIterator<Item = &'a str>) -> String {
    const SHOWN: usize = 20;
    let count = texts.len();
    if count == 0 {
        return "none".to_owned();
    }
    let mut list = texts.take(SHOWN).map(shown).collect::<Vec<_>>().join(", ");
    if count > SHOWN {
        list.push_str(&format!(" and {} more", count - SHOWN));
    }
    list
}
