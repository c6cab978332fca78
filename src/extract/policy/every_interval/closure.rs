//! The closed set of candidate places: every place that a stitch can be stopped at when it is pushed.
//!
//! Round 0 has the first legal place of each lane and the first legal places from each fixed stop on; each later
//! round what the new places of the round before stop: see the head of `every_interval` for the list and for why
//! the result is complete. A lane keeps at most [`MOST_PLACES`] places, and there are at most [`MOST_ROUNDS`]
//! rounds: where that leaves a place out, the feature is named.

use super::super::super::shadows::{Shadow, on_run};
use super::super::legal::beyond;
use super::super::{ExtractError, Ground};
use super::clusters::Layer;
use super::lanes::Lane;
use crate::geometry::Rect;
use crate::geometry::rtree::Visitor;
use crate::layout::rules::Metric;
use rayon::prelude::*;
use std::collections::BTreeSet;

/// The most places of a lane.
pub(super) const MOST_PLACES: usize = 64;

/// The most rounds.
pub(super) const MOST_ROUNDS: usize = 24;

/// What is known of a lane so far.
#[derive(Clone, Debug, Default)]
pub(super) struct Stops {
    /// The candidate places, in lane coordinates.
    pub(super) places: BTreeSet<i32>,
    /// Where neighbours, fixed or stitched, stop a stitch: the first place at which it is far enough.
    stops: BTreeSet<i64>,
    /// The places that were new in the last round.
    fresh: Vec<i32>,
    /// Whether a place was left out.
    pub(super) full: bool,
}

impl Stops {
    fn add(&mut self, lane: &Lane, stop: i64) {
        let Some(place) = lane.legal.first_from(stop) else {
            return;
        };
        if self.places.contains(&place) {
            return;
        }
        if self.places.len() >= MOST_PLACES {
            self.full = true;
            return;
        }
        self.places.insert(place);
        self.fresh.push(place);
    }
}

/// Distances as the closure needs them.
#[derive(Clone, Copy, Debug)]
struct Reach {
    half: i32,
    spacing: i32,
    length: i64,
    metric: Metric,
}

impl Reach {
    /// The first place at which what begins half an overlap before it is not close to `rect` any more; nothing
    /// where `rect` is too far across.
    fn stop(&self, lane: &Lane, rect: &Rect) -> Option<i64> {
        let (rect, along) = (lane.turn(rect), lane.along());
        let above = i64::from(rect.min.y) - i64::from(along.max.y);
        let below = i64::from(along.min.y) - i64::from(rect.max.y);
        let reach = beyond(above.max(below).max(0), self.spacing, self.metric)?;
        Some(i64::from(rect.max.x) + reach + i64::from(self.half) + 1)
    }
}

/// The places of each lane of a layer.
pub(super) fn close(ground: &Ground<'_>, layer: &Layer) -> Result<Vec<Stops>, ExtractError> {
    let rules = ground.rules();
    let reach = Reach {
        half: rules.stitch.overlap / 2,
        spacing: rules.spacing,
        length: i64::from(rules.stitch.fragment_length).max(1),
        metric: rules.spacings.metric,
    };
    let mut all: Vec<Stops> = (layer.lanes.par_iter().with_min_len(16))
        .map(|lane| first_round(ground, layer, lane, &reach))
        .collect();
    for round in 0..=MOST_ROUNDS {
        let fresh = take_fresh(&mut all);
        if fresh.is_empty() {
            break;
        }
        let found: Vec<Vec<(u32, i64)>> = (fresh.par_iter().with_min_len(16))
            .map(|&(lane, place)| stopped_by(layer, lane, place, &reach))
            .collect();
        let is_last = round == MOST_ROUNDS;
        for (lane, stop) in found.into_iter().flatten() {
            let stops = &mut all[lane as usize];
            if stops.stops.insert(stop) && !is_last {
                stops.add(&layer.lanes[lane as usize], stop);
            } else if is_last {
                stops.full |= is_new(&layer.lanes[lane as usize], stops, stop);
            }
        }
        for (lane, stops) in layer.lanes.iter().zip(&mut all) {
            step_by_length(layer, lane, stops, &reach, is_last);
        }
    }
    Ok(all)
}

fn is_new(lane: &Lane, stops: &Stops, stop: i64) -> bool {
    let place = lane.legal.first_from(stop);
    place.is_some_and(|place| !stops.places.contains(&place))
}

/// The new places of all lanes, in the order of lanes.
fn take_fresh(all: &mut [Stops]) -> Vec<(u32, i32)> {
    let each = (0u32..).zip(all.iter_mut());
    each.flat_map(|(lane, stops)| {
        let fresh = std::mem::take(&mut stops.fresh);
        fresh.into_iter().map(move |place| (lane, place))
    })
    .collect()
}

/// The first legal place, and those from each fixed stop on.
fn first_round(ground: &Ground<'_>, layer: &Layer, lane: &Lane, reach: &Reach) -> Stops {
    let mut stops = Stops::default();
    stops.add(lane, i64::MIN);
    let around = ground.around;
    let mut fixed = Vec::new();
    // Features that take no stitch stay whole: their shadows as drawn will do.
    for shadow in on_run(around, lane.feature, &lane.run) {
        if !layer.is_cut(shadow.feature) {
            let Shadow { from, to, .. } = shadow;
            let end = if lane.mirrored {
                -i64::from(from)
            } else {
                to.into()
            };
            fixed.push(end + i64::from(reach.half) + 1);
        }
    }
    let near = lane.area().grown(reach.spacing - 1);
    let mut pieces = Found(Vec::new());
    layer.pieces.query(&near, &mut pieces);
    for piece in pieces.0 {
        fixed.extend(reach.stop(lane, &layer.pieces.items()[piece as usize]));
    }
    fixed.sort_unstable();
    fixed.dedup();
    for &stop in &fixed {
        stops.add(lane, stop);
    }
    stops.stops.extend(fixed);
    stops
}

/// The lanes that a stitch at `place` of a lane stops, and where.
fn stopped_by(layer: &Layer, lane: u32, place: i32, reach: &Reach) -> Vec<(u32, i64)> {
    let overlap = layer.lanes[lane as usize].overlap(place, reach.half);
    let mut near = Found(Vec::new());
    (layer.tree).query(&overlap.grown(reach.spacing - 1), &mut near);
    near.0.sort_unstable();
    let stop = |other: u32| Some((other, reach.stop(&layer.lanes[other as usize], &overlap)?));
    near.0.into_iter().filter_map(stop).collect()
}

/// The places that are the smallest fragment length from another one of the lane.
fn step_by_length(layer: &Layer, lane: &Lane, stops: &mut Stops, reach: &Reach, is_last: bool) {
    // Ascending, so that a chain of steps is taken in one round.
    let mut next = stops.places.first().copied();
    let always = layer.has_right_angles(lane.feature);
    while let Some(place) = next {
        let stop = i64::from(place) + reach.length;
        let between = i64::from(place) + 1..stop;
        if always || stops.stops.range(between).next().is_some() {
            if is_last {
                stops.full |= is_new(lane, stops, stop);
            } else {
                stops.add(lane, stop);
            }
        }
        next = stops.places.range(place + 1..).next().copied();
    }
}

pub(super) struct Found(pub(super) Vec<u32>);

impl Visitor for Found {
    fn enter(&mut self, _: usize) -> bool {
        true
    }

    fn visit(&mut self, item: u32) {
        self.0.push(item);
    }
}
