//! Every place that can matter: no legal stitch elsewhere would do better.
//!
//! **Theorem.** Let the layer have one spacing s, in either metric, and let no feature be named (`beyond`). Then the
//! least cost over the candidates of this policy is the least over all sets of legal places of all features,
//! with the smallest fragment length and the most stitches of a feature as hard constraints. Where features are
//! named, it is the least over all sets in which their stitches are at candidates.
//!
//! *Fragments and parts.* Take a set of stitches, and call what lies between them parts. A part is the union of
//! the fragments in it, overlaps included: a candidate r of a run that is nearer than h, half the overlap, to the
//! stitch p at the end of the part reaches over it to r + h at most, and p reaches to p + h. So the part is close
//! to what one of its fragments is close to, and nothing else, and a colouring of the fragments costs what
//! the parts of its stitches cost. It is enough to show that stitches can be moved to candidates.
//!
//! *What a stitch has to keep to.* Runs and the rest of each feature (`pieces`) make up the parts. Let a set of least
//! cost be given. Whatever is not close in it has to stay so; count every piece with every piece of another
//! feature, or of the same feature where the parts do not hang together. A piece of a run reaches from
//! x = t - h to y = t' + h, where t and t' are stitches (or it ends where the run does), and along the run it is not
//! close to the other piece because it begins beyond that, or because it ends before. Keep the one that holds.
//! 1. A piece that ends before what stays where it is: an upper limit for t'. Pushing down keeps it.
//! 2. A piece that begins beyond what stays where it is: a lower limit for t, a *fixed stop*.
//! 3. A piece that begins beyond a piece of a parallel run, which ends with stitch u: t >= u + 2h + reach + 1, where
//!    reach is the largest distance along that is too close at the distance across. Stretches A, B, A of
//!    one run are a case of this: t >= u + 2h + s.
//! 4. Pieces of runs at right angles, stitches t and u: t >= phi(u) with a growing phi; or a limit that only loosens as
//!    both are pushed; or a trade (`right_angles`).
//! 5. The next stitch of a run: t >= u + max(L, 1), L being the smallest fragment length.
//! 6. t is legal.
//!
//! *Pushing.* Without trades, all of it has the form t >= a growing function of other stitches, or stays when stitches
//! go down. So from below, starting with every stitch at the first legal place of its run, raising each to
//! the first legal place that its lower limits allow, and again, never passes the given set, and ends at one
//! that keeps to everything (Knaster and Tarski; for 3 and 5 these are difference constraints). It has the same
//! masks and costs no more. All places on the way are in the closed set: the first legal place of each run, the
//! first legal place from each fixed stop on, and from each stop of 3, 4 and 5 by a place that is in the set.
//! A trade is met by naming one of its features: its stitches stay at candidates, which are fixed stops then.
//! Features without candidates are fixed from the start, those with slanted edges among them.
//!
//! *Fewer steps of length L.* In a cluster without runs at right angles, u + L is needed only if a stop of 2 or 3 lies
//! strictly between u and u + L. Proof: take among the sets of least cost one whose places have the least sum.
//! It is a least one as above. Let t be a stitch of it whose only tight limit is t = first legal from u + L on. If
//! all its other limits were at most u, what begins at t could begin at u, and the part between u and t vanish: fewer
//! stitches for no more conflicts, against least cost. So a limit v of t lies above u, and below u + L. By 2
//! and 3 it comes from a fixed stop or a stitch at a place smaller than v, hence smaller than t. By
//! induction over places from small to large, v is a stop of the closed set, and so is t.
//! (Runs at right angles share no order of places to go by: there the step is always taken.)
//!
//! The closed set can be dense on long runs: see `closure` for what is kept then, and named. Candidates that cannot
//! matter are dropped afterwards (`dominance`), which keeps the least cost of the instance, whatever is named.
//! Only the directions of pushes are chosen (`clusters`), so that as few features as possible are named.
//!
//! Features that are named get the places of `uncovered` too. By the theorem the least cost is then no more than under that
//! policy, whatever is named.
//!
//! With spacings of several kinds or for wide features nothing is proven, and all features with candidates are named.
//!
//! Source: elementary intervals go back to A. B. Kahng, C.-H. Park, X. Xu, H. Yao, "Layout decomposition for double
//! patterning lithography" (ICCAD 2008), who place one candidate a gap between neighbours. Departure: neighbours
//! that are stitched themselves stop stitches as well, the constraints between two stitches of a run are part of the
//! argument, and what is left out is named.

