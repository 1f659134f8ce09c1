//! Drives, loads, paths and pairs of a review: what a full one means, and that faults are told at their places.

use ebbmap::read::{ReviewFile, parse_review, read_review};
use ebbmap::review::LandingRequest;
use ebbmap::review::drive::{
    Budget, Drive, DriverReturn, Level, Load, Pattern, Pulse, Stream, TableLine, Tone,
};
use ebbmap::review::path::{Receiver, Step};
use std::path::Path;

fn parse(entries: &str) -> ReviewFile {
    let head = "schema = 1\nboard.files = 'fab'\nreference.nets = ['GND']\n";
    parse_review(&format!("{head}{entries}"), "review.toml", Path::new("."))
}

/// The single message of a review with one net that has `keys`: code, marked text, message and hints.
#[track_caller]
fn fault(keys: &str) -> (&'static str, String, String) {
    fault_of(&format!("[[net]]\nname = 'TIDE_SCK'\n{keys}\n"))
}

#[track_caller]
fn fault_of(entries: &str) -> (&'static str, String, String) {
    let file = parse(entries);
    assert!(file.review.is_none(), "must be refused: {entries}");
    let [message] = &file.messages[..] else { panic!("one message for {entries}; got {:#?}", file.messages) };
    let marked = file.text[message.place.span.clone().unwrap()].to_owned();
    (message.code.name, marked, format!("{} / {}", message.text, message.hints.join(" / ")))
}

