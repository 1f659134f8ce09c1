//! Which file of a set is what, and what is told where files are missing, doubled or in disagreement.

use crate::support::{assert_close, board, copper, folder, has, net_area, profile, rectangle, refused};
use ebbmap::board::Origin;
use ebbmap::diag::code::read as code;
use ebbmap::read::read_board;
use std::io::Write;

fn plane(index: usize) -> String {
    copper(index, &rectangle("GND", 0, 0, 10, 10))
}

#[test]
fn names_do_not_decide_what_a_file_is() {
    let (top, bottom) = (plane(1), copper(2, &rectangle("VCC", 0, 0, 20, 10)));
    let legend = plane(1).replace("Copper,L1,Top", "Legend,Top");
    let files =
        [("bottom.gbr", top.as_str()), ("legend.gbr", &bottom), ("top.gbr", &legend), ("notes.txt", "hello")];
    let (board, messages) = board(&files);
    assert_close(net_area(&board, 0, "GND").0, 100.0, 1e-9);
    assert_close(net_area(&board, 1, "VCC").0, 200.0, 1e-9);
    assert!(!has(&messages, code::SET_DUPLICATE));
}

#[test]
fn of_two_files_for_a_layer_the_newer_is_used() {
    let dated = |date: &str, net: &str| {
        format!("%TF.CreationDate,{date}*%\n{}", copper(1, &rectangle(net, 0, 0, 10, 10)))
    };
    let old = dated("2026-01-02T10:00:00+02:00", "OLD");
    let new = dated("2026-01-02T09:30:00+00:00", "NEW");
    for names in [("a.gbr", "b.gbr"), ("b.gbr", "a.gbr")] {
        let (board, messages) = board(&[(names.0, &old), (names.1, &new)]);
        assert_eq!(board.nets[0].name, "NEW");
        let told = messages.iter().find(|message| message.code == code::SET_DUPLICATE).unwrap();
        assert_eq!(told.place.file.as_deref(), Some(names.0));
        assert!(told.text.contains(names.1), "{}", told.text);
    }
}

#[test]
fn the_files_own_word_wins_over_the_job_file() {
    let job = r#"{"GeneralSpecs": {"ProjectId": {"Name": "Saltmarsh tide gauge", "Revision": "A"}, "BoardThickness": 1.6},
        "FilesAttributes": [{"Path": "copper-2.gbr", "FileFunction": "Copper,L5,Inr"},
                            {"Path": "sub/COPPER-1.GBR", "FileFunction": "Copper,L1,Top"}]}"#;
    let silent = plane(1).replace("%TF.FileFunction,Copper,L1,Top*%\n", "");
    let files = [("board.gbrjob", job), ("copper-1.gbr", &silent), ("copper-2.gbr", &plane(2))];
    let (board, messages) = board(&files);
    assert_eq!(
        (board.layers.len(), board.title.as_str(), board.revision.as_str()),
        (2, "Saltmarsh tide gauge", "A")
    );
    let told: Vec<_> = messages.iter().map(|message| (message.code, message.place.file.as_deref())).collect();
    assert!(told.contains(&(code::JOB_CONTRADICTS, Some("copper-2.gbr"))), "{told:?}");
    assert!(told.contains(&(code::SET_FUNCTION, Some("copper-1.gbr"))), "{told:?}");
}

#[test]
fn an_archive_reads_like_the_folder() {
    let files = [("fab/copper-1.gbr", plane(1)), ("fab/profile.gbr", profile(10, 10))];
    let target = folder(&[]);
    let path = target.path().join("set.zip");
    let mut archive = zip::ZipWriter::new(std::fs::File::create(&path).unwrap());
    for (name, text) in &files {
        archive.start_file(*name, zip::write::SimpleFileOptions::default()).unwrap();
        archive.write_all(text.as_bytes()).unwrap();
    }
    archive.finish().unwrap();
    let (zipped, _) = read_board(&path).unwrap();
    let (plain, _) = board(&[("copper-1.gbr", &files[0].1), ("profile.gbr", &files[1].1)]);
    assert_eq!(format!("{zipped:?}"), format!("{plain:?}"));
}

