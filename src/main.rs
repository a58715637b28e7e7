fn main() -> std::process::ExitCode {
    trued::cli::run()
}
