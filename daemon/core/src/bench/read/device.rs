//! Routes and settings: what a sequence may do to the device.

use std::collections::BTreeSet;

use crate::bench::spec::{RouteSpec, SettingSpec};
use crate::bench::{call, field};
use crate::dialect::ArgKind;
use crate::document::Table;
use crate::units::Unit;

/// The longest time to settle: an hour, a thermal time constant of a large heat sink.
const LONGEST_SETTLE_S: f64 = 3600.0;

/// `[route.NAME]`
pub(super) fn route(name: String, table: &mut Table<'_>, instruments: &[String]) -> Option<RouteSpec> {
    let purpose = table.text("purpose").or_else(|| table.missing("purpose", "say in words what it connects"));
    let calls = call::read_list(table, "calls", instruments);
    let _: Option<()> = table.missing("calls", "list the calls that make it: first open, then close");
    // Two routes closed at once can put the device's voltage onto the reference's source, so each opens first.
    let mut opened: BTreeSet<&str> = BTreeSet::new();
    for entry in &calls {
        match entry.call.intent.name() {
            "route.open" | "route.open_all" => {
                opened.insert(&entry.instrument);
            }
            "route.close" if !opened.contains(entry.instrument.as_str()) => table.mistakes().add(
                table.span(),
                format!("route `{name}` closes channels of `{}` before it opened the others", entry.instrument),
                format!("put `{{ instrument = \"{}\", call = \"route.open_all\" }}` before it", entry.instrument),
            ),
            "route.close" => {}
            other => table.mistakes().add(
                table.span(),
                format!("route `{name}` does `{other}`"),
                "a route only opens and closes: `route.open_all`, `route.open`, `route.close`",
            ),
        }
    }
    table.refuse_others();
    Some(RouteSpec { name, purpose: purpose?.value, calls })
}

/// `[setting.NAME]`
pub(super) fn setting(name: String, table: &mut Table<'_>, instruments: &[String]) -> Option<SettingSpec> {
    let argument = table.text("argument");
    let argument_span = argument.as_ref().map_or_else(|| table.span(), |item| item.span.clone());
    let argument = argument.map_or_else(|| "value".to_owned(), |item| item.value);
    let reading = call::read(table, instruments, Some(&argument));
    let unit =
        table.text("unit").or_else(|| table.missing("unit", "the value's unit, such as `\"V\"`")).and_then(|item| {
            let unit = Unit::from_symbol(&item.value);
            if unit.is_none() {
                table.mistakes().add(
                    item.span,
                    format!("`{}` is no unit that is understood", item.value),
                    "one of A, dB, F, Hz, Ω, 1, s, V, without a prefix",
                );
            }
            unit
        });
    let mut end = |key: &str| match unit {
        Some(unit) => table.amount(key, unit).or_else(|| table.missing(key, "the end of what this bench allows")),
        None => {
            // Without a unit the ends cannot be read, but they are no strangers either.
            let _ = table.has(key).then(|| table.number(key));
            None
        }
    };
    let (min, max) = (end("min"), end("max"));
    let settle_s = field::amount(table, "settle", Unit::Second, &(0.0..=LONGEST_SETTLE_S)).unwrap_or(0.0);
    let at_tip = table.flag("at_tip");
    let headroom_v = field::amount(table, "headroom", Unit::Volt, &(0.0..=1e5)).unwrap_or(0.0);
    if let (Some(item), Some(unit)) = (&at_tip, unit)
        && item.value
        && unit != Unit::Volt
    {
        table.mistakes().add(
            item.span.clone(),
            format!("`at_tip` says that `{name}` is a voltage at the tips, but its unit is {unit}"),
            "leave `at_tip` out, or give the setting the unit V",
        );
    }
    if let (Some(min), Some(max)) = (&min, &max)
        && min.value > max.value
    {
        table.mistakes().add(max.span.clone(), "`max` is below `min`", "exchange the two");
    }
    if let Some(entry) = &reading.call {
        let kind = entry.call.intent.spec().args.iter().find(|(known, _)| *known == argument).map(|(_, kind)| *kind);
        let wanted = call::unit_of(entry.call.intent, &argument);
        let call_name = entry.call.intent.name();
        if kind != Some(ArgKind::Number) {
            table.mistakes().add(
                argument_span,
                format!("`{call_name}` has no argument `{argument}` that is a number"),
                "write `argument = \"…\"` and the argument that takes the value",
            );
        } else if unit.is_some_and(|unit| unit != wanted) {
            table.mistakes().add(
                table.span(),
                format!(
                    "`{name}` has another unit than the argument `{argument}` of `{call_name}`, which is in {wanted}"
                ),
                format!("write `unit = \"{wanted}\"`"),
            );
        }
    }
    if reading.intent_known {
        table.refuse_others();
    }
    let setting = SettingSpec {
        name,
        call: reading.call?,
        argument,
        unit: unit?,
        min: min?.value,
        max: max?.value,
        settle_s,
        at_tip: at_tip.is_some_and(|item| item.value),
        headroom_v,
    };
    if let Err(error) = setting.call(setting.min).call.check() {
        table.mistakes().add(table.span(), error.to_string(), "see the calls and their arguments in configs/README.md");
    }
    Some(setting)
}
