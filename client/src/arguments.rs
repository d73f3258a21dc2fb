//! What may stand on the command line.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use crate::commands::{BudgetFlags, TransferArguments};

/// Deskew two single-ended scope probes and measure the voltage between two points, with its uncertainty.
///
/// Both probe grounds are at earth. Never defeat a scope's earth; stay inside the probes' rating and measurement
/// category; hot circuits are for qualified people, and local codes come first.
#[derive(Debug, Parser)]
#[command(name = "evenpair", version, max_term_width = 80)]
pub(crate) struct Arguments {
    /// The daemon's address.
    #[arg(long, global = true, env = "EVENPAIR_SERVER", default_value = "http://127.0.0.1:7488", value_name = "URL")]
    pub(crate) server: String,
    /// Print JSON instead of text.
    #[arg(long, global = true)]
    pub(crate) json: bool,
    /// What to do.
    #[command(subcommand)]
    pub(crate) command: Command,
}

/// What to do.
#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Show the whole job on a simulated bench: deskew, verify, measure, all through a real daemon.
    Demo {
        /// Keep the data in this folder.
        #[arg(long, value_name = "DIR")]
        data: Option<PathBuf>,
        /// The seed of the simulated bench's noise; the scenario's own if absent.
        #[arg(long)]
        seed: Option<u64>,
    },
    /// Show the bench: instruments, pairs, settings, routes, cautions.
    Bench,
    /// Bring an unsettled bench to rest again, once you have looked at it.
    Settle,
    /// Deskew a pair on its references and verify the correction.
    Deskew {
        /// The pair's name.
        pair: String,
        /// The most acquisitions to spend on each reference.
        #[arg(long, value_name = "N")]
        most: Option<u32>,
        /// Write the rounded skew into the scope's own skew setting.
        #[arg(long)]
        use_scope_skew: bool,
        /// Fit the response that is left between the legs, and apply it.
        #[arg(long)]
        response: bool,
    },
    /// Transfer a pair's correction to another vertical range, by a signal that both ranges can show.
    Transfer(TransferArguments),
    /// Verify a pair's correction on fresh acquisitions.
    Verify {
        /// The pair's name.
        pair: String,
    },
    /// Start a sequence: the name of one in the bench's folder, or the path of a file that ends in `.toml`.
    Run {
        /// Name or path.
        sequence: String,
        /// Stay until it has ended, and tell how.
        #[arg(long)]
        wait: bool,
    },
    /// List the runs, the latest first.
    Runs,
    /// Show a run with its stages, captures and figures.
    Show {
        /// The run's identity, or `last`.
        run: String,
    },
    /// Follow a run until it has ended.
    Watch {
        /// The run's identity, or `last`.
        run: String,
    },
    /// Stop a run; the bench goes to its safe state.
    Stop {
        /// The run's identity, or `last`.
        run: String,
    },
    /// Save a run's waveforms and figures in a folder.
    Export {
        /// The run's identity, or `last`.
        run: String,
        /// The format of the waveforms.
        #[arg(long)]
        to: Format,
        /// The folder; made if it is not there.
        folder: PathBuf,
    },
    /// Deskew, correct and measure records that any scope saved, without a daemon.
    Analyse(Box<AnalyseArguments>),
    /// Predict the error before measuring: will two single-ended probes do, and how well must they be deskewed? No daemon.
    ///
    /// From a file, from flags, or from a file with flags that replace some of it. Exit status 0 if two probes will do,
    /// 1 if not.
    Budget {
        /// A plan, such as configs/budgets/high-side-gate.toml.
        file: Option<PathBuf>,
        /// What the file does not say, or says otherwise.
        #[command(flatten)]
        flags: Box<BudgetFlags>,
    },
    /// Check a bench file or a sequence, without a daemon.
    Check {
        /// The file.
        file: PathBuf,
        /// The bench that a sequence is checked against.
        #[arg(long, value_name = "FILE")]
        bench: Option<PathBuf>,
    },
}

