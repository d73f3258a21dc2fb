//! Captures and their figures.

use evenpair_api::{Capture, CoverageBasis, Figure, Grade, LeakBound};
use evenpair_core::units::{Unit, show};

use super::quantity::{self, with_uncertainty};
use super::table::{lines, table};

/// The word for a grade.
pub(crate) fn grade_word(grade: Grade) -> &'static str {
    match grade {
        Grade::Clean => "clean",
        Grade::Shaded => "shaded",
        Grade::Swamped => "swamped",
    }
}

/// One line about a capture, for progress.
pub(crate) fn capture_summary(capture: &Capture) -> String {
    let failed = capture.limits.iter().filter(|limit| !limit.passed).count();
    let verdict = match (capture.limits.len(), failed) {
        (0, _) => "no limits".to_owned(),
        (_, 0) => "within limits".to_owned(),
        (_, failed) => format!("{failed} limit(s) exceeded"),
    };
    format!("capture {} ({}): {verdict}", capture.number, conditions(capture))
}

/// One figure of every capture: corrected beside plain subtraction.
pub(crate) fn captures(captures: &[Capture], figure_name: &str) -> String {
    let head = ["no.", "conditions", figure_name, "plain", "grade", "limits"];
    let mut list = table(&head, &[0, 2, 3]);
    for capture in captures {
        let figure = capture.figures.iter().find(|figure| figure.name == figure_name);
        let (value, plain, grade) = match figure {
            Some(figure) if figure.valid => {
                (quantity::figure(figure), plain(figure), grade_word(figure.grade).to_owned())
            }
            Some(figure) => ("not valid".to_owned(), plain(figure), String::new()),
            None => ("none".to_owned(), String::new(), String::new()),
        };
        let limits =
            match capture.limits.iter().filter(|limit| limit.figure == figure_name).map(|limit| limit.passed).min() {
                None => "",
                Some(true) => "kept",
                Some(false) => "EXCEEDED",
            };
        list.add_row([capture.number.to_string(), conditions(capture), value, plain, grade, limits.to_owned()]);
    }
    lines(&list)
}

/// Every figure of one capture.
pub(crate) fn figures(capture: &Capture) -> String {
    figure_table(&capture.figures, &capture.leak)
}

/// Figures with their leak bound.
pub(super) fn figure_table(figures: &[Figure], leak: &LeakBound) -> String {
    let mut list = table(&["figure", "corrected", "plain", "grade", ""], &[1, 2]);
    for figure in figures {
        let value = if figure.valid { quantity::figure(figure) } else { "not valid".to_owned() };
        let grade = if figure.valid { grade_word(figure.grade) } else { "" };
        let limited = figure.coverage.as_ref().is_some_and(|c| c.basis == CoverageBasis::CommonMode);
        let note = match &figure.why {
            Some(why) => why.clone(),
            None if limited => "common-mode limited".to_owned(),
            None => String::new(),
        };
        list.add_row([figure.name.clone(), value, plain(figure), grade.to_owned(), note]);
    }
    let leak = format!(
        "leak bound {} rms, {} peak, of a common mode that swings {}",
        with_uncertainty(&leak.rms),
        with_uncertainty(&leak.peak),
        with_uncertainty(&leak.common_swing)
    );
    format!("{}\n± and +…/−… hold the true value with 95 %\n{leak}", lines(&list))
}

fn plain(figure: &Figure) -> String {
    let unit = Unit::from_symbol(&figure.quantity.unit).unwrap_or(Unit::One);
    figure.plain.map(|plain| show(plain, unit, 4)).unwrap_or_default()
}

fn conditions(capture: &Capture) -> String {
    let one = |condition: &evenpair_api::Condition| {
        let unit = Unit::from_symbol(&condition.value.unit).unwrap_or(Unit::One);
        show(condition.value.value, unit, 3)
    };
    capture.conditions.iter().map(one).collect::<Vec<_>>().join(", ")
}

#[cfg(test)]
mod tests;
