//! `result.json`: the verdict and everything that it rests on. No time, thread count or path of the
//! machine goes into it.

use std::io::{self, Write};

use serde::Serialize;

use super::{LayerFacts, Report, Stitched, Unresolved, start_json};
use crate::formats::document::Document;
use crate::geometry::Rect;
use crate::layout::length::Micrometres;
use crate::layout::{Metric, Policy, Rules};
use crate::solve::Bounds;

/// The version of the format; it changes when a member changes its meaning or goes away.
const VERSION: u32 = 1;

type Box = [Micrometres; 4];

#[derive(Serialize)]
pub(super) struct Limits {
    lower: u64,
    upper: u64,
}

#[derive(Serialize)]
pub(super) struct Conflict {
    kind: &'static str,
    features: [u32; 2],
    fragments: [u32; 2],
    mask: u8,
    #[serde(skip_serializing_if = "Option::is_none")]
    near_um: Option<Box>,
}

#[derive(Serialize)]
pub(super) struct Stitch {
    feature: u32,
    fragments: [u32; 2],
    masks: [u8; 2],
    weight: u32,
    #[serde(skip_serializing_if = "Option::is_none")]
    at_um: Option<Box>,
}

#[derive(Serialize)]
struct LayoutError {
    features: [u32; 2],
    near_um: [Micrometres; 4],
}

#[derive(Serialize)]
struct BeyondTheorem {
    feature: u32,
    reason: &'static str,
    at_um: Box,
}

#[derive(Serialize)]
struct Unstitchable {
    feature: u32,
    at_um: Box,
}

#[derive(Serialize)]
struct MaskRow {
    mask: usize,
    fragments: u64,
    area: u128,
}

#[derive(Serialize)]
struct Reductions {
    peeled_features: usize,
    dominated_fragments: usize,
    cut_parts: usize,
    identical_pieces: usize,
}

#[derive(Serialize)]
struct Layer<'a> {
    top: &'a str,
    layer: String,
    unit_pm: u64,
    shapes: u64,
    empty_shapes: u64,
    spacing_um: Micrometres,
    stitch: &'static str,
    overlap_um: Micrometres,
    fragment_length_um: Micrometres,
    corner_um: Micrometres,
    stitch_weight: u32,
    #[serde(flatten)]
    special: Special,
}

/// The rules that few layers have; each is left out where it says nothing.
#[derive(Serialize)]
struct Special {
    #[serde(skip_serializing_if = "Option::is_none")]
    metric: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    end_length_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Option::is_none")]
    side_to_side_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Option::is_none")]
    side_to_end_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Option::is_none")]
    end_to_end_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Option::is_none")]
    corner_to_corner_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    wide_um: Vec<[Micrometres; 3]>,
    #[serde(skip_serializing_if = "Option::is_none")]
    any_mask_um: Option<Micrometres>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    keep_outs: Vec<KeptOut>,
    #[serde(skip_serializing_if = "Option::is_none")]
    most_stitches: Option<u32>,
    #[serde(skip_serializing_if = "is_none")]
    listed: usize,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    fixed_layers: Vec<FixedLayer>,
    #[serde(skip_serializing_if = "is_none")]
    fixed_points: usize,
    #[serde(skip_serializing_if = "is_none")]
    same_mask: usize,
    #[serde(skip_serializing_if = "is_none")]
    different_masks: usize,
}

#[derive(Serialize)]
struct KeptOut {
    layer: String,
    distance_um: Micrometres,
}

#[derive(Serialize)]
struct FixedLayer {
    layer: String,
    mask: u8,
}

fn is_none(count: &usize) -> bool {
    *count == 0
}

