//! The fewest changes: of all colourings that cost no more than a given one, one that differs from another colouring
//! in as few features as possible.
//!
//! Unresolved units and stitches are counted and bounded by what the given colouring costs, and a literal
//! for each feature holds where one of its fragments has left its mask. Models with fewer and fewer
//! of those are asked for until there is none: linear search from above over an incremental totalizer (its source
//! stands in [`encodings::totalizer`]), which suits places of some features, nearly all of whose answers change one or two.

use encodings::colour::{AtMostOne, Colours};
use encodings::self_spacing::FeatureGraph;
use encodings::totalizer::Totalizer;
use encodings::{
    ClauseSink, Cost, Instance, Lit, Mask, VarAllocator, conflict, self_spacing, ties,
};

use super::backend::{Answer, SatBackend, Varisat};
use super::limits::Stop;

/// More stitches than this, each counted by its weight, are not counted at all.
const MOST_STITCHES: u64 = 100_000;

/// A legal colouring that costs no more than `best`, a legal one, and differs from `start` in as few of the
/// features `counted` as possible; and whether none differs in fewer. `start` costs more than `best`, or is not
/// legal, so that something must change.
pub fn fewest(
    instance: &Instance,
    start: &[Mask],
    counted: &[u32],
    mut best: Vec<Mask>,
    stop: &Stop,
) -> (Vec<Mask>, bool) {
    let changes = |colouring: &[Mask]| {
        let changed = |&&feature: &&u32| {
            let range = instance.fragments_of(feature);
            let range = range.start as usize..range.end as usize;
            colouring[range.clone()] != start[range]
        };
        counted.iter().filter(changed).count() as u32
    };
    let cost = instance.cost(&best);
    let mut least = changes(&best);
    if least <= 1 {
        return (best, true);
    }
    let Some(mut search) = Search::new(instance, start, counted, cost, stop) else {
        return (best, false);
    };
    while least > 1 {
        match search.with_fewer_than(least) {
            Answer::Unsatisfiable(_) => return (best, true),
            Answer::Stopped => return (best, false),
            Answer::Satisfiable => {}
        }
        let model = search.solver.model();
        let found = search.colours.decode(|lit| model.holds(lit));
        let now = changes(&found);
        let fits = instance.check_legal(&found).is_ok() && instance.cost(&found) <= cost;
        if !fits || now >= least {
            // An error of this program, of which nothing is claimed.
            return (best, false);
        }
        (best, least) = (found, now);
    }
    (best, true)
}

struct Search {
    solver: Varisat,
    colours: Colours,
    changed: Totalizer,
}

impl Search {
    /// The formula; `None` where there is too much to count.
    fn new(
        instance: &Instance,
        start: &[Mask],
        counted: &[u32],
        cost: Cost,
        stop: &Stop,
    ) -> Option<Search> {
        let mut solver = Varisat::new(stop);
        let near = (0u32..).zip(start);
        let near = near.map(|(fragment, &mask)| (instance.allowed(fragment), Some(mask)));
        let masks = instance.masks();
        let colours = Colours::encode_near(masks, near, AtMostOne::Stated, &mut solver);
        bound_conflicts(instance, &colours, cost.conflicts, &mut solver)?;
        bound_stitches(instance, &colours, cost.stitches, &mut solver)?;
        for tie in instance.ties() {
            ties::encode(&colours, tie, &mut solver);
        }
        let changed: Vec<Lit> = (counted.iter())
            .map(|&feature| {
                let changed = solver.fresh();
                for fragment in instance.fragments_of(feature) {
                    let stays = colours.lit(fragment, start[fragment as usize]);
                    let clause: Vec<Lit> = stays.into_iter().chain([changed]).collect();
                    solver.clause(&clause);
                }
                changed
            })
            .collect();
        Some(Search {
            changed: Totalizer::new(&changed),
            solver,
            colours,
        })
    }

    fn with_fewer_than(&mut self, count: u32) -> Answer {
        let least = self.changed.at_least(count, &mut self.solver);
        let fewer: Vec<Lit> = least.into_iter().map(|lit| !lit).collect();
        self.solver.solve(&fewer)
    }
}

fn bound_conflicts(
    instance: &Instance,
    colours: &Colours,
    most: u64,
    solver: &mut Varisat,
) -> Option<()> {
    let mut violated = Vec::with_capacity(instance.unit_count());
    for pair in instance.pairs() {
        let unless = solver.fresh();
        for &edge in pair {
            conflict::separate(colours, edge, Some(unless), solver);
        }
        violated.push(unless);
    }
    for unit in instance.self_units() {
        let unless = solver.fresh();
        let Some(first) = unit.first() else { continue };
        let fragments = instance.fragments_of(instance.feature_of(first[0]));
        let own = instance.stitches().iter();
        let own = own.filter(|stitch| fragments.contains(&stitch.a));
        let graph = FeatureGraph {
            stitches: own.map(|stitch| [stitch.a, stitch.b]).collect(),
            fragments: fragments.clone().collect(),
        };
        for &ends in unit {
            self_spacing::encode(colours, ends, &graph, Some(unless), solver);
        }
        violated.push(unless);
    }
    at_most(&violated, most, solver)
}

fn bound_stitches(
    instance: &Instance,
    colours: &Colours,
    most: u64,
    solver: &mut Varisat,
) -> Option<()> {
    let weights = instance.stitches().iter().map(|s| u64::from(s.weight));
    let unit = weights.clone().fold(0, common_divisor).max(1);
    if weights.map(|weight| weight / unit).sum::<u64>() > MOST_STITCHES {
        return None;
    }
    let mut used = Vec::new();
    for stitch in instance.stitches() {
        let differs = solver.fresh();
        conflict::join(colours, [stitch.a, stitch.b], differs, solver);
        let times = u64::from(stitch.weight) / unit;
        used.extend(std::iter::repeat_n(differs, times as usize));
    }
    at_most(&used, most / unit, solver)
}

fn at_most(literals: &[Lit], most: u64, solver: &mut Varisat) -> Option<()> {
    let beyond = u32::try_from(most).ok()?.checked_add(1)?;
    if let Some(more) = Totalizer::new(literals).at_least(beyond, solver) {
        solver.clause(&[!more]);
    }
    Some(())
}

fn common_divisor(a: u64, b: u64) -> u64 {
    match b {
        0 => a,
        _ => common_divisor(b, a % b),
    }
}
