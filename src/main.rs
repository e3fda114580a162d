//! The command; everything it does is in the library.

fn main() -> std::process::ExitCode {
    dutybank::cli::run()
}
