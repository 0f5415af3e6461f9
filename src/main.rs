//! The command line program; all of it is in the library.

fn main() -> std::process::ExitCode {
    stillgate::cli::main()
}
