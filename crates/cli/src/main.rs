//! The `hillpull` program: arguments, progress, messages and exit codes around the engine crates.

mod args;
mod commands;
mod config;
mod exit;
mod interrupt;
mod load;
mod messages;
mod progress;
mod run_effect;
mod summary;

fn main() -> std::process::ExitCode {
    commands::main().into()
}
