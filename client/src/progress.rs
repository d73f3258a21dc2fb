//! Progress of a run: a bar on a terminal, plain lines elsewhere.

use std::io::IsTerminal;

use evenpair_api::{Event, EventKind};
use indicatif::{ProgressBar, ProgressStyle};

use crate::output;
use crate::render;
use crate::trouble::Trouble;

/// Shows the events of a run as they come.
pub(crate) struct Progress {
    bar: Option<ProgressBar>,
    /// Nothing is shown: what is printed is for a program.
    silent: bool,
    last: String,
}

impl Progress {
    /// For standard output; `silent` shows nothing.
    pub(crate) fn new(silent: bool) -> Self {
        let bar = (!silent && std::io::stdout().is_terminal()).then(|| {
            let bar = ProgressBar::new(1);
            let style = ProgressStyle::with_template("{bar:24} {pos}/{len} {wide_msg}");
            bar.set_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()));
            bar
        });
        Self { bar, silent, last: String::new() }
    }

    /// Shows one event.
    pub(crate) fn show(&mut self, event: &Event) -> Result<(), Trouble> {
        match &event.kind {
            EventKind::Progressed { progress } => {
                if let Some(bar) = &self.bar {
                    bar.set_length(progress.total.max(1));
                    bar.set_position(progress.done);
                    bar.set_message(progress.doing.clone());
                    return Ok(());
                }
                let line = format!("[{}/{}] {}", progress.done, progress.total, progress.doing);
                if progress.doing.is_empty() || line == self.last {
                    return Ok(());
                }
                self.last.clone_from(&line);
                self.line(event, &line)
            }
            EventKind::Captured { capture } => self.line(event, &render::capture_summary(capture)),
            EventKind::Corrected { correction } => self.line(
                event,
                &format!("correction of {}: skew {}", correction.pair, render::with_uncertainty(&correction.skew)),
            ),
            EventKind::StateChanged { state, reason } => {
                if state.ended()
                    && let Some(bar) = &self.bar
                {
                    bar.finish_and_clear();
                }
                let reason = reason.as_ref().map(|reason| format!(": {reason}")).unwrap_or_default();
                self.line(event, &format!("{}{reason}", format!("{state:?}").to_lowercase()))
            }
        }
    }

    fn line(&self, event: &Event, text: &str) -> Result<(), Trouble> {
        let text = render::wrap(&format!("{:8.2} s  {text}", event.at_s), 12);
        match &self.bar {
            _ if self.silent => Ok(()),
            Some(bar) => bar.suspend(|| output::print(&text)),
            None => output::print(&text),
        }
    }
}
