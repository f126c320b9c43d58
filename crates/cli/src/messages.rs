//! What the program says on stderr: errors, hints, warnings.
//!
//! Shape: `error: what was being done: why it failed`, an empty line, `hint: the next step`. Everything reads the same
//! without colour; colour is used on a terminal only, and not when `NO_COLOR` is set.

use crate::exit::Stop;
use std::fmt::Display;
use std::io::{IsTerminal, Write};

/// Where messages go, and whether warnings are wanted.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Messages {
    quiet: bool,
    colour: bool,
}

impl Messages {
    /// Messages for this process; `quiet` drops everything but errors.
    pub(crate) fn new(quiet: bool) -> Self {
        let no_colour = std::env::var_os("NO_COLOR").is_some_and(|v| !v.is_empty());
        Self {
            quiet,
            colour: !no_colour && std::io::stderr().is_terminal(),
        }
    }

    /// Prints the error that ended the run, with its causes and the next step.
    pub(crate) fn stop(self, stop: &Stop) {
        let word = self.word("error", "31");
        let mut text = format!("{word}: {}", chain(&stop.cause));
        if let Some(hint) = &stop.hint {
            let word = self.word("hint", "36");
            text.push_str(&format!("\n\n{word}: {hint}"));
        }
        say(&text);
    }

    /// Prints a warning, unless the run is quiet.
    pub(crate) fn warning(self, text: impl Display) {
        if !self.quiet {
            say(&format!("{}: {text}", self.word("warning", "33")));
        }
    }

    /// Prints plain text, unless the run is quiet.
    pub(crate) fn note(self, text: impl Display) {
        if !self.quiet {
            say(&text.to_string());
        }
    }

    fn word(self, word: &str, ansi: &str) -> String {
        if self.colour {
            format!("\u{1b}[1;{ansi}m{word}\u{1b}[0m")
        } else {
            word.to_owned()
        }
    }
}

/// The causes from the outermost to the innermost, without those whose text the one before already holds.
fn chain(error: &anyhow::Error) -> String {
    let mut text = String::new();
    let mut last = String::new();
    for cause in error.chain() {
        let part = cause.to_string();
        if text.is_empty() {
            text.clone_from(&part);
        } else if !last.contains(&part) {
            text.push_str(": ");
            text.push_str(&part);
        }
        last = part;
    }
    text
}

/// One line to stderr. A closed stderr is no reason to fail: there is nobody left to tell.
fn say(text: &str) {
    let _ = writeln!(std::io::stderr().lock(), "{text}");
}

#[cfg(test)]
mod tests {
    use super::*;
    use anyhow::Context;

    #[test]
    fn the_chain_does_not_repeat_itself() {
        let inner = std::io::Error::other("disk full");
        let error = Err::<(), _>(inner)
            .context("write `a.csv`: disk full")
            .context("save the results")
            .unwrap_err();
        assert_eq!(chain(&error), "save the results: write `a.csv`: disk full");
    }
}
