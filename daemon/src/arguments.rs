//! What may stand on the daemon's command line.

use std::net::SocketAddr;
use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};
use evenpair_core::dialect::HIGHEST_CHANNEL;

/// The daemon that owns a bench: it talks to the instruments, runs sequences, and answers on HTTP.
///
/// It listens on loopback only.
#[derive(Debug, Parser)]
#[command(
    name = "evenpaird",
    version,
    max_term_width = 80,
    subcommand_negates_reqs = true,
    args_conflicts_with_subcommands = true
)]
pub(crate) struct Arguments {
    #[command(subcommand)]
    pub(crate) command: Option<Command>,
    /// The bench file.
    #[arg(long, value_name = "FILE", required_unless_present = "check")]
    pub(crate) bench: Option<PathBuf>,
    /// The folder for everything that is measured; made if it is not there.
    #[arg(long, value_name = "DIR", required = true)]
    pub(crate) data: Option<PathBuf>,
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

/// What the program does instead of serving a bench.
#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Try a dialect on one instrument, outside any bench: what works, what differs, what is refused.
    ///
    /// It only asks, unless `--allow-set` is given. Sources, outputs and routes are never set. Exit status: 0 when
    /// everything that was tried works, 1 when something differs or is refused, 2 when nothing could be tried.
    Dialect(DialectArguments),
}

/// What a trial of a dialect needs to know.
#[derive(Debug, Args)]
pub(crate) struct DialectArguments {
    /// The dialect: a file that ends in `.toml`, or the name of one that comes with the daemon.
    #[arg(value_name = "FILE")]
    pub(crate) file: String,
    /// The instrument's address, such as `TCPIP::192.168.1.20::5025::SOCKET`; without it, the file is only read.
    #[arg(long, value_name = "RESOURCE")]
    pub(crate) at: Option<String>,
    /// Also change settings: each is set to something near by, asked for, compared, and given back. An acquisition is
    /// started too.
    #[arg(long, requires = "at")]
    pub(crate) allow_set: bool,
    /// Try only what an instrument in this role needs; without it, all that the dialect has words for.
    #[arg(long = "as", value_name = "ROLE")]
    pub(crate) role: Option<Role>,
    /// The channel or output that is asked about.
    #[arg(long, value_name = "N", default_value_t = 1, value_parser = clap::value_parser!(i64).range(1..=HIGHEST_CHANNEL))]
    pub(crate) channel: i64,
    /// How long to wait for a reply, in seconds.
    #[arg(long = "timeout", value_name = "SECONDS", default_value_t = 2.0, value_parser = patience)]
    pub(crate) timeout_s: f64,
}

/// What an instrument is on a bench.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum Role {
    /// It acquires records.
    Scope,
    /// It makes signals.
    Source,
    /// It supplies voltage and current.
    Supply,
    /// It closes and opens routes.
    Switch,
}

fn patience(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(seconds) if (0.01..=600.0).contains(&seconds) => Ok(seconds),
        _ => Err("0.01 to 600 seconds".to_owned()),
    }
}
