//! Records: a preamble's numbers brought to common names, and samples that fit them.

use super::expression::Expression;
use super::reply::{Manner, without_header};
use super::samples::{Format, Order, SHIFT};
use super::value::nearest_whole;
use super::{DialectError, Fields, Message, RawRecord, Value};
use crate::analysis::record::Samples;

/// The longest record that is read, whatever a preamble says: 64 Mi samples, several times what a bench may ask for.
const MOST_POINTS: i64 = 1 << 26;

/// What `[samples]` and `[record]` of a dialect say.
#[derive(Debug)]
pub(super) struct Reading {
    pub(super) format: Format,
    pub(super) order: Order,
    /// The most bytes of text before a block.
    pub(super) most_lead_bytes: usize,
    /// Volts of `raw`.
    pub(super) volts: Option<Expression>,
    /// Seconds of `index`.
    pub(super) seconds: Option<Expression>,
    /// Single fields of the preamble.
    pub(super) fields: Vec<(&'static str, Expression)>,
}

impl Reading {
    /// Which fields of a preamble the expressions give.
    pub(super) fn gives(&self) -> Vec<&'static str> {
        let mut given: Vec<&str> = self.fields.iter().map(|(name, _)| *name).collect();
        if self.volts.is_some() {
            given.extend(["volts_per_code", "zero_v"]);
        }
        if self.seconds.is_some() {
            given.extend(["interval_s", "start_s"]);
        }
        given
    }

    /// Adds what the expressions give to the fields that came; an expression replaces the field of its name.
    pub(super) fn complete(&self, fields: &mut Fields) -> Result<(), DialectError> {
        let came: Vec<(String, f64)> = fields
            .iter()
            .filter_map(|(name, _)| fields.number(name).ok().map(|number| (name.clone(), number)))
            .collect();
        let numbers: Vec<(&str, f64)> = came.iter().map(|(name, number)| (name.as_str(), *number)).collect();
        for (name, expression) in &self.fields {
            fields.set(*name, expression.evaluate(&numbers)?);
        }
        if let Some(volts) = &self.volts {
            let (slope, zero) = volts.line("raw", &numbers)?;
            fields.set("volts_per_code", slope);
            fields.set("zero_v", zero);
        }
        if let Some(seconds) = &self.seconds {
            let (slope, zero) = seconds.line("index", &numbers)?;
            fields.set("interval_s", slope);
            fields.set("start_s", zero);
        }
        for name in ["points", "averages", "acquisition"] {
            let found = fields.number(name)?;
            let whole = nearest_whole(found).ok_or(DialectError::NotWhole { name, found })?;
            fields.set(name, Value::Whole(whole));
        }
        let points = fields.whole("points")?;
        if !(0..=MOST_POINTS).contains(&points) {
            let allowed = "0 to 67108864";
            return Err(DialectError::Preamble { name: "points".to_owned(), found: points as f64, allowed });
        }
        Ok(())
    }

    /// The samples of one reply.
    pub(super) fn samples(&self, data: &Message, command: &str, manner: Manner) -> Result<Samples, DialectError> {
        let bare = match data {
            Message::Line(line) if manner.header => Some(Message::Line(without_header(line, manner).to_owned())),
            _ => None,
        };
        self.format.decode(self.order, bare.as_ref().unwrap_or(data), command, manner.units)
    }

    /// The record that a preamble and the samples make.
    pub(super) fn record(&self, preamble: &Fields, samples: Samples) -> Result<RawRecord, DialectError> {
        let wanted = preamble.whole("points")?;
        if i64::try_from(samples.len()).ok() != Some(wanted) {
            return Err(DialectError::Length { wanted, found: samples.len() });
        }
        let checked = |name: &str, good: fn(f64) -> bool, allowed: &'static str| {
            let found = preamble.number(name)?;
            let refusal = || DialectError::Preamble { name: name.to_owned(), found, allowed };
            if found.is_finite() && good(found) { Ok(found) } else { Err(refusal()) }
        };
        let any = |_: f64| true;
        let above = |number: f64| number > 0.0;
        let volts_per_code = checked("volts_per_code", |number| number != 0.0, "a number other than 0")?;
        let (low, high) = (checked("low_code", any, "a number")?, checked("high_code", any, "a number")?);
        if low >= high {
            let allowed = "a number above `low_code`";
            return Err(DialectError::Preamble { name: "high_code".to_owned(), found: high, allowed });
        }
        let averages = checked("averages", |number| number >= 1.0, "1 or more")?;
        // Codes without a sign were shifted down to fit; the line from codes to volts moves with them.
        let shift = match (self.format, &samples) {
            (Format::U16, Samples::Codes(_)) => f64::from(SHIFT),
            _ => 0.0,
        };
        Ok(RawRecord {
            volts_per_code,
            zero_v: shift.mul_add(volts_per_code, checked("zero_v", any, "a number")?),
            interval_s: checked("interval_s", above, "a number above 0")?,
            start_s: checked("start_s", any, "a number")?,
            end_codes: (low - shift, high - shift),
            step_v: checked("step_v", above, "a number above 0")?,
            // More averages than fit into 32 bits are as good as that many.
            averages: averages as u32,
            acquisition: preamble.whole("acquisition")?,
            samples,
        })
    }
}
