//! `evenpair budget`: the predicted errors of a measurement not yet made, without a daemon.

mod flags;

use std::path::Path;

use evenpair_core::document::Mistake;
use evenpair_core::planning::{self, Flaw, Plan};

pub(crate) use flags::BudgetFlags;

use super::check::show_mistakes;
use crate::exit::Exit;
use crate::trouble::Trouble;
use crate::{output, render};

/// Makes the budget of the plan in `file`, with what `flags` say instead, and shows it.
pub(crate) fn budget(file: Option<&Path>, flags: BudgetFlags, json: bool) -> Result<Exit, Trouble> {
    let over = flags.plan();
    let told = match file {
        Some(path) => from_file(path, over)?,
        None => planning::budget(&over).map_err(|flaws| incomplete(&flaws))?,
    };
    if json {
        output::print_json(&told)?;
    } else {
        output::print(&render::budget(&told))?;
    }
    Ok(if told.verdict.two_probes_do() { Exit::Passed } else { Exit::LimitFailed })
}

fn from_file(path: &Path, over: Plan) -> Result<planning::Budget, Trouble> {
    let text = std::fs::read_to_string(path).map_err(|source| Trouble::File {
        doing: "reading the plan",
        path: path.into(),
        source,
    })?;
    let wrong = |mistakes: Vec<Mistake>| {
        show_mistakes(path, &text, &mistakes);
        Trouble::Mistakes { path: path.into(), count: mistakes.len() }
    };
    let written = planning::read(&text).map_err(wrong)?;
    planning::budget(&written.plan.clone().overlaid(over)).map_err(|flaws| {
        // A file that is right by itself is not to blame for what the flags made of it.
        if planning::budget(&written.plan).is_ok() { incomplete(&flaws) } else { wrong(written.mistakes(&flaws)) }
    })
}

fn incomplete(flaws: &[Flaw]) -> Trouble {
    let told: Vec<String> = flaws.iter().map(|flaw| format!("\n  {flaw}")).collect();
    Trouble::Usage(format!(
        "the plan is not complete or not consistent; see `evenpair budget --help`:{}",
        told.concat()
    ))
}
