//! Exit codes of the command: one enum, one mapping to numbers.

/// How a command ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Exit {
    /// Complete and within limits.
    Complete,
    /// Complete, but a finding is above its limit.
    Exceeded,
    /// Unusable input or usage: nothing was written.
    Unusable,
    /// Incomplete: something was skipped or withheld, each named in a message.
    Incomplete,
}

impl Exit {
    /// The number that the shell sees.
    pub fn code(self) -> u8 {
        match self {
            Self::Complete => 0,
            Self::Exceeded => 1,
            Self::Unusable => 2,
            Self::Incomplete => 3,
        }
    }
}

impl From<Exit> for std::process::ExitCode {
    fn from(exit: Exit) -> Self {
        Self::from(exit.code())
    }
}
