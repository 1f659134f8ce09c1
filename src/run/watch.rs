//! Who is told what a run does while it does it.

use crate::diag::Diagnostic;

/// Gets the messages and the progress of a run, from any thread.
pub trait Watch: Sync {
    /// A message, as soon as it is known.
    fn message(&self, message: &Diagnostic);
    /// The plan stands: so many maps will be solved.
    fn planned(&self, maps: usize);
    /// One more map is solved and written, or withheld.
    fn mapped(&self, net: &str, band: &str);
}

/// Watches nothing.
#[derive(Clone, Copy, Debug, Default)]
pub struct Unwatched;

impl Watch for Unwatched {
    fn message(&self, _: &Diagnostic) {}
    fn planned(&self, _: usize) {}
    fn mapped(&self, _: &str, _: &str) {}
}
