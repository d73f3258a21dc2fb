//! What may stand on the daemon's command line.

use std::net::SocketAddr;
use std::path::PathBuf;

use clap::{Parser, ValueEnum};

/// The daemon that owns a bench: it talks to the instruments, runs sequences, and answers on HTTP.
///
/// It listens on loopback only.
#[derive(Debug, Parser)]
#[command(name = "evenpaird", version, max_term_width = 80)]
pub(crate) struct Arguments {
    /// The bench file.
    #[arg(long, value_name = "FILE", required_unless_present = "check")]
    pub(crate) bench: Option<PathBuf>,
    /// The folder for everything that is measured; made if it is not there.
    #[arg(long, value_name = "DIR")]
    pub(crate) data: PathBuf,
    /// Check the data folder instead of serving: whether everything that the store promises holds.
    #[arg(long, conflicts_with = "bench")]
    pub(crate) check: bool,
    /// The address to listen on; port 0 is any free one.
    #[arg(long, value_name = "ADDR", default_value = evenpair_api::DEFAULT_LISTEN)]
    pub(crate) listen: SocketAddr,
    /// What to log, such as `info` or `evenpaird::session=debug,info`.
    #[arg(long, value_name = "FILTER", default_value = "info", env = "EVENPAIR_LOG")]
    pub(crate) log: String,
    /// How to log, on standard error.
    #[arg(long, value_name = "FORMAT", default_value = "human")]
    pub(crate) log_format: LogFormat,
    /// End when standard input closes: for a program that starts the daemon and must not leave it behind.
    #[arg(long)]
    pub(crate) exit_with_stdin: bool,
}

/// The form of the log.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum LogFormat {
    /// Lines for people.
    Human,
    /// A JSON object a line.
    Json,
}
