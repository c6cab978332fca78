//! A window: the formula of some features of a piece at one level of cost.
//!
//! At the level of conflicts the softs are units, and stitches are free, so stitch edges are left out. At
//! the level of stitches the softs are stitch edges, and whatever the finished first level keeps is
//! hard. A counter can be used only where its whole cluster lies in the window; the units of a cluster that
//! reaches beyond it are left out, which only weakens the formula: a core found in a window is a core.

use rustc_hash::FxHashMap;

use encodings::colour::{AtMostOne, Colours};
use encodings::self_spacing::FeatureGraph;
use encodings::totalizer::Totalizer;
use encodings::{ClauseSink, Lit, Mask, VarAllocator, conflict, self_spacing, symmetry, ties};

use super::level::{Level, Relaxations};
use super::relaxation::{Counter, Relaxation, Soft, Weights, counters_below};
use crate::solve::backend::{Answer, SatBackend, Varisat};
use crate::solve::limits::Stop;
use crate::solve::places::Places;

/// The formula of a window.
pub struct Window<'a> {
    places: &'a Places<'a>,
    level: Level,
    pub(super) solver: Varisat,
    colours: Colours,
    /// The first fragment of each feature in the numbering of the window.
    first: FxHashMap<u32, u32>,
    fragments: usize,
    /// The literal "violated" of each unit of conflict in use, and of each stitch edge.
    units: FxHashMap<u32, Lit>,
    stitches: FxHashMap<u32, Lit>,
    totalizers: FxHashMap<(Level, u32), Totalizer>,
    /// Softs by the literal that keeps them.
    soft_of: FxHashMap<Lit, Soft>,
    /// Softs of this window with their weights; others are none of its business.
    pub weights: Weights,
    /// Counters made here, numbered on from the relaxation's.
    added: Vec<Counter>,
    base: u32,
    /// The effort of the last call of the solver.
    pub(super) last_effort: u64,
    /// The cores found, in order.
    pub cores: Vec<Vec<Soft>>,
}

