//! The packings of the pieces: which units are bounded, and by how much.
//!
//! The core-guided search leaves packings behind. Pieces that were enumerated have none: they are tiny, so
//! they are searched again; should that come to less, the whole piece is one bound.

use encodings::Instance;

use crate::reduce::Reduced;
use crate::solve::core_guided::relaxation::Cluster;
use crate::solve::{self, Choice, Engine, Limits, PieceOutcome, Scale};

/// The bounds found on a piece, units in its own numbers.
#[derive(Clone, Debug, Default)]
pub struct Packing {
    /// Bounds on conflicts.
    pub conflicts: Vec<Cluster>,
    /// Bounds on stitches.
    pub stitches: Vec<Cluster>,
}

/// The packing of a piece; nothing for a copy, which shares that of the piece it equals.
pub fn of(reduced: &Reduced, outcomes: &[PieceOutcome], piece: usize) -> Packing {
    let outcome = &outcomes[piece];
    let instance = &reduced.pieces[piece].instance;
    let mut packing = match outcome.engine {
        Engine::Copy | Engine::Greedy => return Packing::default(),
        Engine::CoreGuided => Packing {
            conflicts: outcome.conflict_packing.clone(),
            stitches: outcome.stitch_packing.clone(),
        },
        Engine::Enumeration => searched(instance, outcome),
    };
    let sum = |clusters: &[Cluster]| clusters.iter().map(|cluster| cluster.limit).sum::<u64>();
    if sum(&packing.conflicts) < outcome.conflicts.lower {
        let units = (0..instance.unit_count() as u32).collect();
        packing.conflicts = vec![Cluster::of(units, outcome.conflicts.lower)];
    }
    if sum(&packing.stitches) < outcome.stitches.lower {
        let units = (0..instance.stitches().len() as u32).collect();
        packing.stitches = vec![Cluster::of(units, outcome.stitches.lower)];
    }
    packing
}

fn searched(instance: &Instance, outcome: &PieceOutcome) -> Packing {
    if outcome.conflicts.lower + outcome.stitches.lower == 0 {
        return Packing::default();
    }
    let search = Choice::CoreGuided(Scale::USUAL);
    let found = solve::solve_piece(instance, search, &Limits::default());
    Packing {
        conflicts: found.conflict_packing,
        stitches: found.stitch_packing,
    }
}
