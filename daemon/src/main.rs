//! The `restudy` program.

fn main() -> std::process::ExitCode {
    restudy::cli::main()
}
