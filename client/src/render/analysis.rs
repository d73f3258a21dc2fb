//! What saved records show.

use evenpair_api::{Analysis, SavedRecords, VerifiedOn};
use evenpair_core::units::{Unit, show};

use super::bench::wrap;
use super::captures::figure_table;
use super::correction::{rejection, response};
use super::quantity::with_uncertainty;

/// Everything: how the files were read, the correction, its rejection, the figures.
pub(crate) fn analysis(found: &Analysis) -> String {
    let mut text = Vec::new();
    let files = [
        ("reference", Some(&found.reference)),
        ("verification", found.verification.as_ref()),
        ("device", found.device.as_ref()),
    ];
    for (what, records) in files {
        text.extend(records.map(|records| how_read(what, records)));
    }
    text.push(format!(
        "\ncorrection\n  skew    {}   (positive: the negative leg is late)\n  gain    {}   (negative leg relative to \
         positive leg)\n  offset  {}   (at the tips)\n  ± is the expanded uncertainty, k = 2",
        with_uncertainty(&found.skew),
        with_uncertainty(&found.gain),
        with_uncertainty(&found.offset)
    ));
    text.extend(found.response.as_ref().map(|found| format!("\n{}", response(found))));
    let on = match found.verified_on {
        VerifiedOn::Fresh => "measured on an acquisition of its own, to which nothing was fitted",
        VerifiedOn::OtherHalf => {
            "fitted on the first half of the reference, measured on the second: not an independent acquisition, so what \
             drifts between two of them is not in it; give one with --verification"
        }
        VerifiedOn::Itself => {
            "measured on the very record that the correction was fitted to, since its halves are too short: not \
             independent; give another acquisition with --verification"
        }
    };
    text.push(format!("\n{}\n{}", rejection(&found.rejection), set_in(on)));
    if let Some(leak) = &found.leak {
        text.push(format!("\n{}", figure_table(&found.figures, leak)));
    }
    text.extend(found.warnings.iter().map(|warning| wrap(&format!("note: {warning}"), 2)));
    text.join("\n")
}

fn how_read(what: &str, records: &SavedRecords) -> String {
    let seconds = |value| show(value, Unit::Second, 4);
    let mut text = vec![format!(
        "{what}: {} samples every {}, from {}",
        records.points,
        seconds(records.sample_interval.value),
        seconds(records.start.value)
    )];
    for guess in &records.guesses {
        text.push(set_in(&format!("taken: {} = {}", flag(&guess.option), guess.taken)));
    }
    text.extend(records.notes.iter().map(|note| set_in(&format!("note: {note}"))));
    text.join("\n")
}

/// The flag that tells an option.
fn flag(option: &str) -> String {
    format!("--{}", option.replace('_', "-"))
}

/// Text set in by two, broken where it would be too wide.
fn set_in(text: &str) -> String {
    let lines = wrap(text, 0);
    lines.lines().map(|line| format!("  {}", line.trim_start())).collect::<Vec<_>>().join("\n")
}
