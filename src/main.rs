//! Starts the program and sets its exit status; nothing else.

fn main() -> std::process::ExitCode {
    shottower::cli::main()
}
