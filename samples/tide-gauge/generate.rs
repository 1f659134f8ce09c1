//! Writes the fabrication data of the sample boards: `cargo run --release --example tide-gauge -- OUTDIR`.

mod design;
mod fabrication;
mod gerber;
mod obstacle;
mod package;
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
fn files() -> Vec<(String, String)> {
    let mut all = Vec::new();
    for (folder, design) in [("small/fab", small::small())] {
        all.extend(
            fabrication::files(&design).into_iter().map(|(name, text)| (format!("{folder}/{name}"), text)),
        );
    }
    all
}
