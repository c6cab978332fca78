//! What a core-guided search has relaxed so far at one level of cost.
//!
//! A soft unit (a conflict pair, a self-spacing or a stitch edge) may be violated at the price of its
//! weight. Each core, a set of softs that cannot all be kept, raises the lower bound by its least weight
//! and is replaced: its members lose that weight, and a counter over them may be exceeded at that
//! weight. Invariant: the cost of any colouring is the lower bound plus the weights of the active softs
//! that it violates and of the counts beyond them; so a colouring that keeps all active softs is optimal.
//!
//! OLL: Andres, Kaufmann, Matheis and Schaub, "Unsatisfiability-based optimization in clasp", ICLP 2012;
//! for MaxSAT: Morgado, Dodaro and Marques-Silva, "Core-guided MaxSAT with soft cardinality
//! constraints", CP 2014. Where we differ: units that share a counter form a cluster with a limit of its
//! own. All cores of a cluster speak of its units only, so the limits of clusters, whose units are
//! disjoint, are true bounds one by one: they are the packing of the certificate.

use std::collections::{BTreeMap, BTreeSet};

/// Something that the search would like to keep.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Soft {
    /// This unit is not violated.
    Unit(u32),
    /// At most this many members of the counter are violated.
    Count {
        /// The counter.
        counter: u32,
        /// The number.
        at_most: u32,
    },
}

/// A counter over the members of a core.
#[derive(Clone, Debug)]
pub struct Counter {
    /// What is counted: how many of these are violated. In spatial order.
    pub members: Vec<Soft>,
    /// The smallest unit among them, which places the counter in the order of units.
    pub lead: u32,
}

/// A bound that the search found: its units cost at least the limit, whatever the rest does.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Cluster {
    /// The units, ascending.
    pub units: Vec<u32>,
    /// The least total weight of violated units among them.
    pub limit: u64,
    /// The counters over them.
    counters: Vec<u32>,
}

impl Cluster {
    /// A bound found by other means than cores: no counter speaks of it.
    pub fn of(units: Vec<u32>, limit: u64) -> Cluster {
        Cluster {
            units,
            limit,
            counters: Vec::new(),
        }
    }
}

/// The weights of the active softs.
#[derive(Clone, Debug, Default)]
pub struct Weights(BTreeMap<Soft, u64>);

impl Weights {
    /// The active softs in order.
    pub fn active(&self) -> impl Iterator<Item = Soft> + '_ {
        self.0.keys().copied()
    }

    /// The weight of a soft, 0 where it is not active.
    pub fn get(&self, soft: Soft) -> u64 {
        self.0.get(&soft).copied().unwrap_or(0)
    }

    /// Gives a soft a weight.
    pub fn set(&mut self, soft: Soft, weight: u64) {
        self.0.insert(soft, weight);
    }

    /// Replaces a core by a counter of number `counter` over it; returns the weight of the core.
    /// `members` tells how many members an older counter has.
    pub fn relax(&mut self, core: &[Soft], counter: u32, members: impl Fn(u32) -> usize) -> u64 {
        let weight = core.iter().map(|&soft| self.get(soft)).min().unwrap_or(0);
        for &soft in core {
            match self.get(soft) - weight {
                0 => self.0.remove(&soft),
                rest => self.0.insert(soft, rest),
            };
            if let Soft::Count { counter, at_most } = soft
                && (at_most as usize) + 1 < members(counter)
            {
                *self
                    .0
                    .entry(Soft::Count {
                        counter,
                        at_most: at_most + 1,
                    })
                    .or_default() += weight;
            }
        }
        if core.len() > 1 {
            self.set(
                Soft::Count {
                    counter,
                    at_most: 1,
                },
                weight,
            );
        }
        weight
    }
}

fn exceeds(soft: Soft, violated: &impl Fn(u32) -> bool, known: &BTreeMap<u32, u32>) -> bool {
    match soft {
        Soft::Unit(unit) => violated(unit),
        Soft::Count { counter, at_most } => known.get(&counter).is_some_and(|&n| n > at_most),
    }
}

