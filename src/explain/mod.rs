//! Certificate and input to irreducible cores and repairs: "not decomposable" as a list of places that a
//! layout designer can act on.
//!
//! | file | what it does |
//! |---|---|
//! | [`units`] | the bounds of a certificate as units of conflict |
//! | [`core`] | shrinks a bound to an irreducible core |
//! | [`shape`] | tells cliques, odd cycles and wheels |
//! | [`gap`] | exact distances |
//! | [`place`] | a core in the words of the user: features, spacings, coordinates |
//! | [`repair`] | repairs, and the order in which they are shown |
//! | [`search`] | looks for the repairs of a place |
//! | [`movement`] | the smallest movements that make a distance large enough |
//! | [`positions`] | where a stitch would help, and what is in its way |
//! | [`site`] | verifies a repair in its neighbourhood |
//! | [`cut`] | a feature cut at one more place |
//! | [`local`] | a neighbourhood extracted anew, with features moved |
//! | [`window`] | colours a neighbourhood anew, what is around it staying as it is |
//! | [`text`] | what people read |
//! | [`write`](mod@write) | `explanation.json`, which `explanation.md` beside this file describes |

pub mod core;
pub mod cut;
pub mod gap;
pub mod local;
pub mod movement;
pub mod place;
pub mod positions;
pub mod repair;
pub mod search;
pub mod shape;
pub mod site;
pub mod text;
pub mod units;
pub mod window;
pub mod write;

use std::sync::atomic::{AtomicUsize, Ordering};

use rayon::prelude::*;
use thiserror::Error;

use encodings::{Instance, Mask};

use crate::extract::Extraction;
use crate::extract::survey::Survey;
use crate::layout::{Hand, Layout, Policy, Rules};
use crate::solve::places::Places;
use crate::solve::{Bounds, Stop};
use core::Shrunk;
pub use place::Place;
use repair::Obstacle;
use site::{Ground, Site};
pub use units::Bound;

/// What is explained: an instance and the colouring that its certificate gives.
#[derive(Clone, Copy)]
pub struct Subject<'a> {
    /// The instance.
    pub instance: &'a Instance,
    /// Where it comes from; nothing for a graph.
    pub layer: Option<Layer<'a>>,
    /// A legal colouring.
    pub colouring: &'a [Mask],
}

/// A layer and what was extracted from it.
#[derive(Clone, Copy)]
pub struct Layer<'a> {
    /// Its shapes.
    pub layout: &'a Layout,
    /// Its rules.
    pub rules: &'a Rules,
    /// Its features and fragments.
    pub extraction: &'a Extraction,
}

/// Why movements and new stitches are not looked for under some rules: they are tried out on a neighbourhood that
/// is extracted anew, where only the plain rules are sure to say the same as on the whole layer.
pub(crate) fn special(rules: &Rules) -> Option<Obstacle> {
    let Rules { stitch, hand, .. } = rules;
    if !rules.has_one_spacing() {
        return Some(Obstacle::SeveralSpacings);
    }
    let is_local = matches!(stitch.policy, Policy::None | Policy::Uncovered);
    let is_plain = is_local && stitch.keep_outs.is_empty() && stitch.most_per_feature.is_none();
    (!is_plain || *hand != Hand::default()).then_some(Obstacle::SpecialRules)
}

/// Which places are explained, and how far.
#[derive(Clone, Debug, Default)]
pub struct Wanted {
    /// Only this one, from 1.
    pub place: Option<usize>,
    /// Whether the colouring is proven to have the fewest conflicts.
    pub is_best: bool,
    /// When to stop.
    pub stop: Stop,
}

/// All places of a layer or graph that need conflicts, or those asked for.
#[derive(Clone, Debug)]
pub struct Explanation {
    /// Whose places they are.
    pub heading: Heading,
    /// What the certificate says of the conflicts.
    pub conflicts: Bounds,
    /// How many places there are in all.
    pub total: usize,
    /// The places, ascending by their numbers.
    pub places: Vec<Place>,
}

/// Whose places are explained.
#[derive(Clone, Debug)]
pub struct Heading {
    /// The name of the input file, without its directories.
    pub input: String,
    /// K.
    pub masks: u8,
    /// The layer; nothing for a graph.
    pub layer: Option<LayerHeading>,
}

/// The layer whose places are explained.
#[derive(Clone, Debug)]
pub struct LayerHeading {
    /// The top cell.
    pub top: String,
    /// One database unit, in picometres.
    pub unit_pm: u64,
    /// The rules.
    pub rules: Rules,
}

/// Why there is no explanation.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum ExplainError {
    /// A bound does not hold.
    #[error(
        "conflict bound {bound} does not hold: its units can be coloured with fewer than {limit} \
         conflicts (maskproof audit tells more)"
    )]
    NoBound {
        /// The bound, from 0.
        bound: usize,
        /// Its limit.
        limit: u64,
    },
    /// No such place.
    #[error("place {asked} of {total}: places are numbered from 1")]
    NoPlace {
        /// The number asked for.
        asked: usize,
        /// How many there are.
        total: usize,
    },
    /// The stop sign went up.
    #[error("stopped before all places were explained")]
    Stopped,
}

/// Explains each of `bounds`, in parallel: place i is bound i - 1. `progress` gets the number of places
/// done and to do. The result does not depend on the number of threads.
///
/// # Errors
/// A bound that does not hold, a place that does not exist, or the stop sign.
pub fn explain(
    subject: &Subject<'_>,
    bounds: &[Bound],
    wanted: &Wanted,
    progress: &(dyn Fn(usize, usize) + Sync),
) -> Result<Vec<Place>, ExplainError> {
    let total = bounds.len();
    let chosen: Vec<usize> = match wanted.place {
        None => (0..total).collect(),
        Some(asked) if (1..=total).contains(&asked) => vec![asked - 1],
        Some(asked) => return Err(ExplainError::NoPlace { asked, total }),
    };
    let places = Places::new(subject.instance);
    // A layer that was extracted can be surveyed too; where not, no stitches are looked for.
    let survey = subject
        .layer
        .and_then(|layer| Survey::new(layer.layout, layer.rules).ok());
    let surveyor = survey.as_ref().map(Survey::surveyor);
    let ground = Ground::new(
        subject,
        &places,
        bounds,
        surveyor.as_ref(),
        wanted.is_best,
        &wanted.stop,
    );
    let done = AtomicUsize::new(0);
    let one = |&i: &usize| {
        let place = explain_one(&ground, i, &bounds[i]);
        progress(done.fetch_add(1, Ordering::Relaxed) + 1, chosen.len());
        place
    };
    let found: Vec<Result<Place, ExplainError>> = chosen.par_iter().map(one).collect();
    if wanted.stop.now() {
        return Err(ExplainError::Stopped);
    }
    found.into_iter().collect()
}

fn explain_one(ground: &Ground<'_>, index: usize, bound: &Bound) -> Result<Place, ExplainError> {
    let core = match core::shrink(ground.places, bound, ground.stop) {
        Shrunk::Core(core) => core,
        Shrunk::Stopped => return Err(ExplainError::Stopped),
        Shrunk::NoBound => {
            return Err(ExplainError::NoBound {
                bound: index,
                limit: bound.limit,
            });
        }
    };
    let mut place = place::of(ground.subject, index + 1, core);
    let features = place.features.iter().map(|feature| feature.number);
    let site = Site::new(ground, index, &bound.units, features.collect());
    place.repairs = search::repairs(&site, &place.core, &place.spacings);
    Ok(place)
}
