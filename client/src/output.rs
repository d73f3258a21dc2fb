//! Standard output that survives a reader who stops reading.

use std::io::Write;

use serde::Serialize;

use crate::trouble::Trouble;

/// Prints text as it is, with a line's end.
pub(crate) fn print(text: &str) -> Result<(), Trouble> {
    let mut out = std::io::stdout().lock();
    // Flushed at once: whoever watches a pipe sees progress when it happens.
    let written = writeln!(out, "{}", text.trim_end_matches('\n')).and_then(|()| out.flush());
    written.map_err(|source| match source.kind() {
        std::io::ErrorKind::BrokenPipe => Trouble::NoReader,
        _ => Trouble::File { doing: "writing to", path: "standard output".into(), source },
    })
}

/// Prints one JSON document.
pub(crate) fn print_json(value: &impl Serialize) -> Result<(), Trouble> {
    let text = serde_json::to_string_pretty(value)
        .map_err(|error| Trouble::Demo(format!("making JSON of the answer: {error}")))?;
    print(&text)
}
