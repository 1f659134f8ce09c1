//! Finds out which file of a set is what: by the files' own attributes first, the job file second, never by name alone.

use super::drill::is_drill;
use super::gerber::excerpt;
use super::job::{Job, read_job};
use super::log::Log;
use super::source::Source;
use crate::diag::code::read as code;
use crate::diag::{Diagnostic, Place};
use std::collections::BTreeMap;

/// The files of a set that matter.
#[derive(Debug, Default)]
pub struct Selection {
    /// Copper layers: index from 0 and file, sorted.
    pub copper: Vec<(usize, Source)>,
    /// The board's profile.
    pub profile: Option<Source>,
    /// Drill files, and whether they are Gerber files.
    pub drills: Vec<(Source, bool)>,
    /// Component layers, read for part values.
    pub components: Vec<Source>,
    /// The job file.
    pub job: Option<(Job, String)>,
}

/// Value of a file attribute, found without reading the file as a whole: name, fields.
pub fn file_attribute<'a>(text: &'a str, name: &str) -> Option<Vec<&'a str>> {
    let mut rest = text;
    while let Some(at) = rest.find("TF.") {
        let tail = &rest[at + 3..];
        if let Some(value) = tail.strip_prefix(name).filter(|value| value.starts_with([',', '*', '\n', '\r']))
        {
            let end = value.find(['*', '\n', '\r', '%']).unwrap_or(value.len());
            return Some(value[..end].split(',').skip(1).map(str::trim).collect());
        }
        rest = tail;
    }
    None
}

/// Seconds since 1970 of a date like `2025-09-21T22:43:26-04:00`, for comparing only; local time where it names no zone.
pub fn date_seconds(text: &str) -> Option<i64> {
    let number = |range: std::ops::Range<usize>| text.get(range)?.parse::<i64>().ok();
    let (year, month, day) = (number(0..4)?, number(5..7)?, number(8..10)?);
    let (hour, minute, second) = (number(11..13)?, number(14..16)?, number(17..19)?);
    let zone = match text.get(19..).and_then(|zone| Some((zone.chars().next()?, zone))) {
        Some((sign @ ('+' | '-'), zone)) => {
            let minutes = zone.get(1..3)?.parse::<i64>().ok()? * 60
                + zone.get(4..6).map_or(Some(0), |m| m.parse().ok())?;
            if sign == '+' { minutes } else { -minutes }
        }
        _ => 0,
    };
    // Days from civil date, the usual formula for the Gregorian calendar with the year starting in March.
    let (y, m) = if month > 2 { (year, month - 3) } else { (year - 1, month + 9) };
    let days =
        365 * y + y.div_euclid(4) - y.div_euclid(100) + y.div_euclid(400) + (153 * m + 2) / 5 + day - 719_469;
    Some(((days * 24 + hour) * 60 + minute - zone) * 60 + second)
}

/// What a file is, as far as it matters here.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Role {
    Copper(usize),
    Profile,
    Drill(String),
    Component(String),
}

fn role_of(function: &[&str]) -> Option<Role> {
    match function.first().copied()? {
        "Copper" => {
            let number = function.get(1)?.strip_prefix('L')?.parse::<usize>().ok()?;
            (1..=200).contains(&number).then(|| Role::Copper(number - 1))
        }
        "Profile" => Some(Role::Profile),
        "Plated" | "NonPlated" | "MixedPlating" => Some(Role::Drill(function.join(","))),
        "Component" => Some(Role::Component(function.join(","))),
        _ => None,
    }
}

fn about(file: &str, message: Diagnostic) -> Diagnostic {
    Diagnostic { place: Place { file: Some(file.to_owned()), ..message.place.clone() }, ..message }
}

