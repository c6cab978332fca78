//! The command `maskproof`; everything is in the library.

fn main() -> std::process::ExitCode {
    maskproof::cli::main()
}