#[test]
fn archives_with_names_that_lead_out_are_refused() {
    for name in ["../copper-1.gbr", "/etc/copper-1.gbr", "a/../../b.gbr", "C:/copper.gbr", "..\\copper.gbr"] {
        let target = folder(&[]);
        let path = target.path().join("set.zip");
        let mut archive = zip::ZipWriter::new(std::fs::File::create(&path).unwrap());
        archive.start_file(name, zip::write::SimpleFileOptions::default()).unwrap();
        archive.write_all(plane(1).as_bytes()).unwrap();
        archive.finish().unwrap();
        let messages = read_board(&path).unwrap_err();
        assert!(has(&messages, code::FILE_ARCHIVE), "{name}: {messages:?}");
    }
    let target = folder(&[("set.zip", "this is no archive")]);
    assert!(has(&read_board(&target.path().join("set.zip")).unwrap_err(), code::FILE_ARCHIVE));
    assert!(has(&read_board(&target.path().join("nothing")).unwrap_err(), code::FILE_UNREADABLE));
}

#[test]
fn missing_layers_and_nets_are_refused() {
    let messages = refused(&[("copper-1.gbr", &plane(1)), ("copper-3.gbr", &plane(3))]);
    assert!(
        messages.iter().any(|m| m.code == code::SET_COPPER && m.text.contains("L2 of 3")),
        "{messages:?}"
    );
    assert!(has(&refused(&[("notes.txt", "hello")]), code::SET_COPPER));
    let netless = plane(1).replace("%TO.N,GND*%\n", "");
    assert!(has(&refused(&[("copper-1.gbr", &netless)]), code::SET_NETS));
    let negative = plane(1).replace("%MOMM*%", "%MOMM*%\n%TF.FilePolarity,Negative*%");
    assert!(has(&refused(&[("copper-1.gbr", &negative)]), code::GERBER_NEGATIVE));
}

#[test]
fn all_problems_are_listed_before_a_set_is_refused() {
    let broken = |index: usize| plane(index).replace("M02", "D99*\nG99*\nM02");
    let messages = refused(&[("copper-1.gbr", &broken(1)), ("copper-2.gbr", &broken(2))]);
    let places: Vec<_> =
        messages.iter().map(|m| (m.place.file.as_deref().unwrap(), m.place.line.unwrap())).collect();
    assert_eq!(
        places,
        [("copper-1.gbr", 19), ("copper-1.gbr", 20), ("copper-2.gbr", 19), ("copper-2.gbr", 20)]
    );
}

#[test]
fn profiles_have_arcs_and_cut_outs() {
    // A 20 x 10 mm board whose right end is a half circle, with a round cut-out of 2 mm radius.
    let text = "%TF.FileFunction,Profile,NP*%\n%FSLAX46Y46*%\n%MOMM*%\n%ADD10C,0.05*%\nD10*\nG75*\n\
                G03X20000000Y10000000I0J5000000D02*\nG01X20000000Y0D02*\nG03X20000000Y10000000I0J5000000D01*\n\
                G01X0Y10000000D02*\nX20000000Y10000000D01*\nX0Y10000000D02*\nX0Y0D01*\nX20000000Y0D01*\n\
                G02X8000000Y5000000D02*\nX8000000Y5000000I2000000J0D01*\nM02*\n";
    let (board, _) = board(&[("copper-1.gbr", &plane(1)), ("profile.gbr", text)]);
    let pi = std::f64::consts::PI;
    assert_close(board.outline.area() * 1e6, 200.0 + 12.5 * pi - 4.0 * pi, 0.02);
    assert_eq!((board.outline.0.len(), board.outline.0[0].holes.len()), (1, 1));
}

#[test]
fn without_a_profile_the_board_is_the_box_of_its_copper() {
    let (board, messages) = board(&[("copper-1.gbr", &plane(1))]);
    assert_close(board.outline.area() * 1e6, 100.0, 1e-9);
    assert!(has(&messages, code::OUTLINE_MISSING) && has(&messages, code::DRILL_MISSING));
}

