//! What the review asks for, against the board: patterns become nets, names of pins become pins, overrides go in.

use super::course::Line;
use crate::board::{Board, NetId, Origin, PinId};
use crate::diag::code::{plan as code, review as review_code};
use crate::diag::{Diagnostic, nearest};
use crate::review::{NetRequest, Review};
use crate::unit::length_text;

/// Puts the review's title, revision and stackup into the board. Each value that replaces one of the files is a note.
pub fn apply_review(board: &mut Board, review: &Review) -> Vec<Diagnostic> {
    let mut messages = Vec::new();
    for (key, own, value) in
        [("title", &mut board.title, &review.title), ("revision", &mut board.revision, &review.revision)]
    {
        if value.is_empty() || own == value {
            continue;
        }
        if !own.is_empty() {
            let text = format!("{key} `{value}` of the review replaces `{own}` of the files");
            messages.push(Diagnostic::note(review_code::REVIEW_OVERRIDE, text));
        }
        own.clone_from(value);
    }
    let wanted = &review.stackup;
    let stackup = &mut board.stackup;
    let fits = |key: &str, got: usize, want: usize, messages: &mut Vec<Diagnostic>| {
        if got != 0 && got != want {
            let text =
                format!("list `{key}` under `[stackup]` must have {want} entries on this board; got {got}");
            let message = Diagnostic::error(review_code::REVIEW_STACKUP_LENGTH, text)
                .hint("entries run from the top; write `\"\"` to keep the value of the files");
            messages.push(message);
        }
        got == want
    };
    let mut replaced = |what: String, old: String, new: String, origin: Origin| {
        if origin == Origin::File && old != new {
            let text = format!("{what} {new} of the review replaces {old} of the files");
            messages.push(Diagnostic::note(review_code::REVIEW_OVERRIDE, text));
        }
    };
    let mut faults = Vec::new();
    if fits("copper", wanted.copper_m.len(), stackup.foils.len(), &mut faults) {
        for (layer, (foil, value)) in stackup.foils.iter_mut().zip(&wanted.copper_m).enumerate() {
            let Some(value) = *value else { continue };
            let what = format!("copper thickness of L{}", layer + 1);
            replaced(what, length_text(foil.thickness_m), length_text(value), foil.origin);
            (foil.thickness_m, foil.origin) = (value, Origin::Review);
        }
    }
    if fits("dielectric", wanted.dielectric_m.len(), stackup.dielectrics.len(), &mut faults) {
        for (layer, (sheet, value)) in stackup.dielectrics.iter_mut().zip(&wanted.dielectric_m).enumerate() {
            let Some(value) = *value else { continue };
            let what = format!("dielectric between L{} and L{}", layer + 1, layer + 2);
            replaced(what, length_text(sheet.thickness_m), length_text(value), sheet.origin);
            (sheet.thickness_m, sheet.origin) = (value, Origin::Review);
        }
    }
    if fits("permittivity", wanted.permittivity.len(), stackup.dielectrics.len(), &mut faults) {
        for (layer, (sheet, value)) in stackup.dielectrics.iter_mut().zip(&wanted.permittivity).enumerate() {
            let Some(value) = *value else { continue };
            let what = format!("permittivity between L{} and L{}", layer + 1, layer + 2);
            replaced(what, format!("{}", sheet.permittivity), format!("{value}"), sheet.permittivity_origin);
            (sheet.permittivity, sheet.permittivity_origin) = (value, Origin::Review);
        }
    }
    if let Some(celsius) = wanted.temperature_c {
        stackup.temperature_c = celsius;
    }
    messages.extend(faults);
    messages
}

/// Whether `name` fits `pattern`, in which `*` stands for any text.
pub fn matches(pattern: &str, name: &str) -> bool {
    let mut parts = pattern.split('*');
    let first = parts.next().unwrap_or_default();
    let Some(mut rest) = name.strip_prefix(first) else { return false };
    let mut parts: Vec<&str> = parts.collect();
    let Some(last) = parts.pop() else { return rest.is_empty() };
    for part in parts {
        match rest.find(part) {
            Some(at) => rest = &rest[at + part.len()..],
            None => return false,
        }
    }
    rest.len() >= last.len() && rest.ends_with(last)
}

/// A message at a key of a net request.
pub fn at_key(review: &Review, request: &NetRequest, key: &str, mut message: Diagnostic) -> Diagnostic {
    message.place.file = Some(review.file.clone());
    let mark = request.marks.get(key).or_else(|| request.marks.get("name"));
    message.place.line = Some(mark.as_ref().map_or(request.line, |mark| mark.0));
    message.place.span = mark.map(|mark| mark.1);
    message
}