/// A counter and those below it that are not `known`, each after those that it counts (a counter counts
/// earlier ones only). Not by recursion, since they may be thousands deep, and each once, since counters
/// share members: the ways down can be exponentially many.
pub fn counters_below<'a>(
    counter: u32,
    members: impl Fn(u32) -> &'a [Soft],
    known: impl Fn(u32) -> bool,
) -> Vec<u32> {
    let mut found: BTreeSet<u32> = BTreeSet::new();
    let mut open = vec![counter];
    while let Some(counter) = open.pop() {
        if !known(counter) && found.insert(counter) {
            open.extend(members(counter).iter().filter_map(|member| match member {
                Soft::Count { counter, .. } => Some(*counter),
                Soft::Unit(_) => None,
            }));
        }
    }
    found.into_iter().collect()
}

/// The relaxation of one level.
#[derive(Clone, Debug)]
pub struct Relaxation {
    /// The weights of the active softs.
    pub weights: Weights,
    counters: Vec<Counter>,
    /// For each unit the cluster it is in.
    cluster_of: Vec<u32>,
    clusters: Vec<Cluster>,
    /// The sum of the weights of all cores.
    lower: u64,
}

const NONE: u32 = u32::MAX;

impl Relaxation {
    /// Nothing relaxed: every unit may be violated at its weight.
    pub fn new(weights: impl IntoIterator<Item = u64>) -> Relaxation {
        let weights: BTreeMap<Soft, u64> = weights
            .into_iter()
            .enumerate()
            .map(|(unit, weight)| (Soft::Unit(unit as u32), weight))
            .collect();
        Relaxation {
            counters: Vec::new(),
            cluster_of: vec![NONE; weights.len()],
            clusters: Vec::new(),
            lower: 0,
            weights: Weights(weights),
        }
    }

    /// What every colouring costs at least at this level.
    pub fn lower(&self) -> u64 {
        self.lower
    }

    /// How many counters there are.
    pub fn counter_count(&self) -> u32 {
        self.counters.len() as u32
    }

    /// One counter.
    pub fn counter(&self, counter: u32) -> &Counter {
        &self.counters[counter as usize]
    }

    /// The number of the cluster of a unit.
    pub fn cluster_of(&self, unit: u32) -> Option<u32> {
        let cluster = self.cluster_of[unit as usize];
        (cluster != NONE).then_some(cluster)
    }

    /// One cluster.
    pub fn cluster(&self, cluster: u32) -> &Cluster {
        &self.clusters[cluster as usize]
    }

    /// The bounds found: their units are disjoint and their limits add up to the lower bound.
    pub fn packing(&self) -> Vec<Cluster> {
        self.clusters
            .iter()
            .filter(|cluster| !cluster.units.is_empty())
            .cloned()
            .collect()
    }

