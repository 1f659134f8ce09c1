//! Opens a fabrication set: a folder or a ZIP archive, as named texts.

use crate::diag::Diagnostic;
use crate::diag::code::read as code;
use std::io::Read;
use std::path::Path;

/// Largest file that is read, in bytes.
const LARGEST_FILE: u64 = 400 << 20;
/// Most files in a set.
const MOST_FILES: usize = 5_000;

/// A file of the set.
#[derive(Clone, Debug)]
pub struct Source {
    /// Path inside the folder or archive, parts joined by `/`.
    pub name: String,
    /// Its text: UTF-8, else each byte as one character (ISO 8859-1).
    pub text: String,
}

/// Reads all files of a folder (without its subfolders) or archive, sorted by name.
pub fn open_set(path: &Path, messages: &mut Vec<Diagnostic>) -> Vec<Source> {
    let mut sources = if path.is_dir() {
        open_folder(path, messages)
    } else if path.is_file() {
        open_archive(path, messages)
    } else {
        let text = format!(
            "`{}` must be a folder or a ZIP archive with fabrication data; it does not exist",
            shown(path)
        );
        messages.push(Diagnostic::error(code::FILE_UNREADABLE, text));
        Vec::new()
    };
    sources.sort_by(|a, b| a.name.cmp(&b.name));
    sources
}

/// The last part of a path: messages never show absolute paths.
fn shown(path: &Path) -> String {
    path.file_name().map_or_else(|| path.display().to_string(), |name| name.to_string_lossy().into_owned())
}

fn text_of(bytes: Vec<u8>) -> String {
    match String::from_utf8(bytes) {
        Ok(text) => text,
        Err(error) => error.into_bytes().into_iter().map(char::from).collect(),
    }
}

fn unreadable(name: &str, why: impl std::fmt::Display) -> Diagnostic {
    let mut message =
        Diagnostic::error(code::FILE_UNREADABLE, format!("`{name}` must be readable; got: {why}"));
    message.place.file = Some(name.to_owned());
    message
}

fn open_folder(path: &Path, messages: &mut Vec<Diagnostic>) -> Vec<Source> {
    let entries = match std::fs::read_dir(path) {
        Ok(entries) => entries,
        Err(error) => {
            messages.push(unreadable(&shown(path), error));
            return Vec::new();
        }
    };
    let mut files: Vec<_> = entries.filter_map(Result::ok).map(|entry| entry.path()).collect();
    files.retain(|file| file.is_file());
    files.sort();
    if files.len() > MOST_FILES {
        let text = format!("the folder must hold at most {MOST_FILES} files; got {}", files.len());
        messages.push(Diagnostic::error(code::FILE_UNREADABLE, text));
        files.truncate(MOST_FILES);
    }
    let mut sources = Vec::new();
    for file in files {
        let name = shown(&file);
        if std::fs::metadata(&file).is_ok_and(|data| data.len() > LARGEST_FILE) {
            messages.push(unreadable(&name, "more than 400 MiB"));
            continue;
        }
        match std::fs::read(&file) {
            Ok(bytes) => {
                let is_archive = bytes.starts_with(b"PK\x03\x04");
                if is_archive {
                    let text = format!("archive `{name}` inside the folder is not opened");
                    messages.push(Diagnostic::note(code::FILE_IGNORED, text));
                } else {
                    sources.push(Source { name, text: text_of(bytes) });
                }
            }
            Err(error) => messages.push(unreadable(&name, error)),
        }
    }
    sources
}

fn open_archive(path: &Path, messages: &mut Vec<Diagnostic>) -> Vec<Source> {
    let name = shown(path);
    let archive = std::fs::File::open(path).map_err(|error| error.to_string());
    let archive = archive.and_then(|file| {
        zip::ZipArchive::new(std::io::BufReader::new(file)).map_err(|error| error.to_string())
    });
    let mut archive = match archive {
        Ok(archive) => archive,
        Err(why) => {
            let text =
                format!("`{name}` must be a folder or a ZIP archive with fabrication data; got: {why}");
            messages.push(Diagnostic::error(code::FILE_ARCHIVE, text));
            return Vec::new();
        }
    };
    if archive.len() > MOST_FILES {
        let text = format!("archive `{name}` must hold at most {MOST_FILES} files; got {}", archive.len());
        messages.push(Diagnostic::error(code::FILE_ARCHIVE, text));
        return Vec::new();
    }
    let mut sources = Vec::new();
    let mut left = LARGEST_FILE;
    for index in 0..archive.len() {
        let entry = match archive.by_index(index) {
            Ok(entry) => entry,
            Err(error) => {
                messages.push(unreadable(&name, error));
                continue;
            }
        };
        if entry.is_dir() {
            continue;
        }
        let inside = match entry.name() {
            Ok(inside) => inside.replace('\\', "/"),
            Err(error) => {
                messages.push(unreadable(&name, error));
                continue;
            }
        };
        let drive = inside.as_bytes().get(1) == Some(&b':');
        if inside.starts_with('/') || drive || inside.split('/').any(|part| part == "..") {
            let text = format!("archive `{name}` must hold relative names without `..`; got `{inside}`");
            messages.push(Diagnostic::error(code::FILE_ARCHIVE, text));
            continue;
        }
        let mut bytes = Vec::new();
        // One byte more than allowed tells whether the limit was passed; stated sizes are not trusted.
        match entry.take(left + 1).read_to_end(&mut bytes) {
            Ok(_) if bytes.len() as u64 > left => {
                messages.push(unreadable(&name, "more than 400 MiB when unpacked"));
                return sources;
            }
            Ok(_) => {
                left -= bytes.len() as u64;
                sources.push(Source { name: inside, text: text_of(bytes) });
            }
            Err(error) => messages.push(unreadable(&inside, error)),
        }
    }
    sources
}