/// Sorts the files of a set.
pub fn select(sources: Vec<Source>, messages: &mut Vec<Diagnostic>) -> Selection {
    let mut selection = Selection::default();
    let (jobs, rest): (Vec<_>, Vec<_>) = sources.into_iter().partition(|source| is_job(&source.text));
    for source in jobs {
        let mut log = Log::new(source.name.clone());
        if let Some(job) = read_job(&source.text, &mut log) {
            match &selection.job {
                None => selection.job = Some((job, source.name.clone())),
                Some((_, first)) => {
                    let text = format!("a second job file is left out; `{first}` is used");
                    log.warning(0, code::SET_DUPLICATE, text);
                }
            }
        }
        messages.extend(log.finish());
    }
    let mut groups: BTreeMap<Role, Vec<(Source, bool)>> = BTreeMap::new();
    for source in rest {
        let is_gerber = source.text.contains("%FS") || source.text.contains("%MO");
        if !is_gerber && !is_drill(&source.text) {
            continue;
        }
        let own = file_attribute(&source.text, "FileFunction");
        let listed = selection.job.as_ref().and_then(|(job, _)| job_function(job, &source.name));
        if let (Some(own), Some(listed)) = (&own, &listed) {
            report_contradiction(&source.name, own, listed, messages);
        }
        let stated: Option<Vec<&str>> = match (&own, &listed) {
            (Some(own), _) => Some(own.clone()),
            (None, Some(listed)) => {
                let text =
                    format!("the file does not say what it is; the job file says `{listed}`, which is used");
                messages.push(about(&source.name, Diagnostic::warning(code::SET_FUNCTION, text)));
                Some(listed.split(',').collect())
            }
            (None, None) => None,
        };
        let role = match stated {
            Some(function) => {
                let role = role_of(&function);
                if role.is_none() && function.first() == Some(&"Copper") {
                    let text = format!(
                        "file function `{}` must read like `Copper,L1,Top`",
                        excerpt(&function.join(","))
                    );
                    messages.push(about(&source.name, Diagnostic::error(code::SET_FUNCTION, text)));
                }
                role
            }
            None if !is_gerber => Some(Role::Drill(format!("?{}", source.name))),
            None => {
                let text = "a Gerber file without a FileFunction attribute is not used";
                let hint = "export with X2 attributes, or list the file in the job file";
                messages.push(about(&source.name, Diagnostic::warning(code::SET_FUNCTION, text).hint(hint)));
                None
            }
        };
        if let Some(role) = role {
            groups.entry(role).or_default().push((source, is_gerber));
        }
    }
    for (role, files) in groups {
        let (source, is_gerber) = newest(&role, files, messages);
        match role {
            Role::Copper(index) => selection.copper.push((index, source)),
            Role::Profile => selection.profile = Some(source),
            Role::Drill(_) => selection.drills.push((source, is_gerber)),
            Role::Component(_) => selection.components.push(source),
        }
    }
    check_copper(&selection, messages);
    selection
}

fn is_job(text: &str) -> bool {
    let start = text.trim_start_matches(|c: char| c.is_whitespace() || c == '\u{feff}');
    start.starts_with('{') && (text.contains("\"FilesAttributes\"") || text.contains("\"GeneralSpecs\""))
}

/// What the job file says of a file; names are compared without their folder, and without case when nothing fits.
fn job_function(job: &Job, name: &str) -> Option<String> {
    let base = |path: &str| path.rsplit(['/', '\\']).next().unwrap_or_default().to_owned();
    let wanted = base(name);
    let exact = job.files.iter().find(|(path, _)| base(path) == wanted);
    let found = exact.or_else(|| job.files.iter().find(|(path, _)| base(path).eq_ignore_ascii_case(&wanted)));
    found.map(|(_, function)| function.clone()).filter(|function| !function.is_empty())
}

