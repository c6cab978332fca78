//! The search for cores in a window, and their minimising.
//!
//! Deletion-based minimising with the refutations' own cores (Bakker, Dikker, Tempelman and Wognum,
//! "Diagnosing and solving over-determined constraint satisfaction problems", IJCAI 1993; the refinement
//! as usual since). Where we differ: whole runs of members are left out of long cores first, the effort is
//! limited in bytes of proof, which are the same on every run, and no core counts before it was refuted
//! on its own.

use super::relaxation::{Relaxation, Soft};
use super::window::Window;
use crate::solve::backend::{Answer, SatBackend};

/// How a search for cores in a window ended.
pub enum Ended {
    /// All softs that are left can be kept: a colouring that does.
    Kept,
    /// The stop sign went up.
    Stopped,
}

/// How often a core that the solver named and did not confirm is asked for again.
const MOST_HINTS: usize = 3;

/// Minimising a core may take twice the effort of finding it, and of this many bytes of proof: a core that
/// was hard to refute is hard to refute again for each member.
const LEAST_EFFORT: u64 = 1 << 16;

/// A core of more members than this loses whole runs of them first.
const LONG_CORE: usize = 16;

impl Window<'_> {
    /// Finds cores and relaxes them here until the rest can be kept.
    pub fn find_cores(&mut self, relaxation: &Relaxation) -> Ended {
        loop {
            let active: Vec<Soft> = self.weights.active().collect();
            match self.solve(relaxation, &active) {
                Answer::Satisfiable => return Ended::Kept,
                Answer::Stopped => return Ended::Stopped,
                Answer::Unsatisfiable(suspects) => {
                    let suspects = self.softs_of(&suspects);
                    let core = self.minimise(relaxation, active, suspects);
                    if core.is_empty() {
                        return Ended::Stopped;
                    }
                    self.relax(relaxation, core);
                }
            }
        }
    }

    /// A core within `failing`, softs that cannot all be kept: those that the solver suspects, with one
    /// after the other left out as long as the rest stays a core. Stopped early, it is a larger core.
    ///
    /// The solver's own cores are hints ([`crate::solve::backend`]): what is returned has been assumed as
    /// it is, nothing else with it, and refuted.
    pub fn minimise(
        &mut self,
        relaxation: &Relaxation,
        failing: Vec<Soft>,
        suspects: Vec<Soft>,
    ) -> Vec<Soft> {
        let spend = self.last_effort.max(LEAST_EFFORT);
        let until = self.solver.effort() + spend;
        let mut refuted = failing;
        let mut core = suspects;
        for _ in 0..MOST_HINTS {
            core.sort_unstable();
            self.leave_out(relaxation, &mut core, &mut refuted, until);
            if core == refuted {
                return core;
            }
            match self.solve(relaxation, &core) {
                Answer::Unsatisfiable(_) => return core,
                Answer::Stopped => return refuted,
                Answer::Satisfiable => {}
            }
            self.solver.renew();
            core = match self.solve(relaxation, &refuted) {
                Answer::Unsatisfiable(suspects) => self.softs_of(&suspects),
                _ => return refuted,
            };
        }
        refuted
    }

    /// Leaves members out of `core` while it seems to stay one, whole runs of them at first where it is
    /// long; `refuted` is the last set that is known to be a core.
    fn leave_out(
        &mut self,
        relaxation: &Relaxation,
        core: &mut Vec<Soft>,
        refuted: &mut Vec<Soft>,
        until: u64,
    ) {
        let mut run = if core.len() > LONG_CORE {
            core.len() / 4
        } else {
            1
        };
        loop {
            // Members before `at` have been tried in runs of this length.
            let mut at = 0;
            while at < core.len() && core.len() > run {
                if self.solver.effort() > until {
                    return;
                }
                let end = (at + run).min(core.len());
                let mut without = core.clone();
                without.drain(at..end);
                match self.solve(relaxation, &without) {
                    Answer::Stopped => return,
                    Answer::Satisfiable => at = end,
                    Answer::Unsatisfiable(suspects) => {
                        let suspects = self.softs_of(&suspects);
                        let before = core[..at].iter().filter(|soft| suspects.contains(soft));
                        at = before.count();
                        core.retain(|soft| suspects.contains(soft));
                        *refuted = without;
                    }
                }
            }
            if run == 1 {
                return;
            }
            run = (run / 4).max(1);
        }
    }
}
