//! The one name space of message and finding codes, one file for each room that raises them.

pub mod field;
pub mod finding;
pub mod plan;
pub mod read;
pub mod review;
pub mod run;
pub mod solve;
pub mod style;

/// A stable code with the paragraph that `ebbmap explain` prints.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Code {
    /// Name in lower case with hyphens, for example `net-unknown`.
    pub name: &'static str,
    /// What it means, what the tool did, what the user can do.
    pub meaning: &'static str,
}

/// All codes, sorted by room.
pub fn all() -> impl Iterator<Item = Code> {
    [read::ALL, review::ALL, plan::ALL, solve::ALL, field::ALL, style::ALL, finding::ALL, run::ALL]
        .into_iter()
        .flatten()
        .copied()
}
