//! Where proofs go while they are made: to files in the end, to memory in tests.

use std::collections::BTreeMap;
use std::io::{self, Write};
use std::sync::{Mutex, PoisonError};

/// Takes proofs, from several threads at once.
pub trait ProofStore: Sync {
    /// Keeps a proof under a name that no other has; `content` writes its text.
    ///
    /// # Errors
    /// The system's refusal.
    fn put(&self, name: &str, content: &dyn Fn(&mut dyn Write) -> io::Result<()>)
    -> io::Result<()>;
}

/// Proofs in memory, by name.
#[derive(Debug, Default)]
pub struct InMemory(Mutex<BTreeMap<String, Vec<u8>>>);

impl InMemory {
    /// All proofs by their names.
    pub fn into_proofs(self) -> BTreeMap<String, Vec<u8>> {
        self.0.into_inner().unwrap_or_else(PoisonError::into_inner)
    }
}

impl ProofStore for InMemory {
    fn put(
        &self,
        name: &str,
        content: &dyn Fn(&mut dyn Write) -> io::Result<()>,
    ) -> io::Result<()> {
        let mut text = Vec::new();
        content(&mut text)?;
        let mut proofs = self.0.lock().unwrap_or_else(PoisonError::into_inner);
        proofs.insert(name.to_owned(), text);
        Ok(())
    }
}
