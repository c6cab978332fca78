//! The closed set of candidate places: every place that a stitch can be stopped at when it is pushed.
//!
//! The base of a lane is its first legal place, and the first legal place from each fixed stop on. Round by round,
//! what the new places of the round before stop is added: see the head of `every_interval` for the list and for why
//! the result is complete. On long lanes the sums of all these steps become dense. A lane that would take
//! more than [`MOST_STEPS`] of them, or steps beyond [`MOST_ROUNDS`] rounds, keeps its base only, and its feature is
//! named; what such a lane stops on others is found anew from its base, which may bring others back
//! below the limit.

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

/// The most places of a lane beyond its base.
const MOST_STEPS: usize = 16;

/// The most rounds of steps.
const MOST_ROUNDS: usize = 64;

/// How often lanes are reduced to their base before all that take steps are.
const MOST_TRIES: usize = 3;

/// What is known of a lane so far.
#[derive(Clone, Debug, Default)]
pub(super) struct Stops {
    /// The candidate places, in lane coordinates.
    pub(super) places: BTreeSet<i32>,
    /// Whether the lane keeps its base only, although there are steps.
    pub(super) only_base: bool,
    /// How many places the base has.
    base: usize,
    /// Where neighbours, fixed or stitched, stop a stitch: the first place at which it is far enough.
    stops: BTreeSet<i64>,
    /// The places that were new in the last round.
    fresh: Vec<i32>,
    /// Whether a step was left out.
    full: bool,
}

impl Stops {
    fn add(&mut self, lane: &Lane, stop: i64) {
        if let Some(place) = lane.legal.first_from(stop)
            && self.places.insert(place)
        {
            self.fresh.push(place);
        }
    }

    /// Adds a place of a later round, unless there are too many.
    fn step(&mut self, lane: &Lane, stop: i64, is_last: bool) {
        let new = |place: &i32| !self.places.contains(place);
        if self.only_base || self.full || lane.legal.first_from(stop).filter(new).is_none() {
            return;
        }
        if is_last || self.places.len() >= self.base + MOST_STEPS {
            self.full = true;
        } else {
            self.add(lane, stop);
        }
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
    let base: Vec<Stops> = (layer.lanes.par_iter().with_min_len(16))
        .map(|lane| base(ground, layer, lane, &reach))
        .collect();
    let mut only_base = vec![false; base.len()];
    for attempt in 0.. {
        let mut all = base.clone();
        for (stops, &only) in all.iter_mut().zip(&only_base) {
            stops.only_base = only;
        }
        rounds(layer, &mut all, &reach);
        if !all.iter().any(|stops| stops.full) {
            return Ok(all);
        }
        for (only, stops) in only_base.iter_mut().zip(&all) {
            let takes_steps = stops.places.len() > stops.base;
            *only |= stops.full || (attempt >= MOST_TRIES && takes_steps);
        }
    }
    Ok(base)
}

/// Takes steps until there are no more.
fn rounds(layer: &Layer, all: &mut [Stops], reach: &Reach) {
    for round in 0..=MOST_ROUNDS {
        let fresh = take_fresh(all);
        if fresh.is_empty() {
            return;
        }
        let is_last = round == MOST_ROUNDS;
        let found: Vec<Vec<(u32, i64)>> = (fresh.par_iter().with_min_len(64))
            .map(|&(lane, place)| stopped_by(layer, lane, place, reach))
            .collect();
        let mut touched: Vec<u32> = fresh.into_iter().map(|(lane, _)| lane).collect();
        for (lane, stop) in found.into_iter().flatten() {
            let stops = &mut all[lane as usize];
            if !stops.only_base && stops.stops.insert(stop) {
                stops.step(&layer.lanes[lane as usize], stop, is_last);
                touched.push(lane);
            }
        }
        touched.sort_unstable();
        touched.dedup();
        for lane in touched {
            let stops = &mut all[lane as usize];
            step_by_length(layer, &layer.lanes[lane as usize], stops, reach, is_last);
        }
    }
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
fn base(ground: &Ground<'_>, layer: &Layer, lane: &Lane, reach: &Reach) -> Stops {
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
    stops.base = stops.places.len();
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
    if stops.only_base || stops.full {
        return;
    }
    // Ascending, so that a chain of steps is taken in one round.
    let mut next = stops.places.first().copied();
    let always = layer.has_right_angles(lane.feature);
    while let Some(place) = next {
        let stop = i64::from(place) + reach.length;
        let between = i64::from(place) + 1..stop;
        if always || stops.stops.range(between).next().is_some() {
            stops.step(lane, stop, is_last);
        }
        if stops.full {
            return;
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
