//! The `ebbmap` command: calls the library's command-line interface and returns its exit code.

fn main() -> std::process::ExitCode {
    ebbmap::cli::main()
}
