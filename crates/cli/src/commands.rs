//! From the command line to the exit code: parses, runs the command, reports what stopped it.

use crate::args::{Cli, Command};
use crate::exit::{Exit, Stop};
use crate::messages::Messages;
use crate::run_effect;
use clap::{CommandFactory, Parser};
use std::io::Write;
use std::panic::{AssertUnwindSafe, catch_unwind};

/// Runs the program.
pub(crate) fn main() -> Exit {
    let cli = match Cli::try_parse() {
        Ok(cli) => cli,
        Err(error) => {
            // Help and version come this way too, with stdout and code 0. A closed pipe is no reason to fail.
            let _ = error.print();
            return if error.use_stderr() {
                Exit::BadInput
            } else {
                Exit::Done
            };
        }
    };
    let quiet = matches!(&cli.command, Command::Effect(args) if args.quiet);
    let messages = Messages::new(quiet);
    let command = || match cli.command {
        Command::Effect(args) => run_effect::run(&args, messages),
        Command::Completions { shell } => completions(shell),
        Command::Manual { command } => manual(command.as_deref()),
    };
    // A fault of the program says where it happened by itself (the panic's own message) and ends with a documented code.
    let ended = catch_unwind(AssertUnwindSafe(command)).unwrap_or_else(|_| {
        Err(
            Stop::failure(anyhow::anyhow!("a fault of the program, see above"))
                .hint("please report it with the message above and the command that led to it"),
        )
    });
    match ended {
        Ok(exit) => exit,
        // Whoever read our output has had enough.
        Err(stop) if stop.is_broken_pipe() => Exit::Done,
        Err(stop) => {
            messages.stop(&stop);
            stop.exit
        }
    }
}

fn completions(shell: clap_complete::Shell) -> Result<Exit, Stop> {
    let mut script = Vec::new();
    clap_complete::generate(shell, &mut Cli::command(), "hillpull", &mut script);
    print(&script)
}

fn manual(name: Option<&str>) -> Result<Exit, Stop> {
    let mut program = Cli::command();
    program.build();
    let command = match name {
        None => program,
        Some(name) => program
            .find_subcommand(name)
            .cloned()
            .map(|c| {
                c.display_name(format!("hillpull-{name}"))
                    .disable_help_flag(true)
            })
            .ok_or_else(|| {
                let names: Vec<&str> = program
                    .get_subcommands()
                    .map(clap::Command::get_name)
                    .collect();
                Stop::bad(format!("there is no command `{name}`"))
                    .hint(format!("the commands are: {}", names.join(", ")))
            })?,
    };
    let mut page = Vec::new();
    clap_mangen::Man::new(command)
        .render(&mut page)
        .map_err(Stop::failure)?;
    print(&page)
}

fn print(bytes: &[u8]) -> Result<Exit, Stop> {
    let mut out = std::io::stdout().lock();
    out.write_all(bytes)
        .and_then(|()| out.flush())
        .map_err(Stop::failure)?;
    Ok(Exit::Done)
}
