//! How a dialect file says that samples and preambles are read.

use std::collections::BTreeMap;

use super::choice;
use crate::dialect::Intent;
use crate::dialect::expression::Expression;
use crate::dialect::intent::PREAMBLE;
use crate::dialect::record::Reading;
use crate::dialect::samples::{Format, Order};
use crate::dialect::step::Step;
use crate::document::Table;

/// What `[samples]` and `[record]` say, checked against the replies of `record.preamble`.
pub(super) fn reading(top: &mut Table<'_>, intents: &BTreeMap<Intent, Vec<Step>>) -> Option<Reading> {
    let samples = top.table("samples").map(|mut table| {
        let span = table.span();
        let format = choice(&mut table, "format", &Format::NAMES);
        let format = format.or_else(|| table.missing("format", "one of i8, u8, i16, u16, f32, text"));
        let order = choice(&mut table, "order", &[("big", Order::Big), ("little", Order::Little)]);
        let single = matches!(format, Some(Format::I8 | Format::U8 | Format::Text));
        let order = order
            .or_else(|| if single { Some(Order::Big) } else { table.missing("order", "`\"big\"` or `\"little\"`") });
        table.refuse_others();
        (span, format, order)
    });
    let steps = intents.get(&Intent::RecordPreamble).map(Vec::as_slice).unwrap_or_default();
    let names: Vec<&str> = steps.iter().flat_map(|step| step.wanted.names()).collect();
    let (mut volts, mut seconds, mut fields) = (None, None, Vec::new());
    if let Some(mut table) = top.table("record") {
        volts = expression(&mut table, "volts", &names, Some("raw"));
        seconds = expression(&mut table, "seconds", &names, Some("index"));
        let single = ["points", "low_code", "high_code", "step_v", "averages", "acquisition"];
        fields = single
            .into_iter()
            .filter_map(|name| expression(&mut table, name, &names, None).map(|expression| (name, expression)))
            .collect();
        table.refuse_others();
    }
    let (span, format, order) = samples?;
    let reading = Reading { format: format?, order: order?, volts, seconds, fields };
    let given = reading.gives();
    let lacking: Vec<&str> =
        PREAMBLE.iter().map(|(name, _)| *name).filter(|name| !names.contains(name) && !given.contains(name)).collect();
    if !lacking.is_empty() && intents.contains_key(&Intent::RecordPreamble) {
        let help = "name them in the reply of `record.preamble`, or give `volts` (of `raw`), `seconds` (of `index`) or \
                    an expression of their name under `[record]`";
        top.mistakes().add(span, format!("nothing gives {}", lacking.join(", ")), help);
    }
    Some(reading)
}

fn expression(table: &mut Table<'_>, key: &'static str, names: &[&str], variable: Option<&str>) -> Option<Expression> {
    let text = table.text(key)?;
    let known: Vec<&str> = names.iter().copied().chain(variable).collect();
    match Expression::compile(key, &text.value, &known) {
        Ok(expression) => Some(expression),
        Err(why) => {
            table.mistakes().add(text.span, format!("`{key}`: {why}"), format!("names here: {}", known.join(", ")));
            None
        }
    }
}
