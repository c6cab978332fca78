//! The cuts of each stitch policy.
//!
//! `none` and `uncovered` tell where they are. `listed` cuts where the rules say, all of them. For `every-interval` the certificate says where, and
//! each of its cuts is held against the rules: what an audit then proves is about these places for stitches, and not about all that there
//! could be. (To derive that they suffice would be another function from runs to candidates, like that of `uncovered`.)

use super::candidates;
use super::cuts::{self, Candidate, Cuts, rects_of_features};
use super::ground::Ground;
use super::hand::features_at;
use super::near;
use super::runs::{Run, Runs};
use crate::audit::{Rejection, Step};
use crate::certificate::SplitFeature;
use crate::geometry::{Point, Rect};
use crate::layout::Policy;
use rayon::prelude::*;

/// The cuts of the policy of the rules.
pub(super) fn cuts(ground: &Ground, split: &[SplitFeature]) -> Result<Cuts, Rejection> {
    match ground.rules.stitch.policy {
        Policy::None => Ok(Cuts::default()),
        Policy::Uncovered => {
            let runs = runs_of(ground, |feature| !ground.by_hand[feature as usize])?;
            let candidates = candidates::uncovered(&runs, ground)?.into_iter();
            let of_run = |(run, place): (u32, i32)| candidate(&runs.runs, run, place);
            let candidates: Vec<Candidate> = candidates.filter_map(of_run).collect();
            cuts::divided(&candidates, &runs)
        }
        Policy::Listed => listed(ground),
        Policy::EveryInterval => named(ground, split),
    }
}

/// Why a line is no cut, where the policy does not have it.
pub(super) fn objection(ground: &Ground, feature: u32, line: [i32; 4]) -> String {
    let policy = ground.rules.stitch.policy;
    if policy == Policy::None {
        return "the policy none places no candidates".to_owned();
    }
    let line = rect(line);
    let found = runs_of(ground, |other| other == feature).and_then(|runs| {
        let runs = runs.ordered();
        let run = match ground.site(&runs, feature, line) {
            Ok((_, run, _)) => run.area(),
            Err(reason) => return Ok(reason),
        };
        let kept_out = ground.kept_out(&[line])?.into_iter().next().flatten();
        Ok(kept_out.unwrap_or_else(|| separates_nothing(policy, run)))
    });
    found.unwrap_or_else(|rejection| rejection.reason)
}

fn separates_nothing(policy: Policy, run: Rect) -> String {
    let Rect { min, max } = run;
    let run = format!("run from ({}, {}) to ({}, {})", min.x, min.y, max.x, max.y);
    match policy {
        Policy::EveryInterval => format!("on the {run}, it separates nothing"),
        Policy::Listed => {
            format!("the rules list none there on the {run}, or it separates nothing")
        }
        _ => format!("the policy places none there on the {run}, or it separates nothing"),
    }
}

/// The runs of those features that are wanted.
fn runs_of(ground: &Ground, wanted: impl Fn(u32) -> bool + Sync) -> Result<Runs, Rejection> {
    let rects = rects_of_features(&ground.bodies, &ground.features);
    Runs::new(rects.into_par_iter().filter(|own| wanted(own.0)).collect())
}

fn candidate(runs: &[Run], number: u32, place: i32) -> Option<Candidate> {
    let run = runs.get(number as usize)?;
    Some(Candidate {
        feature: run.feature,
        line: run.line(place),
        run: number,
    })
}

