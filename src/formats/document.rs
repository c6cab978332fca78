//! JSON written as it is produced: one member of the outer object a line, one entry of a long list a
//! line, so that a result can be read by people and compared by `diff`.

use std::io::{self, Write};

use serde::Serialize;

/// An outer object being written.
pub struct Document<'a, W: Write> {
    out: &'a mut W,
    first: bool,
}

impl<'a, W: Write> Document<'a, W> {
    /// Opens the object.
    pub fn open(out: &'a mut W) -> io::Result<Document<'a, W>> {
        out.write_all(b"{")?;
        Ok(Document { out, first: true })
    }

    /// Writes a member.
    pub fn member(&mut self, name: &str, value: impl Serialize) -> io::Result<()> {
        self.name(name)?;
        entry(self.out, &value)
    }

    /// Writes a member that is a list, one entry a line.
    pub fn list<T: Serialize>(
        &mut self,
        name: &str,
        entries: impl IntoIterator<Item = T>,
    ) -> io::Result<()> {
        self.name(name)?;
        self.out.write_all(b"[")?;
        for (i, value) in entries.into_iter().enumerate() {
            self.out.write_all(if i == 0 { b"\n " } else { b",\n " })?;
            entry(self.out, &value)?;
        }
        self.out.write_all(b"]")
    }

    /// Closes the object.
    pub fn close(self) -> io::Result<()> {
        self.out.write_all(b"}\n")
    }

    fn name(&mut self, name: &str) -> io::Result<()> {
        self.out.write_all(if self.first { b"" } else { b",\n" })?;
        self.first = false;
        entry(self.out, &name)?;
        self.out.write_all(b":")
    }
}

fn entry(out: &mut impl Write, value: &impl Serialize) -> io::Result<()> {
    serde_json::to_writer(out, value).map_err(io::Error::from)
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn members_and_lists_read_back() {
        let mut out = Vec::new();
        let mut document = Document::open(&mut out).unwrap();
        document.member("format", "x\"y").unwrap();
        document.list("none", [0u32; 0]).unwrap();
        document.list("some", [[1, 2], [3, 4]]).unwrap();
        document.close().unwrap();
        let text = String::from_utf8(out).unwrap();
        assert_eq!(
            text,
            "{\"format\":\"x\\\"y\",\n\"none\":[],\n\"some\":[\n [1,2],\n [3,4]]}\n"
        );
        let read: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(read["some"][1][0], 3);
    }
}
