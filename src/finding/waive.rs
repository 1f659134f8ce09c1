//! Waivers: findings that the user bears until a revision of the board.

use super::{Finding, Waived};
use crate::diag::Diagnostic;
use crate::diag::code::finding as code;
use crate::plan::matches;
use crate::review::Review;
use std::cmp::Ordering;

/// Marks the findings that the review waives. Gives warnings for waivers that are over or fit nothing.
pub fn waive(findings: &mut [Finding], review: &Review, revision: &str) -> Vec<Diagnostic> {
    let mut messages = Vec::new();
    for waiver in &review.waivers {
        let fits =
            |finding: &Finding| finding.code.name == waiver.code && matches(&waiver.path, &finding.path);
        let place = |message: Diagnostic| {
            let mut message = message.in_file(review.file.clone(), waiver.line);
            message.place.span = waiver.marks.get("expires").map(|mark| mark.1);
            message
        };
        if !findings.iter().any(fits) {
            let text =
                format!("waiver of `{}` on `{}` must fit a finding; none is left", waiver.code, waiver.path);
            messages.push(place(Diagnostic::warning(code::WAIVER_UNUSED, text)).hint("remove the waiver"));
            continue;
        }
        match compare(revision, &waiver.expires) {
            Some(Ordering::Less) => {
                let waived = Waived { reason: waiver.reason.clone(), expires: waiver.expires.clone() };
                let fitting = findings.iter_mut().filter(|finding| fits(finding));
                fitting.for_each(|finding| finding.waived = Some(waived.clone()));
            }
            order => {
                let how = if order.is_some() { "has been reached" } else { "cannot be compared with it" };
                let text = format!(
                    "waiver of `{}` on `{}` must end after revision `{revision}` of the board; its end `{}` {how}",
                    waiver.code, waiver.path, waiver.expires
                );
                messages.push(
                    place(Diagnostic::warning(code::WAIVER_EXPIRED, text))
                        .hint("mend the finding, or decide anew and set a later `expires`"),
                );
            }
        }
    }
    messages
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
