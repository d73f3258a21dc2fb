//! The dialects that a bench's instruments speak: read once each, and able to say all that the bench wants to say.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use evenpair_core::bench::{Bench, BenchCall};
use evenpair_core::dialect::{self, Dialect, Mistaken, Source};

use crate::mistakes;

/// Why a bench's instruments cannot be spoken to.
#[derive(Debug, thiserror::Error)]
pub(crate) enum DialectTrouble {
    #[error("the dialect {name}: {count} mistake(s), shown above; nothing was started")]
    Mistakes { name: String, count: usize },
    #[error(
        "the instruments `{first}` and `{second}` are both at {resource}, but its dialect says that it serves one client \
         at a time; make one instrument of them"
    )]
    OneClient { first: String, second: String, resource: String },
    #[error("reading the dialect {}: {source}", path.display())]
    Read { path: PathBuf, source: std::io::Error },
    #[error(
        "there is no dialect `{dialect}` with this daemon; those that come with it: {known}. A file of your own is named \
         by its path, which ends in `.toml`"
    )]
    Unknown { dialect: String, known: String },
    #[error("the instrument `{instrument}` cannot do what the bench file asks of it: {what}")]
    Unspeakable { instrument: String, what: String },
}

/// Reads every dialect of the bench. A name that ends in `.toml` is a file beside the bench file.
pub(crate) fn read(bench: &Bench, bench_file: &Path) -> Result<BTreeMap<String, Arc<Dialect>>, DialectTrouble> {
    let mut dialects = BTreeMap::new();
    for instrument in &bench.instruments {
        if !dialects.contains_key(&instrument.dialect) {
            let dialect = load(&instrument.dialect, bench_file.parent().unwrap_or_else(|| Path::new(".")))?;
            dialects.insert(instrument.dialect.clone(), Arc::new(dialect));
        }
    }
    for (at, second) in bench.instruments.iter().enumerate() {
        let first = bench.instruments[..at].iter().find(|first| first.resource == second.resource);
        let single = dialects.get(&second.dialect).is_some_and(|dialect| dialect.one_client());
        if let (Some(first), true) = (first, single) {
            return Err(DialectTrouble::OneClient {
                first: first.name.clone(),
                second: second.name.clone(),
                resource: second.resource.to_string(),
            });
        }
    }
    for call in every_call(bench) {
        let spec = bench.instrument(&call.instrument);
        let Some(dialect) = spec.and_then(|spec| dialects.get(&spec.dialect)) else { continue };
        dialect.plan(&call.call).map_err(|error| DialectTrouble::Unspeakable {
            instrument: call.instrument.clone(),
            what: error.to_string(),
        })?;
    }
    Ok(dialects)
}

/// Reads the dialect of this name, or, when it ends in `.toml`, the file at this path within `folder`, with every
/// dialect that it is like. Mistakes are shown on standard error.
pub(crate) fn load(name: &str, folder: &Path) -> Result<Dialect, DialectTrouble> {
    let source = if is_path(name) {
        let path = folder.join(name);
        file(&path).map_err(|source| DialectTrouble::Read { path, source })?
    } else {
        let known = || dialect::bundled_names().collect::<Vec<_>>().join(", ");
        let unknown = || DialectTrouble::Unknown { dialect: name.to_owned(), known: known() };
        Source { place: name.to_owned(), text: dialect::bundled(name).ok_or_else(unknown)?.to_owned() }
    };
    let mut beside = |path: &str, place: &str| {
        let path = Path::new(place).parent().unwrap_or_else(|| Path::new(".")).join(path);
        file(&path).map_err(|error| format!("reading {}: {error}", path.display()))
    };
    Dialect::read_from(source, &mut beside).map_err(|found| {
        for Mistaken { source, mistakes } in &found {
            mistakes::show(Path::new(&source.place), &source.text, mistakes);
        }
        let count = found.iter().map(|mistaken| mistaken.mistakes.len()).sum();
        DialectTrouble::Mistakes { name: name.to_owned(), count }
    })
}

fn is_path(name: &str) -> bool {
    Path::new(name).extension().is_some_and(|ending| ending.eq_ignore_ascii_case("toml"))
}

/// A file by its one true path, so that it is known again when it is come upon twice.
fn file(path: &Path) -> std::io::Result<Source> {
    let place: PathBuf = path.canonicalize()?;
    Ok(Source { text: std::fs::read_to_string(&place)?, place: place.display().to_string() })
}

/// Everything that the bench file says to an instrument; settings at their lowest value.
fn every_call(bench: &Bench) -> Vec<BenchCall> {
    let routes = bench.routes.iter().flat_map(|route| route.calls.clone());
    let references =
        bench.references.iter().flat_map(|reference| [reference.start.clone(), reference.stop.clone()].concat());
    let settings = bench.settings.iter().map(|setting| setting.call(setting.min));
    let calls = bench.prepare.iter().chain(&bench.safe).cloned();
    calls.chain(routes).chain(references).chain(settings).collect()
}
