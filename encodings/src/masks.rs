//! Masks and sets of masks.

/// A mask, 0..K-1. People read K masks as 1..K.
pub type Mask = u8;

/// The most masks an instance may have.
pub const MAX_MASKS: u8 = 8;

/// A set of masks, at most [`MAX_MASKS`] of them.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct MaskSet(u8);

impl MaskSet {
    /// No mask at all.
    pub const EMPTY: MaskSet = MaskSet(0);

    /// The masks 0..`masks`-1.
    pub fn all(masks: u8) -> MaskSet {
        MaskSet(((1u16 << masks) - 1) as u8)
    }

    /// The set of one mask.
    pub fn only(mask: Mask) -> MaskSet {
        MaskSet(1 << mask)
    }

    /// The set whose bit i says whether mask i is in it.
    pub fn from_bits(bits: u8) -> MaskSet {
        MaskSet(bits)
    }

    /// Bit i says whether mask i is in the set.
    pub fn bits(self) -> u8 {
        self.0
    }

    /// Whether `mask` is in the set.
    pub fn contains(self, mask: Mask) -> bool {
        self.0 >> mask & 1 == 1
    }

    /// How many masks the set holds.
    pub fn len(self) -> u32 {
        self.0.count_ones()
    }

    /// Whether the set is empty.
    pub fn is_empty(self) -> bool {
        self.0 == 0
    }

    /// Whether every mask of the set is in `other`.
    pub fn is_subset(self, other: MaskSet) -> bool {
        self.0 & !other.0 == 0
    }

    /// The masks in both sets.
    pub fn intersection(self, other: MaskSet) -> MaskSet {
        MaskSet(self.0 & other.0)
    }

    /// The set without `mask`.
    pub fn without(self, mask: Mask) -> MaskSet {
        MaskSet(self.0 & !(1 << mask))
    }

    /// The smallest mask of the set.
    pub fn first(self) -> Option<Mask> {
        (self.0 != 0).then(|| self.0.trailing_zeros() as Mask)
    }

    /// The masks of the set, ascending.
    pub fn iter(self) -> impl Iterator<Item = Mask> {
        (0..MAX_MASKS).filter(move |&mask| self.contains(mask))
    }
}
