//! Limits, grades, numbers and waivers of findings, on reviews as a user writes them.

use ebbmap::diag::Severity;
use ebbmap::finding::{Grade, grade, limits_of, waive, waiver_messages};
use ebbmap::read::parse_review;
use std::path::Path;

const HEAD: &str =
    "schema = 1\nboard.files = 'fab'\nreference.nets = ['GND']\nnet = [{ name = 'TIDE_SCK' }]\n";

fn parse(text: &str) -> ebbmap::read::ReviewFile {
    parse_review(&format!("{HEAD}{text}"), "review.toml", Path::new(""))
}

#[test]
fn limits_are_read_with_their_exceptions() {
    let file = parse(
        "[limits]\nextra_inductance = \"2nH\"\nshare_drop = 0.4\n[[limits.path]]\nname = \"TIDE_*\"\nextra_path = \"8mm\"\n\
         [[limits.path]]\nname = \"TIDE_SCK\"\nstray = 0.02\n",
    );
    assert_eq!(file.messages, []);
    let limits = file.review.unwrap().limits;
    assert_eq!((limits.all.extra_inductance_h, limits.all.share_drop), (2e-9, 0.4));
    assert_eq!(limits_of(&limits, "LEVEL"), &limits.all);
    assert_eq!(limits_of(&limits, "TIDE_MOSI").extra_path_m, 8e-3);
    let own = limits_of(&limits, "TIDE_SCK");
    assert_eq!((own.stray, own.extra_path_m, own.extra_inductance_h), (0.02, limits.all.extra_path_m, 2e-9));
}

#[test]
fn bad_limits_and_waivers_are_told_at_their_place() {
    let file = parse(
        "[limits]\nextra_inductance = 2\nwarn_at = 1.5\nshare = 0.3\n[[waiver]]\ncode = \"return-detuor\"\npath = \"A\"\n\
         reason = \"old\"\nexpires = \"B\"\n[[waiver]]\ncode = \"stray-return\"\n",
    );
    assert!(file.review.is_none());
    let told: Vec<(u32, &str)> =
        file.messages.iter().map(|message| (message.place.line.unwrap(), message.code.name)).collect();
    let want = [
        (6, "review-wrong-type"),
        (7, "review-bad-value"),
        (8, "review-unknown-key"),
        (10, "review-bad-value"),
        (14, "review-missing-key"),
    ];
    for entry in want {
        assert!(told.contains(&entry), "{entry:?} is not among {told:?}");
    }
    let near = file.messages.iter().find(|message| message.place.line == Some(10)).unwrap();
    assert_eq!(near.hints, ["did you mean `return-detour`?"]);
}

#[test]
fn grades_follow_the_limit() {
    assert_eq!(grade(1.01, 1.0, 0.5), Some(Grade::Fail));
    assert_eq!(grade(1.0, 1.0, 0.5), Some(Grade::Warn));
    assert_eq!(grade(0.5, 1.0, 0.5), None);
    assert_eq!(grade(-3.0, 1.0, 0.5), None);
}

#[test]
fn waivers_end_with_their_revision() {
    let text = "[[waiver]]\ncode = \"return-detour\"\npath = \"TIDE_*\"\nreason = \"slot for the shield\"\nexpires = \"C\"\n\
                [[waiver]]\ncode = \"plane-edge\"\npath = \"TIDE_SCK\"\nreason = \"x\"\nexpires = \"C\"\n";
    let review = parse(text).review.unwrap();
    let finding = crate::documents::finding("TIDE_SCK");
    for (revision, waived) in
        [("A", true), ("B", true), ("C", false), ("D", false), ("7", false), ("", false)]
    {
        let mut findings = [finding.clone()];
        assert!(findings[0].is_exceeded());
        waive(&mut findings, &review, revision);
        assert_eq!(findings[0].waived.is_some(), waived, "revision {revision}");
        assert_eq!(findings[0].is_exceeded(), !waived);
        let messages = waiver_messages(&findings, &review, revision);
        let codes: Vec<&str> = messages.iter().map(|message| message.code.name).collect();
        let want: &[&str] = if waived { &["waiver-unused"] } else { &["waiver-expired", "waiver-unused"] };
        assert_eq!(codes, want, "revision {revision}");
        assert!(messages.iter().all(|message| message.severity == Severity::Warning));
    }
}
