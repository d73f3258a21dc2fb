//! Runs.

use evenpair_api::{Run, RunState, Runs};

use super::table::{lines, table};
use super::wrap::wrap;

/// The word for a run's state.
pub(crate) fn state_word(state: RunState) -> &'static str {
    match state {
        RunState::Waiting => "waiting",
        RunState::Running => "running",
        RunState::Passed => "passed",
        RunState::Failed => "failed",
        RunState::Stopped => "stopped",
        RunState::Broken => "broken",
    }
}

/// A list of runs.
pub(crate) fn runs(runs: &Runs) -> String {
    if runs.items.is_empty() {
        return "no runs yet".to_owned();
    }
    let mut list = table(&["run", "state", "captures", "title"], &[2]);
    for run in &runs.items {
        list.add_row([
            run.id.to_string(),
            state_word(run.state).to_owned(),
            run.progress.captures.to_string(),
            run.title.clone(),
        ]);
    }
    lines(&list)
}

/// One run: how it ended, why, and its stages.
pub(crate) fn run(run: &Run) -> String {
    let mut text = vec![format!("run {}: {}", run.id, state_word(run.state)), format!("  {}", run.title)];
    text.push(format!(
        "  {} of {} steps, {} captures, accepted {}",
        run.progress.done,
        run.progress.total,
        run.progress.captures,
        run.created_at.strftime("%Y-%m-%d %H:%M:%S UTC")
    ));
    if !run.state.ended() && !run.progress.doing.is_empty() {
        text.push(format!("  now: {}", run.progress.doing));
    }
    text.extend(run.reason.iter().map(|reason| format!("  why: {reason}")));
    for failure in &run.failures {
        text.push(format!("  capture {}: {}", failure.capture, failure.text));
    }
    let mut text: Vec<String> = text.iter().map(|line| wrap(line, 4)).collect();
    if !run.stages.is_empty() {
        let mut stages = table(&["at", "stage", "outcome"], &[0]);
        for stage in &run.stages {
            let outcome = stage.outcome.clone().unwrap_or_default();
            stages.add_row([format!("{:.2} s", stage.started_s), stage.text.clone(), outcome]);
        }
        text.push(lines(&stages));
    }
    text.join("\n")
}