mod closure;
mod clusters;
mod dominance;
mod lanes;
mod pieces;
mod right_angles;

use std::collections::BTreeSet;

use super::super::cutting::Candidate;
use super::super::neighbours::Neighbourhood;
use super::super::parts::Parts;
use super::super::spacing::{Faces, Outlines, Relation};
use super::super::{pairs, stitching};
use super::uncovered::Uncovered;
use super::{Beyond, BeyondReason, ExtractError, Ground, Placement, StitchPolicy};
use crate::layout::Spacings;
use clusters::Layer;

/// The policy of all places that can matter.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct EveryInterval {
    /// Whether candidates that cannot matter are dropped.
    pub drops: bool,
}

impl EveryInterval {
    /// As the rules name it.
    pub const USUAL: EveryInterval = EveryInterval { drops: true };
}

impl StitchPolicy for EveryInterval {
    fn place(
        &self,
        ground: &Ground<'_>,
        progress: &dyn Fn(usize),
    ) -> Result<Placement, ExtractError> {
        let layer = Layer::new(ground, progress)?;
        let stops = closure::close(ground, &layer)?;
        let mut candidates = vec![Vec::new(); ground.feature_count()];
        let mut before = 0;
        for (lane, stops) in layer.lanes.iter().zip(&stops) {
            let mut places: Vec<i32> = stops.places.iter().map(|&t| lane.place_on_run(t)).collect();
            places.sort_unstable();
            before += places.len();
            if let Some(own) = candidates.get_mut(lane.feature as usize) {
                let run = lane.run;
                own.extend(places.into_iter().map(|place| Candidate { run, place }));
            }
        }
        let beyond = beyond(ground, &layer, &stops);
        drop(layer);
        before += with_uncovered(ground, &beyond, &mut candidates)?;
        if self.drops && before > 0 {
            candidates = without_dominated(ground, &candidates)?;
        }
        Ok(Placement {
            candidates,
            before,
            beyond,
        })
    }
}

/// Gives the features that are named the places of `uncovered` as well; how many places are new.
fn with_uncovered(
    ground: &Ground<'_>,
    beyond: &[Beyond],
    candidates: &mut [Vec<Candidate>],
) -> Result<usize, ExtractError> {
    if beyond.is_empty() {
        return Ok(0);
    }
    let others = Uncovered.place(ground, &|_| ())?.candidates;
    let mut new = 0;
    for &Beyond { feature, .. } in beyond {
        let at = feature as usize;
        if let (Some(own), Some(others)) = (candidates.get_mut(at), others.get(at)) {
            let key = |candidate: &Candidate| (candidate.run, candidate.place);
            let known: BTreeSet<_> = own.iter().map(key).collect();
            let more = others.iter().filter(|other| !known.contains(&key(other)));
            let had = own.len();
            own.extend(more);
            new += own.len() - had;
        }
    }
    Ok(new)
}

/// The features for which the theorem does not hold.
fn beyond(ground: &Ground<'_>, layer: &Layer, stops: &[closure::Stops]) -> Vec<Beyond> {
    let mut found = Vec::new();
    let spacings = Spacings {
        metric: ground.rules().spacings.metric,
        any_mask: ground.rules().spacings.any_mask,
        ..Spacings::default()
    };
    let several = ground.rules().spacings != spacings;
    for (lane, stops) in layer.lanes.iter().zip(stops) {
        let feature = lane.feature;
        if several {
            let reason = BeyondReason::KindsOfSpacing;
            found.push(Beyond { feature, reason });
        } else if stops.only_base {
            let reason = BeyondReason::TooMany;
            found.push(Beyond { feature, reason });
        }
    }
    found.extend(layer.trading.iter().map(|&feature| Beyond {
        feature,
        reason: BeyondReason::RightAngle,
    }));
    found.sort_unstable();
    found.dedup_by_key(|one| one.feature);
    found
}