/// The nets to chart with the request of each, in the order of the review. Names beat patterns; of two patterns the
/// first counts. Patterns leave out reference nets.
pub fn expand<'r>(
    board: &Board,
    review: &'r Review,
    messages: &mut Vec<Diagnostic>,
) -> Vec<(NetId, &'r NetRequest)> {
    let is_reference = |name: &str| review.reference_nets.iter().any(|reference| reference == name);
    let named: Vec<&str> = review.nets.iter().map(|net| net.name.as_str()).collect();
    let names = || board.nets.iter().map(|net| net.name.as_str());
    let mut found: Vec<(NetId, &NetRequest)> = Vec::new();
    for request in &review.nets {
        let mut fault = |code, text: String, hint: Option<String>| {
            let message = at_key(review, request, "name", Diagnostic::error(code, text));
            messages.push(match hint {
                Some(hint) => message.hint(hint),
                None => message,
            });
        };
        if let Some(net) = board.net(&request.name) {
            if is_reference(&request.name) {
                let text = format!("net `{}` must not be charted: it is a reference net", request.name);
                fault(code::NET_IS_REFERENCE, text, None);
            } else {
                found.push((net, request));
            }
            continue;
        }
        if !request.name.contains('*') {
            let text = format!("net `{}` must be a net of the board; it is not", request.name);
            let hint = nearest(&request.name, names()).map(|near| format!("did you mean `{near}`?"));
            fault(
                code::NET_UNKNOWN,
                text,
                hint.or_else(|| Some("`ebbmap look BOARD` lists the nets".into())),
            );
            continue;
        }
        let before = found.len();
        for (index, net) in board.nets.iter().enumerate() {
            let id = NetId(index as u32);
            let free = !named.contains(&net.name.as_str()) && !found.iter().any(|known| known.0 == id);
            if free && !is_reference(&net.name) && matches(&request.name, &net.name) {
                found.push((id, request));
            }
        }
        if found.len() == before {
            let text = format!("pattern `{}` must match a net of the board; it matches none", request.name);
            fault(code::NET_UNKNOWN, text, Some("`ebbmap look BOARD` lists the nets".into()));
        }
    }
    found
}

/// The line of a net from its driver to its receiver: those of the request, or its only two pins.
pub fn ends(board: &Board, review: &Review, net: NetId, request: &NetRequest) -> Result<Line, Diagnostic> {
    let name = board.net_name(net);
    let pins: Vec<PinId> = (0..board.pins.len())
        .filter(|&index| board.pins[index].net == Some(net))
        .map(|index| PinId(index as u32))
        .collect();
    let label = |pin: PinId| board.pins[pin.0 as usize].label();
    let available = || {
        const LISTED: usize = 24;
        let list: Vec<String> = pins.iter().take(LISTED).map(|&pin| format!("`{}`", label(pin))).collect();
        let more =
            if pins.len() > LISTED { format!(" and {} more", pins.len() - LISTED) } else { String::new() };
        format!("pins of the net are {}{more}", list.join(", "))
    };
    if pins.len() < 2 {
        let text = format!("net `{name}` must have two pins at least to be charted; it has {}", pins.len());
        return Err(at_key(review, request, "name", Diagnostic::error(code::NET_FEW_PINS, text)));
    }
    let wanted = |key: &str, value: &Option<String>| -> Result<Option<PinId>, Diagnostic> {
        let Some(value) = value else { return Ok(None) };
        if let Some(&pin) = pins.iter().find(|&&pin| label(pin) == *value) {
            return Ok(Some(pin));
        }
        let other = board.pins.iter().find(|pin| pin.label() == *value);
        let what = match other.and_then(|pin| pin.net) {
            Some(other) => format!("it is on net `{}`", board.net_name(other)),
            None if other.is_some() => "it is on no net".into(),
            None => "the board has no such pin".into(),
        };
        let text = format!("{key} `{value}` must be a pin of net `{name}`; {what}");
        Err(at_key(review, request, key, Diagnostic::error(code::PIN_UNKNOWN, text)).hint(available()))
    };
    let driver = wanted("driver", &request.driver)?;
    let receiver = wanted("receiver", &request.receiver)?;
    let other = |known: PinId| (pins.len() == 2).then(|| if pins[0] == known { pins[1] } else { pins[0] });
    let (driver, receiver) = match (driver, receiver) {
        (Some(driver), None) => (Some(driver), other(driver)),
        (None, Some(receiver)) => (other(receiver), Some(receiver)),
        (None, None) if pins.len() == 2 => (Some(pins[0]), Some(pins[1])),
        both => both,
    };
    match (driver, receiver) {
        (Some(driver), Some(receiver)) => {
            Ok(Line { driver, through: Vec::new(), receivers: vec![(receiver, 1.0)], current: 1.0 })
        }
        (driver, _) => {
            let missing = if driver.is_none() && receiver.is_none() {
                "`driver` and `receiver`"
            } else if driver.is_none() {
                "`driver`"
            } else {
                "`receiver`"
            };
            let text = format!("net `{name}` has {} pins, so its entry must name {missing}", pins.len());
            Err(at_key(review, request, "name", Diagnostic::error(code::PINS_NEEDED, text)).hint(available()))
        }
    }
}

#[cfg(test)]
mod tests {
    use super::matches;

    #[test]
    fn stars_stand_for_any_text() {
        assert!(matches("ADC_*", "ADC_SCK") && matches("ADC_*", "ADC_") && matches("*", ""));
        assert!(matches("*_N", "USB_N") && matches("a*b*c", "aXbYbZc") && matches("a*b*b", "abb"));
        assert!(!matches("ADC_*", "XADC_") && !matches("a*b*b", "ab") && !matches("ab", "abc"));
        assert!(!matches("ab*ba", "aba"));
    }
}
