//! `manifest.json`: all files of a run with their size and SHA-256.

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use std::path::{Component, Path};

/// The files of a run, in the order in which they were written.
#[derive(Clone, Debug, Default)]
pub struct Manifest {
    files: Vec<Entry>,
}

#[derive(Clone, Debug, Deserialize, Serialize)]
struct Entry {
    file: String,
    bytes: usize,
    sha256: String,
}

#[derive(Deserialize, Serialize)]
struct Document {
    schema: u32,
    program: String,
    #[serde(default, skip_deserializing)]
    version: &'static str,
    files: Vec<Entry>,
}

impl Manifest {
    /// Adds a file by its name relative to the folder, with `/` between folders.
    pub fn add(&mut self, name: &str, bytes: usize, sha256: String) {
        self.files.push(Entry { file: name.to_owned(), bytes, sha256 });
    }

    /// Names of the files.
    pub fn names(&self) -> impl Iterator<Item = &str> {
        self.files.iter().map(|entry| entry.file.as_str())
    }

    /// The text of `manifest.json`, files sorted by name.
    pub fn write(&self) -> Vec<u8> {
        let mut files = self.files.clone();
        files.sort_by(|a, b| a.file.cmp(&b.file));
        let document =
            Document { schema: 1, program: "ebbmap".to_owned(), version: env!("CARGO_PKG_VERSION"), files };
        super::json(&document)
    }

    /// Names of the files that an earlier manifest lists; none if `bytes` is not such a manifest, or names a file
    /// outside its folder.
    pub fn read(bytes: &[u8]) -> Option<Vec<String>> {
        let document: Document = serde_json::from_slice(bytes).ok()?;
        let ours = document.program == "ebbmap" && document.files.iter().all(|entry| is_inside(&entry.file));
        ours.then(|| document.files.into_iter().map(|entry| entry.file).collect())
    }
}

/// Whether a name stays inside the folder that it is relative to.
pub fn is_inside(name: &str) -> bool {
    let mut parts = Path::new(name).components().peekable();
    parts.peek().is_some() && parts.all(|part| matches!(part, Component::Normal(_)))
}

/// SHA-256 of `bytes` in lower-case hexadecimal digits.
pub fn sha256_hex(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180-2, appendix B.1.
    #[test]
    fn hash_of_abc() {
        assert_eq!(sha256_hex(b"abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    }
}
