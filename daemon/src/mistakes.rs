//! Mistakes of a bench file or a dialect, shown with file, line and a caret.

use std::path::Path;

use evenpair_core::document::Mistake;

/// Shows every mistake on standard error.
pub(crate) fn show(path: &Path, text: &str, mistakes: &[Mistake]) {
    for mistake in mistakes {
        let labels = vec![miette::LabeledSpan::at(mistake.span.clone(), "here")];
        let report = miette::miette!(labels = labels, help = mistake.help.clone(), "{}", mistake.what)
            .with_source_code(miette::NamedSource::new(path.display().to_string(), text.to_owned()));
        eprintln!("{report:?}");
    }
}