#[test]
fn every_drive_arrives_in_si_units() {
    let file = read_review(&Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/review/signals.toml"));
    assert!(file.messages.is_empty(), "{:#?}", file.messages);
    let review = file.review.unwrap();
    let signal = |index: usize| review.nets[index].signal.clone();
    let clock = signal(0);
    let level = Some(Level::Volts(3.3));
    let pulse = Pulse { frequency_hz: 8e6, rise_s: 2e-9, fall_s: 3e-9, duty: 0.4, level };
    assert_eq!(clock.drive, Some(Drive::Clock(pulse)));
    assert_eq!(clock.load, Some(Load { series_ohm: 33.0, termination_ohm: None, capacitance_f: 5e-12 }));
    assert_eq!(clock.landing, DriverReturn::Both);
    let stream = Stream {
        bit_rate_hz: 115_200.0,
        edge_s: 20e-9,
        pattern: Pattern::Prbs { order: 9 },
        level: Some(Level::Amperes(4e-3)),
    };
    assert_eq!(signal(1).drive, Some(Drive::Data(stream)));
    assert_eq!((signal(1).load, signal(1).landing), (None, DriverReturn::Ground));
    let tone = Tone { frequency_hz: 32e3, bandwidth_hz: 2e3, level: Some(Level::Volts(0.01)) };
    assert_eq!(signal(2).drive, Some(Drive::Tone(tone)));
    assert_eq!(signal(2).budget, Some(Budget::Converter { bits: 12, full_scale_v: 2.048, lsb: 0.5 }));
    let lines = [(0.0, 0.03), (1e6, 2e-3), (2e6, 1e-3)]
        .map(|(frequency_hz, current_rms_a)| TableLine { frequency_hz, current_rms_a });
    assert_eq!(signal(3).drive, Some(Drive::Spectrum(lines.to_vec())));
    assert_eq!(signal(3).budget, Some(Budget::Volts(0.5e-6)));

    let hot = &review.paths[0];
    let pins = Step::Pins { enter: "Q3.5".into(), leave: "Q3.2".into() };
    assert_eq!(hot.through, [pins, Step::Part("D2".into())]);
    assert_eq!(hot.receivers, [Receiver { pin: "C41.2".into(), share: 1.0 }]);
    let level = Some(Level::Amperes(0.8));
    let ripple = Pulse { frequency_hz: 3e5, rise_s: 8e-9, fall_s: 8e-9, duty: 0.25, level };
    assert_eq!(hot.signal.drive, Some(Drive::Ripple(ripple)));
    let shared = &review.paths[1];
    assert_eq!((shared.driver.as_str(), shared.receivers[1].share, shared.line), ("U5.3", 0.75, 34));
    assert_eq!(shared.receiver_landing, Some(LandingRequest::Pin("U7.3".into())));
    assert!(!shared.signal.drive.as_ref().unwrap().is_absolute());
    let pair = &review.pairs[0];
    assert_eq!((pair.positive.as_str(), pair.negative.as_str(), pair.imbalance), ("LINK_P", "LINK_N", 0.1));
    assert_eq!(pair.signal.load.unwrap().termination_ohm, Some(100.0));
}

#[test]
fn faults_of_drives_are_told_at_their_places() {
    // keys of the net, code, marked text, words that the message must hold
    let cases = [
        ("drive = 'clock'", "review-wrong-type", "'clock'", "kind = \"clock\""),
        ("drive = { frequency = '8MHz' }", "review-missing-key", "{", "`kind`"),
        ("drive = { kind = 'clok' }", "review-bad-value", "'clok'", "did you mean `clock`?"),
        ("drive = { kind = 'clock', edge = '2ns' }", "review-missing-key", "{", "`frequency`"),
        ("drive = { kind = 'clock', frequency = '8MHz' }", "review-missing-key", "{", "edge = \"2ns\""),
        ("drive = { kind = 'clock', frequency = 8e6, edge = '2ns' }", "review-wrong-type", "8e6", "kHz"),
        (
            "drive = { kind = 'clock', frequency = '8MHz', edge = '2' }",
            "review-bad-value",
            "'2'",
            "bare number",
        ),
        (
            "drive = { kind = 'clock', frequency = '8MHz', edgee = '2ns', edge = '2ns' }",
            "review-unknown-key",
            "edgee",
            "did you mean `edge`?",
        ),
        (
            "drive = { kind = 'clock', frequency = '8MHz', edge = '2ns', rise = '1ns' }",
            "review-bad-value",
            "'1ns'",
            "beside `edge`",
        ),
        ("drive = { kind = 'clock', frequency = '8MHz', rise = '2ns' }", "review-missing-key", "{", "`fall`"),
        (
            "drive = { kind = 'clock', frequency = '8MHz', edge = '2ns', duty = 1.5 }",
            "review-bad-value",
            "1.5",
            "between 0 and 1",
        ),
        (
            "drive = { kind = 'clock', frequency = '8MHz', edge = '2ns', swing = '3V', current = '1mA' }",
            "review-bad-value",
            "'1mA'",
            "not both",
        ),
        (
            "drive = { kind = 'clock', frequency = '8MHz', edge = '2ns', swing = '3V' }",
            "review-missing-key",
            "{ kind = 'clock', frequency = '8MHz', edge = '2ns', swing = '3V' }",
            "load = \"5pF\"",
        ),
        (
            "drive = { kind = 'clock', frequency = '100MHz', edge = '5ns' }",
            "review-bad-value",
            "{ kind = 'clock', frequency = '100MHz', edge = '5ns' }",
            "6.25 ns",
        ),
        (
            "drive = { kind = 'ripple', frequency = '1MHz', edge = '5ns', swing = '1V' }",
            "review-unknown-key",
            "swing",
            "`current`",
        ),
        ("drive = { kind = 'data', rate = '1MHz', edge = '5ns' }", "review-bad-value", "'1MHz'", "bit rate"),
        (
            "drive = { kind = 'data', rate = '1Gbit/s', edge = '1ns' }",
            "review-bad-value",
            "{ kind = 'data', rate = '1Gbit/s', edge = '1ns' }",
            "longer than a bit",
        ),
        (
            "drive = { kind = 'data', rate = '1Mbit/s', edge = '1ns', pattern = 'prbs77' }",
            "review-bad-value",
            "'prbs77'",
            "prbs31",
        ),
        (
            "drive = { kind = 'tone', frequency = '1kHz', bandwidth = '3kHz' }",
            "review-bad-value",
            "'3kHz'",
            "2 kHz at most",
        ),
        ("drive = { kind = 'spectrum', lines = [] }", "review-bad-value", "[]", "one line at least"),
        ("drive = { kind = 'spectrum', lines = [['1MHz']] }", "review-bad-value", "['1MHz']", "got 1 values"),
        (
            "drive = { kind = 'spectrum', lines = [['1MHz', '1mA'], ['1000kHz', '2mA']] }",
            "review-duplicate",
            "['1000kHz', '2mA']",
            "1 MHz",
        ),
        (
            "drive = { kind = 'spectrum', lines = [['-1MHz', '1mA']] }",
            "review-bad-value",
            "'-1MHz'",
            "below zero",
        ),
        ("load = '50ohm'", "review-bad-value", "'50ohm'", "capacitance"),
        ("load = '0pF'", "review-bad-value", "'0pF'", "above zero"),
        ("landing = 'vcc'", "review-bad-value", "'vcc'", "`supply`"),
        ("budget = 3", "review-wrong-type", "3", "bits = 12"),
        ("budget = { bits = 12.5, full_scale = '2V' }", "review-bad-value", "12.5", "1 to 32"),
        ("budget = { bits = 12 }", "review-missing-key", "{", "`full_scale`"),
    ];
    for (keys, code, marked, words) in cases {
        let got = fault(keys);
        assert_eq!((got.0, got.1.as_str()), (code, marked), "{keys}: {}", got.2);
        assert!(got.2.contains(words), "{keys}: {}", got.2);
    }
}

#[test]
fn faults_of_paths_and_pairs_are_told_at_their_places() {
    let net = "[[net]]\nname = 'TIDE_SCK'\n";
    let path = |keys: &str| format!("{net}[[path]]\nname = 'A'\ndriver = 'U1.2'\n{keys}\n");
    let pair = |keys: &str| format!("{net}[[pair]]\nname = 'B'\npositive = 'B_P'\n{keys}\n");
    let cases = [
        (path(""), "review-missing-key", "[", "`receiver`"),
        (path("receiver = 'U1.2'"), "review-bad-value", "[", "another pin"),
        (path("receiver = 'U12'"), "review-bad-value", "'U12'", "a pin such as"),
        (path("receiver = 'U2.1'\nthrough = ['R1.2']"), "review-bad-value", "'R1.2'", "its two pins"),
        (
            path("receiver = 'U2.1'\nthrough = [['Q1.5', 'Q2.2']]"),
            "review-bad-value",
            "['Q1.5', 'Q2.2']",
            "one part",
        ),
        (path("receiver = 'U2.1'\nthrough = 'R1'"), "review-wrong-type", "'R1'", "a list of parts"),
        (
            path("receivers = [{ pin = 'U2.1', share = 0.5 }, { pin = 'U3.1', share = 0.6 }]"),
            "review-bad-value",
            "[{ pin = 'U2.1', share = 0.5 }, { pin = 'U3.1', share = 0.6 }]",
            "sum to 1",
        ),
        (path("receivers = [{ pin = 'U2.1' }]"), "review-missing-key", "{", "`share`"),
        (path("receiver = 'U2.1'\nthru = []"), "review-unknown-key", "thru", "`through`"),
        (pair("negative = 'B_P'"), "review-bad-value", "'B_P'", "two different"),
        (pair(""), "review-missing-key", "[", "`negative`"),
        (pair("negative = 'B_N'\nimbalance = 10"), "review-bad-value", "10", "0.1"),
        (
            format!("{net}[[pair]]\nname = 'TIDE_SCK'\npositive = 'B_P'\nnegative = 'B_N'\n"),
            "review-duplicate",
            "'TIDE_SCK'",
            "line 4 has a net",
        ),
    ];
    for (entries, code, marked, words) in cases {
        let got = fault_of(&entries);
        assert_eq!((got.0, got.1.as_str()), (code, marked), "{entries}: {}", got.2);
        assert!(got.2.contains(words), "{entries}: {}", got.2);
    }
}
