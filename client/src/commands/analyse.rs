//! `evenpair analyse`: records that some scope saved, without a daemon.

use evenpair_api::convert::{self, Acquisitions};
use evenpair_api::{Reading, ReferenceShape};
use evenpair_core::units::{Amount, Unit};

use crate::analyse::read;
use crate::arguments::{AnalyseArguments, ShapeWord};
use crate::exit::Exit;
use crate::trouble::Trouble;
use crate::{output, render};

/// Reads the files, analyses them, shows what was found.
pub(crate) fn analyse(arguments: &AnalyseArguments, json: bool) -> Result<Exit, Trouble> {
    let reading = reading(arguments)?;
    let own = |interval: &Option<String>, span: &Option<String>| -> Result<Reading, Trouble> {
        let mut own = reading.clone();
        own.interval_s = amount("device-interval", interval, Unit::Second)?.or(own.interval_s);
        own.span_v = amount("device-span", span, Unit::Volt)?.or(own.span_v);
        Ok(own)
    };
    let reference = read(&arguments.reference, arguments.reference_negative.as_deref(), &reading)?;
    let verification = arguments.verification.as_deref();
    let verification =
        verification.map(|path| read(path, arguments.verification_negative.as_deref(), &reading)).transpose()?;
    let device_reading = own(&arguments.device_interval, &arguments.device_span)?;
    let device = arguments.device.as_deref();
    let device = device.map(|path| read(path, arguments.device_negative.as_deref(), &device_reading)).transpose()?;
    let shape = arguments.shape.map(|word| match word {
        ShapeWord::Edges => ReferenceShape::Edges,
        ShapeWord::Sine => ReferenceShape::Sine,
        ShapeWord::Multitone => ReferenceShape::Multitone,
        ShapeWord::Unknown => ReferenceShape::Unknown,
    });
    let period_s = amount("period", &arguments.period, Unit::Second)?;
    let scale_spec = arguments.scale_spec.as_deref().map(share).transpose()?;
    let all = Acquisitions { reference, verification, device };
    let found = convert::analyse(all, shape, period_s, scale_spec, arguments.response)
        .map_err(|error| Trouble::Records { path: arguments.reference.clone(), why: error.to_string() })?;
    if json {
        output::print_json(&found)?;
    } else {
        output::print(&render::analysis(&found))?;
    }
    Ok(Exit::Passed)
}

/// What the flags tell about the files.
fn reading(arguments: &AnalyseArguments) -> Result<Reading, Trouble> {
    Ok(Reading {
        separator: arguments.separator.clone(),
        decimal: arguments.decimal.clone(),
        header_lines: arguments.header_lines,
        time: arguments.time.clone(),
        negative_time: arguments.negative_time.clone(),
        positive: arguments.positive.clone(),
        negative: arguments.negative.clone(),
        time_unit: arguments.time_unit.clone(),
        volt_unit: arguments.volt_unit.clone(),
        interval_s: amount("interval", &arguments.interval, Unit::Second)?,
        attenuation: arguments.attenuation,
        negative_attenuation: arguments.negative_attenuation,
        bits: arguments.bits,
        span_v: amount("span", &arguments.span, Unit::Volt)?,
        averages: arguments.averages,
    })
}

fn amount(flag: &str, text: &Option<String>, unit: Unit) -> Result<Option<f64>, Trouble> {
    let Some(text) = text else { return Ok(None) };
    Amount::parse_in(text, unit).map(Some).map_err(|error| Trouble::Usage(format!("--{flag}: {error}")))
}

/// `1.5 %` or `0.015`.
fn share(text: &str) -> Result<f64, Trouble> {
    let (number, scale) = match text.trim().strip_suffix('%') {
        Some(number) => (number.trim(), 0.01),
        None => (text.trim(), 1.0),
    };
    let value = number.parse::<f64>().ok().map(|value| value * scale);
    value
        .filter(|value| (0.0..1.0).contains(value))
        .ok_or_else(|| Trouble::Usage(format!("--scale-spec: `{text}` is no share; write `1.5 %` or `0.015`")))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_share_is_a_number_or_percent() {
        assert!((share("1.5 %").unwrap() - 0.015).abs() < 1e-15);
        assert!((share("0.02").unwrap() - 0.02).abs() < 1e-15);
        for wrong in ["", "%", "x", "-1", "150 %", "nan"] {
            assert!(share(wrong).is_err(), "{wrong}");
        }
    }
}
