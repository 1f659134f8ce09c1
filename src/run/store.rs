//! The folder that a run fills: whole files only, a manifest of all of them, nothing else touched.
//!
//! A file is written under a temporary name beside its place and then renamed, so a reader never sees half of it and
//! a failure leaves the old one. Names that the old manifest lists and the new run does not write are removed. A journal
//! names each file before it is written and goes when the manifest stands, so the next run also knows what a run wrote
//! that was killed.

use crate::report::{Manifest, is_inside, sha256_hex};
use std::fmt;
use std::fs;
use std::io;
use std::io::Write as _;
use std::path::{Path, PathBuf};

/// Name of the manifest of a drawn review in its folder.
pub const MANIFEST: &str = "manifest.json";
/// Name of the manifest of pictures of layers.
pub const LAYERS: &str = "layers.json";
/// First line of a journal.
const JOURNAL_HEAD: &str = "ebbmap: files of a run that has not ended";
/// What is added to a name while the file is written.
const TEMPORARY: &str = ".part~";

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
    /// Name of the manifest; the journal's is the same with `.unfinished`.
    name: &'static str,
    manifest: Manifest,
    /// Files that an earlier run into the folder wrote.
    earlier: Vec<String>,
    /// Open from the first file on.
    journal: Option<fs::File>,
}

impl Store {
    /// Makes the folder where it does not exist and proves that files can be written there, before anything is
    /// computed for it. `name` is that of the manifest: runs of different kinds do not remove each other's files.
    pub fn open(folder: &Path, name: &'static str) -> Result<Self, StoreFailure> {
        fs::create_dir_all(folder).map_err(|error| failure("make the folder", folder, error))?;
        let probe = folder.join(".ebbmap-probe~");
        fs::write(&probe, b"").map_err(|error| failure("write into", folder, error))?;
        fs::remove_file(&probe).map_err(|error| failure("write into", folder, error))?;
        let path = folder.join(name);
        let mut earlier = match fs::read(&path) {
            Ok(bytes) => Manifest::read(&bytes).ok_or_else(|| {
                let what = "it is not a manifest of this program; choose another folder or remove it";
                failure("replace", &path, io::Error::new(io::ErrorKind::InvalidData, what))
            })?,
            Err(error) if error.kind() == io::ErrorKind::NotFound => Vec::new(),
            Err(error) => return Err(failure("read", &path, error)),
        };
        let journal = folder.join(journal_name(name));
        match fs::read_to_string(&journal) {
            Ok(text) => earlier.extend(unfinished(&text)),
            Err(error) if error.kind() == io::ErrorKind::NotFound => {}
            Err(error) => return Err(failure("read", &journal, error)),
        }
        Ok(Self { folder: folder.to_owned(), name, manifest: Manifest::default(), earlier, journal: None })
    }

    /// Writes one file; `name` is relative to the folder, with `/` between folders.
    pub fn write(&mut self, name: &str, bytes: &[u8]) -> Result<(), StoreFailure> {
        self.announce(name)?;
        self.replace(name, bytes)?;
        self.manifest.add(name, bytes.len(), sha256_hex(bytes));
        Ok(())
    }

    /// Names a file in the journal before it is written. The journal starts with what earlier runs left, so that a
    /// second killed run loses nothing.
    fn announce(&mut self, name: &str) -> Result<(), StoreFailure> {
        let path = self.folder.join(journal_name(self.name));
        let known = if self.journal.is_none() { self.earlier.join("\n") } else { String::new() };
        let write = |journal: &mut Option<fs::File>| {
            if journal.is_none() {
                let mut file = fs::File::create(&path)?;
                writeln!(file, "{JOURNAL_HEAD}\n{known}")?;
                *journal = Some(file);
            }
            journal.as_mut().map_or(Ok(()), |file| writeln!(file, "{name}"))
        };
        write(&mut self.journal).map_err(|error| failure("write", &path, error))
    }

