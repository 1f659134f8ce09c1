//! The house rules as tests: floors, headers, sizes, documents in step, nothing that must not be in the repository.

#![allow(clippy::unwrap_used)] // a failed step of a test is a failed test

use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};

/// Floor of each room under `src/`; a file imports only from lower floors, and from its own room.
const FLOORS: &[(&str, u32)] = &[
    ("diag", 0),
    ("unit", 0),
    ("geom", 1),
    ("math", 1),
    ("board", 2),
    ("review", 2),
    ("style", 2),
    ("read", 3),
    ("spread", 3),
    ("sheet", 3),
    ("signal", 3),
    ("plan", 4),
    ("field", 4),
    ("figure", 5),
    ("finding", 6),
    ("draw", 7),
    ("report", 8),
    ("run", 9),
    ("cli", 10),
];

/// Arrows that the floors alone would forbid or allow wrongly: (room, imported room, allowed).
const ARROWS: &[(&str, &str, bool, &str)] = &[
    ("diag", "geom", true, "a message may carry a spot on the board; Point is plain data"),
    ("unit", "diag", true, "text errors of quantities are messages"),
    ("review", "geom", true, "zones are rings"),
    ("plan", "field", true, "PlaneId names a plane in both"),
    ("field", "plan", true, "a chart plan is what a field solves"),
    ("spread", "board", false, "closed forms know no board"),
    ("spread", "review", false, "closed forms know no board"),
    ("sheet", "board", false, "the solver knows no board"),
    ("sheet", "review", false, "the solver knows no board"),
    ("read", "signal", true, "the name of a band stands for its limits"),
    ("signal", "board", false, "bands know no board"),
    ("draw", "sheet", false, "drawing sees results only"),
    ("draw", "spread", false, "drawing sees results only"),
    ("draw", "read", false, "drawing reads no files"),
];

/// Longest file under `src/`, inline tests included.
const LONGEST_FILE: usize = 700;

/// Files of constants that may be longer.
const TABLES: &[&str] = &[];

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

/// All files below `folder`, sorted, as paths relative to the repository.
fn files_below(folder: &str) -> Vec<PathBuf> {
    let mut found = Vec::new();
    let mut open = vec![root().join(folder)];
    while let Some(folder) = open.pop() {
        let Ok(entries) = fs::read_dir(&folder) else { continue };
        for entry in entries {
            let path = entry.unwrap().path();
            if path.is_dir() {
                open.push(path);
            } else {
                found.push(path.strip_prefix(root()).unwrap().to_owned());
            }
        }
    }
    found.sort();
    found
}

fn sources(folder: &str) -> Vec<(PathBuf, String)> {
    let rust = files_below(folder).into_iter().filter(|path| path.extension().is_some_and(|e| e == "rs"));
    let read: Vec<_> =
        rust.map(|path| (path.clone(), fs::read_to_string(root().join(path)).unwrap())).collect();
    assert!(!read.is_empty(), "no sources in {folder}: this test would check nothing");
    read
}

/// The room of a file under `src/`; none for `main.rs` and `lib.rs`.
fn room(path: &Path) -> Option<String> {
    let mut parts = path.components().skip(1);
    let first = parts.next()?.as_os_str().to_str()?.to_owned();
    parts.next().map(|_| first)
}

/// Source text with line comments, strings and character literals blanked, so that words in them do not count.
fn code_only(text: &str) -> String {
    let mut code = String::new();
    for line in text.lines() {
        let mut in_string = false;
        let mut previous = ' ';
        let mut chars = line.chars().peekable();
        while let Some(c) = chars.next() {
            if !in_string && c == '/' && chars.peek() == Some(&'/') {
                break;
            }
            if c == '"' && previous != '\\' && previous != '\'' {
                in_string = !in_string;
            }
            code.push(if in_string { ' ' } else { c });
            previous = if previous == '\\' && c == '\\' { ' ' } else { c };
        }
        code.push('\n');
    }
    code
}

/// Rooms named after `crate::` in a source, also in `use crate::{a::b, c}`.
fn imported_rooms(code: &str) -> BTreeSet<String> {
    let mut rooms = BTreeSet::new();
    for (at, _) in code.match_indices("crate::") {
        let rest = &code[at + "crate::".len()..];
        let name = |text: &str| -> String {
            text.trim_start().chars().take_while(|c| c.is_ascii_alphanumeric() || *c == '_').collect()
        };
        if let Some(list) = rest.strip_prefix('{') {
            let mut depth = 1;
            let mut start = 0;
            for (index, c) in list.char_indices() {
                match c {
                    '{' => depth += 1,
                    '}' => depth -= 1,
                    _ => {}
                }
                if (c == ',' && depth == 1) || depth == 0 {
                    rooms.insert(name(&list[start..index]));
                    start = index + 1;
                }
                if depth == 0 {
                    break;
                }
            }
        } else {
            rooms.insert(name(rest));
        }
    }
    rooms.remove("");
    rooms
}