/// Writes the result.
pub fn write(report: &Report, out: &mut impl Write) -> io::Result<()> {
    let counts = report.counts;
    let unit_pm = report.layer.as_ref().map_or(0, |layer| layer.unit_pm);
    let mut document = Document::open(out)?;
    // `directory::RESULT_MARK` knows a result by this first member.
    document.member("format", "maskproof-result")?;
    document.member("version", VERSION)?;
    document.member("verdict", report.verdict().as_str())?;
    document.member("stopped_by", report.stop.map(|stop| stop.as_str()))?;
    document.member("input", &report.input)?;
    document.member("masks", report.masks)?;
    if let Some(layer) = &report.layer {
        document.member("layer", layer_member(layer))?;
    }
    document.member("features", counts.features)?;
    document.member("fragments", counts.fragments)?;
    document.member("conflict_pairs", counts.conflict_pairs)?;
    document.member("self_spacings", counts.self_spacings)?;
    document.member("self_spacing_features", counts.self_spacing_features)?;
    document.member("stitch_candidates", counts.stitch_candidates)?;
    document.member("conflicts", limits(report.conflicts))?;
    document.member("stitches", limits(report.stitches))?;
    document.member("pieces", report.pieces.len())?;
    document.member("reductions", reductions(report))?;
    document.list("mask_use", mask_rows(report))?;
    document.list(
        "unresolved",
        report.unresolved.iter().map(|left| conflict(left, unit_pm)),
    )?;
    document.list(
        "stitched",
        report.stitched.iter().map(|used| stitch(used, unit_pm)),
    )?;
    if let Some(start) = &report.start {
        start_json::write(start, unit_pm, &mut document)?;
    }
    if let Some(layer) = &report.layer {
        let features = layer.unstitchable.iter();
        let entries = features.map(|&(feature, place)| Unstitchable {
            feature,
            at_um: corners(place, unit_pm),
        });
        document.list("unstitchable", entries)?;
        if layer.rules.stitch.policy == Policy::EveryInterval {
            document.member("candidates_found", layer.candidates_found)?;
            let features = layer.beyond_theorem.iter();
            let entries = features.map(|&(feature, reason, place)| BeyondTheorem {
                feature,
                reason,
                at_um: corners(place, unit_pm),
            });
            document.list("beyond_theorem", entries)?;
        }
        if layer.rules.spacings.any_mask > 0 {
            let pairs = layer.too_close.iter();
            let entries = pairs.map(|&(features, place)| LayoutError {
                features,
                near_um: corners(place, unit_pm),
            });
            document.list("layout_errors", entries)?;
        }
    }
    document.close()
}

fn layer_member(facts: &LayerFacts) -> Layer<'_> {
    let length = |units| Micrometres::new(units, facts.unit_pm);
    let stitch = &facts.rules.stitch;
    Layer {
        top: &facts.top,
        layer: facts.rules.layer.to_string(),
        unit_pm: facts.unit_pm,
        shapes: facts.shapes,
        empty_shapes: facts.empty_shapes,
        spacing_um: length(facts.rules.spacing),
        stitch: stitch.policy.name(),
        overlap_um: length(stitch.overlap),
        fragment_length_um: length(stitch.fragment_length),
        corner_um: length(stitch.corner),
        stitch_weight: stitch.weight,
        special: special(&facts.rules, &length),
    }
}

fn special(rules: &Rules, length: &dyn Fn(i32) -> Micrometres) -> Special {
    let (spacings, stitch, hand) = (&rules.spacings, &rules.stitch, &rules.hand);
    let kind = |spacing: Option<i32>| spacing.map(length);
    let given = |units: i32| (units > 0).then(|| length(units));
    let wide = spacings.wide.iter();
    let keep_outs = stitch.keep_outs.iter();
    let fixed_layers = hand.fixed_layers.iter();
    Special {
        metric: (spacings.metric != Metric::default()).then(|| spacings.metric.name()),
        end_length_um: given(spacings.end_length),
        side_to_side_um: kind(spacings.side_to_side),
        side_to_end_um: kind(spacings.side_to_end),
        end_to_end_um: kind(spacings.end_to_end),
        corner_to_corner_um: kind(spacings.corner_to_corner),
        wide_um: wide
            .map(|row| [row.width, row.run_length, row.spacing].map(length))
            .collect(),
        any_mask_um: given(spacings.any_mask),
        keep_outs: keep_outs
            .map(|kept| KeptOut {
                layer: kept.layer.to_string(),
                distance_um: length(kept.distance),
            })
            .collect(),
        most_stitches: stitch.most_per_feature,
        listed: stitch.listed.len(),
        fixed_layers: fixed_layers
            .map(|&(layer, mask)| FixedLayer {
                layer: layer.to_string(),
                mask: mask + 1,
            })
            .collect(),
        fixed_points: hand.fixed.len(),
        same_mask: hand.same.len(),
        different_masks: hand.different.len(),
    }
}

pub(super) fn limits(bounds: Bounds) -> Limits {
    Limits {
        lower: bounds.lower,
        upper: bounds.upper,
    }
}

