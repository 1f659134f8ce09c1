//! The program as a process: exit codes, messages, the output folder, the same bytes for any number of threads.

#![allow(clippy::unwrap_used)] // a failed step of a test is a failed test

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// A folder with a small board and its review, and a way to run the program there.
struct Desk {
    folder: tempfile::TempDir,
}

/// Two-layer board of 12 x 8 mm by hand: two straight tracks of net SIG and CLK over a plane of GND on the bottom.
const TOP: &str = "%FSLAX46Y46*%
%MOMM*%
%TF.FileFunction,Copper,L1,Top*%
%TF.FilePolarity,Positive*%
%TA.AperFunction,Conductor*%
%ADD10C,0.2*%
%TA.AperFunction,SMDPad,CuDef*%
%ADD11R,0.3X0.3*%
%TA.AperFunction,ComponentPad*%
%ADD12C,0.6*%
%TD*%
%TO.N,SIG*%
D10*
G01*
X2000000Y3000000D02*
X10000000Y3000000D01*
%TO.P,U1,1*%
D11*
X2000000Y3000000D03*
%TO.P,U2,1*%
X10000000Y3000000D03*
%TD*%
%TO.N,CLK*%
D10*
X2000000Y5000000D02*
X10000000Y5000000D01*
%TO.P,U1,3*%
D11*
X2000000Y5000000D03*
%TO.P,U2,3*%
X10000000Y5000000D03*
%TD*%
%TO.N,GND*%
%TO.P,U1,2*%
D12*
X2000000Y4000000D03*
%TO.P,U2,2*%
X10000000Y4000000D03*
%TD*%
M02*
";

const BOTTOM: &str = "%FSLAX46Y46*%
%MOMM*%
%TF.FileFunction,Copper,L2,Bot*%
%TF.FilePolarity,Positive*%
%TA.AperFunction,ComponentPad*%
%ADD12C,0.6*%
%TD*%
%TO.N,GND*%
G36*
X500000Y500000D02*
G01*
X11500000Y500000D01*
X11500000Y7500000D01*
X500000Y7500000D01*
X500000Y500000D01*
G37*
%TO.P,U1,2*%
D12*
X2000000Y4000000D03*
%TO.P,U2,2*%
X10000000Y4000000D03*
%TD*%
%LPC*%
G36*
X5900000Y2000000D02*
G01*
X6100000Y2000000D01*
X6100000Y4200000D01*
X5900000Y4200000D01*
X5900000Y2000000D01*
G37*
M02*
";

const PROFILE: &str = "%FSLAX46Y46*%
%MOMM*%
%TF.FileFunction,Profile,NP*%
%ADD10C,0.05*%
D10*
X0Y0D02*
G01*
X12000000Y0D01*
X12000000Y8000000D01*
X0Y8000000D01*
X0Y0D01*
M02*
";

const DRILL: &str = "M48
; #@! TF.FileFunction,Plated,1,2,PTH
METRIC
; #@! TA.AperFunction,Plated,PTH,ComponentDrill
T1C0.300
%
G05
T1
X2.000Y4.000
X10.000Y4.000
M30
";

const REVIEW: &str = r#"schema = 1
[board]
files = "fab"
title = "Small board"
revision = "A"
[stackup]
copper = ["35um", "35um"]
dielectric = ["0.2mm"]
permittivity = [4.2]
[reference]
nets = ["GND"]
[[net]]
name = "SIG"
driver = "U1.1"
receiver = "U2.1"
[[net]]
name = "CLK"
driver = "U1.3"
receiver = "U2.3"
[[band]]
name = "MF"
[[band]]
name = "mine"
from = "3MHz"
to = "30MHz"
at = ["5MHz", "10MHz"]
[solver]
cell = "0.2mm"
"#;

