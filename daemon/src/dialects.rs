//! The dialects that a bench's instruments speak: read once each, and able to say all that the bench wants to say.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use evenpair_core::bench::{Bench, BenchCall};
use evenpair_core::dialect::{self, Dialect};

use crate::mistakes;

/// Why a bench's instruments cannot be spoken to.
#[derive(Debug, thiserror::Error)]
pub(crate) enum DialectTrouble {
    #[error("the dialect {}: {count} mistake(s), shown above; nothing was started", path.display())]
    Mistakes { path: PathBuf, count: usize },
    #[error("reading the dialect {} of the instrument `{instrument}`: {source}", path.display())]
    Read { instrument: String, path: PathBuf, source: std::io::Error },
    #[error(
        "the instrument `{instrument}` speaks the dialect `{dialect}`, which does not come with this daemon; those that \
         do: {known}. A file of your own is named by its path, which ends in `.toml`"
    )]
    Unknown { instrument: String, dialect: String, known: String },
    #[error("the instrument `{instrument}` cannot do what the bench file asks of it: {what}")]
    Unspeakable { instrument: String, what: String },
}

/// Reads every dialect of the bench. A name that ends in `.toml` is a file beside the bench file.
pub(crate) fn read(bench: &Bench, bench_file: &Path) -> Result<BTreeMap<String, Arc<Dialect>>, DialectTrouble> {
    let mut dialects = BTreeMap::new();
    for instrument in &bench.instruments {
        if !dialects.contains_key(&instrument.dialect) {
            let dialect = read_one(&instrument.name, &instrument.dialect, bench_file)?;
            dialects.insert(instrument.dialect.clone(), Arc::new(dialect));
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

fn read_one(instrument: &str, name: &str, bench_file: &Path) -> Result<Dialect, DialectTrouble> {
    let (path, text) = if Path::new(name).extension().is_some_and(|ending| ending == "toml") {
        let path = bench_file.parent().unwrap_or_else(|| Path::new(".")).join(name);
        let text = std::fs::read_to_string(&path).map_err(|source| DialectTrouble::Read {
            instrument: instrument.to_owned(),
            path: path.clone(),
            source,
        })?;
        (path, text)
    } else {
        let text = dialect::bundled(name).ok_or_else(|| DialectTrouble::Unknown {
            instrument: instrument.to_owned(),
            dialect: name.to_owned(),
            known: dialect::bundled_names().collect::<Vec<_>>().join(", "),
        })?;
        (PathBuf::from(name), text.to_owned())
    };
    Dialect::read(&text).map_err(|found| {
        mistakes::show(&path, &text, &found);
        DialectTrouble::Mistakes { path, count: found.len() }
    })
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