fn reductions(report: &Report) -> Reductions {
    Reductions {
        peeled_features: report.reductions.peeled,
        dominated_fragments: report.reductions.dominated,
        cut_parts: report.reductions.cut,
        identical_pieces: report.reductions.identical,
    }
}

fn mask_rows(report: &Report) -> impl Iterator<Item = MaskRow> {
    report.mask_use.iter().enumerate().map(|(i, held)| MaskRow {
        mask: i + 1,
        fragments: held.fragments,
        area: held.area,
    })
}

pub(super) fn conflict(left: &Unresolved, unit_pm: u64) -> Conflict {
    let [a, b] = left.features;
    Conflict {
        kind: if a == b {
            "self-spacing"
        } else {
            "conflict pair"
        },
        features: left.features,
        fragments: left.fragments,
        mask: left.mask + 1,
        near_um: left.place.map(|place| corners(place, unit_pm)),
    }
}

pub(super) fn stitch(used: &Stitched, unit_pm: u64) -> Stitch {
    Stitch {
        feature: used.feature,
        fragments: used.fragments,
        masks: used.masks.map(|mask| mask + 1),
        weight: used.weight,
        at_um: used.place.map(|place| corners(place, unit_pm)),
    }
}

fn corners(place: Rect, unit_pm: u64) -> Box {
    [place.min.x, place.min.y, place.max.x, place.max.y].map(|x| Micrometres::new(x, unit_pm))
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::report::{directory, samples};

    fn text(report: &Report) -> String {
        let mut out = Vec::new();
        write(report, &mut out).unwrap();
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn the_members_promised_are_there() {
        let text = text(&samples::layer());
        assert!(text.starts_with(directory::RESULT_MARK));
        let read: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(read["version"], 1);
        assert_eq!(read["verdict"], "undecided");
        assert_eq!(read["stopped_by"], "time limit");
        assert_eq!(read["masks"], 3);
        assert_eq!(read["conflicts"]["lower"], 2);
        assert_eq!(read["conflicts"]["upper"], 3);
        assert_eq!(read["stitches"]["upper"], 1);
        assert_eq!(read["layer"]["layer"], "67/20");
        assert_eq!(read["layer"]["spacing_um"], 0.25);
        // Masks are numbered from 1 for people.
        assert_eq!(read["unresolved"][0]["mask"], 3);
        assert_eq!(read["unresolved"][0]["near_um"][0], -0.17);
        assert_eq!(read["stitched"][0]["masks"][0], 1);
        assert_eq!(read["mask_use"][2]["mask"], 3);
        assert_eq!(read["unstitchable"][0]["feature"], 3);
        assert_eq!(read["reductions"]["peeled_features"], 3);
    }

    #[test]
    fn special_rules_are_there_where_they_say_something() {
        let mut report = samples::layer();
        let plain: serde_json::Value = serde_json::from_str(&text(&report)).unwrap();
        assert_eq!(plain["layer"].as_object().unwrap().len(), 11);
        let layer = report.layer.as_mut().unwrap();
        let rules = &mut layer.rules;
        rules.spacings.metric = Metric::Square;
        rules.spacings.end_to_end = Some(300);
        rules.spacings.any_mask = 100;
        rules.stitch.keep_outs = vec![crate::layout::KeepOut {
            layer: rules.layer,
            distance: 30,
        }];
        rules.hand.fixed_layers = vec![(rules.layer, 1)];
        rules.hand.same = vec![Vec::new(), Vec::new()];
        let read: serde_json::Value = serde_json::from_str(&text(&report)).unwrap();
        let layer = &read["layer"];
        assert_eq!(layer["metric"], "square");
        assert_eq!(layer["end_to_end_um"], 0.3);
        assert_eq!(layer["any_mask_um"], 0.1);
        assert_eq!(layer["keep_outs"][0]["layer"], "67/20");
        assert_eq!(layer["keep_outs"][0]["distance_um"], 0.03);
        assert_eq!(layer["fixed_layers"][0]["mask"], 2);
        assert_eq!(layer["same_mask"], 2);
        assert_eq!(layer.as_object().unwrap().len(), 17);
    }

    #[test]
    fn graphs_have_no_layer_and_no_places() {
        let mut report = samples::layer();
        report.layer = None;
        report.unresolved[0].place = None;
        let text = text(&report);
        assert!(!text.contains("\"layer\"") && !text.contains("near_um"));
    }
}
