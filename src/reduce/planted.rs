//! Bugs on purpose, one for each reduction, behind the feature `planted-bugs`: the tests that hold "a bug in a
//! reduction can lose a certificate, never make a false one" turn them on. Without the feature nothing
//! of this is compiled in.

/// A wrong lemma.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Bug {
    /// Peels features with as many neighbour fragments as masks.
    Peel,
    /// Deletes end fragments whatever they conflict with.
    Dominated,
    /// Forgets conflict edges when it splits into components.
    Components,
    /// Forgets conflict edges when it splits into blocks.
    Blocks,
    /// Hangs blocks on nothing: their masks are not permuted to agree.
    Hinges,
    /// Forgets which masks are excluded when it splits into blocks.
    Palette,
    /// Splits along cuts of as many conflict edges as there are masks.
    Cuts,
    /// Takes pieces for equal whatever conflicts they have.
    Identical,
}

#[cfg(feature = "planted-bugs")]
mod switch {
    use super::Bug;
    use std::cell::Cell;

    thread_local! {
        static ON: Cell<Option<Bug>> = const { Cell::new(None) };
    }

    /// Turns one bug on for this thread, and off any other.
    pub fn plant(bug: Option<Bug>) {
        ON.set(bug);
    }

    pub(in crate::reduce) fn has(bug: Bug) -> bool {
        ON.get() == Some(bug)
    }
}

#[cfg(feature = "planted-bugs")]
pub use switch::plant;

#[cfg(feature = "planted-bugs")]
pub(super) use switch::has;

/// Never, without the feature.
#[cfg(not(feature = "planted-bugs"))]
pub(super) const fn has(_: Bug) -> bool {
    false
}