impl<'a> Window<'a> {
    /// The formula of `features`, ascending; the search in it begins near `best`, a colouring of the piece.
    pub fn new(
        places: &'a Places<'a>,
        features: &[u32],
        level: Level,
        relaxations: &Relaxations,
        best: &[Mask],
        stop: &Stop,
    ) -> Window<'a> {
        let instance = places.instance;
        let mut first = FxHashMap::default();
        let mut fragments = Vec::new();
        for &feature in features {
            first.insert(feature, fragments.len() as u32);
            fragments.extend(instance.fragments_of(feature));
        }
        let comparing = features
            .iter()
            .any(|&f| !places.self_spacings(f).is_empty());
        let at_most_one = if comparing {
            AtMostOne::Stated
        } else {
            AtMostOne::Open
        };
        let mut solver = Varisat::new(stop);
        let near = fragments
            .iter()
            .map(|&f| (instance.allowed(f), best.get(f as usize).copied()));
        let colours = Colours::encode_near(instance.masks(), near, at_most_one, &mut solver);
        let mut window = Window {
            places,
            level,
            solver,
            colours,
            first,
            fragments: fragments.len(),
            units: FxHashMap::default(),
            stitches: FxHashMap::default(),
            totalizers: FxHashMap::default(),
            soft_of: FxHashMap::default(),
            weights: Weights::default(),
            added: Vec::new(),
            base: relaxations.at(level).counter_count(),
            last_effort: 0,
            cores: Vec::new(),
        };
        window.encode_units(features, relaxations);
        if level == Level::Stitches {
            window.encode_stitches(features, relaxations);
        }
        window.encode_ties(features);
        window
    }

    /// Breaks the symmetry of interchangeable masks by precedence on a dense place. (With two masks it was
    /// measured to cost more than it gives.)
    pub fn break_symmetry(&mut self, features: &[u32]) {
        let masks = self.places.instance.masks();
        if masks > 2 && (0..self.fragments as u32).all(|f| self.may_take_all(f)) {
            let dense: Vec<u32> = self
                .places
                .dense(features)
                .into_iter()
                .map(|f| self.local(f))
                .collect();
            symmetry::precedence(&self.colours, &dense, &mut self.solver);
        }
    }

    fn may_take_all(&self, fragment: u32) -> bool {
        (0..self.colours.masks()).all(|mask| self.colours.lit(fragment, mask).is_some())
    }

    /// Fixes the features that `fixed` names to their masks in `colours`, a colouring of the piece.
    pub fn fix(&mut self, colours: &[Mask], fixed: impl Fn(u32) -> bool) {
        let mut features: Vec<u32> = self.first.keys().copied().filter(|&f| fixed(f)).collect();
        features.sort_unstable();
        for fragment in features
            .into_iter()
            .flat_map(|f| self.places.instance.fragments_of(f))
        {
            if let Some(lit) = self
                .colours
                .lit(self.local(fragment), colours[fragment as usize])
            {
                self.solver.clause(&[lit]);
            }
        }
    }

    /// The units of conflict between the features, ascending.
    fn units_among(&self, features: &[u32]) -> Vec<u32> {
        let mut units = Vec::new();
        for &feature in features {
            units.extend(
                self.places
                    .neighbours(feature)
                    .iter()
                    .filter(|&&(other, _)| other > feature && self.first.contains_key(&other))
                    .map(|&(_, pair)| pair),
            );
            units.extend(self.places.self_unit(feature));
        }
        units.sort_unstable();
        units
    }

    fn encode_units(&mut self, features: &[u32], relaxations: &Relaxations) {
        let relaxation = &relaxations.conflicts;
        let units = self.units_among(features);
        let whole = whole_clusters(relaxation, &units);
        for &unit in &units {
            let weight = relaxation.weights.get(Soft::Unit(unit));
            let hard = self.level == Level::Stitches && weight > 0;
            if hard {
                self.encode_unit(unit, None);
            } else if weight > 0
                || relaxation
                    .cluster_of(unit)
                    .is_some_and(|c| whole.contains(&c))
            {
                let violated = self.solver.fresh();
                self.units.insert(unit, violated);
                self.encode_unit(unit, Some(violated));
            }
            if weight > 0 && self.level == Level::Conflicts {
                self.weights.set(Soft::Unit(unit), weight);
            }
        }
        for cluster in whole {
            let counts: Vec<Soft> = relaxation.active_counts(cluster).collect();
            for soft in counts {
                match self.level {
                    Level::Conflicts => self.weights.set(soft, relaxation.weights.get(soft)),
                    Level::Stitches => {
                        let violated = self.violated(relaxation, Level::Conflicts, soft);
                        self.solver.clause(&[!violated]);
                    }
                }
            }
        }
    }

    fn encode_unit(&mut self, unit: u32, unless: Option<Lit>) {
        let instance = self.places.instance;
        let edges = instance.unit(unit);
        match instance.is_self_unit(unit) {
            false => {
                for &[a, b] in edges {
                    let edge = [self.local(a), self.local(b)];
                    conflict::separate(&self.colours, edge, unless, &mut self.solver);
                }
            }
            true => {
                let feature = instance.feature_of(edges[0][0]);
                let stitch = |&s: &u32| {
                    let stitch = instance.stitches()[s as usize];
                    [self.local(stitch.a), self.local(stitch.b)]
                };
                let graph = FeatureGraph {
                    fragments: instance
                        .fragments_of(feature)
                        .map(|f| self.local(f))
                        .collect(),
                    stitches: self.places.stitches(feature).iter().map(stitch).collect(),
                };
                for &[a, b] in edges {
                    let ends = [self.local(a), self.local(b)];
                    self_spacing::encode(&self.colours, ends, &graph, unless, &mut self.solver);
                }
            }
        }
    }

    /// The ties that speak of features of the window only; leaving out the others weakens the formula.
    fn encode_ties(&mut self, features: &[u32]) {
        let instance = self.places.instance;
        let mut inside: Vec<u32> = features
            .iter()
            .flat_map(|&f| self.places.ties(f))
            .copied()
            .collect();
        inside.sort_unstable();
        inside.dedup();
        for tie in inside {
            let known = |f: u32| {
                self.first
                    .contains_key(&instance.feature_of(f))
                    .then(|| self.local(f))
            };
            if let Some(tie) = instance.ties()[tie as usize].renumbered(known) {
                ties::encode(&self.colours, &tie, &mut self.solver);
            }
        }
    }

    fn encode_stitches(&mut self, features: &[u32], relaxations: &Relaxations) {
        let relaxation = &relaxations.stitches;
        let mut inside: Vec<u32> = features
            .iter()
            .flat_map(|&f| self.places.stitches(f).iter().copied())
            .collect();
        inside.sort_unstable();
        let whole = whole_clusters(relaxation, &inside);
        for &i in &inside {
            let weight = relaxation.weights.get(Soft::Unit(i));
            if weight == 0 && !relaxation.cluster_of(i).is_some_and(|c| whole.contains(&c)) {
                continue;
            }
            let stitch = self.places.instance.stitches()[i as usize];
            let used = self.solver.fresh();
            self.stitches.insert(i, used);
            let edge = [self.local(stitch.a), self.local(stitch.b)];
            conflict::join(&self.colours, edge, used, &mut self.solver);
            if weight > 0 {
                self.weights.set(Soft::Unit(i), weight);
            }
        }
        for cluster in whole {
            for soft in relaxation.active_counts(cluster) {
                self.weights.set(soft, relaxation.weights.get(soft));
            }
        }
    }

    /// The number of a fragment in the window.
    fn local(&self, fragment: u32) -> u32 {
        let instance = self.places.instance;
        let feature = instance.feature_of(fragment);
        let first = self.first.get(&feature).copied().unwrap_or(0);
        first + (fragment - instance.fragments_of(feature).start)
    }

    /// The literal that holds where a soft of a level is violated.
    fn violated(&mut self, relaxation: &Relaxation, level: Level, soft: Soft) -> Lit {
        if let Soft::Count { counter, .. } = soft {
            let missing = counters_below(
                counter,
                |counter| self.members(relaxation, level, counter),
                |counter| self.totalizers.contains_key(&(level, counter)),
            );
            for counter in missing {
                let members = self.members(relaxation, level, counter).to_vec();
                let inputs: Vec<Lit> = members
                    .into_iter()
                    .map(|member| self.output(level, member))
                    .collect();
                self.totalizers
                    .insert((level, counter), Totalizer::new(&inputs));
            }
        }
        self.output(level, soft)
    }

    /// The same, where the totalizer of the soft has been made.
    fn output(&mut self, level: Level, soft: Soft) -> Lit {
        let known = match (soft, level) {
            (Soft::Unit(unit), Level::Conflicts) => self.units.get(&unit).copied(),
            (Soft::Unit(unit), Level::Stitches) => self.stitches.get(&unit).copied(),
            (Soft::Count { counter, at_most }, _) => self
                .totalizers
                .get_mut(&(level, counter))
                .and_then(|totalizer| totalizer.at_least(at_most + 1, &mut self.solver)),
        };
        // A unit that the formula leaves out is free to be violated, and a count beyond all members never
        // is: a literal that nothing else speaks of serves for both.
        known.unwrap_or_else(|| self.solver.fresh())
    }

    fn members<'r>(&'r self, relaxation: &'r Relaxation, level: Level, counter: u32) -> &'r [Soft] {
        match counter.checked_sub(self.base) {
            Some(own) if level == self.level && (own as usize) < self.added.len() => {
                &self.added[own as usize].members
            }
            _ => &relaxation.counter(counter).members,
        }
    }

    /// Assumptions that keep the given softs.
    fn keep(&mut self, relaxation: &Relaxation, softs: &[Soft]) -> Vec<Lit> {
        softs
            .iter()
            .map(|&soft| {
                let keep = !self.violated(relaxation, self.level, soft);
                self.soft_of.insert(keep, soft);
                keep
            })
            .collect()
    }

    /// Solves with the given softs kept; on failure, some of them that cannot all be kept.
    pub fn solve(&mut self, relaxation: &Relaxation, softs: &[Soft]) -> Answer {
        let assumptions = self.keep(relaxation, softs);
        let before = self.solver.effort();
        let answer = self.solver.solve(&assumptions);
        self.last_effort = self.solver.effort() - before;
        answer
    }

    /// The softs behind the literals of a failed core.
    pub fn softs_of(&self, core: &[Lit]) -> Vec<Soft> {
        core.iter()
            .filter_map(|lit| self.soft_of.get(lit).copied())
            .collect()
    }

    /// Relaxes a core within the window and notes it.
    pub(super) fn relax(&mut self, relaxation: &Relaxation, mut core: Vec<Soft>) {
        core.sort_unstable_by_key(|&soft| (self.lead(relaxation, soft), soft));
        let counter = self.base + self.added.len() as u32;
        let mut weights = std::mem::take(&mut self.weights);
        weights.relax(&core, counter, |c| {
            self.members(relaxation, self.level, c).len()
        });
        self.weights = weights;
        if core.len() > 1 {
            let leads = core.iter().map(|&soft| self.lead(relaxation, soft));
            self.added.push(Counter {
                lead: leads.min().unwrap_or(0),
                members: core.clone(),
            });
        }
        self.cores.push(core);
    }

    /// The least unit below a soft, kept with each counter: counters share members, so that walking down
    /// would meet some of them exponentially often.
    fn lead(&self, relaxation: &Relaxation, soft: Soft) -> u32 {
        let Soft::Count { counter, .. } = soft else {
            return relaxation.lead(soft);
        };
        match counter.checked_sub(self.base) {
            Some(own) if (own as usize) < self.added.len() => self.added[own as usize].lead,
            _ => relaxation.lead(soft),
        }
    }

    /// The masks of the window's fragments in the last model, in the order of its features.
    pub fn masks(&self) -> Vec<Mask> {
        let model = self.solver.model();
        self.colours.decode(|lit| model.holds(lit))
    }
}