#[test]
fn imports_point_downward() {
    let floors: BTreeMap<&str, u32> = FLOORS.iter().copied().collect();
    let mut wrong = Vec::new();
    for (path, text) in sources("src") {
        let Some(room) = room(&path) else { continue };
        let Some(floor) = floors.get(room.as_str()) else {
            wrong.push(format!("{}: room `{room}` has no floor in FLOORS", path.display()));
            continue;
        };
        // tests inside a file may use any room, for example to read a style
        let outside_tests = text.split("#[cfg(test)]").next().unwrap_or_default();
        for imported in imported_rooms(&code_only(outside_tests)) {
            let Some(other) = floors.get(imported.as_str()) else { continue };
            let arrow = ARROWS.iter().find(|arrow| arrow.0 == room && arrow.1 == imported);
            let allowed = arrow.map_or(other < floor, |arrow| arrow.2);
            if imported != room && !allowed {
                wrong.push(format!("{}: `{room}` must not import `{imported}`", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

#[test]
fn import_scanner_sees_lists_and_paths() {
    let code = code_only(
        "use crate::{board::{Board, Net}, geom::Point};\nlet x = crate::plan::Plan; // crate::cli\n",
    );
    let want: BTreeSet<String> = ["board", "geom", "plan"].iter().map(|s| s.to_string()).collect();
    assert_eq!(imported_rooms(&code), want);
}

#[test]
fn heavy_crates_stay_in_their_file() {
    const ONLY: &[(&str, &str)] = &[
        ("resvg", "src/draw"),
        ("tiny_skia", "src/draw"),
        ("usvg", "src/draw"),
        ("clap", "src/cli"),
        ("indicatif", "src/cli"),
        ("i_overlay", "src/geom"),
        ("toml", "src/read"),
    ];
    let mut wrong = Vec::new();
    for (path, text) in sources("src") {
        let code = code_only(&text);
        for (name, home) in ONLY {
            if code.contains(&format!("{name}::")) && !path.starts_with(home) {
                wrong.push(format!("{}: `{name}` belongs to {home}", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

#[test]
fn files_open_with_a_header_and_stay_short() {
    let mut wrong = Vec::new();
    for (path, text) in sources("src") {
        let name = path.display();
        let first = text.lines().next().unwrap_or_default();
        if !first.starts_with("//! ") {
            wrong.push(format!("{name}: must open with a `//!` sentence that says what the file is"));
        }
        let lines = text.lines().count();
        if lines > LONGEST_FILE && !TABLES.contains(&name.to_string().as_str()) {
            wrong.push(format!("{name}: has {lines} lines; at most {LONGEST_FILE}"));
        }
        for banned in ["utils", "util", "helpers", "helper", "common", "misc"] {
            if path.file_stem().is_some_and(|stem| stem == banned) {
                wrong.push(format!("{name}: a file is named after its noun, not `{banned}`"));
            }
        }
    }
    for (path, text) in sources("tests").into_iter().chain(sources("samples")) {
        if !text.starts_with("//!") {
            wrong.push(format!("{}: must open with a `//!` sentence", path.display()));
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

/// Files of the numerical rooms name model, source and checks; `mod.rs` and pure data are excused by having no `fn`.
#[test]
fn numerical_files_name_their_checks() {
    let mut wrong = Vec::new();
    for (path, text) in sources("src/spread").into_iter().chain(sources("src/sheet")) {
        let excused = path.ends_with("mod.rs") || !code_only(&text).contains("fn ");
        if excused {
            continue;
        }
        let header: String =
            text.lines().take_while(|line| line.starts_with("//!")).collect::<Vec<_>>().join("\n");
        if !header.contains("Checked by:") {
            wrong.push(format!("{}: header lacks `Checked by:`", path.display()));
            continue;
        }
        // every name in back quotes after it must exist somewhere
        let everything = everything();
        let names = header.split("Checked by:").nth(1).unwrap_or_default();
        for name in names.split('`').skip(1).step_by(2) {
            let function = name.rsplit("::").next().unwrap_or(name);
            if !everything.contains(&format!("fn {function}")) && !root().join(name).exists() {
                wrong.push(format!("{}: checked by `{name}`, which does not exist", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

fn everything() -> String {
    sources("src").into_iter().chain(sources("tests")).map(|(_, text)| text).collect()
}

#[test]
fn developers_document_names_every_room_and_nothing_else() {
    let text = fs::read_to_string(root().join("DEVELOPERS.md")).unwrap();
    let mut wrong = Vec::new();
    let mut rooms = BTreeSet::new();
    for (path, _) in sources("src") {
        rooms.extend(room(&path));
    }
    for room in &rooms {
        if !text.contains(&format!("`src/{room}/`")) {
            wrong.push(format!("DEVELOPERS.md does not name `src/{room}/`"));
        }
    }
    // whatever looks like a path of the repository must exist
    for quoted in text.split('`').skip(1).step_by(2) {
        let is_path =
            ["src/", "tests/", "samples/", "styles/", ".ci/"].iter().any(|top| quoted.starts_with(top));
        if is_path && !quoted.contains(['*', '<', ' ']) && !root().join(quoted).exists() {
            wrong.push(format!("DEVELOPERS.md names `{quoted}`, which does not exist"));
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

#[test]
fn codes_are_unique_and_explained() {
    let mut seen = BTreeSet::new();
    for code in ebbmap::diag::code::all() {
        assert!(seen.insert(code.name), "code `{}` is listed twice", code.name);
        let plain = code.name.chars().all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-');
        assert!(plain, "code `{}` must be lower case with hyphens", code.name);
        let words = code.meaning.split_whitespace().count();
        assert!(words >= 12, "code `{}` needs a paragraph that helps; it has {words} words", code.name);
    }
    assert!(!seen.is_empty(), "no codes: this test would check nothing");
}

/// Every `Code` constant of a room stands in the room's `ALL`, so that `explain` knows it.
#[test]
fn every_code_constant_is_listed() {
    let listed: BTreeSet<&str> = ebbmap::diag::code::all().map(|code| code.name).collect();
    let mut found = 0;
    for (path, text) in sources("src/diag/code") {
        for (at, _) in text.match_indices("name: \"") {
            let name = text[at + 7..].split('"').next().unwrap();
            assert!(listed.contains(name), "{}: code `{name}` is not in ALL", path.display());
            found += 1;
        }
    }
    assert!(found == 0 || found >= listed.len() / 2, "the scan of src/diag/code finds too little: {found}");
}

#[test]
fn sources_name_no_place_outside_the_repository() {
    let mut wrong = Vec::new();
    for (path, text) in sources("src") {
        for banned in ["/work/", "../shared", "/home/", "/tmp/", "SystemTime", "chrono", "Instant::now"] {
            // time is for the progress bar alone, which lives in cli
            let excused = banned == "Instant::now" && path.starts_with("src/cli");
            if text.contains(banned) && !excused {
                wrong.push(format!("{}: contains `{banned}`", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

/// Printing belongs to the command line, panicking macros to nobody.
#[test]
fn library_does_not_print_or_leave_gaps() {
    let mut wrong = Vec::new();
    for (path, text) in sources("src") {
        let code = code_only(&text);
        for banned in ["println!", "eprintln!", "print!(", "todo!", "unimplemented!", "dbg!"] {
            if code.contains(banned) {
                wrong.push(format!("{}: contains `{banned}`", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

/// A golden folder is a case with its references, or it is a leftover.
#[test]
fn golden_cases_are_complete() {
    let mut folders: BTreeMap<PathBuf, BTreeSet<String>> = BTreeMap::new();
    let mut wrong = Vec::new();
    for path in files_below("tests/golden") {
        let name = path.file_name().unwrap().to_str().unwrap().to_owned();
        folders.entry(path.parent().unwrap().to_owned()).or_default().insert(name);
        let bytes = fs::metadata(root().join(&path)).unwrap().len();
        if path.extension().is_some_and(|e| e == "png") && bytes > 20 * 1024 {
            let case = fs::read_to_string(root().join(path.with_file_name("case.toml"))).unwrap_or_default();
            if !case.contains("large = \"") {
                wrong.push(format!(
                    "{}: {bytes} bytes; at most 20480 without `large = \"reason\"`",
                    path.display()
                ));
            }
        }
    }
    for (folder, names) in &folders {
        if names.iter().any(|name| name.ends_with(".rs")) {
            continue;
        }
        if !names.contains("case.toml") {
            wrong.push(format!("{}: has no case.toml", folder.display()));
        }
        if !names.iter().any(|name| name.starts_with("expect.")) {
            wrong.push(format!("{}: has no expect.* reference", folder.display()));
        }
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
}

#[test]
fn the_top_of_the_repository_is_as_documented() {
    const KNOWN: &[&str] = &[
        ".ci",
        ".clippy.toml",
        ".git",
        ".gitignore",
        ".rustfmt.toml",
        "Cargo.lock",
        "Cargo.toml",
        "DEVELOPERS.md",
        "LICENSE",
        "README.md",
        "out",
        "samples",
        "src",
        "styles",
        "target",
        "tests",
    ];
    for entry in fs::read_dir(root()).unwrap() {
        let name = entry.unwrap().file_name().into_string().unwrap();
        assert!(KNOWN.contains(&name.as_str()), "`{name}` does not belong at the top of the repository");
    }
}
