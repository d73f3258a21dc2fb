//! How a dialect file says that samples and preambles are read.

use std::collections::BTreeMap;

use super::choice;
use crate::dialect::Intent;
use crate::dialect::expression::Expression;
use crate::dialect::intent::PREAMBLE;
use crate::dialect::record::Reading;
use crate::dialect::samples::{Format, Order};
use crate::dialect::step::Spoken;
use crate::dialect::template::LONGEST;
use crate::document::Table;

/// What `[samples]` and `[record]` say, checked against the replies of `record.preamble`.
pub(super) fn reading(top: &mut Table<'_>, intents: &BTreeMap<Intent, Spoken>) -> Option<Reading> {
    let samples = top.table("samples").map(|mut table| {
        let span = table.span();
        let format = choice(&mut table, "format", &Format::NAMES);
        let format = format.or_else(|| table.missing("format", "one of i8, u8, i16, u16, f32, text"));
        let order = choice(&mut table, "order", &[("big", Order::Big), ("little", Order::Little)]);
        let single = matches!(format, Some(Format::I8 | Format::U8 | Format::Text));
        let order = order
            .or_else(|| if single { Some(Order::Big) } else { table.missing("order", "`\"big\"` or `\"little\"`") });
        let lead = lead(&mut table);
        table.refuse_others();
        (span, format, order, lead)
    });
    let preamble = intents.get(&Intent::RecordPreamble);
    let steps = preamble.map(|spoken| spoken.steps.as_slice()).unwrap_or_default();
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
    let (span, format, order, most_lead_bytes) = samples?;
    let reading = Reading { format: format?, order: order?, most_lead_bytes, volts, seconds, fields };
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

/// The most bytes of text before a block.
fn lead(table: &mut Table<'_>) -> usize {
    let Some(lead) = table.whole("lead") else { return 0 };
    match usize::try_from(lead.value) {
        Ok(bytes) if bytes <= LONGEST => bytes,
        _ => {
            let help = format!("the most characters that may stand before the `#` of a block, 0 to {LONGEST}");
            table.mistakes().add(lead.span, format!("a lead of {} characters", lead.value), help);
            0
        }
    }
}

fn expression(table: &mut Table<'_>, key: &'static str, names: &[&str], variable: Option<&str>) -> Option<Expression> {
    let text = table.text(key)?;
    let known: Vec<&str> = names.iter().copied().chain(variable).collect();
    match Expression::compile(&format!("record.{key}"), &text.value, &known, "no reply") {
        Ok(expression) => Some(expression),
        Err(why) => {
            table.mistakes().add(text.span, format!("`{key}`: {why}"), format!("names here: {}", known.join(", ")));
            None
        }
    }
}
