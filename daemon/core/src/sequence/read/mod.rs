//! From the text of a sequence to checked, unrolled steps, with every mistake at its place.

mod asked;
mod axis;
mod stage;
mod unroll;

use super::step::{self, Sequence};
use crate::bench::Bench;
use crate::document::{self, Mistake, Table};
use crate::units::Unit;

/// What the stages are checked against.
struct Context<'a> {
    bench: &'a Bench,
    figures: &'a dyn Fn(&str) -> Option<Unit>,
}

/// Reads a sequence and checks it whole against `bench`; `figure_names` knows the unit of each figure.
///
/// # Errors
/// Every mistake in it, sorted by place.
pub fn read(text: &str, bench: &Bench, figure_names: &dyn Fn(&str) -> Option<Unit>) -> Result<Sequence, Vec<Mistake>> {
    document::read(text, |top| sequence(top, &Context { bench, figures: figure_names }))
}

fn sequence(top: &mut Table<'_>, context: &Context<'_>) -> Option<Sequence> {
    let title = top.text("title").or_else(|| top.missing("title", "say in a few words what the sequence is for"));
    let stages = stage::read_list(top, "stage", context, stage::Part::Stages { depth: 0 });
    if !top.has("stage") {
        let _: Option<()> = top.missing("stage", "write each stage as `[[stage]]`");
    }
    let always = stage::read_list(top, "always", context, stage::Part::Always);
    // Unrolling needs right stages; with a mistake among them it would only repeat it.
    if !top.mistakes().is_empty() {
        return None;
    }
    let steps = unroll::unroll(&stages, context.bench, step::prepare(context.bench), top)?;
    let always = unroll::unroll(&always, context.bench, None, top)?;
    Some(Sequence { title: title?.value, steps, always })
}

#[cfg(test)]
mod tests;
