//! A simulated bench with a daemon on it.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::Output;

use serde_json::Value;
use tempfile::TempDir;

use crate::api::Api;
use crate::control::Control;
use crate::process::{Program, run_to_end};
use crate::rewrite::set_resource;

/// The texts that a lab is made of; begin with the shipped ones and change what the test is about.
#[derive(Debug, Clone)]
pub struct LabPlan {
    /// The simulator's scenario.
    pub scenario: String,
    /// The bench file; the instruments' addresses are filled in.
    pub bench: String,
    /// More sequences for the bench's folder: name without ending, text.
    pub sequences: Vec<(String, String)>,
    /// Where an instrument is said to be, instead of where the simulator has it: name, VISA resource string.
    pub elsewhere: Vec<(String, String)>,
}

impl LabPlan {
    /// The same plan with one more sequence.
    #[must_use]
    pub fn with_sequence(mut self, name: &str, text: &str) -> Self {
        self.sequences.push((name.to_owned(), text.to_owned()));
        self
    }

    /// The same plan with one value of the bench file changed; see [`crate::set_in_table`].
    #[must_use]
    pub fn with_bench(mut self, table: &str, key: &str, value: &str) -> Self {
        self.bench = crate::set_in_table(&self.bench, table, key, value);
        self
    }

    /// The same plan with the simulator's control port, for [`Lab::control`].
    #[must_use]
    pub fn with_control(mut self) -> Self {
        self.scenario.push_str("\n[control]\nport = 0\n");
        self
    }

    /// The same plan with all instruments of one of the simulator's personalities, and with its dialect, which lies in
    /// `tests/dialects`.
    #[must_use]
    pub fn speaking(mut self, personality: &str) -> Self {
        let dialect = crate::project().join("tests/dialects").join(format!("{personality}.toml"));
        for (nth, name) in ["scope", "generator", "supply", "switch"].into_iter().enumerate() {
            let value = format!("0\npersonality = \"{personality}\"");
            self.scenario = crate::set_in_nth(&self.scenario, "[[instrument]]", nth, "port", &value);
            let table = format!("instrument.{name}");
            self.bench = crate::set_in_table(&self.bench, &table, "dialect", &format!("\"{}\"", dialect.display()));
        }
        self
    }

    /// The same plan with an instrument somewhere else, which is given half a second for each reply.
    #[must_use]
    pub fn with_instrument_at(mut self, instrument: &str, resource: &str) -> Self {
        let table = format!("instrument.{instrument}");
        self.bench = crate::set_in_table(&self.bench, &table, "dialect", "\"scpi-99\"\ntimeout = \"500 ms\"");
        self.elsewhere.push((instrument.to_owned(), resource.to_owned()));
        self
    }
}

impl Default for LabPlan {
    fn default() -> Self {
        let read = |path: &str| {
            let path = crate::project().join("configs").join(path);
            std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
        };
        Self {
            scenario: read("scenarios/greenhouse-fan.toml"),
            bench: read("benches/greenhouse-fan.toml"),
            sequences: vec![
                ("gate-night".to_owned(), read("sequences/gate-night.toml")),
                ("quick-look".to_owned(), read("sequences/quick-look.toml")),
            ],
            elsewhere: Vec::new(),
        }
    }
}

/// A simulated bench with a daemon on it.
#[derive(Debug)]
pub struct Lab {
    /// The daemon's API.
    pub api: Api,
    /// The daemon's address, such as `http://127.0.0.1:40001`.
    pub url: String,
    /// The simulator.
    pub sim: Program,
    /// The daemon.
    pub daemon: Program,
    /// Where the simulator has each instrument: name, VISA resource string.
    pub instruments: BTreeMap<String, String>,
    control: Option<String>,
    folder: TempDir,
}