impl Desk {
    fn new() -> Self {
        let desk = Self { folder: tempfile::tempdir().unwrap() };
        desk.put("fab/copper-1.gbr", TOP);
        desk.put("fab/copper-2.gbr", BOTTOM);
        desk.put("fab/profile.gbr", PROFILE);
        desk.put("fab/plated.drl", DRILL);
        desk.put("review.toml", REVIEW);
        desk
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn put(&self, name: &str, text: &str) {
        let path = self.path(name);
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(path, text).unwrap();
    }

    fn run(&self, arguments: &[&str]) -> Run {
        let program = Command::new(env!("CARGO_BIN_EXE_ebbmap"))
            .args(arguments)
            .current_dir(self.folder.path())
            .env_remove("NO_COLOR")
            .output();
        Run(program.unwrap())
    }

    /// Names and contents of all files below a folder.
    fn files(&self, name: &str) -> BTreeMap<String, Vec<u8>> {
        let mut found = BTreeMap::new();
        collect(&self.path(name), "", &mut found);
        found
    }
}

fn collect(folder: &Path, prefix: &str, found: &mut BTreeMap<String, Vec<u8>>) {
    let Ok(entries) = fs::read_dir(folder) else { return };
    for entry in entries {
        let path = entry.unwrap().path();
        let name = format!("{prefix}{}", path.file_name().unwrap().to_str().unwrap());
        if path.is_dir() {
            collect(&path, &format!("{name}/"), found);
        } else {
            found.insert(name, fs::read(path).unwrap());
        }
    }
}

struct Run(Output);

impl Run {
    fn out(&self) -> String {
        String::from_utf8(self.0.stdout.clone()).unwrap()
    }

    fn err(&self) -> String {
        String::from_utf8(self.0.stderr.clone()).unwrap()
    }

    #[track_caller]
    fn exits(self, code: i32) -> Self {
        let got = self.0.status.code();
        assert_eq!(got, Some(code), "\nstdout:\n{}\nstderr:\n{}", self.out(), self.err());
        self
    }

