//! `evenpair check`: a bench file or a sequence, without a daemon.

use std::path::Path;

use evenpair_core::analysis::figures::FigureKind;
use evenpair_core::bench::{self, Bench};
use evenpair_core::document::{Mistake, line_and_column};
use evenpair_core::sequence;
use serde::Serialize;

use crate::exit::Exit;
use crate::output;
use crate::trouble::Trouble;

/// What was found.
#[derive(Serialize)]
struct Checked {
    file: String,
    kind: &'static str,
    steps: usize,
    captures: usize,
    mistakes: Vec<evenpair_api::MistakeReport>,
}

/// Checks a file. With a bench given it is a sequence, else a bench file.
pub(crate) fn check(file: &Path, bench_file: Option<&Path>, json: bool) -> Result<Exit, Trouble> {
    let text = read(file)?;
    let Some(bench_file) = bench_file else {
        return match bench::read(&text) {
            Ok(bench) => {
                let found = format!(
                    "bench `{}`: {} instruments, {} pairs",
                    bench.name,
                    bench.instruments.len(),
                    bench.pairs.len()
                );
                right(file, "bench", 0, 0, &found, json)
            }
            Err(mistakes) => wrong(file, "bench", &text, &mistakes, json),
        };
    };
    let bench_text = read(bench_file)?;
    let bench: Bench = match bench::read(&bench_text) {
        Ok(bench) => bench,
        Err(mistakes) => return wrong(bench_file, "bench", &bench_text, &mistakes, json),
    };
    let unit_of = |name: &str| FigureKind::parse(name).map(FigureKind::unit);
    match sequence::read(&text, &bench, &unit_of) {
        Ok(sequence) => {
            let (steps, captures) = (sequence.steps.len(), sequence.captures());
            let found = format!("sequence `{}`: {steps} steps, {captures} captures", sequence.title);
            right(file, "sequence", steps, captures, &found, json)
        }
        Err(mistakes) => wrong(file, "sequence", &text, &mistakes, json),
    }
}

fn read(path: &Path) -> Result<String, Trouble> {
    std::fs::read_to_string(path).map_err(|source| Trouble::File { doing: "reading", path: path.into(), source })
}

fn right(
    file: &Path,
    kind: &'static str,
    steps: usize,
    captures: usize,
    found: &str,
    json: bool,
) -> Result<Exit, Trouble> {
    if json {
        output::print_json(&Checked { file: file.display().to_string(), kind, steps, captures, mistakes: vec![] })?;
    } else {
        output::print(&format!("{}: {found}; no mistakes", file.display()))?;
    }
    Ok(Exit::Passed)
}

fn wrong(file: &Path, kind: &'static str, text: &str, mistakes: &[Mistake], json: bool) -> Result<Exit, Trouble> {
    if json {
        let report = |mistake: &Mistake| {
            let (line, column) = line_and_column(text, mistake.span.start);
            evenpair_api::MistakeReport { line, column, what: mistake.what.clone(), help: mistake.help.clone() }
        };
        let mistakes = mistakes.iter().map(report).collect();
        output::print_json(&Checked { file: file.display().to_string(), kind, steps: 0, captures: 0, mistakes })?;
    } else {
        show_mistakes(file, text, mistakes);
    }
    Err(Trouble::Mistakes { path: file.into(), count: mistakes.len() })
}

/// Shows every mistake on standard error, with its line and a caret.
pub(super) fn show_mistakes(file: &Path, text: &str, mistakes: &[Mistake]) {
    for mistake in mistakes {
        let labels = vec![miette::LabeledSpan::at(mistake.span.clone(), "here")];
        let report = miette::miette!(labels = labels, help = mistake.help.clone(), "{}", mistake.what)
            .with_source_code(miette::NamedSource::new(file.display().to_string(), text.to_owned()));
        eprintln!("{report:?}");
    }
}