    /// Removes what an earlier run wrote and this one did not, then writes the manifest. Gives the names written.
    pub fn finish(self) -> Result<Vec<String>, StoreFailure> {
        let names: Vec<String> = self.manifest.names().map(str::to_owned).collect();
        for name in &self.earlier {
            let path = self.folder.join(name);
            // What a killed run was just writing.
            let _ = fs::remove_file(temporary(&path));
            if names.contains(name) {
                continue;
            }
            match fs::remove_file(&path) {
                Ok(()) => self.remove_empty_folder(&path),
                Err(error) if error.kind() == io::ErrorKind::NotFound => self.remove_empty_folder(&path),
                Err(error) => return Err(failure("remove the outdated", &path, error)),
            }
        }
        self.replace(self.name, &self.manifest.write())?;
        let journal = self.folder.join(journal_name(self.name));
        match fs::remove_file(&journal) {
            Err(error) if error.kind() != io::ErrorKind::NotFound => Err(failure("remove", &journal, error)),
            _ => Ok(names),
        }
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
        let temporary = temporary(&path);
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

/// Name under which a file is written.
fn temporary(path: &Path) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(TEMPORARY);
    PathBuf::from(name)
}

/// Name of the journal beside a manifest.
fn journal_name(manifest: &str) -> String {
    format!("{manifest}.unfinished")
}

/// The names in a journal, those inside the folder; none if it is no journal of this program. The last line counts too,
/// whole or not: what it names is removed only where a file has that name.
fn unfinished(text: &str) -> Vec<String> {
    let mut lines = text.lines();
    if lines.next() != Some(JOURNAL_HEAD) {
        return Vec::new();
    }
    lines.filter(|name| !name.is_empty() && is_inside(name)).map(str::to_owned).collect()
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
        let mut first = Store::open(folder.path(), MANIFEST).unwrap();
        first.write("maps/a.svg", b"a").unwrap();
        first.write("b.json", b"b").unwrap();
        first.finish().unwrap();
        fs::write(folder.path().join("mine.txt"), b"mine").unwrap();
        let mut second = Store::open(folder.path(), MANIFEST).unwrap();
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
        assert!(Store::open(&folder, MANIFEST).is_err());
        assert_eq!(fs::read(&victim).unwrap(), b"keep");
    }

    #[test]
    fn what_a_killed_run_left_is_removed_by_the_next() {
        let folder = tempfile::tempdir().unwrap();
        let mut first = Store::open(folder.path(), MANIFEST).unwrap();
        first.write("a.json", b"a").unwrap();
        first.finish().unwrap();
        for name in ["maps/b.svg", "maps/c.svg"] {
            // Killed: dropped without an end, the second time also in the middle of a file.
            let mut killed = Store::open(folder.path(), MANIFEST).unwrap();
            killed.write(name, b"half a run").unwrap();
        }
        fs::write(folder.path().join("maps/c.svg.part~"), b"<svg").unwrap();
        fs::write(folder.path().join("mine.txt"), b"mine").unwrap();
        let mut last = Store::open(folder.path(), MANIFEST).unwrap();
        last.write("d.json", b"d").unwrap();
        last.finish().unwrap();
        assert_eq!(names(folder.path()), ["d.json", "manifest.json", "mine.txt"]);
    }

    #[test]
    fn a_journal_cannot_reach_outside_the_folder_nor_name_what_it_did_not_announce() {
        let parent = tempfile::tempdir().unwrap();
        fs::write(parent.path().join("victim.txt"), b"keep").unwrap();
        let folder = parent.path().join("out");
        fs::create_dir(&folder).unwrap();
        fs::write(folder.join("mine.txt"), b"mine").unwrap();
        for text in [format!("{JOURNAL_HEAD}\n../victim.txt\n"), "my list\nmine.txt\n".to_owned()] {
            fs::write(folder.join("manifest.json.unfinished"), text).unwrap();
            let mut store = Store::open(&folder, MANIFEST).unwrap();
            store.write("a.json", b"a").unwrap();
            store.finish().unwrap();
            assert_eq!(names(&folder), ["a.json", "manifest.json", "mine.txt"]);
            assert_eq!(fs::read(parent.path().join("victim.txt")).unwrap(), b"keep");
        }
    }

    #[test]
    fn a_foreign_manifest_is_not_replaced() {
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join(MANIFEST), b"{\"name\": \"web page\"}").unwrap();
        let error = Store::open(folder.path(), MANIFEST).unwrap_err().to_string();
        assert!(error.contains("not a manifest"), "{error}");
        assert_eq!(names(folder.path()), [MANIFEST]);
    }
}
