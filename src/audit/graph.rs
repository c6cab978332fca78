//! The problem of a graph or instance file, which lists it.

use encodings::{self, Instance};

use super::problem::{Problem, Stitch, Tie};

/// The problem that an instance states: its lists, copied.
pub fn derive(instance: &Instance) -> Problem {
    let features = instance.feature_count() as u32;
    let starts = (0..features).map(|feature| instance.fragments_of(feature).start);
    let mut close: Vec<[u32; 2]> = instance.edges().to_vec();
    close.extend(instance.self_spacings());
    close.sort_unstable();
    let mut stitches: Vec<Stitch> = (instance.stitches().iter())
        .map(|stitch| Stitch {
            ends: [stitch.a, stitch.b],
            weight: stitch.weight,
        })
        .collect();
    stitches.sort_unstable();
    let fragments = instance.fragment_count() as u32;
    Problem {
        masks: instance.masks(),
        feature_start: starts.chain([fragments]).collect(),
        allowed: (0..fragments)
            .map(|fragment| instance.allowed(fragment).bits())
            .collect(),
        close,
        stitches,
        ties: ties(instance),
    }
}

fn ties(instance: &Instance) -> Vec<Tie> {
    let copied = |tie: &encodings::Tie| match tie {
        encodings::Tie::Same(ends) => Tie::Same(*ends),
        encodings::Tie::Different(ends) => Tie::Different(*ends),
        encodings::Tie::AtMost { most, stitches } => Tie::AtMost {
            most: u64::from(*most),
            stitches: (stitches.iter())
                .map(|stitch| Stitch {
                    ends: [stitch.a, stitch.b],
                    weight: stitch.weight,
                })
                .collect(),
        },
    };
    let mut ties: Vec<Tie> = instance.ties().iter().map(copied).collect();
    ties.sort_by_key(Tie::first);
    ties
}
