//! What a proof is about, besides the input: the member `rules` of a certificate, from the rules of a
//! layer and back.

use serde::{Deserialize, Serialize};

use super::digest::sha256;
use crate::formats::rules::{parse_layer, parse_metric, parse_policy};
use crate::geometry::{COORDINATE_LIMIT, Point};
use crate::layout::{
    self, Hand, KeepOut, LayerId, Listed, Metric, Policy, Spacings, StitchRules, WideSpacing,
};
use encodings::Mask;
use encodings::masks::MAX_MASKS;

/// The rules of a graph or of a layer.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum Rules {
    /// A layer of a layout.
    Layer(Box<LayerRules>),
    /// A graph.
    Graph(GraphRules),
}

/// The rules of a graph.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct GraphRules {
    /// K, the number of masks.
    pub masks: u8,
}

/// The rules of a layer; lengths in database units, masks from 1. Members from `metric` on are left out
/// where they say nothing.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LayerRules {
    /// K, the number of masks.
    pub masks: u8,
    /// The cell that is flattened.
    pub top: String,
    /// The layer, number/datatype.
    pub layer: String,
    /// One database unit in picometres.
    pub unit_pm: u64,
    /// Features closer than this conflict on one mask.
    pub spacing: i32,
    /// The policy that placed the stitch candidates.
    pub stitch: String,
    /// Overlap of the two masks at a stitch.
    pub overlap: i32,
    /// Smallest length of a fragment along its run.
    pub fragment_length: i32,
    /// Smallest distance of a stitch's overlap from a corner.
    pub corner: i32,
    /// The price of one stitch.
    pub stitch_weight: u32,
    /// How distances are taken, where not straight.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub metric: Option<String>,
    /// How short a line end is.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub end_length: i32,
    /// Spacing between two sides.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub side_to_side: Option<i32>,
    /// Spacing between a side and a line end.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub side_to_end: Option<i32>,
    /// Spacing between two line ends.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub end_to_end: Option<i32>,
    /// Spacing between two convex corners.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub corner_to_corner: Option<i32>,
    /// Spacings of wide features: width, run length, spacing.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub wide: Vec<[i32; 3]>,
    /// Spacing on any masks.
    #[serde(default, skip_serializing_if = "is_zero")]
    pub any_mask: i32,
    /// What stitches keep away from, and how far.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub keep_outs: Vec<(String, i32)>,
    /// The most stitches of one feature.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub most_stitches: Option<u32>,
    /// The candidates of the policy `listed`: a point of the feature, a point of the cut.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub listed: Vec<[i32; 4]>,
    /// Layers whose shapes are on a mask.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub fixed_layers: Vec<(String, Mask)>,
    /// Points of features that are on a mask.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub fixed: Vec<(i32, i32, Mask)>,
    /// Points of features that share a mask.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub same: Vec<Vec<[i32; 2]>>,
    /// Points of features on masks that are all different.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub different: Vec<Vec<[i32; 2]>>,
}

fn is_zero(length: &i32) -> bool {
    *length == 0
}

impl Rules {
    /// The rules of a graph.
    pub fn of_graph(masks: u8) -> Rules {
        Rules::Graph(GraphRules { masks })
    }