/// The file's own attribute wins; that the job file says otherwise for a file that matters is told.
fn report_contradiction(name: &str, own: &[&str], listed: &str, messages: &mut Vec<Diagnostic>) {
    let listed_fields: Vec<&str> = listed.split(',').collect();
    let (own_role, listed_role) = (role_of(own), role_of(&listed_fields));
    if own_role != listed_role && (own_role.is_some() || listed_role.is_some()) {
        let text = format!(
            "the file says it is `{}`, the job file says `{}`; the file's own word is taken",
            excerpt(&own.join(",")),
            excerpt(listed)
        );
        messages.push(about(name, Diagnostic::warning(code::JOB_CONTRADICTS, text)));
    }
}

/// Of several files that say they are the same the one with the newest creation date.
fn newest(role: &Role, mut files: Vec<(Source, bool)>, messages: &mut Vec<Diagnostic>) -> (Source, bool) {
    let date = |source: &Source| {
        let fields = file_attribute(&source.text, "CreationDate")?;
        date_seconds(fields.first()?)
    };
    let mut best = 0;
    for index in 1..files.len() {
        if date(&files[index].0) > date(&files[best].0) {
            best = index;
        }
    }
    let chosen = files.swap_remove(best);
    files.sort_by(|a, b| a.0.name.cmp(&b.0.name));
    for (other, _) in &files {
        let what = match role {
            Role::Copper(index) => format!("copper layer L{}", index + 1),
            Role::Profile => "the profile".to_owned(),
            Role::Drill(function) | Role::Component(function) => format!("`{function}`"),
        };
        let reason = match (date(&chosen.0), date(other)) {
            (Some(a), Some(b)) if a > b => "which is newer",
            (Some(_), None) => "which is dated",
            _ => "the first by name, as dates do not decide",
        };
        let text = format!("two files say that they are {what}; `{}` is used, {reason}", chosen.0.name);
        let message =
            Diagnostic::warning(code::SET_DUPLICATE, text).hint("remove the stale file from the set");
        messages.push(about(&other.name, message));
    }
    chosen
}

/// Copper layers must be numbered from 1 without gaps.
fn check_copper(selection: &Selection, messages: &mut Vec<Diagnostic>) {
    let n_layers = selection.copper.last().map_or(0, |(index, _)| index + 1);
    if n_layers == 0 {
        let text = "the set must have copper layers that say so (`TF.FileFunction,Copper,L1,Top`); got none";
        let hint = "export Gerber X2: a set without these attributes does not tell layers and nets";
        messages.push(Diagnostic::error(code::SET_COPPER, text).hint(hint));
    }
    for index in 0..n_layers {
        if !selection.copper.iter().any(|(layer, _)| *layer == index) {
            let text = format!("copper layer L{} of {n_layers} is missing from the set", index + 1);
            messages.push(Diagnostic::error(code::SET_COPPER, text));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dates_with_zones_compare_by_instant() {
        let a = date_seconds("2026-03-01T00:30:00+02:00").unwrap();
        let b = date_seconds("2026-02-28T22:30:00Z").unwrap();
        assert_eq!(a, b);
        assert_eq!(date_seconds("1970-01-01T00:00:00Z"), Some(0));
        assert_eq!(date_seconds("2000-02-29T12:00:00-04:00"), Some(951_840_000));
        assert_eq!(date_seconds("yesterday"), None);
    }

    #[test]
    fn file_attributes_are_found_in_both_forms() {
        let text = "G04 #@! TF.FileFunctionX,a*\nG04 #@! TF.FileFunction,Copper,L2,Inr*";
        assert_eq!(file_attribute(text, "FileFunction"), Some(vec!["Copper", "L2", "Inr"]));
        assert_eq!(
            file_attribute("%TF.FileFunction,Profile,NP*%", "FileFunction"),
            Some(vec!["Profile", "NP"])
        );
        assert_eq!(file_attribute("; #@! TF.FileFunction,Plated,1,4\nM48", "FileFunction").unwrap().len(), 3);
        assert_eq!(file_attribute("", "FileFunction"), None);
    }
}
