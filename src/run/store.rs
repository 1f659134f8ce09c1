//! The folder that a run fills: whole files only, a manifest of all of them, nothing else touched.
//!
//! A file is written under a temporary name beside its place and then renamed, so a reader never sees half of it and
//! a failure leaves the old one. Names that the old manifest lists and the new run does not write are removed.

use crate::report::{Manifest, sha256_hex};
use std::fmt;
use std::fs;
use std::io;
use std::io::Write as _;
use std::path::{Path, PathBuf};

/// Name of the manifest in the folder.
const MANIFEST: &str = "manifest.json";

/// Why a file could not be written, with the path as the user wrote it.
#[derive(Debug)]
pub struct StoreFailure {
    /// What was tried, for example `write`.
    pub action: &'static str,
    /// The path.
    pub path: PathBuf,
    /// What the operating system said.
    pub error: io::Error,
}

impl fmt::Display for StoreFailure {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "cannot {} `{}`: {}", self.action, self.path.display(), self.error)
    }
}

impl std::error::Error for StoreFailure {}

/// An open output folder.
#[derive(Debug)]
pub struct Store {
    folder: PathBuf,
    manifest: Manifest,
    /// Files that an earlier run into the folder wrote.
    earlier: Vec<String>,
}

impl Store {
    /// Makes the folder where it does not exist and proves that files can be written there, before anything is
    /// computed for it.
    pub fn open(folder: &Path) -> Result<Self, StoreFailure> {
        fs::create_dir_all(folder).map_err(|error| failure("make the folder", folder, error))?;
        let probe = folder.join(".ebbmap-probe~");
        fs::write(&probe, b"").map_err(|error| failure("write into", folder, error))?;
        fs::remove_file(&probe).map_err(|error| failure("write into", folder, error))?;
        let path = folder.join(MANIFEST);
        let earlier = match fs::read(&path) {
            Ok(bytes) => Manifest::read(&bytes).ok_or_else(|| {
                let what = "it is not a manifest of this program; choose another folder or remove it";
                failure("replace", &path, io::Error::new(io::ErrorKind::InvalidData, what))
            })?,
            Err(error) if error.kind() == io::ErrorKind::NotFound => Vec::new(),
            Err(error) => return Err(failure("read", &path, error)),
        };
        Ok(Self { folder: folder.to_owned(), manifest: Manifest::default(), earlier })
    }

    /// Writes one file; `name` is relative to the folder, with `/` between folders.
    pub fn write(&mut self, name: &str, bytes: &[u8]) -> Result<(), StoreFailure> {
        self.replace(name, bytes)?;
        self.manifest.add(name, bytes.len(), sha256_hex(bytes));
        Ok(())
    }

    /// Removes what an earlier run wrote and this one did not, then writes the manifest. Gives the names written.
    pub fn finish(self) -> Result<Vec<String>, StoreFailure> {
        let names: Vec<String> = self.manifest.names().map(str::to_owned).collect();
        for name in self.earlier.iter().filter(|name| !names.contains(name)) {
            let path = self.folder.join(name);
            match fs::remove_file(&path) {
                Ok(()) => self.remove_empty_folder(&path),
                Err(error) if error.kind() == io::ErrorKind::NotFound => {}
                Err(error) => return Err(failure("remove the outdated", &path, error)),
            }
        }
        self.replace(MANIFEST, &self.manifest.write())?;
        Ok(names)
    }

    /// Removes the folder of a removed file if it is empty now, but never the output folder itself.
    fn remove_empty_folder(&self, file: &Path) {
        if let Some(parent) = file.parent()
            && parent != self.folder
        {
            // Fails while anything is left in it, which is what is wanted.
            let _ = fs::remove_dir(parent);
        }
    }

    fn replace(&self, name: &str, bytes: &[u8]) -> Result<(), StoreFailure> {
        let path = self.folder.join(name);
        if let Some(parent) = path.parent() {
            fs::create_dir_all(parent).map_err(|error| failure("make the folder", parent, error))?;
        }
        let mut temporary = path.clone().into_os_string();
        temporary.push(".part~");
        let temporary = PathBuf::from(temporary);
        let written = fs::File::create(&temporary)
            .and_then(|mut file| file.write_all(bytes).and_then(|()| file.flush()))
            .and_then(|()| fs::rename(&temporary, &path));
        written.map_err(|error| {
            // The failure that counts is the first; a leftover that cannot be removed changes nothing.
            let _ = fs::remove_file(&temporary);
            failure("write", &path, error)
        })
    }
}

fn failure(action: &'static str, path: &Path, error: io::Error) -> StoreFailure {
    StoreFailure { action, path: path.to_owned(), error }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> =
            fs::read_dir(folder).unwrap().map(|e| e.unwrap().file_name().into_string().unwrap()).collect();
        names.sort();
        names
    }

    #[test]
    fn a_new_run_removes_only_what_the_old_manifest_names() {
        let folder = tempfile::tempdir().unwrap();
        let mut first = Store::open(folder.path()).unwrap();
        first.write("maps/a.svg", b"a").unwrap();
        first.write("b.json", b"b").unwrap();
        first.finish().unwrap();
        fs::write(folder.path().join("mine.txt"), b"mine").unwrap();
        let mut second = Store::open(folder.path()).unwrap();
        second.write("b.json", b"b2").unwrap();
        assert_eq!(second.finish().unwrap(), ["b.json"]);
        assert_eq!(names(folder.path()), ["b.json", "manifest.json", "mine.txt"]);
        assert_eq!(fs::read(folder.path().join("b.json")).unwrap(), b"b2");
    }

    #[test]
    fn a_manifest_cannot_reach_outside_the_folder() {
        let parent = tempfile::tempdir().unwrap();
        let victim = parent.path().join("victim.txt");
        fs::write(&victim, b"keep").unwrap();
        let folder = parent.path().join("out");
        fs::create_dir(&folder).unwrap();
        let mut forged = Manifest::default();
        forged.add("../victim.txt", 4, "0".repeat(64));
        forged.add(victim.to_str().unwrap(), 4, "0".repeat(64));
        fs::write(folder.join(MANIFEST), forged.write()).unwrap();
        assert!(Store::open(&folder).is_err());
        assert_eq!(fs::read(&victim).unwrap(), b"keep");
    }

    #[test]
    fn a_foreign_manifest_is_not_replaced() {
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join(MANIFEST), b"{\"name\": \"web page\"}").unwrap();
        let error = Store::open(folder.path()).unwrap_err().to_string();
        assert!(error.contains("not a manifest"), "{error}");
        assert_eq!(names(folder.path()), [MANIFEST]);
    }
}
