//! The demo's files: the shipped scenario, bench and sequences, laid out in one folder.

use std::path::{Path, PathBuf};

use crate::trouble::Trouble;

/// The daemon's log.
pub(super) const DAEMON_LOG: &str = "daemon.log";

/// The simulated bench's log.
pub(super) const BENCH_LOG: &str = "bench.log";

const SCENARIO: &str = include_str!("../../../configs/scenarios/greenhouse-fan.toml");
const BENCH: &str = include_str!("../../../configs/benches/greenhouse-fan.toml");
const SEQUENCES: [(&str, &str); 2] = [
    ("gate-night.toml", include_str!("../../../configs/sequences/gate-night.toml")),
    ("quick-look.toml", include_str!("../../../configs/sequences/quick-look.toml")),
];

/// Where everything of a demo lies.
#[derive(Debug, Clone)]
pub(super) struct Place {
    pub(super) folder: PathBuf,
    pub(super) scenario: PathBuf,
    pub(super) bench: PathBuf,
    pub(super) data: PathBuf,
}

/// An instrument of the simulated bench: name and VISA resource string.
pub(super) type Address = (String, String);

/// Writes the scenario and the sequences.
pub(super) fn lay_out(folder: &Path, seed: Option<u64>) -> Result<Place, Trouble> {
    let place = Place {
        folder: folder.to_owned(),
        scenario: folder.join("scenario.toml"),
        bench: folder.join("bench.toml"),
        data: folder.join("data"),
    };
    let sequences = folder.join("sequences");
    std::fs::create_dir_all(&sequences).map_err(|source| Trouble::File {
        doing: "making the folder",
        path: sequences.clone(),
        source,
    })?;
    let scenario = match seed {
        Some(seed) => with_value(SCENARIO, "", "seed", &seed.to_string()),
        None => Some(SCENARIO.to_owned()),
    };
    let scenario = scenario.ok_or_else(|| Trouble::Demo("the shipped scenario has no seed to replace".to_owned()))?;
    write(&place.scenario, &scenario)?;
    for (name, text) in SEQUENCES {
        write(&sequences.join(name), text)?;
    }
    Ok(place)
}

/// Writes the bench file with the addresses that the simulated instruments told.
pub(super) fn write_bench(place: &Place, addresses: &[Address]) -> Result<(), Trouble> {
    let mut text = with_value(BENCH, "", "sequences", "\"sequences\"");
    for (name, resource) in addresses {
        text = text
            .and_then(|text| with_value(&text, &format!("instrument.{name}"), "resource", &format!("\"{resource}\"")));
    }
    let text =
        text.ok_or_else(|| Trouble::Demo("the shipped bench file does not fit the simulated bench".to_owned()))?;
    write(&place.bench, &text)
}

fn write(path: &Path, text: &str) -> Result<(), Trouble> {
    std::fs::write(path, text).map_err(|source| Trouble::File { doing: "writing", path: path.to_owned(), source })
}

/// `text` with the line `key = …` of the table `[table]` (the top for an empty name) replaced; none if it has none.
/// Everything else, comments too, stays as it is.
fn with_value(text: &str, table: &str, key: &str, value: &str) -> Option<String> {
    let head = format!("[{table}]");
    let (mut inside, mut done) = (table.is_empty(), false);
    let lines: Vec<String> = text
        .lines()
        .map(|line| {
            if line.starts_with('[') {
                inside = line.trim_end() == head;
            }
            let is_key = line.split_once('=').is_some_and(|(name, _)| name.trim() == key);
            if inside && is_key && !done {
                done = true;
                return format!("{key} = {value}");
            }
            line.to_owned()
        })
        .collect();
    done.then(|| lines.join("\n") + "\n")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_the_wanted_line_changes() {
        let text = "seed = 1 # why\n[a]\nresource = \"x\"\n[b]\nresource = \"y\"\n";
        assert_eq!(with_value(text, "", "seed", "7").unwrap(), text.replace("seed = 1 # why", "seed = 7"));
        assert_eq!(with_value(text, "b", "resource", "\"z\"").unwrap(), text.replace("\"y\"", "\"z\""));
        assert_eq!(with_value(text, "c", "resource", "\"z\""), None);
        assert_eq!(with_value(text, "a", "seed", "1"), None);
    }

    #[test]
    fn the_shipped_files_fit_each_other() {
        let folder = tempfile::tempdir().unwrap();
        let place = lay_out(folder.path(), Some(99)).unwrap();
        assert!(std::fs::read_to_string(&place.scenario).unwrap().lines().any(|line| line == "seed = 99"));
        let addresses: Vec<Address> = ["scope", "generator", "supply", "switch"]
            .iter()
            .enumerate()
            .map(|(n, name)| ((*name).to_owned(), format!("TCPIP::127.0.0.1::{}::SOCKET", 6000 + n)))
            .collect();
        write_bench(&place, &addresses).unwrap();
        let bench = evenpair_core::bench::read(&std::fs::read_to_string(&place.bench).unwrap()).unwrap();
        assert_eq!(bench.instrument("supply").unwrap().resource.to_string(), "TCPIP::127.0.0.1::6002::SOCKET");
    }
}
