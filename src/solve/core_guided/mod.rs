//! Core-guided search for the least cost of a piece: conflicts first, then stitches.
//!
//! Cores are local, so the search is: disjoint cliques give the first bounds ([`cliques`]); tiles of growing
//! size are searched for more, side by side ([`window`]); their colourings are put together
//! ([`patchwork`]) and mended place by place ([`repair`]); where a place cannot be mended, cores are
//! searched around it; the whole piece is asked last, and rarely. When everything that is left is kept,
//! the colouring is optimal at its level. [`relaxation`] has the method and its sources.

pub mod cliques;
pub mod cores;
pub mod level;
pub mod patchwork;
pub mod relaxation;
pub mod repair;
pub mod window;

use rayon::prelude::*;

use encodings::{Cost, Mask};

use super::Bounds;
use super::backend::Answer;
use super::descent;
use super::feasibility::{self, Feasibility};
use super::limits::Stop;
use super::places::Places;
use cores::Ended;
use level::{Level, Relaxations};
use relaxation::{Cluster, Relaxation, Soft};
use repair::Repair;
use window::Window;

/// What the search found.
pub struct Found {
    /// The best colouring.
    pub colouring: Vec<Mask>,
    /// Bounds on the conflicts.
    pub conflicts: Bounds,
    /// Bounds on the stitches.
    pub stitches: Bounds,
    /// Bounds with disjoint units of conflict: their limits add up to the lower bound.
    pub conflict_packing: Vec<Cluster>,
    /// Bounds with disjoint stitch edges.
    pub stitch_packing: Vec<Cluster>,
}

/// How large windows are. No outcome depends on it but the time; tests use tiny ones.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Scale {
    /// A piece of at most this many fragments is one window.
    pub one_window: usize,
    /// The first tiles hold about this many fragments, and those of each further stage four times as many.
    pub first_tile: usize,
}

impl Scale {
    /// Chosen by measuring the contact array and the wires of `benchmarks`.
    pub const USUAL: Scale = Scale {
        one_window: 120,
        first_tile: 48,
    };
    /// Every step of the search happens even in pieces of a few fragments.
    pub const TINY: Scale = Scale {
        one_window: 1,
        first_tile: 1,
    };
}

/// Finds a colouring of least cost, or the best one and true bounds where it is stopped. `start` is a
/// legal colouring.
pub fn least_cost(places: &Places<'_>, start: Vec<Mask>, scale: Scale, stop: &Stop) -> Found {
    let instance = places.instance;
    let weights = instance
        .stitches()
        .iter()
        .map(|stitch| u64::from(stitch.weight));
    let mut search = Search {
        places,
        relaxations: Relaxations {
            conflicts: Relaxation::new(vec![1; instance.unit_count()]),
            stitches: Relaxation::new(weights),
        },
        cost: instance.cost(&start),
        patchwork: start.clone(),
        best: start,
        infeasible: false,
        scale,
        stop,
    };
    for clique in cliques::disjoint_cliques(instance) {
        search
            .relaxations
            .conflicts
            .take(clique.pairs, clique.limit);
    }
    if search.finish(Level::Conflicts) {
        search.descend();
        search.finish(Level::Stitches);
    }
    search.found()
}

struct Search<'a> {
    places: &'a Places<'a>,
    relaxations: Relaxations,
    best: Vec<Mask>,
    cost: Cost,
    /// The colourings of the last stage's tiles, put together.
    patchwork: Vec<Mask>,
    /// Proven to cost something, though no core may have been found yet.
    infeasible: bool,
    scale: Scale,
    stop: &'a Stop,
}

/// What the search of a window found.
struct Searched {
    /// Its cores, in order.
    cores: Vec<Vec<Soft>>,
    /// The masks of its fragments, where all softs that are left can be kept.
    masks: Option<Vec<Mask>>,
}

