//! Which nets of a plan are drawn: all, or those that `--only` names.

use crate::diag::code::run as code;
use crate::diag::{Diagnostic, nearest};
use crate::plan::{Plan, matches};

/// For each net of the plan, whether it is drawn. A name or pattern that matches no net is an error with a near name.
pub fn chosen(plan: &Plan, only: &[String]) -> Result<Vec<bool>, Vec<Diagnostic>> {
    if only.is_empty() {
        return Ok(vec![true; plan.paths.len()]);
    }
    let names: Vec<&str> = plan.paths.iter().map(|net| net.name.as_str()).collect();
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
    match nearest(pattern, names.iter().copied()) {
        Some(name) => message.hint(format!("did you mean `{name}`?")),
        None => message.hint(format!("the review charts {}", list(names))),
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
