//! Writes the fabrication data of the sample boards: `cargo run --release --example tide-gauge -- OUTDIR`.

mod design;
mod fabrication;
mod gauge;
mod gerber;
mod obstacle;
mod package;
mod parts;
mod pour;
mod route;
mod small;

use std::path::Path;

fn main() {
    let Some(folder) = std::env::args().nth(1) else {
        eprintln!("usage: tide-gauge OUTDIR");
        std::process::exit(2);
    };
    for (path, text) in files() {
        let path = Path::new(&folder).join(path);
        let parent = path.parent().unwrap_or(Path::new("."));
        if let Err(error) = std::fs::create_dir_all(parent).and_then(|()| std::fs::write(&path, text)) {
            eprintln!("cannot write {}: {error}", path.display());
            std::process::exit(2);
        }
    }
}

/// All files of all boards: path relative to the samples' folder, and text.
pub fn files() -> Vec<(String, String)> {
    let all = gauge::all_variants();
    let mut boards = vec![("small", small::small())];
    boards.extend(gauge::Revision::ALL.map(|revision| (revision.folder(), gauge::gauge(&all, revision))));
    let mut files = Vec::new();
    for (folder, design) in boards {
        let written = fabrication::files(&design).into_iter();
        files.extend(written.map(|(name, text)| (format!("{folder}/fab/{name}"), text)));
    }
    files
}