impl Search<'_> {
    /// Searches one level to its end; says whether the best colouring is proven optimal there.
    fn finish(&mut self, level: Level) -> bool {
        let mut stage = 0;
        let mut size = self.scale.first_tile;
        while size <= LARGEST_TILE.min(self.places.instance.fragment_count() / 2)
            && !self.is_tight(level)
        {
            self.search_tiles(level, size, stage);
            if stage == 0 {
                self.try_for_nothing(level);
            }
            stage += 1;
            size *= GROWTH;
        }
        if stage == 0 {
            self.try_for_nothing(level);
        }
        if self.is_tight(level) {
            return true;
        }
        if self.places.instance.fragment_count() <= self.scale.one_window {
            self.search_at_once(level);
        } else {
            self.search_by_repair(level);
        }
        self.is_tight(level)
    }

    /// No tile showed a conflict: perhaps the piece can be coloured at no cost at all. Where it cannot, and
    /// there are no stitches to pay for, all units together are a first bound of 1.
    fn try_for_nothing(&mut self, level: Level) {
        if level == Level::Stitches || self.relaxations.conflicts.lower() > 0 {
            return;
        }
        match feasibility::decide(self.places, self.stop) {
            Feasibility::Colouring(colouring) => self.improve(colouring),
            Feasibility::Infeasible => {
                self.infeasible = self.places.instance.stitches().is_empty();
            }
            Feasibility::Stopped => {}
        }
    }

    /// What every colouring costs at least at a level.
    fn lower(&self, level: Level) -> u64 {
        let lower = self.relaxations.at(level).lower();
        if level == Level::Conflicts {
            lower.max(u64::from(self.infeasible))
        } else {
            lower
        }
    }

    fn is_tight(&self, level: Level) -> bool {
        self.cost_at(level) == self.lower(level)
    }

    /// What the best colouring costs at a level.
    fn cost_at(&self, level: Level) -> u64 {
        match level {
            Level::Conflicts => self.cost.conflicts,
            Level::Stitches => self.cost.stitches,
        }
    }

    /// Searches tiles of about `size` fragments. Tiles of one stage share no unit: they are independent.
    fn search_tiles(&mut self, level: Level, size: usize, stage: u32) {
        let base = self.relaxations.at(level).counter_count();
        let tiles = self.places.tiles(size, stage);
        let found: Vec<Searched> = tiles
            .par_iter()
            .map(|tile| self.search_window(tile, level))
            .collect();
        let mut patchwork = self.patchwork.clone();
        for (tile, searched) in tiles.iter().zip(found) {
            self.take_in(level, base, searched.cores);
            if let Some(masks) = searched.masks {
                patchwork::lay(self.places, &mut patchwork, tile, &masks);
            }
        }
        descent::improve(self.places, &mut patchwork, self.stop);
        self.improve(patchwork.clone());
        self.patchwork = patchwork;
    }

    /// Searches a window for cores; its own counters are numbered on from those of the relaxation.
    fn search_window(&self, features: &[u32], level: Level) -> Searched {
        if self.stop.now() {
            return Searched {
                cores: Vec::new(),
                masks: None,
            };
        }
        let mut window = Window::new(
            self.places,
            features,
            level,
            &self.relaxations,
            &self.best,
            self.stop,
        );
        window.break_symmetry(features);
        let ended = window.find_cores(self.relaxations.at(level));
        Searched {
            masks: matches!(ended, Ended::Kept).then(|| window.masks()),
            cores: window.cores,
        }
    }

    /// Takes in the cores of a window. Counters from `base` on are the window's own, in the order of
    /// its cores of two members or more.
    fn take_in(&mut self, level: Level, base: u32, cores: Vec<Vec<Soft>>) {
        let relaxation = self.relaxations.at_mut(level);
        let mut own: Vec<u32> = Vec::new();
        for mut core in cores {
            for soft in &mut core {
                if let Soft::Count { counter, .. } = soft
                    && let Some(i) = counter.checked_sub(base)
                    && let Some(&now) = own.get(i as usize)
                {
                    *counter = now;
                }
            }
            own.extend(relaxation.relax(core));
        }
    }

    /// Searches the whole piece in one window.
    fn search_at_once(&mut self, level: Level) {
        let features: Vec<u32> = (0..self.places.instance.feature_count() as u32).collect();
        let base = self.relaxations.at(level).counter_count();
        let searched = self.search_window(&features, level);
        self.take_in(level, base, searched.cores);
        if let Some(masks) = searched.masks {
            self.improve(masks);
        }
    }

    /// Mends the best patchwork until it keeps all active softs; where it cannot be mended, there is a core
    /// to find: around that place, or else in the whole piece.
    fn search_by_repair(&mut self, level: Level) {
        let mut colours = match level {
            Level::Conflicts => self.patchwork.clone(),
            Level::Stitches => self.best.clone(),
        };
        while !self.is_tight(level) && !self.stop.now() {
            let mut repair = Repair {
                places: self.places,
                level,
                relaxations: &self.relaxations,
                colours,
                stop: self.stop,
            };
            let broken = repair.mend();
            colours = repair.colours;
            self.improve(colours.clone());
            if broken.is_empty() {
                return;
            }
            let mut found = false;
            for soft in broken {
                // A core found around one place may have replaced the soft of the next one.
                let is_active = self.relaxations.at(level).weights.get(soft) > 0;
                found |= is_active && self.search_around(level, &[soft]);
            }
            if !found {
                match self.search_whole(level, &colours) {
                    Some(masks) => colours = masks,
                    None => return,
                }
            }
        }
    }

    /// Asks for a model of the whole piece, as long as cores turn up instead; `None` when stopped.
    fn search_whole(&mut self, level: Level, near: &[Mask]) -> Option<Vec<Mask>> {
        let features: Vec<u32> = (0..self.places.instance.feature_count() as u32).collect();
        let mut whole = Window::new(
            self.places,
            &features,
            level,
            &self.relaxations,
            near,
            self.stop,
        );
        whole.break_symmetry(&features);
        loop {
            let relaxation = self.relaxations.at(level);
            let active: Vec<Soft> = relaxation.weights.active().collect();
            match whole.solve(relaxation, &active) {
                Answer::Satisfiable => return Some(whole.masks()),
                Answer::Stopped => return None,
                Answer::Unsatisfiable(suspects) => {
                    let suspects = whole.softs_of(&suspects);
                    if !self.search_around(level, &suspects)
                        && !self.relax_core(level, &mut whole, active, suspects)
                    {
                        return None;
                    }
                }
            }
        }
    }

    /// Searches for cores around a core of the whole piece, in growing windows; says whether it found any.
    fn search_around(&mut self, level: Level, core: &[Soft]) -> bool {
        let start = self.relaxations.features_of(self.places, level, core);
        for steps in STEPS {
            let features = self.places.around(&start, steps);
            if features.len() * 2 > self.places.instance.feature_count() {
                return false;
            }
            let base = self.relaxations.at(level).counter_count();
            let cores = self.search_window(&features, level).cores;
            if !cores.is_empty() {
                self.take_in(level, base, cores);
                return true;
            }
        }
        false
    }

    /// Relaxes a core that no window shows.
    fn relax_core(
        &mut self,
        level: Level,
        whole: &mut Window<'_>,
        failing: Vec<Soft>,
        suspects: Vec<Soft>,
    ) -> bool {
        let core = whole.minimise(self.relaxations.at(level), failing, suspects);
        if core.is_empty() {
            return false;
        }
        self.relaxations.at_mut(level).relax(core);
        true
    }

    /// Single changes that save stitches and cost no conflict: models of the first level have many stitches.
    fn descend(&mut self) {
        let mut colours = self.best.clone();
        descent::improve(self.places, &mut colours, self.stop);
        self.improve(colours);
    }

    /// Takes a colouring that costs less.
    fn improve(&mut self, colouring: Vec<Mask>) {
        let cost = self.places.instance.cost(&colouring);
        if cost < self.cost {
            (self.best, self.cost) = (colouring, cost);
        }
    }

    fn found(self) -> Found {
        let cost = self.cost;
        let conflicts = Bounds {
            lower: self.lower(Level::Conflicts),
            upper: cost.conflicts,
        };
        let tight = conflicts.is_tight();
        let stitches = Bounds {
            lower: if tight {
                self.relaxations.stitches.lower()
            } else {
                0
            },
            upper: cost.stitches,
        };
        let mut conflict_packing = self.relaxations.conflicts.packing();
        if conflict_packing.is_empty() && self.infeasible {
            let units = (0..self.places.instance.unit_count() as u32).collect();
            conflict_packing.push(Cluster::of(units, 1));
        }
        Found {
            colouring: self.best,
            conflicts,
            stitches,
            conflict_packing,
            stitch_packing: if tight {
                self.relaxations.stitches.packing()
            } else {
                Vec::new()
            },
        }
    }
}

/// Tiles of a stage are this much larger than those of the stage before.
const GROWTH: usize = 4;

/// Larger tiles than this cost more, for models of them, than the cores that only they show are worth:
/// those turn up where repair fails.
const LARGEST_TILE: usize = 800;

/// How far around a core to search, try by try.
const STEPS: [usize; 5] = [1, 2, 3, 5, 8];