/// The cuts that the certificate names, as far as they are legal: the others have no match when the two are compared.
fn named(ground: &Ground, split: &[SplitFeature]) -> Result<Cuts, Rejection> {
    let mut cut: Vec<u32> = split.iter().map(|split| split.feature).collect();
    cut.sort_unstable();
    let runs = runs_of(ground, |feature| cut.binary_search(&feature).is_ok())?.ordered();
    let mut candidates: Vec<Candidate> = Vec::new();
    for SplitFeature { feature, cuts, .. } in split {
        candidates.extend(cuts.iter().filter_map(|cut| {
            let (run, _, _) = ground.site(&runs, *feature, rect(cut.line)).ok()?;
            Some(Candidate {
                feature: *feature,
                line: rect(cut.line),
                run,
            })
        }));
    }
    candidates.sort_unstable();
    candidates.dedup();
    let lines: Vec<Rect> = candidates.iter().map(|one| one.line).collect();
    let mut kept_out = ground.kept_out(&lines)?.into_iter();
    candidates.retain(|_| kept_out.next() == Some(None));
    cuts::divided(&candidates, &runs)
}

/// The cuts that the rules list: at each place the one on that run of the feature on which it is legal. Two runs may have a point
/// in common, and no more than one of them can be cut there.
fn listed(ground: &Ground) -> Result<Cuts, Rejection> {
    let list = &ground.rules.stitch.listed;
    let points: Vec<Point> = list.iter().map(|one| one.feature).collect();
    let features = features_at(&points, &ground.bodies, &ground.features)?;
    let mut cut = features.clone();
    cut.sort_unstable();
    let runs = runs_of(ground, |feature| cut.binary_search(&feature).is_ok())?.ordered();
    let at: Vec<Point> = list.iter().map(|one| one.at).collect();
    let on = runs_at(&runs, &features, &at)?;
    let mut candidates: Vec<Candidate> = Vec::with_capacity(list.len());
    for (number, (&Point { x, y }, &feature)) in (0..).zip(at.iter().zip(&features)) {
        let first = on.partition_point(|hit| hit[0] < number);
        let own = on[first..].iter().take_while(|hit| hit[0] == number);
        let mut reason = "it is on no straight run of the feature".to_owned();
        let mut legal = None;
        for &[_, run] in own {
            let place = if runs.runs[run as usize].upright {
                y
            } else {
                x
            };
            let line = runs.runs[run as usize].line(place);
            match ground.site(&runs, feature, line) {
                Ok(_) => legal = Some(Candidate { feature, line, run }),
                Err(other) => reason = other,
            }
        }
        candidates.push(legal.ok_or_else(|| illegal(x, y, &reason))?);
    }
    let lines: Vec<Rect> = candidates.iter().map(|one| one.line).collect();
    let kept_out = ground.kept_out(&lines)?;
    if let Some((Point { x, y }, reason)) = (at.iter().zip(kept_out)).find(|(_, hit)| hit.is_some())
    {
        return Err(illegal(*x, *y, &reason.unwrap_or_default()));
    }
    candidates.sort_unstable();
    candidates.dedup();
    cuts::divided(&candidates, &runs)
}

fn illegal(x: i32, y: i32, reason: &str) -> Rejection {
    let reason = format!("the rules list a cut at ({x}, {y}): {reason}");
    Rejection::new(Step::Stitches, reason)
}

/// The runs of features that have points: the number of the point, then that of the run.
fn runs_at(runs: &Runs, features: &[u32], at: &[Point]) -> Result<Vec<[u32; 2]>, Rejection> {
    let count = runs.runs.len() as u32;
    let points = at.iter().map(|&point| Rect {
        min: point,
        max: point,
    });
    let boxes: Vec<Rect> = runs.runs.iter().map(Run::area).chain(points).collect();
    let labels: Vec<u32> = (0..boxes.len() as u32)
        .map(|i| u32::from(i < count))
        .collect();
    near::pairs(&boxes, &labels, 0, |run, point| {
        let point = point - count;
        let own = runs.runs[run as usize].feature == features[point as usize];
        own.then_some([point, run])
    })
}

fn rect([x0, y0, x1, y1]: [i32; 4]) -> Rect {
    Rect {
        min: Point::new(x0, y0),
        max: Point::new(x1, y1),
    }
}
