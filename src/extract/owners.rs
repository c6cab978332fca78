//! Who owns the parts: features or fragments, each with the list of its parts.

/// The owner of each part and the parts of each owner: 8 bytes a part and 4 an owner.
pub(super) struct Owners {
    of: Vec<u32>,
    /// Where the parts of each owner start in `parts`.
    start: Vec<u32>,
    /// The parts of all owners, owner by owner, in the order of the tree.
    parts: Vec<u32>,
}

impl Owners {
    /// Lists the parts of `count` owners.
    pub(super) fn new(of: Vec<u32>, count: usize) -> Owners {
        let mut start = vec![0u32; count + 1];
        for &owner in &of {
            start[owner as usize + 1] += 1;
        }
        for owner in 0..count {
            start[owner + 1] += start[owner];
        }
        let mut next = start.clone();
        let mut parts = vec![0u32; of.len()];
        for (part, &owner) in (0u32..).zip(&of) {
            let place = &mut next[owner as usize];
            parts[*place as usize] = part;
            *place += 1;
        }
        Owners { of, start, parts }
    }

    /// How many owners there are.
    pub(super) fn len(&self) -> usize {
        self.start.len() - 1
    }

    /// The owner of a part.
    pub(super) fn of(&self, part: u32) -> u32 {
        self.of[part as usize]
    }

    /// The parts of an owner.
    pub(super) fn parts_of(&self, owner: u32) -> &[u32] {
        let ends = [self.start[owner as usize], self.start[owner as usize + 1]];
        &self.parts[ends[0] as usize..ends[1] as usize]
    }
}