/// The clusters that lie wholly among the given units, ascending.
fn whole_clusters(relaxation: &Relaxation, units: &[u32]) -> Vec<u32> {
    let mut seen: Vec<u32> = units
        .iter()
        .filter_map(|&unit| relaxation.cluster_of(unit))
        .collect();
    seen.sort_unstable();
    seen.chunk_by(|a, b| a == b)
        .filter(|same| relaxation.cluster(same[0]).units.len() == same.len())
        .map(|same| same[0])
        .collect()
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use crate::solve::Limits;
    use encodings::InstanceBuilder;

    /// Counters that share members form a graph in which the ways down to the units grow like the Fibonacci
    /// numbers: following each way would take years here.
    #[test]
    fn the_lead_of_deeply_shared_counters_is_found_at_once() {
        const COUNTERS: u32 = 90;
        let features = COUNTERS + 8;
        let mut builder = InstanceBuilder::new(2);
        for _ in 0..features {
            builder.feature(1);
        }
        for a in 1..features {
            builder.pair([[a - 1, a]]);
        }
        let instance = builder.build().unwrap();
        let places = Places::new(&instance);
        let relaxations = Relaxations {
            conflicts: Relaxation::new(vec![1; instance.unit_count()]),
            stitches: Relaxation::new(Vec::<u64>::new()),
        };
        let all: Vec<u32> = (0..features).collect();
        let colouring = vec![0; features as usize];
        let mut window = Window::new(
            &places,
            &all,
            Level::Conflicts,
            &relaxations,
            &colouring,
            &Limits::default().for_piece(),
        );
        let count = |counter, at_most| Soft::Count { counter, at_most };
        let units = [2, 1, 0].map(Soft::Unit).to_vec();
        window.relax(&relaxations.conflicts, units);
        window.relax(&relaxations.conflicts, [3, 4, 5].map(Soft::Unit).to_vec());
        for own in 2..COUNTERS {
            let core = vec![
                count(own - 1, 1),
                count(own - 2, if own == 2 { 1 } else { 2 }),
                Soft::Unit(own + 4),
            ];
            window.relax(&relaxations.conflicts, core);
        }
        let leads: Vec<u32> = window.added.iter().map(|counter| counter.lead).collect();
        assert_eq!(leads[..3], [0, 3, 0]);
        assert!(leads[2..].iter().all(|&lead| lead == 0));
    }
}
