//! The `chargeskin` command: words in, exit code out.

fn main() -> std::process::ExitCode {
    chargeskin::cli::main()
}