impl Lab {
    /// Starts both programs and waits until they are ready.
    ///
    /// # Panics
    /// When one of them does not come up.
    pub async fn start(plan: &LabPlan) -> Self {
        let folder = tempfile::tempdir().expect("a temporary folder");
        let place = folder.path();
        let write = |name: &str, text: &str| {
            let path = place.join(name);
            std::fs::write(&path, text).expect("writing a test's file");
            path
        };
        let scenario = write("scenario.toml", &plan.scenario);
        let mut sim = Program::start(
            "evenpair-sim",
            &["--scenario", text(&scenario), "--exit-with-stdin"],
            &place.join("sim.log"),
        );
        let (mut instruments, mut control) = (BTreeMap::new(), None);
        loop {
            let line = sim.line().await.expect("the simulator becomes ready");
            if line == "ready" {
                break;
            }
            let told: Value = serde_json::from_str(&line).expect("the simulator tells JSON");
            let word = |key: &str| told[key].as_str().expect("name and resource").to_owned();
            if word("kind") == "control" {
                control = Some(word("resource"));
            } else {
                instruments.insert(word("name"), word("resource"));
            }
        }
        let mut bench = plan.bench.clone();
        for (name, resource) in instruments.iter().chain(plan.elsewhere.iter().map(|(name, at)| (name, at))) {
            bench = set_resource(&bench, name, resource);
        }
        std::fs::create_dir_all(place.join("sequences")).expect("a folder for sequences");
        for (name, sequence) in &plan.sequences {
            write(&format!("sequences/{name}.toml"), sequence);
        }
        bench = crate::set_in_table(&bench, "", "sequences", "\"sequences\"");
        write("bench.toml", &bench);
        let (daemon, url) = Self::start_daemon(place).await;
        Self { api: Api::new(&url), url, sim, daemon, instruments, control, folder }
    }

    async fn start_daemon(place: &Path) -> (Program, String) {
        let (bench, data) = (place.join("bench.toml"), place.join("data"));
        let arguments =
            ["--bench", text(&bench), "--data", text(&data), "--listen", "127.0.0.1:0", "--exit-with-stdin"];
        let mut daemon = Program::start("evenpaird", &arguments, &place.join("daemon.log"));
        let line = daemon.line().await;
        let Some(url) = line.as_deref().and_then(|line| line.strip_prefix("listening on ")) else {
            let log = std::fs::read_to_string(place.join("daemon.log")).unwrap_or_default();
            panic!("the daemon said {line:?}; its log:\n{log}");
        };
        let url = url.to_owned();
        (daemon, url)
    }

    /// Starts the daemon again on the same data, after it has ended.
    ///
    /// # Panics
    /// When it does not come up.
    pub async fn restart_daemon(&mut self) {
        let (daemon, url) = Self::start_daemon(self.folder.path()).await;
        self.daemon = daemon;
        self.api = Api::new(&url);
        self.url = url;
    }

    /// What an instrument of the simulator answers to a query over a connection of its own.
    ///
    /// # Panics
    /// When the scenario has no such instrument, or it does not answer.
    pub async fn ask(&self, instrument: &str, query: &str) -> String {
        let resource = self.instruments.get(instrument).unwrap_or_else(|| panic!("no instrument `{instrument}`"));
        crate::ask(resource, query).await
    }

    /// The simulator's control port.
    ///
    /// # Panics
    /// When the plan did not ask for it.
    pub async fn control(&self) -> Control {
        Control::connect(self.control.as_deref().expect("a plan with the control port")).await
    }

    /// Runs `evenpair` against this lab's daemon to its end.
    pub async fn evenpair(&self, arguments: &[&str]) -> Output {
        run_to_end("evenpair", &[&["--server", self.url.as_str()], arguments].concat()).await
    }

    /// What the daemon has logged.
    #[must_use]
    pub fn log(&self) -> String {
        std::fs::read_to_string(self.folder().join("daemon.log")).unwrap_or_default()
    }

    /// The folder that holds the bench file, the logs and `data`.
    #[must_use]
    pub fn folder(&self) -> &Path {
        self.folder.path()
    }

    /// The daemon's data folder.
    #[must_use]
    pub fn data(&self) -> PathBuf {
        self.folder.path().join("data")
    }
}

fn text(path: &Path) -> &str {
    path.to_str().expect("a temporary path is UTF-8")
}
