//! The command-line interface: arguments, commands, exit codes.
//!
//! Results go to standard output, messages and progress to standard error. The commands use the library as an
//! outsider would; nothing here computes or draws.

mod args;
mod console;
mod draw;
mod exit;
mod explain;
mod look;
mod progress;

pub use console::Console;
pub use exit::Exit;

use args::{Arguments, Command};
use clap::Parser as _;

/// Runs the command of this process and gives its exit code.
pub fn main() -> std::process::ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(usage) => {
            // A reader that went away (`ebbmap --help | head -1`) is no failure, and nobody is left to tell.
            let _ = usage.print();
            return if usage.use_stderr() { Exit::Unusable.into() } else { Exit::Complete.into() };
        }
    };
    let mut console = Console::of_process();
    let exit = match &arguments.command {
        Command::Draw(order) => draw::draw(order, &mut console),
        Command::Check(order) => draw::check(order, &mut console),
        Command::Look { path, json, picture, style } => {
            let pictures = picture.as_deref().map(|out| (out, style.as_str()));
            look::look(path, *json, pictures, &mut console)
        }
        Command::Explain { code } => explain::explain(code.as_deref(), &mut console),
    };
    console.finish(exit).into()
}
