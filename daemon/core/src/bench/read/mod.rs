//! From the text of a bench file to a checked [`Bench`], with every mistake at its place.
//!
//! Tables are read in the order in which they name each other, so that a name can be checked where it stands; a
//! declaration that is itself wrong still counts as declared, or one mistake would grow into ten.

mod device;
mod pair;
mod parts;
mod reference;

use super::spec::Bench;
use super::{Role, call, field};
use crate::document::{self, Item, Mistake, Table};

pub(crate) use reference::overrides;
pub use reference::{OFFSETS_V, SPANS_V};

/// The names that the file declares, whether or not their tables are right.
#[derive(Debug, Default)]
struct Declared {
    instruments: Vec<String>,
    probes: Vec<String>,
    references: Vec<String>,
    routes: Vec<String>,
    settings: Vec<String>,
}

/// Reads and checks a bench file.
///
/// # Errors
/// Every mistake in it, sorted by place.
pub fn read(text: &str) -> Result<Bench, Vec<Mistake>> {
    document::read(text, bench)
}

fn bench(top: &mut Table<'_>) -> Option<Bench> {
    let name = top.text("name").or_else(|| top.missing("name", "give the bench a name: `name = \"…\"`"));
    let sequences = top.text("sequences").and_then(|item| parts::folder(top, item));
    let cautions = top.texts("cautions").unwrap_or_default().into_iter().map(|item| item.value).collect();

    let instruments = entries(top, "instrument");
    let probes = entries(top, "probe");
    let routes = entries(top, "route");
    let settings = entries(top, "setting");
    let references = entries(top, "reference");
    let pairs = entries(top, "pair");
    for (kind, empty, why) in [
        ("instrument", instruments.is_empty(), "declare each as `[instrument.NAME]`"),
        ("pair", pairs.is_empty(), "declare each as `[pair.NAME]`: without one nothing can be measured"),
    ] {
        if empty {
            let _: Option<()> = top.missing(kind, why);
        }
    }
    let declared = Declared {
        instruments: names(&instruments),
        probes: names(&probes),
        references: names(&references),
        routes: names(&routes),
        settings: names(&settings),
    };

    let instruments = each(instruments, parts::instrument);
    let probes = each(probes, parts::probe);
    let routes = each(routes, |name, table| device::route(name, table, &declared.instruments));
    let settings = each(settings, |name, table| device::setting(name, table, &declared.instruments));
    let references = each(references, |name, table| reference::reference(name, table, &declared, &settings));
    let places: Vec<Item<String>> = pairs.iter().map(|(name, _)| name.clone()).collect();
    let pairs = each(pairs, |name, table| pair::pair(name, table, &declared, &probes));
    let prepare = call::read_list(top, "prepare", &declared.instruments);
    let safe = call::read_list(top, "safe", &declared.instruments);
    if safe.is_empty() {
        let help = "list the calls that bring the bench to rest, each as `[[safe]]`: it is what happens on any failure";
        let _: Option<()> = top.missing("safe", help);
    }

    let bench = Bench {
        name: name?.value,
        sequences,
        cautions,
        instruments,
        pairs,
        references,
        settings,
        routes,
        prepare,
        safe,
    };
    check_references(&bench, &places, top);
    Some(bench)
}

/// Whether each pair's own references suit it.
fn check_references(bench: &Bench, places: &[Item<String>], top: &Table<'_>) {
    for pair in &bench.pairs {
        let Some(place) = places.iter().find(|place| place.value == pair.name) else { continue };
        for (name, role) in [(&pair.skew_reference, Role::Skew), (&pair.gain_reference, Role::Gain)] {
            let Some(reference) = bench.reference(name) else { continue };
            for why in bench.misfits(pair, reference, role) {
                top.mistakes().add(
                    place.span.clone(),
                    why,
                    format!("change `[reference.{name}]` or `[pair.{}]`, or take another reference", pair.name),
                );
            }
        }
    }
}

type Entries<'t> = Vec<(Item<String>, Table<'t>)>;

/// The named tables of a kind in the order of the text.
fn entries<'t>(top: &mut Table<'t>, kind: &str) -> Entries<'t> {
    let mut entries = top.named_tables(kind);
    entries.sort_by_key(|(name, _)| name.span.start);
    for (name, _) in entries.iter().filter(|(name, _)| !field::is_name(&name.value)) {
        top.mistakes().add(
            name.span.clone(),
            format!("`{}` cannot be a name", name.value),
            "a letter, then letters, digits, `_` and `-`, at most 64 in all",
        );
    }
    entries
}

fn names(entries: &Entries<'_>) -> Vec<String> {
    entries.iter().map(|(name, _)| name.value.clone()).collect()
}

/// Reads each table and refuses the keys that its reader did not ask for.
fn each<T>(entries: Entries<'_>, mut read: impl FnMut(String, &mut Table<'_>) -> Option<T>) -> Vec<T> {
    entries.into_iter().filter_map(|(name, mut table)| read(name.value, &mut table)).collect()
}
