//! Arguments in, exit code out.

fn main() -> std::process::ExitCode {
    kolk::cli::main()
}