    /// The active softs over a cluster's counters.
    pub fn active_counts(&self, cluster: u32) -> impl Iterator<Item = Soft> + '_ {
        self.clusters[cluster as usize]
            .counters
            .iter()
            .flat_map(|&counter| {
                let from = Soft::Count {
                    counter,
                    at_most: 0,
                };
                let to = Soft::Count {
                    counter,
                    at_most: u32::MAX,
                };
                self.weights.0.range(from..=to).map(|(&soft, _)| soft)
            })
    }

    /// The units that a soft speaks of, ascending.
    pub fn units_of(&self, soft: Soft) -> Vec<u32> {
        let Soft::Count { counter, .. } = soft else {
            return vec![self.lead(soft)];
        };
        let below = counters_below(counter, |c| &self.counter(c).members, |_| false);
        let members = below
            .into_iter()
            .flat_map(|counter| &self.counter(counter).members);
        let units: BTreeSet<u32> = members
            .filter_map(|member| match member {
                Soft::Unit(unit) => Some(*unit),
                Soft::Count { .. } => None,
            })
            .collect();
        units.into_iter().collect()
    }

    /// Whether a soft is broken, where `violated` tells of each unit. `known` keeps how many members of
    /// each counter are, for as long as the colouring stays.
    pub fn is_broken(
        &self,
        soft: Soft,
        violated: &impl Fn(u32) -> bool,
        known: &mut BTreeMap<u32, u32>,
    ) -> bool {
        if let Soft::Count { counter, .. } = soft {
            let members = |counter: u32| self.counter(counter).members.as_slice();
            for counter in counters_below(counter, members, |c| known.contains_key(&c)) {
                let broken = |&&member: &&Soft| exceeds(member, violated, known);
                let count = members(counter).iter().filter(broken).count() as u32;
                known.insert(counter, count);
            }
        }
        exceeds(soft, violated, known)
    }

    /// The place of a soft in the order of units.
    pub fn lead(&self, soft: Soft) -> u32 {
        match soft {
            Soft::Unit(unit) => unit,
            Soft::Count { counter, .. } => self.counter(counter).lead,
        }
    }

    /// Takes in a core of active softs; returns its new counter, if it has more than one member.
    pub fn relax(&mut self, mut core: Vec<Soft>) -> Option<u32> {
        core.sort_unstable_by_key(|&soft| (self.lead(soft), soft));
        let counter = self.counter_count();
        let counters = &self.counters;
        let weight = self.weights.relax(&core, counter, |counter| {
            counters[counter as usize].members.len()
        });
        self.take_bound(core, weight)
    }

    /// Takes in a bound known otherwise: of these units, of weight 1 and in no cluster yet, at least
    /// `limit` are violated. The same invariant: their cost is the limit and what exceeds it.
    pub fn take(&mut self, units: Vec<u32>, limit: u32) {
        let counter = self.counter_count();
        let members: Vec<Soft> = units.into_iter().map(Soft::Unit).collect();
        for member in &members {
            self.weights.0.remove(member);
        }
        if members.len() > 1 && (limit as usize) < members.len() {
            self.weights.set(
                Soft::Count {
                    counter,
                    at_most: limit,
                },
                1,
            );
        }
        self.take_bound(members, u64::from(limit));
    }

    fn take_bound(&mut self, members: Vec<Soft>, weight: u64) -> Option<u32> {
        self.lower += weight;
        let cluster = self.join_clusters(&members);
        self.clusters[cluster as usize].limit += weight;
        if members.len() < 2 {
            return None;
        }
        let counter = self.counter_count();
        let lead = members
            .iter()
            .map(|&soft| self.lead(soft))
            .min()
            .unwrap_or(0);
        self.counters.push(Counter { members, lead });
        self.clusters[cluster as usize].counters.push(counter);
        Some(counter)
    }

    /// Puts the clusters and units that a core touches into one cluster, the largest of them.
    fn join_clusters(&mut self, core: &[Soft]) -> u32 {
        let mut touched: Vec<u32> = Vec::new();
        let mut fresh: Vec<u32> = Vec::new();
        for &soft in core {
            let unit = self.lead(soft);
            match self.cluster_of(unit) {
                Some(cluster) => touched.push(cluster),
                None => fresh.push(unit),
            }
        }
        touched.sort_unstable();
        touched.dedup();
        let size = |&cluster: &u32| self.clusters[cluster as usize].units.len();
        let into = touched
            .iter()
            .copied()
            .max_by_key(|c| (size(c), std::cmp::Reverse(*c)));
        let into = into.unwrap_or_else(|| {
            self.clusters.push(Cluster::default());
            self.clusters.len() as u32 - 1
        });
        let mut joined = std::mem::take(&mut self.clusters[into as usize]);
        for other in touched.into_iter().filter(|&other| other != into) {
            let other = std::mem::take(&mut self.clusters[other as usize]);
            joined.limit += other.limit;
            joined.counters.extend(other.counters);
            fresh.extend(other.units);
        }
        for &unit in &fresh {
            self.cluster_of[unit as usize] = into;
        }
        joined.units.extend(fresh);
        joined.units.sort_unstable();
        self.clusters[into as usize] = joined;
        into
    }
}
