//! Which nets of a plan are drawn: all, or those that `--only` names.

use crate::diag::Diagnostic;
use crate::diag::code::run as code;
use crate::plan::Plan;

/// For each net of the plan, whether it is drawn. A name or pattern that matches no net is an error with a near name.
pub fn chosen(plan: &Plan, only: &[String]) -> Result<Vec<bool>, Vec<Diagnostic>> {
    if only.is_empty() {
        return Ok(vec![true; plan.nets.len()]);
    }
    let names: Vec<&str> = plan.nets.iter().map(|net| net.net.as_str()).collect();
    let lost = only.iter().filter(|pattern| !names.iter().any(|name| matches(pattern, name)));
    let errors: Vec<Diagnostic> = lost.map(|pattern| unknown(pattern, &names)).collect();
    if !errors.is_empty() {
        return Err(errors);
    }
    Ok(names.iter().map(|name| only.iter().any(|pattern| matches(pattern, name))).collect())
}

fn unknown(pattern: &str, names: &[&str]) -> Diagnostic {
    let text =
        format!("net `{pattern}` of `--only` must be a net of the review that is charted; none matches");
    let message = Diagnostic::error(code::ONLY_UNKNOWN, text);
    let near = names.iter().map(|name| (distance(pattern, name), *name)).min();
    match near {
        Some((steps, name)) if steps <= pattern.chars().count().div_ceil(3) => {
            message.hint(format!("did you mean `{name}`?"))
        }
        _ => message.hint(format!("the review charts {}", list(names))),
    }
}

fn list(names: &[&str]) -> String {
    let shown: Vec<String> = names.iter().take(8).map(|name| format!("`{name}`")).collect();
    match names.len() {
        0 => "no net".to_owned(),
        n if n > shown.len() => format!("{} and {} more", shown.join(", "), n - shown.len()),
        _ => shown.join(", "),
    }
}

/// Whether `name` is `pattern`, in which `*` stands for any text.
fn matches(pattern: &str, name: &str) -> bool {
    let mut parts = pattern.split('*');
    // `split` gives at least one part.
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
    rest.ends_with(last)
}

/// Number of single-character edits between two names, upper and lower case being equal.
fn distance(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.to_uppercase().chars().collect();
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, from) in a.to_uppercase().chars().enumerate() {
        let mut before = row[0];
        row[0] = i + 1;
        for (j, &to) in b.iter().enumerate() {
            let kept = before + usize::from(from != to);
            before = row[j + 1];
            row[j + 1] = kept.min(before + 1).min(row[j] + 1);
        }
    }
    row[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn patterns() {
        for (pattern, name, want) in [
            ("SCK", "SCK", true),
            ("SCK", "SCK2", false),
            ("ADC_*", "ADC_SCK", true),
            ("*SCK", "ADC_SCK", true),
            ("A*S*K", "ADC_SCK", true),
            ("A*X*K", "ADC_SCK", false),
            ("*", "", true),
            ("AB*BA", "ABA", false),
        ] {
            assert_eq!(matches(pattern, name), want, "{pattern} on {name}");
        }
    }

    #[test]
    fn edits() {
        assert_eq!(distance("kitten", "sitting"), 3);
        assert_eq!(distance("", "abc"), 3);
        assert_eq!(distance("adc_sck", "ADC_SCK"), 0);
    }
}