    /// The rules of a layer of `top`; `policy` is the name of the stitch policy.
    pub fn of_layer(rules: &layout::Rules, policy: &str, top: &str, unit_pm: u64) -> Rules {
        let layout::Rules {
            layer,
            masks,
            spacing,
            spacings,
            stitch,
            hand,
        } = rules;
        let wide = spacings.wide.iter();
        let keep_outs = stitch.keep_outs.iter();
        let listed = stitch.listed.iter();
        let fixed_layers = hand.fixed_layers.iter();
        let fixed = hand.fixed.iter();
        Rules::Layer(Box::new(LayerRules {
            masks: *masks,
            top: top.to_owned(),
            layer: layer.to_string(),
            unit_pm,
            spacing: *spacing,
            stitch: policy.to_owned(),
            overlap: stitch.overlap,
            fragment_length: stitch.fragment_length,
            corner: stitch.corner,
            stitch_weight: stitch.weight,
            metric: (spacings.metric != Metric::default())
                .then(|| spacings.metric.name().to_owned()),
            end_length: spacings.end_length,
            side_to_side: spacings.side_to_side,
            side_to_end: spacings.side_to_end,
            end_to_end: spacings.end_to_end,
            corner_to_corner: spacings.corner_to_corner,
            wide: wide
                .map(|row| [row.width, row.run_length, row.spacing])
                .collect(),
            any_mask: spacings.any_mask,
            keep_outs: keep_outs
                .map(|keep_out| (keep_out.layer.to_string(), keep_out.distance))
                .collect(),
            most_stitches: stitch.most_per_feature,
            listed: listed
                .map(|Listed { feature, at }| [feature.x, feature.y, at.x, at.y])
                .collect(),
            fixed_layers: fixed_layers
                .map(|(layer, mask)| (layer.to_string(), mask + 1))
                .collect(),
            fixed: fixed.map(|(at, mask)| (at.x, at.y, mask + 1)).collect(),
            same: numbers(&hand.same),
            different: numbers(&hand.different),
        }))
    }

    /// K, the number of masks.
    pub fn masks(&self) -> u8 {
        match self {
            Rules::Layer(rules) => rules.masks,
            Rules::Graph(rules) => rules.masks,
        }
    }

    /// SHA-256 of the member as it is written.
    pub fn sha256(&self) -> String {
        // Strings and integers only: writing them to memory does not fail.
        sha256(&serde_json::to_vec(self).unwrap_or_default())
    }
}

fn numbers(sets: &[Vec<Point>]) -> Vec<Vec<[i32; 2]>> {
    let set = |set: &Vec<Point>| set.iter().map(|at| [at.x, at.y]).collect();
    sets.iter().map(set).collect()
}

impl LayerRules {
    /// The rules of the layer, where they are possible ones.
    ///
    /// # Errors
    /// What is no possible rule, in words.
    pub fn resolve(&self) -> Result<layout::Rules, String> {
        let rules = layout::Rules {
            layer: layer(&self.layer)?,
            masks: self.masks,
            spacing: self.spacing,
            spacings: self.spacings()?,
            stitch: self.stitch()?,
            hand: self.hand()?,
        };
        if !(2..=MAX_MASKS).contains(&self.masks) || self.unit_pm == 0 {
            return Err("a rule is out of range".to_owned());
        }
        check_layers(&rules)?;
        Ok(rules)
    }

    fn spacings(&self) -> Result<Spacings, String> {
        let named = self.metric.as_deref().map(parse_metric);
        let metric = named.transpose().map_err(|error| error.to_string())?;
        let wide = self.wide.iter().map(|&[width, run_length, spacing]| {
            Ok(WideSpacing {
                width: positive(width)?,
                run_length: positive(run_length)?,
                spacing: positive(spacing)?,
            })
        });
        let kind = |spacing: Option<i32>| spacing.map(positive).transpose();
        let spacings = Spacings {
            metric: metric.unwrap_or_default(),
            end_length: length(self.end_length)?,
            side_to_side: kind(self.side_to_side)?,
            side_to_end: kind(self.side_to_end)?,
            end_to_end: kind(self.end_to_end)?,
            corner_to_corner: kind(self.corner_to_corner)?,
            wide: wide.collect::<Result<_, String>>()?,
            any_mask: length(self.any_mask)?,
        };
        let of_ends = spacings.side_to_end.or(spacings.end_to_end);
        if of_ends.is_some() && spacings.end_length == 0 {
            return Err("spacings of line ends without end_length".to_owned());
        }
        let rows = spacings.wide.iter().map(|row| (row.width, row.run_length));
        if !rows.is_sorted_by(|a, b| a < b) {
            return Err("the spacings of wide features are not ascending".to_owned());
        }
        let kinds = [
            Some(positive(self.spacing)?),
            spacings.side_to_side,
            spacings.side_to_end,
            spacings.end_to_end,
            spacings.corner_to_corner,
        ];
        let wide = spacings.wide.iter().map(|row| row.spacing);
        let mut all = kinds.into_iter().flatten().chain(wide);
        match all.any(|spacing| spacing <= spacings.any_mask) {
            true => Err("any_mask is not smaller than every other spacing".to_owned()),
            false => Ok(spacings),
        }
    }

