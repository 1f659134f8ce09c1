//! Waivers: findings that the user bears until a revision of the board.

use super::{Finding, Waived};
use crate::diag::Diagnostic;
use crate::diag::code::finding as code;
use crate::plan::matches;
use crate::review::Review;
use crate::review::limit::Waiver;
use std::cmp::Ordering;

/// Marks the findings that the review waives for a revision of the board.
pub fn waive(findings: &mut [Finding], review: &Review, revision: &str) {
    for waiver in review.waivers.iter().filter(|waiver| is_valid(waiver, revision)) {
        let waived = Waived { reason: waiver.reason.clone(), expires: waiver.expires.clone() };
        let fitting = findings.iter_mut().filter(|finding| fits(waiver, finding));
        fitting.for_each(|finding| finding.waived = Some(waived.clone()));
    }
}

/// Warnings for waivers that are over or fit no finding of the review.
pub fn waiver_messages(findings: &[Finding], review: &Review, revision: &str) -> Vec<Diagnostic> {
    let mut messages = Vec::new();
    for waiver in &review.waivers {
        let place = |message: Diagnostic| message.in_file(review.file.clone(), waiver.line);
        if !findings.iter().any(|finding| fits(waiver, finding)) {
            let text =
                format!("waiver of `{}` on `{}` must fit a finding; none is left", waiver.code, waiver.path);
            messages.push(place(Diagnostic::warning(code::WAIVER_UNUSED, text)).hint("remove the waiver"));
        } else if !is_valid(waiver, revision) {
            let how = match compare(revision, &waiver.expires) {
                Some(_) => "has been reached",
                None => "cannot be compared with it",
            };
            let text = format!(
                "waiver of `{}` on `{}` must end after revision `{revision}` of the board; its end `{}` {how}",
                waiver.code, waiver.path, waiver.expires
            );
            let hint = "mend the finding, or decide anew and set a later `expires`";
            messages.push(place(Diagnostic::warning(code::WAIVER_EXPIRED, text)).hint(hint));
        }
    }
    messages
}

fn fits(waiver: &Waiver, finding: &Finding) -> bool {
    finding.code.name == waiver.code && matches(&waiver.path, &finding.path)
}

fn is_valid(waiver: &Waiver, revision: &str) -> bool {
    compare(revision, &waiver.expires) == Some(Ordering::Less)
}

/// Compares revisions: pieces of letters by length and then by the alphabet, pieces of digits by value; none where a
/// letter stands against a digit or a revision is empty.
pub fn compare(a: &str, b: &str) -> Option<Ordering> {
    let (a, b) = (pieces(a), pieces(b));
    if a.is_empty() || b.is_empty() {
        return None;
    }
    for (x, y) in a.iter().zip(&b) {
        let order = match (x.parse::<u64>(), y.parse::<u64>()) {
            (Ok(x), Ok(y)) => x.cmp(&y),
            (Err(_), Err(_)) => x.chars().count().cmp(&y.chars().count()).then_with(|| x.cmp(y)),
            _ => return None,
        };
        if order != Ordering::Equal {
            return Some(order);
        }
    }
    Some(a.len().cmp(&b.len()))
}

/// Runs of letters and of digits, in capitals; what is neither divides them.
fn pieces(revision: &str) -> Vec<String> {
    let mut pieces: Vec<String> = Vec::new();
    let mut kind = None;
    for c in revision.chars() {
        let now = if c.is_numeric() { Some(true) } else { c.is_alphabetic().then_some(false) };
        if now.is_some() {
            if now != kind {
                pieces.push(String::new());
            }
            if let Some(piece) = pieces.last_mut() {
                piece.extend(c.to_uppercase());
            }
        }
        kind = now;
    }
    pieces
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn revisions_have_the_order_of_the_trade() {
        for (a, b) in
            [("A", "B"), ("Z", "AA"), ("9", "10"), ("1.9", "1.10"), ("A1", "A2"), ("a", "B"), ("2", "2b")]
        {
            assert_eq!(compare(a, b), Some(Ordering::Less), "{a} before {b}");
            assert_eq!(compare(b, a), Some(Ordering::Greater), "{b} after {a}");
        }
        assert_eq!(compare("B", "b"), Some(Ordering::Equal));
        assert_eq!(compare("A", "1"), None);
        assert_eq!(compare("", "B"), None);
    }
}