    #[track_caller]
    fn says(self, words: &[&str]) -> Self {
        let text = self.err();
        for word in words {
            assert!(text.contains(word), "`{word}` is not in:\n{text}");
        }
        assert!(!text.contains("panicked"), "{text}");
        self
    }
}

#[test]
fn draws_everything_it_names_and_nothing_else() {
    let desk = Desk::new();
    let run = desk.run(&["draw", "review.toml", "--out", "out", "--numbers"]).exits(0);
    assert_eq!(run.out(), "", "results are files");
    assert!(!run.err().contains('\u{1b}'), "no color and no bar without a terminal: {}", run.err());
    let files = desk.files("out");
    let mut want: Vec<String> = Vec::new();
    for net in ["SIG", "CLK"] {
        for band in ["MF", "mine@5MHz", "mine@10MHz"] {
            want.push(format!("maps/{net}--L2-GND--{band}.svg"));
            want.push(format!("maps/{net}--L2-GND--{band}.png"));
            want.push(format!("numbers/{net}--L2-GND--{band}.npz"));
        }
    }
    let documents = ["findings.json", "findings.csv", "findings.gbr", "review.md", "numbers/index.json"];
    for name in ["contact-sheet-1.svg", "contact-sheet-1.png"].into_iter().chain(documents) {
        want.push(name.to_owned());
    }
    want.sort();
    let manifest: serde_json::Value = serde_json::from_slice(&files["manifest.json"]).unwrap();
    let listed: Vec<String> = manifest["files"]
        .as_array()
        .unwrap()
        .iter()
        .map(|f| f["file"].as_str().unwrap().to_owned())
        .collect();
    assert_eq!(listed, want);
    want.push("manifest.json".to_owned());
    want.sort();
    assert_eq!(files.keys().cloned().collect::<Vec<_>>(), want);
    for entry in manifest["files"].as_array().unwrap() {
        let bytes = &files[entry["file"].as_str().unwrap()];
        assert_eq!(entry["bytes"].as_u64().unwrap() as usize, bytes.len());
        assert_eq!(entry["sha256"].as_str().unwrap(), ebbmap::report::sha256_hex(bytes));
    }
    let findings: serde_json::Value = serde_json::from_slice(&files["findings.json"]).unwrap();
    assert_eq!(findings["maps"].as_array().unwrap().len(), 6);
    for map in findings["maps"].as_array().unwrap() {
        let share = map["figures"]["share_3h"]["value"].as_f64().unwrap();
        assert!((0.0..1.0).contains(&share), "{share}");
        assert!(
            files.contains_key(map["svg"].as_str().unwrap())
                && files.contains_key(map["png"].as_str().unwrap())
        );
    }
}

#[test]
fn same_bytes_for_any_number_of_threads_and_any_folder() {
    let desk = Desk::new();
    desk.run(&["draw", "review.toml", "--out", "one", "--numbers", "--jobs", "1"]).exits(0);
    let elsewhere = Desk::new();
    elsewhere.run(&["draw", "review.toml", "--out", "deep/two", "--numbers", "--jobs", "3"]).exits(0);
    let (one, two) = (desk.files("one"), elsewhere.files("deep/two"));
    assert_eq!(one.keys().collect::<Vec<_>>(), two.keys().collect::<Vec<_>>());
    for (name, bytes) in &one {
        assert!(bytes == &two[name], "{name} differs between one and three threads");
    }
}

#[test]
fn outputs_hold_no_path_and_no_time() {
    let desk = Desk::new();
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(0);
    let folder = desk.folder.path().to_str().unwrap().to_owned();
    let year = std::time::SystemTime::now().duration_since(std::time::UNIX_EPOCH).unwrap().as_secs()
        / 31_556_952
        + 1970;
    for (name, bytes) in desk.files("out") {
        let text = String::from_utf8_lossy(&bytes);
        assert!(!text.contains(&folder), "{name} names the folder");
        if !name.ends_with(".png") {
            for day in [format!("{year}-"), format!("{year}/")] {
                assert!(!text.contains(&day), "{name} seems to hold a date");
            }
        }
    }
}

#[test]
fn only_draws_the_chosen_net_on_the_common_scale() {
    let desk = Desk::new();
    desk.run(&["draw", "review.toml", "--out", "all"]).exits(0);
    desk.run(&["draw", "review.toml", "--out", "some", "--only", "S*"]).exits(0);
    let (all, some) = (desk.files("all"), desk.files("some"));
    let maps: Vec<_> = some.keys().filter(|name| name.starts_with("maps/")).collect();
    assert_eq!(maps.len(), 6);
    for name in maps {
        assert!(name.contains("SIG"), "{name}");
        assert!(some[name] == all[name], "{name} depends on what else is drawn");
    }
}

#[test]
fn unknown_only_names_a_near_net() {
    let desk = Desk::new();
    desk.run(&["draw", "review.toml", "--out", "out", "--only", "SGI"]).exits(2).says(&[
        "error[only-unknown]",
        "`SGI`",
        "did you mean `SIG`?",
    ]);
    assert!(!desk.path("out").exists());
}

#[test]
fn unknown_net_of_the_review_is_refused_with_its_line_and_a_near_name() {
    let desk = Desk::new();
    desk.put("review.toml", &REVIEW.replace("name = \"SIG\"", "name = \"SIGG\""));
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(2).says(&[
        "error[net-unknown]",
        "review.toml:13",
        "SIGG",
        "`SIG`",
    ]);
    assert!(!desk.path("out").exists());
}

#[test]
fn all_faults_of_a_review_are_named_at_once() {
    let desk = Desk::new();
    let text = REVIEW.replace("revision", "revison").replace("\"0.2mm\"]", "\"0.2\"]");
    desk.put("review.toml", &text);
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(2).says(&["revison", "revision", "0.2", "unit"]);
    assert!(!desk.path("out").exists());
}

#[test]
fn missing_files_are_named() {
    let desk = Desk::new();
    desk.run(&["draw", "nowhere.toml", "--out", "out"]).exits(2).says(&["error[", "nowhere.toml"]);
    desk.run(&["look", "nowhere"]).exits(2).says(&["error[", "nowhere"]);
    desk.put("review.toml", &REVIEW.replace("files = \"fab\"", "files = \"lost\""));
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(2).says(&["error[", "lost"]);
    assert!(!desk.path("out").exists());
}

#[test]
fn a_folder_that_cannot_be_written_is_refused_before_solving() {
    let desk = Desk::new();
    desk.put("out", "a file where the folder should be");
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(2).says(&["error[cannot-write]", "`out`"]);
    assert_eq!(fs::read_to_string(desk.path("out")).unwrap(), "a file where the folder should be");
}

#[test]
fn a_foreign_manifest_is_left_alone() {
    let desk = Desk::new();
    desk.put("out/manifest.json", "{\"name\": \"a web page\"}");
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(2).says(&["error[cannot-write]", "manifest"]);
    assert_eq!(desk.files("out").len(), 1);
}

#[test]
fn a_second_run_removes_its_own_leftovers_only() {
    let desk = Desk::new();
    desk.run(&["draw", "review.toml", "--out", "out", "--numbers"]).exits(0);
    desk.put("out/notes.txt", "mine");
    desk.put("out/maps/sketch.svg", "mine too");
    desk.run(&["draw", "review.toml", "--out", "out", "--only", "CLK"]).exits(0);
    let files = desk.files("out");
    assert!(
        files.keys().all(|name| !name.contains("SIG") && !name.starts_with("numbers/")),
        "{:?}",
        files.keys()
    );
    assert!(files.contains_key("notes.txt") && files.contains_key("maps/sketch.svg"));
    assert!(!desk.path("out/numbers").exists(), "an emptied folder goes too");
}

#[test]
fn what_is_withheld_is_named_and_ends_with_3() {
    let desk = Desk::new();
    // without the driver's reference pin the nearest via is 8 mm away
    let pad = "%TO.P,U1,2*%\nD12*\nX2000000Y4000000D03*\n";
    for (name, text) in [("fab/copper-1.gbr", TOP), ("fab/copper-2.gbr", BOTTOM)] {
        assert!(text.contains(pad));
        desk.put(name, &text.replace(pad, "D12*\n"));
    }
    desk.put("fab/plated.drl", &DRILL.replace("X2.000Y4.000\n", ""));
    desk.run(&["draw", "review.toml", "--out", "out"]).exits(3).says(&["[landing-none]", "driver_landing"]);
    let files = desk.files("out");
    let findings: serde_json::Value = serde_json::from_slice(&files["findings.json"]).unwrap();
    for map in findings["maps"].as_array().unwrap() {
        assert_eq!(map["withheld"]["code"], "landing-none");
        assert!(map["svg"].is_null() && map["figures"].is_null());
    }
    assert!(files.contains_key("contact-sheet-1.svg"));
    desk.run(&["look", "review.toml"]).exits(3);
}

#[test]
fn look_tells_the_plan_and_writes_nothing() {
    let desk = Desk::new();
    let before = desk.files(".");
    let run = desk.run(&["look", "review.toml"]).exits(0);
    for word in ["SIG", "L2-GND", "0.2 mm", "U1.1", "landing", "cells", "unknowns"] {
        assert!(run.out().contains(word), "`{word}` is not in:\n{}", run.out());
    }
    let json: serde_json::Value =
        serde_json::from_str(&desk.run(&["look", "review.toml", "--json"]).exits(0).out()).unwrap();
    assert_eq!(json["layers"].as_array().unwrap().len(), 2);
    assert_eq!(json["plan"]["nets"].as_array().unwrap().len(), 2);
    assert_eq!(desk.files("."), before);
}

#[test]
fn look_draws_the_layers_where_pictures_are_wanted() {
    let desk = Desk::new();
    let run = desk.run(&["look", "review.toml", "--picture", "out"]).exits(0);
    assert!(run.out().contains("2 layers") && run.out().contains("`out`"), "{}", run.out());
    let names = ["layer-1.png", "layer-1.svg", "layer-2.png", "layer-2.svg", "layers.json"];
    let first = desk.files("out");
    assert_eq!(first.keys().collect::<Vec<_>>(), names);
    for (name, words) in [
        ("layer-1.svg", ["charted net", "SIG", "driver"]),
        ("layer-2.svg", ["reference net", "GND", "landing"]),
    ] {
        let svg = String::from_utf8_lossy(&first[name]).into_owned();
        for word in words {
            assert!(svg.contains(word), "`{word}` is not in {name}");
        }
        assert!(!svg.contains(desk.folder.path().to_str().unwrap()));
    }
    desk.run(&["look", "review.toml", "--picture", "again", "--json"]).exits(0);
    assert!(desk.files("again") == first, "the same input gives the same bytes");
    // Pictures of layers and maps may share a folder: neither removes the other's.
    desk.run(&["draw", "review.toml", "--out", "out", "--only", "SIG"]).exits(0);
    assert!(names.iter().all(|name| desk.path("out").join(name).exists()));
    desk.run(&["look", "fab", "--picture", "out", "--style", "screen"]).exits(0);
    let mixed = desk.files("out");
    assert!(mixed.contains_key("findings.json") && mixed["layer-1.svg"] != first["layer-1.svg"]);
    assert!(
        !String::from_utf8_lossy(&mixed["layer-2.svg"]).contains("reference net"),
        "a board alone has none"
    );
    desk.put("file", "not a folder");
    desk.run(&["look", "fab", "--picture", "file"]).exits(2).says(&["error[cannot-write]", "`file`"]);
    desk.run(&["look", "fab", "--picture", "new", "--style", "no-such-style"])
        .exits(2)
        .says(&["no-such-style"]);
    assert!(!desk.path("new").exists());
    desk.run(&["look", "fab", "--style", "screen"]).exits(2).says(&["--picture"]);
}

/// What a run that was killed has written is removed by the next, although no manifest lists it.
#[test]
fn a_killed_run_leaves_nothing_behind_the_next() {
    let desk = Desk::new();
    desk.run(&["draw", "review.toml", "--out", "out", "--only", "CLK"]).exits(0);
    let whole = desk.files("out");
    let mut child = Command::new(env!("CARGO_BIN_EXE_ebbmap"))
        .args(["draw", "review.toml", "--out", "out", "--cell", "0.05mm", "--numbers", "--jobs", "1"])
        .current_dir(desk.folder.path())
        .stderr(std::process::Stdio::null())
        .spawn()
        .unwrap();
    // Killed as soon as a file stands that the first run did not write.
    let started = std::time::Instant::now();
    let more = |files: &BTreeMap<String, Vec<u8>>| files.keys().any(|name| name.contains("SIG"));
    while !more(&desk.files("out")) && started.elapsed().as_secs() < 60 {
        std::thread::sleep(std::time::Duration::from_millis(2));
    }
    child.kill().unwrap();
    child.wait().unwrap();
    assert!(more(&desk.files("out")) && desk.path("out/manifest.json.unfinished").exists());
    desk.run(&["draw", "review.toml", "--out", "out", "--only", "CLK"]).exits(0);
    assert!(desk.files("out") == whole, "{:?}", desk.files("out").keys());
}

#[test]
fn explain_prints_every_code() {
    let desk = Desk::new();
    let list = desk.run(&["explain"]).exits(0).out();
    assert_eq!(list.lines().count(), ebbmap::diag::code::all().count());
    for name in list.lines() {
        let text = desk.run(&["explain", name]).exits(0).out();
        assert!(text.starts_with(name) && text.len() > name.len() + 40, "{text}");
    }
    desk.run(&["explain", "no-such-code"]).exits(2).says(&["no-such-code"]);
}

#[test]
fn usage_errors_end_with_2_and_help_with_0() {
    let desk = Desk::new();
    for arguments in [
        &["draw", "review.toml"][..],
        &["draw", "review.toml", "--out", "out", "--cell", "0.1"],
        &["draw", "review.toml", "--out", "out", "--cell", "-1mm"],
        &["draw", "review.toml", "--out", "out", "--cell", "0mm"],
        &["draw", "review.toml", "--out", "out", "--jobs", "many"],
        &["draw", "review.toml", "--out", "out", "--style", "no-such-style"],
        &["draw", "review.toml", "--out", "out", "--style", "lost.toml"],
        &["paint"],
        &[],
    ] {
        let run = desk.run(arguments).exits(2);
        assert!(!run.err().is_empty() && run.out().is_empty());
    }
    assert!(!desk.path("out").exists());
    let help = desk.run(&["--help"]).exits(0).out();
    for command in ["draw", "look", "explain", "Exit codes"] {
        assert!(help.contains(command), "{help}");
    }
    desk.run(&["--version"]).exits(0);
}

/// A reader that goes away is no failure: `ebbmap explain | head -1`.
#[cfg(unix)]
#[test]
fn a_closed_pipe_is_success() {
    let desk = Desk::new();
    let mut child = Command::new(env!("CARGO_BIN_EXE_ebbmap"))
        .args(["look", "review.toml", "--json"])
        .current_dir(desk.folder.path())
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let ended = child.wait_with_output().unwrap();
    assert_eq!(ended.status.code(), Some(0), "{}", String::from_utf8_lossy(&ended.stderr));
}
