//! The bench.

use evenpair_api::{Bench, LinkState, Rest};

use super::quantity::with_uncertainty;
use super::table::{lines, table};

/// Instruments, pairs, references, settings and routes, with the cautions first.
pub(crate) fn bench(bench: &Bench) -> String {
    let rest = match bench.rest {
        Rest::Settled => "settled",
        Rest::Unsettled => "UNSETTLED: look at the bench before anything is started",
    };
    let mut parts = vec![format!("bench {}: {rest}", bench.name)];
    parts.extend(bench.cautions.iter().map(|caution| wrap(&format!("! {caution}"), 2)));

    let mut instruments = table(&["instrument", "link", "address, and who it says it is"], &[]);
    for instrument in &bench.instruments {
        let link = if instrument.link == LinkState::Up { "up" } else { "down" };
        let says = instrument.identity.as_deref().or(instrument.trouble.as_deref()).unwrap_or("");
        // `0` says that there are none (IEEE 488.2 10.20).
        let options = instrument.options.as_deref().filter(|options| !matches!(*options, "" | "0"));
        let options = options.map(|options| format!("\noptions {options}")).unwrap_or_default();
        instruments.add_row([&instrument.name, link, &format!("{}\n{says}{options}", instrument.resource)]);
    }
    parts.push(lines(&instruments));

    let mut pairs = table(&["pair", "scope", "positive", "negative", "correction"], &[]);
    for pair in &bench.pairs {
        let leg = |leg: &evenpair_api::Leg| format!("channel {}, ×{}", leg.channel, leg.probe.attenuation);
        let state = pair.correction.map_or_else(|| "none".to_owned(), |state| format!("{state:?}").to_lowercase());
        pairs.add_row([pair.name.clone(), pair.scope.clone(), leg(&pair.positive), leg(&pair.negative), state]);
    }
    parts.push(lines(&pairs));

    let mut references = table(&["reference", "kind", "route", "frequency"], &[3]);
    for reference in &bench.references {
        references.add_row([
            &reference.name,
            &reference.kind,
            &reference.route,
            &with_uncertainty(&reference.frequency),
        ]);
    }
    parts.push(lines(&references));

    let mut settings = table(&["setting", "instrument", "from", "to", "unit"], &[2, 3]);
    for setting in &bench.settings {
        settings.add_row([
            setting.name.clone(),
            setting.instrument.clone(),
            setting.min.to_string(),
            setting.max.to_string(),
            setting.unit.clone(),
        ]);
    }
    parts.push(lines(&settings));

    let mut routes = table(&["route", "connects"], &[]);
    for route in &bench.routes {
        routes.add_row([&route.name, &route.purpose]);
    }
    parts.push(lines(&routes));
    parts.retain(|part| part.contains('\n') || part.starts_with(['b', '!']));
    parts.join("\n\n")
}

/// Text broken at 78 columns, its further lines set in by `indent`.
pub(super) fn wrap(text: &str, indent: usize) -> String {
    let mut lines = vec![String::new()];
    for word in text.split_whitespace() {
        let line = lines.last_mut().map_or(0, |line| line.chars().count());
        if line > indent && line + 1 + word.chars().count() > 78 {
            lines.push(" ".repeat(indent.saturating_sub(1)));
        }
        if let Some(last) = lines.last_mut() {
            if !last.is_empty() {
                last.push(' ');
            }
            last.push_str(word);
        }
    }
    lines.join("\n")
}

#[cfg(test)]
mod tests {
    use super::wrap;

    #[test]
    fn long_text_is_broken_and_set_in() {
        let text = wrap(&format!("! {}", "word ".repeat(40)), 2);
        assert!(text.lines().count() > 2);
        assert!(text.lines().all(|line| line.chars().count() <= 78));
        assert!(text.lines().skip(1).all(|line| line.starts_with("  word")));
    }
}