/// Files of saved records, and what can be told about them; what is not told is guessed and printed.
#[derive(Debug, Args)]
pub(crate) struct AnalyseArguments {
    /// One acquisition with both tips on a reference: text (CSV and its kin) or Parquet.
    #[arg(long, value_name = "FILE")]
    pub(crate) reference: PathBuf,
    /// The reference's negative leg, where each leg has a file.
    #[arg(long, value_name = "FILE")]
    pub(crate) reference_negative: Option<PathBuf>,
    /// Another acquisition of the reference, to verify on.
    #[arg(long, value_name = "FILE")]
    pub(crate) verification: Option<PathBuf>,
    /// Its negative leg, where each leg has a file.
    #[arg(long, value_name = "FILE", requires = "verification")]
    pub(crate) verification_negative: Option<PathBuf>,
    /// One acquisition with the tips on the device.
    #[arg(long, value_name = "FILE")]
    pub(crate) device: Option<PathBuf>,
    /// The device's negative leg, where each leg has a file.
    #[arg(long, value_name = "FILE", requires = "device")]
    pub(crate) device_negative: Option<PathBuf>,
    /// The positive leg's column: its name, or its number from 1.
    #[arg(long, value_name = "COLUMN")]
    pub(crate) positive: Option<String>,
    /// The negative leg's column.
    #[arg(long, value_name = "COLUMN", allow_hyphen_values = true)]
    pub(crate) negative: Option<String>,
    /// The time column.
    #[arg(long, value_name = "COLUMN")]
    pub(crate) time: Option<String>,
    /// The negative leg's own time column, where it has one.
    #[arg(long, value_name = "COLUMN")]
    pub(crate) negative_time: Option<String>,
    /// The unit of the time column: s, ms, us, ns, ps.
    #[arg(long, value_name = "UNIT")]
    pub(crate) time_unit: Option<String>,
    /// The unit of both legs: V, mV, uV, kV.
    #[arg(long, value_name = "UNIT")]
    pub(crate) volt_unit: Option<String>,
    /// Time between two samples, such as `2 ns`, where no column tells it.
    #[arg(long, value_name = "TIME")]
    pub(crate) interval: Option<String>,
    /// The same for the device's file, where it differs.
    #[arg(long, value_name = "TIME")]
    pub(crate) device_interval: Option<String>,
    /// What the fields are separated by: comma, semicolon, tab, blank.
    #[arg(long, value_name = "WORD")]
    pub(crate) separator: Option<String>,
    /// The decimal mark: point, comma.
    #[arg(long, value_name = "WORD")]
    pub(crate) decimal: Option<String>,
    /// How many lines stand before the first row of numbers.
    #[arg(long, value_name = "N")]
    pub(crate) header_lines: Option<u32>,
    /// What the volts in the file are to be multiplied by to be volts at the tip.
    #[arg(long, value_name = "FACTOR")]
    pub(crate) attenuation: Option<f64>,
    /// The same for the negative leg, where it differs.
    #[arg(long, value_name = "FACTOR")]
    pub(crate) negative_attenuation: Option<f64>,
    /// The converter's resolution in bits; needs --span.
    #[arg(long, value_name = "N")]
    pub(crate) bits: Option<u32>,
    /// Full vertical span at the tip, such as `8 V`.
    #[arg(long, value_name = "VOLTS")]
    pub(crate) span: Option<String>,
    /// The same for the device's file, where it differs.
    #[arg(long, value_name = "VOLTS")]
    pub(crate) device_span: Option<String>,
    /// How many acquisitions the scope averaged.
    #[arg(long, value_name = "N")]
    pub(crate) averages: Option<u32>,
    /// The scope's gain specification as half-width, such as `1.5 %`.
    #[arg(long, value_name = "SHARE")]
    pub(crate) scale_spec: Option<String>,
    /// What the reference looks like.
    #[arg(long)]
    pub(crate) shape: Option<ShapeWord>,
    /// Fit the response that is left between the legs, and apply it; needs the reference's period.
    #[arg(long, requires = "period")]
    pub(crate) response: bool,
    /// The reference's period; the skew is then sought within half of it.
    #[arg(long, value_name = "TIME")]
    pub(crate) period: Option<String>,
}

/// What a reference looks like.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum ShapeWord {
    /// A square wave or pulses.
    Edges,
    /// One sine.
    Sine,
    /// A sum of sines.
    Multitone,
    /// Not known.
    Unknown,
}

/// A format of waveform files.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum Format {
    /// Text: time, both legs and the corrected difference in seconds and volts.
    Csv,
    /// The stored file itself: raw codes with their scale, and the corrected difference.
    Parquet,
}

impl Format {
    /// Its media type.
    pub(crate) fn media_type(self) -> &'static str {
        match self {
            Self::Csv => "text/csv",
            Self::Parquet => "application/vnd.apache.parquet",
        }
    }

    /// Its file name's ending.
    pub(crate) fn ending(self) -> &'static str {
        match self {
            Self::Csv => "csv",
            Self::Parquet => "parquet",
        }
    }
}

#[cfg(test)]
mod tests {
    use clap::CommandFactory;

    use super::*;

    #[test]
    fn the_command_line_is_consistent() {
        Arguments::command().debug_assert();
    }

    #[test]
    fn the_default_server_is_where_the_daemon_listens() {
        let arguments = Arguments::try_parse_from(["evenpair", "bench"]).unwrap();
        assert_eq!(arguments.server, format!("http://{}", evenpair_api::DEFAULT_LISTEN));
    }
}