    fn stitch(&self) -> Result<StitchRules, String> {
        let policy = parse_policy(&self.stitch).map_err(|error| error.to_string())?;
        let keep_outs = self.keep_outs.iter().map(|(name, distance)| {
            Ok(KeepOut {
                layer: layer(name)?,
                distance: length(*distance)?,
            })
        });
        let listed = self.listed.iter().map(|&[fx, fy, x, y]| {
            Ok(Listed {
                feature: point([fx, fy])?,
                at: point([x, y])?,
            })
        });
        let stitch = StitchRules {
            policy,
            overlap: length(self.overlap)?,
            fragment_length: length(self.fragment_length)?,
            corner: length(self.corner)?,
            weight: self.stitch_weight,
            keep_outs: keep_outs.collect::<Result<_, String>>()?,
            most_per_feature: self.most_stitches,
            listed: listed.collect::<Result<_, String>>()?,
        };
        if stitch.overlap % 2 != 0 || stitch.weight == 0 || stitch.most_per_feature == Some(0) {
            return Err("a rule is out of range".to_owned());
        }
        if policy != Policy::Listed && !stitch.listed.is_empty() {
            return Err("stitches are listed for a policy that reads no list".to_owned());
        }
        match stitch.listed.is_sorted_by(|a, b| a < b) {
            true => Ok(stitch),
            false => Err("the stitches listed are not ascending".to_owned()),
        }
    }

    fn hand(&self) -> Result<Hand, String> {
        let mask = |mask: Mask| match mask {
            1.. if mask <= self.masks => Ok(mask - 1),
            _ => Err(format!("mask {mask} of {}", self.masks)),
        };
        let fixed_layers = self.fixed_layers.iter();
        let fixed = self.fixed.iter();
        Ok(Hand {
            fixed_layers: fixed_layers
                .map(|(name, on)| Ok((layer(name)?, mask(*on)?)))
                .collect::<Result<_, String>>()?,
            fixed: fixed
                .map(|&(x, y, on)| Ok((point([x, y])?, mask(on)?)))
                .collect::<Result<_, String>>()?,
            same: sets(&self.same)?,
            different: sets(&self.different)?,
        })
    }
}

fn layer(name: &str) -> Result<LayerId, String> {
    parse_layer(name).map_err(|error| error.to_string())
}

fn length(units: i32) -> Result<i32, String> {
    match units {
        0..=COORDINATE_LIMIT => Ok(units),
        _ => Err("a rule is out of range".to_owned()),
    }
}

fn positive(units: i32) -> Result<i32, String> {
    match units {
        1..=COORDINATE_LIMIT => Ok(units),
        _ => Err("a rule is out of range".to_owned()),
    }
}

fn point([x, y]: [i32; 2]) -> Result<Point, String> {
    let at = Point { x, y };
    match at.is_in_range() {
        true => Ok(at),
        false => Err("a point is out of range".to_owned()),
    }
}

fn sets(given: &[Vec<[i32; 2]>]) -> Result<Vec<Vec<Point>>, String> {
    let set = |set: &Vec<[i32; 2]>| {
        let points: Vec<Point> = set.iter().copied().map(point).collect::<Result<_, _>>()?;
        match points.len() {
            0 | 1 => Err("a set of fewer than two points".to_owned()),
            _ => Ok(points),
        }
    };
    given.iter().map(set).collect()
}

/// Each layer that is drawn has one purpose.
fn check_layers(rules: &layout::Rules) -> Result<(), String> {
    let fixed = rules.hand.fixed_layers.iter().map(|&(layer, _)| layer);
    let keep_outs = rules.stitch.keep_outs.iter().map(|keep_out| keep_out.layer);
    let mut all: Vec<LayerId> = fixed.chain(keep_outs).chain([rules.layer]).collect();
    all.sort_unstable();
    match all.windows(2).find(|two| two[0] == two[1]) {
        Some(two) => Err(format!("layer {} is named twice", two[0])),
        None => Ok(()),
    }
}

#[cfg(test)]
mod tests;