/// The candidates that are left when the layer is cut at all of them and those that cannot matter are dropped.
fn without_dominated(
    ground: &Ground<'_>,
    candidates: &[Vec<Candidate>],
) -> Result<Vec<Vec<Candidate>>, ExtractError> {
    let rules = ground.rules();
    let cut = stitching::stitch(ground, candidates)?;
    let close = {
        let parts = Parts::new(&ground.layout.shapes)?;
        let relation = Relation::new(rules);
        let faces = match relation.needs_outlines() {
            true => Some(Outlines::new(&parts, ground.around.owners, &relation)?),
            false => None,
        };
        let faces = faces.map(Faces::of_features);
        let (parts, owners) = parts.of_fragments(ground.around.owners, &cut.fragments)?;
        let faces = faces.map(|faces| faces.of_fragments(&parts, &owners, &cut.fragments));
        let around = Neighbourhood::new(&parts, &owners, &relation, faces.as_ref());
        pairs::find(&around, &|_| ())?
    };
    let length = rules.stitch.fragment_length;
    let left = dominance::left(
        &cut.fragments,
        &cut.candidates,
        &close,
        rules.masks,
        length,
        &|feature| ground.is_by_hand(feature),
    );
    let mut kept = vec![Vec::new(); candidates.len()];
    let cuts = cut.fragments.cuts().iter().zip(&cut.candidates);
    for ((stitch, candidate), _) in cuts.zip(left).filter(|(_, left)| *left) {
        let feature = cut.fragments.feature_of(stitch.sides[0]);
        if let Some(own) = kept.get_mut(feature as usize) {
            own.push(*candidate);
        }
    }
    Ok(kept)
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::super::super::{Extraction, extract_with};
    use super::EveryInterval;
    use crate::geometry::Rect;
    use crate::layout::{LayerId, Layout, Rules, Shapes, StitchRules};

    fn run(rects: &[Rect], drops: bool) -> Extraction {
        let layer = LayerId {
            layer: 1,
            datatype: 0,
        };
        let mut shapes = Shapes::default();
        rects.iter().for_each(|&rect| shapes.push_rect(rect));
        let layout = Layout {
            top: "top".into(),
            layer,
            unit_pm: 1000,
            shapes,
            fixed: Vec::new(),
            keep_outs: Vec::new(),
        };
        let rules = Rules {
            stitch: StitchRules {
                overlap: 8,
                fragment_length: 20,
                corner: 6,
                ..StitchRules::default()
            },
            ..Rules::plain(layer, 2, 30)
        };
        extract_with(&layout, &rules, &EveryInterval { drops }, &|_| ()).unwrap()
    }

    fn places(found: &Extraction) -> Vec<i32> {
        let cuts = found.fragments.cuts().iter();
        let mut places: Vec<i32> = cuts.map(|cut| cut.line.min.x).collect();
        places.sort_unstable();
        places
    }

    #[test]
    fn a_wire_between_two_squares() {
        // Legal from 20 to 80. The square is 18 above the wire and ends at 40: up to 23 along it is close
        // (18^2 + 23^2 < 900), so what begins 4 before a stitch gets away from it at 40 + 23 + 4 + 1 = 68. The other
        // square is close up to the end. From 20, the same mask again at 20 + 8 + 30 = 58; 78 is 20 from 58, with
        // the stop 68 between; 40 is 20 from 20 without one.
        let rects = [
            Rect::new(0, 0, 100, 10),
            Rect::new(30, 28, 40, 38),
            Rect::new(90, 28, 100, 38),
        ];
        let found = run(&rects, false);
        assert_eq!(places(&found), [20, 58, 68, 78]);
        assert_eq!(found.beyond_theorem, []);
        // Two squares that are not close to each other never need two masks at the wire.
        let found = run(&rects, true);
        assert_eq!((found.candidates.before, found.candidates.after), (4, 0));
    }

    #[test]
    fn wires_that_face_each_other_stop_each_other() {
        // Both wires can be cut from 20 to 40 only. 10 across: up to 28 along is close (100 + 28^2 < 900), so a cut
        // of one stops those of the other 4 + 28 + 4 + 1 = 37 farther on, which is beyond 40.
        let rects = [Rect::new(0, 0, 60, 10), Rect::new(0, 20, 60, 30)];
        assert_eq!(places(&run(&rects, false)), [20, 20]);
        // Longer ones: 20, then 57 by the other one, and 58 = 20 + 8 + 30 by the wire itself; from 57 and 58 on 94 to
        // 96. 77 and 78 are 20 from 57 and 58, 57 to 77 with the stop 58 between; from 58 there is none before 78.
        let rects = [Rect::new(0, 0, 110, 10), Rect::new(0, 20, 110, 30)];
        assert_eq!(
            places(&run(&rects, false)),
            [20, 20, 57, 57, 58, 58, 77, 77]
        );
    }
}
