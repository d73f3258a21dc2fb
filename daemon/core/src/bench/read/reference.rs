//! References, and what they and captures may acquire differently from the pair.

use std::ops::RangeInclusive;

use super::Declared;
use crate::bench::spec::{ReferenceKind, ReferenceSpec, SettingSpec};
use crate::bench::{Overrides, Slope, Trigger, call, field};
use crate::document::Table;
use crate::units::Unit;

/// The longest record: 10,000,000 samples, 80 MB for each leg as `f64`; two captures may be in memory at once.
const MOST_POINTS: u32 = 10_000_000;

/// The fewest samples of which an edge and two levels can be told.
const FEWEST_POINTS: u32 = 100;

/// The most sweeps of one record: at a hundred sweeps a second that takes ten minutes.
const MOST_AVERAGES: u32 = 65_536;

/// The spans at the tip that can be meant, in volts.
pub const SPANS_V: RangeInclusive<f64> = 1e-4..=1e5;

/// The middles of a span that can be meant, in volts.
pub const OFFSETS_V: RangeInclusive<f64> = -1e5..=1e5;

/// `[reference.NAME]`
pub(super) fn reference(
    name: String,
    table: &mut Table<'_>,
    declared: &Declared,
    settings: &[SettingSpec],
) -> Option<ReferenceSpec> {
    let kind = field::choice(table, "kind", &ReferenceKind::NAMES)
        .or_else(|| table.missing("kind", "one of in-situ, multitone, pulse, sine, square"));
    let route = field::name(table, "route", "route", &declared.routes);
    if !declared.routes.is_empty() {
        let _: Option<()> = table.missing("route", "name the route that brings it to both tips");
    }
    let frequency_hz = field::amount(table, "frequency", Unit::Hertz, &(1e-3..=1e11))
        .or_else(|| table.missing("frequency", "its repetition frequency, such as `\"1 MHz\"`"));
    let low_v = field::amount(table, "low", Unit::Volt, &(-1e5..=1e5))
        .or_else(|| table.missing("low", "its lowest level at the tips"));
    let high = table.amount("high", Unit::Volt).or_else(|| table.missing("high", "its highest level at the tips"));
    if let (Some(low_v), Some(high)) = (low_v, &high)
        && high.value <= low_v
    {
        table.mistakes().add(high.span.clone(), "`high` is not above `low`", "a reference must move");
    }
    let edge_s = field::amount(table, "edge", Unit::Second, &(1e-13..=1.0));
    let u_level_v = field::amount(table, "u_level", Unit::Volt, &(0.0..=1e3));
    let carry_u_s = field::amount(table, "carry", Unit::Second, &(0.0..=1e-6));
    let needed = table.table("settings").map_or_else(Vec::new, |mut inner| needed(&mut inner, declared, settings));
    let start = call::read_list(table, "start", &declared.instruments);
    let stop = call::read_list(table, "stop", &declared.instruments);
    let overrides = overrides(table);
    table.refuse_others();
    Some(ReferenceSpec {
        name,
        kind: kind?,
        route,
        frequency_hz: frequency_hz?,
        low_v: low_v?,
        high_v: high?.value,
        edge_s,
        u_level_v,
        settings: needed,
        start,
        stop,
        overrides,
        carry_u_s,
    })
}

/// The settings that a reference needs, each within its range, in the order of the text.
fn needed(table: &mut Table<'_>, declared: &Declared, settings: &[SettingSpec]) -> Vec<(String, f64)> {
    let mut keys = table.keys();
    keys.sort_by_key(|key| key.span.start);
    let mut found = Vec::new();
    for key in keys {
        let Some(setting) = settings.iter().find(|setting| setting.name == key.value) else {
            if !declared.settings.contains(&key.value) {
                field::unknown(table, &key, "setting", &declared.settings);
            }
            continue;
        };
        if let Some(value) = field::amount(table, &key.value, setting.unit, &(setting.min..=setting.max)) {
            found.push((key.value, value));
        }
    }
    found
}

/// The keys that say how records are acquired; those that are absent stay as the pair has them.
pub(crate) fn overrides(table: &mut Table<'_>) -> Overrides {
    Overrides {
        span_v: field::amount(table, "span", Unit::Volt, &SPANS_V),
        offset_v: field::amount(table, "offset", Unit::Volt, &OFFSETS_V),
        interval_s: field::amount(table, "interval", Unit::Second, &(1e-13..=10.0)),
        points: field::whole(table, "points", &(FEWEST_POINTS..=MOST_POINTS)),
        averages: field::whole(table, "averages", &(1..=MOST_AVERAGES)),
        position: field::number(table, "position", &(0.0..=1.0)),
        trigger: table.table("trigger").and_then(|mut inner| trigger(&mut inner)),
    }
}

fn trigger(table: &mut Table<'_>) -> Option<Trigger> {
    let channel = field::whole(table, "channel", &(0..=64))
        .or_else(|| table.missing("channel", "a channel of the pair, or 0 for the external input"));
    let level_v = field::amount(table, "level", Unit::Volt, &(-1e5..=1e5))
        .or_else(|| table.missing("level", "the level to cross: at the tip for a channel"));
    let slope = field::choice(table, "slope", &[("negative", Slope::Negative), ("positive", Slope::Positive)]);
    table.refuse_others();
    Some(Trigger { channel: channel?, level_v: level_v?, slope: slope.unwrap_or(Slope::Positive) })
}
