//! What a response means, in words.

use super::solve::Terms;
use super::{BandGain, Response};
use crate::units::{Unit, show};

/// What a term does on acquisitions that were not fitted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Verdict {
    /// The bands get worse on the whole.
    Harms,
    /// The bands get better on the whole.
    Helps,
    /// Neither, beyond chance.
    Nothing,
}

/// The band whose rejection grows most.
fn most(improved: &[BandGain]) -> Option<&BandGain> {
    improved.iter().max_by(|a, b| (a.after_db - a.before_db).total_cmp(&(b.after_db - b.before_db)))
}

pub(super) fn tell(response: &Response, verdicts: &[(Terms, Verdict)], corrects: bool) -> Vec<String> {
    let mut words = Vec::new();
    if let Some(term) = response.pole_zero {
        let relative = term.relative.value;
        let which = if relative > 0.0 { "over" } else { "under" };
        words.push(format!(
            "the negative leg is {:.2} % {which}-compensated against the positive one, time constant {}: trim its probe",
            100.0 * relative.abs(),
            show(term.time_constant_s.value, Unit::Second, 3)
        ));
    }
    if response.taps.len() > 1 {
        words.push(format!(
            "a filter of {} taps makes up for what else differs, as bandwidth does",
            response.taps.len()
        ));
    }
    for (terms, _) in verdicts.iter().filter(|(_, verdict)| *verdict == Verdict::Harms) {
        let what = match terms.taps {
            1 => "a low-frequency term".to_owned(),
            taps => format!("a filter of {taps} taps"),
        };
        words.push(format!("{what} was left out: it loses rejection on acquisitions that were not fitted"));
    }
    match most(&response.improved).filter(|_| corrects) {
        Some(band) => words.push(format!(
            "most is gained between {} and {}: rejection {:.0} dB before, {}{:.0} dB after",
            show(band.from_hz, Unit::Hertz, 2),
            show(band.to_hz, Unit::Hertz, 2),
            band.before_db,
            if band.after_db >= band.floor_db { "at least " } else { "" },
            band.after_db
        )),
        None => words.push("gain and delay are enough: no further term helps".to_owned()),
    }
    words
}
