//! The axes of a sweep: a setting and the values it takes.

use super::Context;
use crate::bench::field;
use crate::document::{Item, Table};

/// The most values of one axis; more than that between two ends is finer than any setting's resolution.
const MOST_VALUES: u32 = 10_000;

/// One axis.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Axis {
    /// The setting.
    pub(super) setting: String,
    /// Its values, in order, all within the setting's range.
    pub(super) values: Vec<f64>,
}

#[derive(Debug, Clone, Copy)]
enum Spacing {
    Linear,
    Logarithmic,
}

/// The axes of a sweep, the outermost first.
pub(super) fn read_list(table: &mut Table<'_>, context: &Context<'_>) -> Vec<Axis> {
    let tables = table.tables("axes");
    let help = "such as `axes = [{ setting = \"bus_voltage\", list = [\"24 V\", \"48 V\"] }]`";
    let _: Option<()> = table.missing("axes", help);
    let tables = tables.unwrap_or_default();
    if table.has("axes") && tables.is_empty() {
        table.mistakes().add(table.span(), "a sweep needs at least one axis", help);
    }
    let mut axes: Vec<Axis> = Vec::new();
    for mut entry in tables {
        let Some(axis) = read(&mut entry, context) else { continue };
        if axes.iter().any(|other| other.setting == axis.setting) {
            entry.mistakes().add(
                entry.span(),
                format!("`{}` is an axis of this sweep twice", axis.setting),
                "the inner one would undo the outer one; leave one out",
            );
        }
        axes.push(axis);
    }
    axes
}

fn read(table: &mut Table<'_>, context: &Context<'_>) -> Option<Axis> {
    let known: Vec<String> = context.bench.settings.iter().map(|setting| setting.name.clone()).collect();
    let name = field::name(table, "setting", "setting", &known)
        .or_else(|| table.missing("setting", "name the setting that is swept"));
    // Without the setting its unit is unknown, so that nothing more can be said about the values.
    let setting = name.and_then(|name| context.bench.setting(&name))?;
    let range = setting.min..=setting.max;
    let list = table.amounts("list", setting.unit);
    let from = table.amount("from", setting.unit);
    let to = table.amount("to", setting.unit);
    let count = field::whole(table, "count", &(2..=MOST_VALUES));
    let spacing =
        field::choice(table, "spacing", &[("linear", Spacing::Linear), ("logarithmic", Spacing::Logarithmic)]);
    table.refuse_others();
    let ends = ["from", "to", "count", "spacing"].iter().any(|key| table.has(key));
    if table.has("list") == ends {
        table.mistakes().add(
            table.span(),
            "an axis has either a `list`, or `from`, `to` and `count`",
            format!(
                "such as `list = [\"1 {0}\", \"2 {0}\"]` or `from = \"1 {0}\", to = \"2 {0}\", count = 5`",
                setting.unit
            ),
        );
        return None;
    }
    if table.has("list") {
        let list = list?;
        if list.is_empty() {
            table.mistakes().add(table.span(), "`list` is empty", "give at least one value");
        }
        let values: Vec<f64> =
            list.iter().filter_map(|item| field::in_range(table, "list", item, setting.unit, &range)).collect();
        return Some(Axis { setting: setting.name.clone(), values });
    }
    for key in ["from", "to", "count"] {
        let _: Option<()> = table.missing(key, "an axis without a `list` has `from`, `to` and `count`");
    }
    let (from, to, count) = (from?, to?, count?);
    for (key, end) in [("from", &from), ("to", &to)] {
        field::in_range(table, key, end, setting.unit, &range)?;
    }
    let values = spread(table, &from, &to, count, spacing.unwrap_or(Spacing::Linear))?;
    Some(Axis { setting: setting.name.clone(), values })
}

/// `count` values from `from` to `to`, both ends exact.
fn spread(table: &Table<'_>, from: &Item<f64>, to: &Item<f64>, count: u32, spacing: Spacing) -> Option<Vec<f64>> {
    let (a, b) = (from.value, to.value);
    if matches!(spacing, Spacing::Logarithmic) && (a <= 0.0 || b <= 0.0) {
        table.mistakes().add(
            if a <= 0.0 { from.span.clone() } else { to.span.clone() },
            "a logarithmic axis cannot reach zero or below",
            "begin above zero, or write `spacing = \"linear\"`",
        );
        return None;
    }
    let last = count.saturating_sub(1);
    let between = |i: u32| {
        let part = f64::from(i) / f64::from(last.max(1));
        match spacing {
            Spacing::Linear => a + (b - a) * part,
            Spacing::Logarithmic => a * (b / a).powf(part),
        }
    };
    Some(
        (0..count)
            .map(|i| {
                if i == 0 {
                    a
                } else if i == last {
                    b
                } else {
                    between(i)
                }
            })
            .collect(),
    )
}
