//! Who is told what a run does while it does it.

use crate::diag::Diagnostic;

/// Gets the messages and the progress of a run, from any thread.
pub trait Watch: Sync {
    /// A message, as soon as it is known. `source` is the text of the file that the message's span counts in, where it
    /// has one.
    fn message(&self, message: &Diagnostic, source: Option<&str>);
    /// The plan stands: so many maps will be solved.
    fn planned(&self, maps: usize);
    /// One more map is solved and written, or withheld.
    fn mapped(&self, net: &str, band: &str);
}

/// Watches nothing.
#[derive(Clone, Copy, Debug, Default)]
pub struct Unwatched;

impl Watch for Unwatched {
    fn message(&self, _: &Diagnostic, _: Option<&str>) {}
    fn planned(&self, _: usize) {}
    fn mapped(&self, _: &str, _: &str) {}
}
