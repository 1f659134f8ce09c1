//! Parts and ties of a review: what they mean, and that faults are told at their places.

use ebbmap::geom::Point;
use ebbmap::read::{ReviewFile, parse_review};
use ebbmap::review::joint::{Branch, TieEnd};
use std::path::Path;

fn parse(entries: &str) -> ReviewFile {
    let head = "schema = 1\nboard.files = 'fab'\nboard.origin = ['10mm', '0mm']\nreference.nets = ['GND', 'AGND']\n\
                net = [{ name = 'TIDE_SCK' }]\n";
    parse_review(&format!("{head}{entries}"), "review.toml", Path::new("."))
}

#[test]
fn parts_and_ties_arrive_in_si_units() {
    let file = parse(
        "[[part]]\nreference = 'C14'\ncapacitance = '100nF'\nresistance = '15mohm'\ninductance = '0.4nH'\n\
         [[part]]\nnets = ['GND', 'V3']\nvalue = '10k'\nfitted = false\n\
         [[part]]\nreference = 'U*'\njoins = ['GND', 'AGND']\n\
         [[tie]]\nname = 'shield'\nfrom = 'J1.3'\nto = { outside = 'cable shield' }\nresistance = '2mohm'\n\
         [[tie]]\nfrom = ['3mm', '4mm']\nto = { net = 'AGND', at = ['5mm', '6mm'] }\ncapacitance = '1nF'\n\
         [stackup]\nplating = '25um'\n",
    );
    assert_eq!(file.messages, []);
    let review = file.review.unwrap();
    assert_eq!(review.stackup.plating_m, Some(25e-6));
    let [c, r, u] = &review.parts[..] else { panic!("three parts: {:?}", review.parts) };
    let branch =
        Branch { resistance_ohm: Some(15e-3), inductance_h: Some(0.4e-9), capacitance_f: Some(100e-9) };
    assert_eq!((c.reference.as_deref(), c.branch, c.fitted, c.line), (Some("C14"), branch, true, 6));
    assert_eq!((r.nets.len(), r.value.as_deref(), r.fitted), (2, Some("10k"), false));
    assert_eq!(u.joins, ["GND", "AGND"]);
    let [shield, strap] = &review.ties[..] else { panic!("two ties: {:?}", review.ties) };
    assert_eq!((shield.name.as_str(), &shield.from), ("shield", &TieEnd::Pin("J1.3".into())));
    assert_eq!(shield.to, TieEnd::Outside("cable shield".into()));
    assert_eq!(strap.name, "tie in line 23");
    let TieEnd::At(at) = strap.from else { panic!("a point: {strap:?}") };
    assert!(at.distance(Point::mm(13.0, 4.0)) < 1e-12, "{at:?}");
    let TieEnd::Net { net, at: Some(at) } = &strap.to else { panic!("a net: {strap:?}") };
    assert!(net == "AGND" && at.distance(Point::mm(15.0, 6.0)) < 1e-12, "{at:?}");
}

#[test]
fn faults_of_parts_and_ties_are_told_at_their_places() {
    // entries, code, marked text, words that the message or its hints must hold
    let cases = [
        ("[[part]]\nresistance = '1ohm'\n", "review-missing-key", "[", "`reference = \"C14\"`"),
        ("[[part]]\nreference = 'C1'\ncapacitance = '100'\n", "review-bad-value", "'100'", "nF"),
        ("[[part]]\nreference = 'C1'\ncapacitance = '0nF'\n", "review-bad-value", "'0nF'", "above zero"),
        ("[[part]]\nreference = 'C1'\nresistance = '-1ohm'\n", "review-bad-value", "'-1ohm'", "below zero"),
        (
            "[[part]]\nreference = 'C1'\ncapacitence = '1nF'\n",
            "review-unknown-key",
            "capacitence",
            "`capacitance`?",
        ),
        ("[[part]]\nreference = 'U1'\njoins = ['GND']\n", "review-bad-value", "['GND']", "two at least"),
        ("[[part]]\nreference = 'U1'\nfitted = 'no'\n", "review-wrong-type", "'no'", "`true` or `false`"),
        ("[[part]]\nreference = 'C1'\n[[part]]\nreference = 'C1'\n", "review-duplicate", "'C1'", "line 6"),
        ("[[tie]]\nfrom = 'J1.3'\n", "review-missing-key", "[", "`to`"),
        ("[[tie]]\nfrom = 'J1.3'\nto = 'chassis'\n", "review-bad-value", "'chassis'", "a pin such as"),
        ("[[tie]]\nfrom = 'J1.3'\nto = 3\n", "review-wrong-type", "3", "{ outside = \"chassis\" }"),
        ("[[tie]]\nfrom = 'J1.3'\nto = 'J1.3'\n", "review-bad-value", "'J1.3'", "two different places"),
        (
            "[[tie]]\nfrom = 'J1.3'\nto = { outside = 'can', at = ['1mm', '1mm'] }\n",
            "review-bad-value",
            "{ outside = 'can', at = ['1mm', '1mm'] }",
            "`outside` alone",
        ),
        (
            "[[tie]]\nfrom = { net = 'GND' }\nto = { net = 'AGND' }\n",
            "review-bad-value",
            "{ net = 'AGND' }",
            "neither end says one",
        ),
    ];
    for (entries, code, marked, words) in cases {
        let file = parse(entries);
        assert!(file.review.is_none(), "must be refused: {entries}");
        let [message] = &file.messages[..] else {
            panic!("one message for {entries}; got {:#?}", file.messages)
        };
        let text = format!("{} / {}", message.text, message.hints.join(" / "));
        let got = &file.text[message.place.span.clone().unwrap()];
        assert_eq!((message.code.name, got), (code, marked), "{entries}: {text}");
        assert!(text.contains(words), "{entries}: {text}");
    }
}