fn stackup_job(materials: &str) -> String {
    format!(r#"{{"GeneralSpecs": {{"BoardThickness": 1.0}}, "MaterialStackup": [{materials}]}}"#)
}

#[test]
fn the_stackup_comes_from_the_job_file_where_it_says_one() {
    let job = stackup_job(
        r#"{"Type": "SolderMask", "Thickness": 0.01},
           {"Type": "Copper", "Thickness": 0.018},
           {"Type": "Dielectric", "Thickness": 0.1, "DielectricConstant": "4.0"},
           {"Type": "Dielectric", "Thickness": 0.3, "DielectricConstant": 3},
           {"Type": "Copper"},
           {"Type": "Dielectric"},
           {"Type": "Copper", "Thickness": 0.018}"#,
    );
    let (board, messages) = board(&[
        ("board.gbrjob", &job),
        ("copper-1.gbr", &plane(1)),
        ("copper-2.gbr", &plane(2)),
        ("copper-3.gbr", &plane(3)),
    ]);
    let stackup = &board.stackup;
    assert_close(stackup.foils[0].thickness_m, 18e-6, 1e-12);
    assert_eq!((stackup.foils[1].origin, stackup.foils[1].thickness_m), (Origin::Assumed, 35e-6));
    // Two sheets in series: 0.4 / (0.1 / 4 + 0.3 / 3).
    assert_close(stackup.dielectrics[0].thickness_m, 0.4e-3, 1e-12);
    assert_close(stackup.dielectrics[0].permittivity, 0.4 / 0.125, 1e-9);
    assert_eq!(stackup.dielectrics[0].origin, Origin::File);
    // What is left of the stated board of 1 mm.
    assert_close(stackup.dielectrics[1].thickness_m, 1e-3 - 0.4e-3 - 2.0 * 18e-6 - 35e-6, 1e-12);
    assert_eq!(stackup.dielectrics[1].permittivity_origin, Origin::Assumed);
    let told: Vec<&str> =
        messages.iter().filter(|m| m.code == code::STACKUP_ASSUMED).map(|m| m.text.as_str()).collect();
    assert_eq!(told.len(), 3, "{told:?}");
    assert!(told[0].contains("L2;") && told[1].contains("L2-L3") && told[2].contains("4.3"), "{told:?}");
}

#[test]
fn a_stackup_of_equal_sheets_is_flagged() {
    let copper = r#"{"Type": "Copper", "Thickness": 0.035}"#;
    let sheet = r#"{"Type": "Dielectric", "Thickness": 0.48, "DielectricConstant": 4.5}"#;
    let job = stackup_job(&[copper, sheet, copper, sheet, copper, sheet, copper].join(","));
    let layers: Vec<String> = (1..=4).map(plane).collect();
    let names = ["1.gbr", "2.gbr", "3.gbr", "4.gbr"];
    let mut files: Vec<(&str, &str)> =
        names.iter().zip(&layers).map(|(name, text)| (*name, text.as_str())).collect();
    files.push(("board.gbrjob", &job));
    let (_, messages) = board(&files);
    assert!(has(&messages, code::STACKUP_DEFAULT) && !has(&messages, code::STACKUP_ASSUMED), "{messages:?}");
}

#[test]
fn a_job_file_that_does_not_fit_is_left_out_with_a_warning() {
    let short = stackup_job(r#"{"Type": "Copper", "Thickness": 0.035}"#);
    let (_, messages) = board(&[("a.gbrjob", &short), ("1.gbr", &plane(1)), ("2.gbr", &plane(2))]);
    assert!(
        messages.iter().any(|m| m.code == code::STACKUP_ASSUMED && m.text.contains("got 1")),
        "{messages:?}"
    );
    let broken = "{\n\"GeneralSpecs\": {\n";
    let (_, messages) = board(&[("a.gbrjob", broken), ("1.gbr", &plane(1))]);
    let told = messages.iter().find(|m| m.code == code::JOB_UNREADABLE).unwrap();
    assert_eq!((told.place.file.as_deref(), told.place.line), (Some("a.gbrjob"), Some(3)));
}
