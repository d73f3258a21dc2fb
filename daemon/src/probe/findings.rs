//! What came of trying a dialect, as a table for people and as an exit status.

use std::fmt;

use evenpair_core::dialect::Intent;

/// What came of one intent.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Outcome {
    /// It did what the dialect says.
    Works,
    /// What came back is not what the dialect says, or not what had been set.
    Differs,
    /// The instrument put an entry into its error queue.
    Refused,
    /// It was not tried.
    Skipped,
}

impl Outcome {
    fn word(self) -> &'static str {
        match self {
            Self::Works => "works",
            Self::Differs => "differs",
            Self::Refused => "refused",
            Self::Skipped => "skipped",
        }
    }
}

/// One intent, tried.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Row {
    pub(crate) intent: Intent,
    pub(crate) outcome: Outcome,
    pub(crate) sent: String,
    pub(crate) received: String,
    /// Why, in words; empty where the outcome says all.
    pub(crate) why: String,
}

/// Everything that was found.
#[derive(Debug)]
pub(crate) struct Findings {
    head: String,
    rows: Vec<Row>,
}

/// How much of what was sent and received is shown in a line.
const SHOWN: usize = 56;

impl Findings {
    /// Nothing yet of this dialect at this address.
    pub(crate) fn new(dialect: &str, resource: &str, identity: Option<&str>) -> Self {
        let who = identity.map(|identity| format!(", which is {identity}")).unwrap_or_default();
        Self { head: format!("the dialect {dialect} at {resource}{who}"), rows: Vec::new() }
    }

    pub(crate) fn add(&mut self, row: Row) {
        self.rows.push(row);
    }

    /// Whether everything that was tried works, and something was.
    pub(crate) fn good(&self) -> bool {
        let count = |outcome| self.count(outcome);
        count(Outcome::Works) > 0 && count(Outcome::Differs) + count(Outcome::Refused) == 0
    }

    fn count(&self, outcome: Outcome) -> usize {
        self.rows.iter().filter(|row| row.outcome == outcome).count()
    }
}

impl fmt::Display for Findings {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(f, "{}", self.head)?;
        let widest =
            |text: fn(&Row) -> String| self.rows.iter().map(|row| text(row).chars().count()).max().unwrap_or(0);
        let sent_width = widest(|row| short(&row.sent));
        for row in &self.rows {
            let Row { intent, outcome, .. } = row;
            let (sent, received) = (short(&row.sent), short(&row.received));
            let arrow = if received.is_empty() { "" } else { "→ " };
            let (name, word) = (intent.name(), outcome.word());
            if sent.is_empty() {
                writeln!(f, "{name:17} {word:8} {}", row.why)?;
                continue;
            }
            let line = format!("{name:17} {word:8} {sent:sent_width$}  {arrow}{received}");
            writeln!(f, "{}", line.trim_end())?;
            if !row.why.is_empty() {
                writeln!(f, "{:17} {:8} {}", "", "", row.why)?;
            }
        }
        let counted = [Outcome::Works, Outcome::Differs, Outcome::Refused, Outcome::Skipped];
        let counted: Vec<String> =
            counted.iter().map(|&which| format!("{} {}", self.count(which), which.word())).collect();
        write!(f, "{}", counted.join(", "))
    }
}

/// A text on one line of limited length.
pub(super) fn short(text: &str) -> String {
    let mut line: String = text.chars().map(|c| if c.is_control() { '·' } else { c }).collect();
    if let Some((cut, _)) = line.char_indices().nth(SHOWN) {
        line.truncate(cut);
        line.push('…');
    }
    line
}

#[cfg(test)]
mod tests;
