//! A file per command: ask the daemon, then show.

mod analyse;
mod bench;
mod budget;
mod check;
mod deskew;
mod export;
mod follow;
mod run;
mod show;
mod transfer;

use evenpair_api::DeskewRequest;

use crate::arguments::{Arguments, Command};
use crate::demo;
use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;

pub(crate) use budget::BudgetFlags;
pub(crate) use follow::follow;
pub(crate) use transfer::TransferArguments;

/// Carries out what the command line says.
pub(crate) async fn perform(arguments: Arguments) -> Result<Exit, Trouble> {
    let json = arguments.json;
    let daemon = || Daemon::new(&arguments.server);
    match arguments.command {
        Command::Demo { data, seed } => demo::demo(data, seed, json).await,
        Command::Bench => bench::bench(&daemon()?, json).await,
        Command::Settle => bench::settle(&daemon()?, json).await,
        Command::Deskew { pair, most, use_scope_skew, response } => {
            let request = DeskewRequest {
                most_acquisitions: most,
                use_scope_skew: use_scope_skew.then_some(true),
                response: response.then_some(true),
                ..DeskewRequest::default()
            };
            deskew::deskew(&daemon()?, &pair, &request, json).await
        }
        Command::Transfer(wish) => transfer::transfer(&daemon()?, &wish, json).await,
        Command::Verify { pair } => deskew::verify(&daemon()?, &pair, json).await,
        Command::Run { sequence, wait } => run::run(&daemon()?, &sequence, wait, json).await,
        Command::Runs => show::runs(&daemon()?, json).await,
        Command::Show { run } => show::show(&daemon()?, &run, json).await,
        Command::Watch { run } => run::watch(&daemon()?, &run, json).await,
        Command::Stop { run } => run::stop(&daemon()?, &run, json).await,
        Command::Export { run, to, folder } => export::export(&daemon()?, &run, to, &folder, json).await,
        Command::Analyse(wish) => analyse::analyse(&wish, json),
        Command::Budget { file, flags } => budget::budget(file.as_deref(), *flags, json),
        Command::Check { file, bench } => check::check(&file, bench.as_deref(), json),
    }
}
