//! Instruments and probes.

use crate::bench::field;
use crate::bench::spec::{InstrumentSpec, ProbeSpec};
use crate::document::{Item, Table};
use crate::scpi::address::Resource;
use crate::units::Unit;

/// The time-out of a reply where the file states none: long enough for a megasample over a slow link.
const DEFAULT_TIMEOUT_S: f64 = 10.0;

/// A relative folder that stays below the bench file's own.
pub(super) fn folder(table: &Table<'_>, item: Item<String>) -> Option<String> {
    let parts: Vec<&str> = item.value.split('/').collect();
    if item.value.is_empty() || item.value.contains('\\') || parts[0].is_empty() || item.value.contains(':') {
        table.mistakes().add(
            item.span,
            format!("`sequences` cannot be `{}`", item.value),
            "write a folder relative to the bench file, with `/` between its parts, such as `\"../sequences\"`",
        );
        return None;
    }
    Some(item.value)
}

/// `[instrument.NAME]`
pub(super) fn instrument(name: String, table: &mut Table<'_>) -> Option<InstrumentSpec> {
    let resource = table
        .text("resource")
        .or_else(|| table.missing("resource", "write its VISA resource string, such as `TCPIP::host::5025::SOCKET`"))
        .and_then(|item| {
            item.value
                .parse::<Resource>()
                .map_err(|error| table.mistakes().add(item.span, error.to_string(), HELP))
                .ok()
        });
    let dialect =
        table.text("dialect").or_else(|| table.missing("dialect", "name a dialect; `scpi-99` comes with the program"));
    let scale_spec = field::number(table, "scale_spec", &(0.0..=0.5));
    let free_commands = table.flag("free_commands").is_some_and(|item| item.value);
    let timeout_s = field::amount(table, "timeout", Unit::Second, &(0.01..=3600.0)).unwrap_or(DEFAULT_TIMEOUT_S);
    table.refuse_others();
    Some(InstrumentSpec { name, resource: resource?, dialect: dialect?.value, scale_spec, free_commands, timeout_s })
}

const HELP: &str = "a resource string after VPP-4.3, such as `TCPIP::192.0.2.7::5025::SOCKET`";

/// `[probe.NAME]`
pub(super) fn probe(name: String, table: &mut Table<'_>) -> Option<ProbeSpec> {
    let attenuation = field::number(table, "attenuation", &(1.0..=100_000.0))
        .or_else(|| table.missing("attenuation", "volts at the tip per volt at the scope: 10 for a x10 probe"));
    let rating_v = field::amount(table, "rating", Unit::Volt, &(0.1..=1e5))
        .or_else(|| table.missing("rating", "the highest voltage to earth that its data sheet allows"));
    let resistance_ohm = field::amount(table, "resistance", Unit::Ohm, &(10.0..=1e12))
        .or_else(|| table.missing("resistance", "its input resistance, such as `\"10 MΩ\"`"));
    let capacitance_f = field::amount(table, "capacitance", Unit::Farad, &(0.0..=1e-6))
        .or_else(|| table.missing("capacitance", "its input capacitance, such as `\"9.5 pF\"`"));
    table.refuse_others();
    Some(ProbeSpec {
        name,
        attenuation: attenuation?,
        rating_v: rating_v?,
        resistance_ohm: resistance_ohm?,
        capacitance_f: capacitance_f?,
    })
}
