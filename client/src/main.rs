//! `evenpair`: deskew, measure and export from the command line, through the daemon's API.
//!
//! Exit status: 0 passed, 1 a limit failed, 2 it could not be completed, 3 wrong usage. A reader that closed the pipe
//! early counts as success.

mod analyse;
mod arguments;
mod commands;
mod demo;
mod exit;
mod http;
mod output;
mod progress;
mod render;
mod trouble;

use clap::Parser;

use arguments::Arguments;
use exit::Exit;

fn main() -> std::process::ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            // Asking for help is no mistake; clap prints it to standard output.
            let exit = if error.use_stderr() { Exit::Usage } else { Exit::Passed };
            let _ = error.print();
            return exit.into();
        }
    };
    let runtime = match tokio::runtime::Builder::new_multi_thread().worker_threads(2).enable_all().build() {
        Ok(runtime) => runtime,
        Err(error) => {
            eprintln!("evenpair: starting: {error}");
            return Exit::Incomplete.into();
        }
    };
    let exit = match runtime.block_on(commands::perform(arguments)) {
        Ok(exit) => exit,
        Err(trouble) => {
            trouble.report();
            trouble.exit()
        }
    };
    exit.into()
}
