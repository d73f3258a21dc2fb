//! `evenpaird`: the daemon that owns a bench.
//!
//! Floors, each using only those below it: [`app`] starts and ends everything; [`http`] answers; [`conductor`] carries
//! runs out; [`session`], [`store`] and [`clock`] touch instruments, disk and time. Beside them, [`probe`] tries a
//! dialect on one instrument without a bench.

mod app;
mod arguments;
mod clock;
mod conductor;
mod dialects;
mod endings;
mod http;
mod mistakes;
mod probe;
mod session;
mod store;

use std::process::ExitCode;

use clap::Parser;

use arguments::{Arguments, Command, LogFormat};

/// Exit status when the daemon could not start: 2, as for a command that could not be completed.
const NOT_STARTED: u8 = 2;

fn main() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            let _ = error.print();
            return ExitCode::from(if error.use_stderr() { 3 } else { 0 });
        }
    };
    if let Some(Command::Dialect(arguments)) = &arguments.command {
        return dialect(arguments);
    }
    let filter = tracing_subscriber::EnvFilter::try_new(&arguments.log).unwrap_or_else(|_| "info".into());
    let subscriber = tracing_subscriber::fmt().with_writer(std::io::stderr).with_env_filter(filter);
    match arguments.log_format {
        LogFormat::Human => subscriber.with_ansi(false).init(),
        LogFormat::Json => subscriber.json().init(),
    }
    let runtime = match tokio::runtime::Builder::new_multi_thread().enable_all().build() {
        Ok(runtime) => runtime,
        Err(error) => {
            eprintln!("evenpaird: starting: {error}");
            return ExitCode::from(NOT_STARTED);
        }
    };
    let ended = runtime.block_on(app::serve(arguments));
    // A read of standard input that is under way cannot be taken back; it must not keep the process.
    runtime.shutdown_timeout(std::time::Duration::from_secs(1));
    match ended {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("evenpaird: {error}");
            ExitCode::from(NOT_STARTED)
        }
    }
}

/// Tries a dialect: 0 when all that was tried works, 1 when not, 2 when nothing could be tried.
fn dialect(arguments: &arguments::DialectArguments) -> ExitCode {
    let failed = |error: &dyn std::error::Error| {
        eprintln!("evenpaird: {error}");
        ExitCode::from(NOT_STARTED)
    };
    let Some(at) = &arguments.at else {
        return match probe::look(&arguments.file) {
            Ok(words) => {
                println!("{words}");
                ExitCode::SUCCESS
            }
            Err(error) => failed(&error),
        };
    };
    let runtime = match tokio::runtime::Builder::new_current_thread().enable_all().build() {
        Ok(runtime) => runtime,
        Err(error) => return failed(&error),
    };
    match runtime.block_on(probe::run(at, arguments)) {
        Ok(findings) => {
            println!("{findings}");
            ExitCode::from(u8::from(!findings.good()))
        }
        Err(error) => failed(&error),
    }
}
