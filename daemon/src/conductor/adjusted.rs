//! What a scope made of the settings that it was asked for: it may round them, and it may clamp them.
//!
//! What it says is what is used. Rounding is told; a window of voltages that does not hold what was asked for is an
//! error, for the measurement was planned to need it.

use evenpair_core::bench::Acquisition;
use evenpair_core::units::{Unit, show};

use super::scope::LegSettings;

/// The part of the span by which the ends of the window may lie inside of what was asked for, and by which an offset
/// or a trigger level may move untold: a hundredth is less than a division's line is wide (common practice, no source).
const PART_OF_SPAN: f64 = 0.01;

/// The part by which a sample interval may differ untold: scopes write six digits and more of it.
const PART_OF_INTERVAL: f64 = 1e-5;

/// Sign of life of an external trigger's level, whose range nobody knows, in volts.
const EXTERNAL_LEVEL_V: f64 = 0.01;

/// A leg whose window does not hold what was asked for: its name, what was asked for, and what it is.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct TooSmall {
    pub(crate) leg: &'static str,
    pub(crate) asked: String,
    pub(crate) got: String,
}

/// Compares what the scope says with what it was asked for; the differences in words.
///
/// # Errors
/// When a leg's window is smaller than asked for.
pub(crate) fn judge(
    asked: &Acquisition,
    got: &Acquisition,
    legs: [(&'static str, &LegSettings); 2],
) -> Result<Vec<String>, TooSmall> {
    let mut told = Vec::new();
    let allowed_v = PART_OF_SPAN * asked.span_v;
    let (low, high) = asked.window_v();
    for (leg, settings) in legs {
        let (leg_low, leg_high) =
            (settings.offset_v - settings.span_v / 2.0, settings.offset_v + settings.span_v / 2.0);
        let window = |low, high| format!("{} to {}", show(low, Unit::Volt, 4), show(high, Unit::Volt, 4));
        if leg_low > low + allowed_v || leg_high < high - allowed_v {
            return Err(TooSmall { leg, asked: window(low, high), got: window(leg_low, leg_high) });
        }
        if settings.span_v > asked.span_v + allowed_v || (settings.offset_v - asked.offset_v).abs() > allowed_v {
            told.push(format!(
                "the scope set the {leg} leg to {} instead of {}",
                window(leg_low, leg_high),
                window(low, high)
            ));
        }
    }
    if (got.interval_s - asked.interval_s).abs() > PART_OF_INTERVAL * asked.interval_s {
        let (asked, got) = (show(asked.interval_s, Unit::Second, 5), show(got.interval_s, Unit::Second, 5));
        told.push(format!("the scope samples every {got} instead of every {asked}"));
    }
    if got.points != asked.points {
        told.push(format!("the scope records {} samples instead of {}", got.points, asked.points));
    }
    if got.averages != asked.averages {
        told.push(format!("the scope averages {} sweeps instead of {}", got.averages, asked.averages));
    }
    if (got.position - asked.position).abs() > PART_OF_SPAN {
        let percent = |part: f64| format!("{:.1} %", 100.0 * part);
        let (asked, got) = (percent(asked.position), percent(got.position));
        told.push(format!("the scope has the trigger at {got} of the record instead of {asked}"));
    }
    let level_v = if asked.trigger.channel == 0 { EXTERNAL_LEVEL_V } else { allowed_v };
    if (got.trigger.level_v - asked.trigger.level_v).abs() > level_v {
        let level = |volts| show(volts, Unit::Volt, 4);
        let (asked, got) = (level(asked.trigger.level_v), level(got.trigger.level_v));
        told.push(format!("the scope set the trigger's level to {got} instead of {asked}"));
    }
    Ok(told)
}

#[cfg(test)]
mod tests;
