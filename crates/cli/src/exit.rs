//! Exit codes, and the error that leads to one.

use std::error::Error;
use std::fmt;
use std::process::ExitCode;

/// How a run ended. The numbers are part of the program's contract: `--help` and the README list them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Exit {
    /// Every station has a result.
    Done,
    /// The run was completed and written, but some stations have no result.
    SomeStationsWithout,
    /// Bad input or usage; nothing was written.
    BadInput,
    /// An input or output failure, or a fault of the program; nothing was written.
    Failure,
    /// Interrupted by the user; nothing was written.
    Interrupted,
}

impl Exit {
    /// The number the shell sees.
    pub(crate) const fn code(self) -> u8 {
        match self {
            Self::Done => 0,
            Self::SomeStationsWithout => 1,
            Self::BadInput => 2,
            Self::Failure => 3,
            // 128 + SIGINT, as shells count it.
            Self::Interrupted => 130,
        }
    }
}

impl From<Exit> for ExitCode {
    fn from(exit: Exit) -> Self {
        Self::from(exit.code())
    }
}

/// An error that ends the run: the chain of causes, the next step for the user, and the exit code.
#[derive(Debug)]
pub(crate) struct Stop {
    pub(crate) exit: Exit,
    pub(crate) cause: anyhow::Error,
    pub(crate) hint: Option<String>,
}

impl Stop {
    /// Bad input or usage: the user can mend it.
    pub(crate) fn bad_input(cause: impl Into<anyhow::Error>) -> Self {
        Self {
            exit: Exit::BadInput,
            cause: cause.into(),
            hint: None,
        }
    }

    /// Bad input told in words.
    pub(crate) fn bad(message: impl fmt::Display) -> Self {
        Self::bad_input(anyhow::anyhow!("{message}"))
    }

    /// An input or output failure, or a fault of the program.
    pub(crate) fn failure(cause: impl Into<anyhow::Error>) -> Self {
        Self {
            exit: Exit::Failure,
            cause: cause.into(),
            hint: None,
        }
    }

    /// The user pressed Ctrl-C.
    pub(crate) fn interrupted() -> Self {
        Self {
            exit: Exit::Interrupted,
            cause: anyhow::anyhow!("interrupted, nothing was written"),
            hint: None,
        }
    }

    /// Adds the next step for the user.
    #[must_use]
    pub(crate) fn hint(mut self, hint: impl fmt::Display) -> Self {
        self.hint = Some(hint.to_string());
        self
    }

    /// Whether the cause is a pipe that the reader closed.
    pub(crate) fn is_broken_pipe(&self) -> bool {
        self.cause
            .chain()
            .any(|e| io_kind(e) == Some(std::io::ErrorKind::BrokenPipe))
    }
}

fn io_kind(error: &(dyn Error + 'static)) -> Option<std::io::ErrorKind> {
    error
        .downcast_ref::<std::io::Error>()
        .map(std::io::Error::kind)
}
