//! Hands the arguments to `cli`; computes nothing.

fn main() -> std::process::ExitCode {
    spotrule::cli::run()
}
