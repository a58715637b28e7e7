//! The binary: all of it is in the library, where tests can reach it.

fn main() -> std::process::ExitCode {
    trued::cli::run()
}
