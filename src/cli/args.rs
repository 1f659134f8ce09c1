//! What was typed, as typed: quantities stay text until the command resolves them.

use clap::{Args, Parser, Subcommand};
use std::path::PathBuf;

/// Shows where the return current of a net flows on the reference planes of a circuit board.
#[derive(Debug, Parser)]
#[command(name = "ebbmap", version, about, max_term_width = 100, after_help = EXIT_CODES)]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// Shown below every help text.
const EXIT_CODES: &str = "Exit codes: 0 complete (and within limits); 1 complete, limits exceeded (`check`, and `draw --limits`); 2 unusable input or usage, nothing written; \
3 incomplete, something was skipped or withheld and each is named.";

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Draw the maps of a review: one picture for each net, plane and band, a contact sheet and the findings
    #[command(after_help = EXIT_CODES)]
    Draw(DrawArguments),
    /// Judge a review: findings with their cause, place, figure and limit, and remedies that were computed; no pictures
    #[command(after_help = EXIT_CODES)]
    Check(CheckArguments),
    /// Print what was understood of a board, or of a review: tracks, planes, landings, cells, before minutes of work
    #[command(after_help = EXIT_CODES)]
    Look {
        /// Folder or ZIP with fabrication data, or a review (.toml)
        path: PathBuf,
        /// Print JSON instead of text
        #[arg(long)]
        json: bool,
        /// Also draw each copper layer as understood (SVG and PNG) into this folder; made if it does not exist
        #[arg(long, value_name = "DIR")]
        picture: Option<PathBuf>,
        /// Style of the pictures by name, or a style file
        #[arg(long, value_name = "NAME|FILE", default_value = "paper", requires = "picture")]
        style: String,
    },
    /// Explain a message code, for example `net-unknown`; without a code, list all
    Explain {
        /// The code that stands in brackets in a message
        code: Option<String>,
    },
}

/// Arguments of `check`.
#[derive(Args, Debug)]
pub struct CheckArguments {
    /// The review file (TOML)
    #[arg(required_unless_present = "schema")]
    pub review: Option<PathBuf>,
    /// Folder for findings.json, findings.csv, review.md and findings.gbr; without it they are only printed
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// Judge only this path of the review (may be repeated; `*` matches any text)
    #[arg(long, value_name = "PATH")]
    pub only: Vec<String>,
    /// Side of a cell with its unit, for example 0.1mm; beats `[solver] cell`
    #[arg(long, value_name = "LENGTH")]
    pub cell: Option<String>,
    /// Threads; the outputs do not depend on it
    #[arg(long, value_name = "N", default_value_t = 0, hide_default_value = true)]
    pub jobs: usize,
    /// Print the JSON Schema of findings.json and do nothing else
    #[arg(long)]
    pub schema: bool,
}

/// Arguments of `draw`.
#[derive(Args, Debug)]
pub struct DrawArguments {
    /// The review file (TOML)
    pub review: PathBuf,
    /// Folder for the maps; made if it does not exist
    #[arg(long, value_name = "DIR")]
    pub out: PathBuf,
    /// Draw only this net of the review (may be repeated; `*` matches any text). Scale and numbering stay those of
    /// all nets
    #[arg(long, value_name = "NET")]
    pub only: Vec<String>,
    /// Side of a cell with its unit, for example 0.1mm; beats `[solver] cell`
    #[arg(long, value_name = "LENGTH")]
    pub cell: Option<String>,
    /// Also write the densities as arrays for NumPy, in DIR/numbers
    #[arg(long)]
    pub numbers: bool,
    /// Exit with 1 where a finding is above its limit
    #[arg(long)]
    pub limits: bool,
    /// Threads; the outputs do not depend on it
    #[arg(long, value_name = "N", default_value_t = 0, hide_default_value = true)]
    pub jobs: usize,
    /// Ends of the color scale, the same on all sheets: `0..-60dB` (0 dB is the density under a straight track),
    /// `1..1000A/m`, or `0..500A/m` for a linear scale
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub scale: Option<String>,
    /// Style by name (`paper` is light, `screen` dark, `mono` for black-and-white printers, `large` has larger type),
    /// or a style file
    #[arg(long, value_name = "NAME|FILE", default_value = "paper")]
    pub style: String,
}
