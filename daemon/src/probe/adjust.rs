//! What a setting is changed to for a trial, and whether what the instrument then says agrees.

use evenpair_core::dialect::{Fields, Intent, SkewSetting, Value};

/// The settings that can be tried, each with the question for it.
pub(super) const PAIRS: [(Intent, Intent); 6] = [
    (Intent::VerticalSet, Intent::VerticalGet),
    (Intent::CouplingSet, Intent::CouplingGet),
    (Intent::TimebaseSet, Intent::TimebaseGet),
    (Intent::TriggerSet, Intent::TriggerGet),
    (Intent::AverageSet, Intent::AverageGet),
    (Intent::SkewSet, Intent::SkewGet),
];

/// The part by which what is said may differ from what was asked for: an instrument's last digits.
const DIGITS: f64 = 0.005;

/// The part by which an instrument may have rounded: the steps 1, 2, 5 are at most a quarter from any number between.
const ROUNDED: f64 = 0.3;

/// How what the instrument says agrees with what was asked for.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Agreement {
    /// It does.
    Same,
    /// It rounded; in words.
    Rounded(String),
    /// It does not; in words.
    Differs(String),
}

/// Something near by that differs from `now`.
pub(super) fn other(set: Intent, now: &Fields, skew: Option<SkewSetting>) -> Fields {
    let mut other = now.clone();
    let number = |name: &str| now.number(name).unwrap_or(0.0);
    let word = |name: &str, from: &str, to: &str, back: &str| {
        let to = if now.keyword(name).is_ok_and(|word| word == from) { to } else { back };
        Value::Keyword(to.to_owned())
    };
    match set {
        Intent::VerticalSet => other.set("span_v", number("span_v") / 2.0),
        Intent::CouplingSet => other.set("coupling", word("coupling", "dc", "ac", "dc")),
        Intent::TimebaseSet => other.set("interval_s", number("interval_s") * 2.0),
        Intent::TriggerSet => other.set("slope", word("slope", "positive", "negative", "positive")),
        Intent::AverageSet => other.set("count", if now.whole("count").is_ok_and(|count| count == 4) { 2 } else { 4 }),
        Intent::SkewSet => {
            let (step_s, range_s) = skew.map_or((0.0, 0.0), |skew| (skew.step_s, skew.range_s));
            let further = number("delay_s") + 10.0 * step_s;
            let delay_s = if further > range_s { number("delay_s") - 10.0 * step_s } else { further };
            other.set("delay_s", skew.map_or(delay_s, |skew| skew.round(delay_s)));
        }
        _ => {}
    }
    other
}

/// Compares `said` with what was `asked` for; `before` is what it was.
pub(super) fn compare(asked: &Fields, said: &Fields, before: &Fields, skew: Option<SkewSetting>) -> Agreement {
    let mut rounded = Vec::new();
    for (name, wanted) in asked.iter() {
        let words = || format!("{name}: {} was asked for, it says {}", shown(Some(wanted)), shown(said.value(name)));
        match (asked.number(name), said.number(name)) {
            (Ok(wanted), Ok(found)) => {
                let least = match name.as_str() {
                    "offset_v" => asked.number("span_v").unwrap_or(0.0) * DIGITS,
                    "delay_s" => skew.map_or(0.0, |skew| skew.step_s / 2.0),
                    "position" => DIGITS,
                    "level_v" => 0.02,
                    _ => 0.0,
                };
                let off = (found - wanted).abs();
                if off <= (DIGITS * wanted.abs()).max(least) {
                    continue;
                }
                let was = before.number(name).unwrap_or(found);
                if off <= ROUNDED * wanted.abs() && off < (was - wanted).abs() {
                    rounded.push(words());
                } else {
                    return Agreement::Differs(words());
                }
            }
            _ if said.value(name) == Some(wanted) => {}
            _ => return Agreement::Differs(words()),
        }
    }
    if rounded.is_empty() { Agreement::Same } else { Agreement::Rounded(rounded.join("; ")) }
}

fn shown(value: Option<&Value>) -> String {
    match value {
        None => "nothing".to_owned(),
        Some(Value::Flag(flag)) => flag.to_string(),
        Some(Value::Keyword(word) | Value::Text(word)) => word.clone(),
        Some(Value::List(list)) => format!("{list:?}"),
        Some(Value::Number(number)) => format!("{number:e}"),
        Some(Value::Whole(whole)) => whole.to_string(),
    }
}

#[cfg(test)]
mod tests;
