//! What can go wrong for a command, how it is told, and with which exit status.

use std::path::PathBuf;

use evenpair_api::{Problem, ProblemCode};

use crate::exit::Exit;

/// Why a command did not do what it was asked.
#[derive(Debug, thiserror::Error)]
pub(crate) enum Trouble {
    /// The daemon's answer is not what its API promises.
    #[error("the daemon at {url} answered {what}; is it a daemon of another version, or another program?")]
    Answer { url: String, what: String },
    /// The demo could not go on.
    #[error("{0}")]
    Demo(String),
    /// A file could not be read or written.
    #[error("{doing} {}: {source}", path.display())]
    File { doing: &'static str, path: PathBuf, source: std::io::Error },
    /// A person pressed Ctrl-C.
    #[error("stopped")]
    Interrupted,
    /// A file has mistakes, which are on the screen already.
    #[error("{}: {count} mistake(s)", path.display())]
    Mistakes { path: PathBuf, count: usize },
    /// The other end of standard output is closed; nobody reads on.
    #[error("nobody reads the output")]
    NoReader,
    /// The daemon refused.
    #[error("{}", .0.detail)]
    Problem(Box<Problem>),
    /// A file of records could not be read or analysed.
    #[error("{}: {why}", path.display())]
    Records { path: PathBuf, why: String },
    /// No daemon answers.
    #[error(
        "no daemon answers at {url}: {reason}; start one with `evenpaird --bench FILE --data DIR`, or name another with --server"
    )]
    Unreachable { url: String, reason: String },
    /// What was asked for makes no sense.
    #[error("{0}")]
    Usage(String),
}

impl Trouble {
    /// Tells it on standard error.
    pub(crate) fn report(&self) {
        if matches!(self, Self::NoReader) {
            return;
        }
        eprintln!("evenpair: {self}");
        if let Self::Problem(problem) = self {
            for mistake in &problem.mistakes {
                eprintln!("  line {}, column {}: {}; {}", mistake.line, mistake.column, mistake.what, mistake.help);
            }
        }
    }

    /// The exit status that belongs to it.
    pub(crate) fn exit(&self) -> Exit {
        use ProblemCode as P;
        match self {
            Self::NoReader => Exit::Passed,
            Self::Mistakes { .. } | Self::Records { .. } | Self::Usage(_) => Exit::Usage,
            Self::Problem(problem) => match problem.code {
                P::InvalidRequest | P::SequenceRefused | P::BodyTooLarge | P::NoCorrection => Exit::Usage,
                P::UnknownCapture | P::UnknownPair | P::UnknownRun | P::UnknownSequence => Exit::Usage,
                _ => Exit::Incomplete,
            },
            _ => Exit::Incomplete,
        }
    }
}
