//! A program of the project, started as a user would start it, and ended when the test is over.

use std::path::PathBuf;
use std::process::{Output, Stdio};
use std::time::Duration;

use tokio::io::{AsyncBufReadExt, BufReader, Lines};
use tokio::process::{Child, ChildStdin, ChildStdout, Command};

/// The longest that anything a test waits for may take; far above what it takes on a slow machine, so that only a hang
/// reaches it.
pub(crate) const PATIENCE: Duration = Duration::from_secs(120);

/// The path of a binary of this workspace, built with the profile that the tests run in.
///
/// # Panics
/// When it was not built: `cargo test` builds only the binaries of the package under test.
#[must_use]
pub fn binary(name: &str) -> PathBuf {
    let test = std::env::current_exe().expect("a test knows its own path");
    let path = test.ancestors().nth(2).expect("a test lies in target/PROFILE/deps").join(name);
    assert!(
        path.exists(),
        "{} is not built; run `cargo build --workspace --bins` with the same profile first",
        path.display()
    );
    path
}

/// A running program whose standard output is read line by line.
#[derive(Debug)]
pub struct Program {
    name: String,
    child: Child,
    lines: Lines<BufReader<ChildStdout>>,
    /// Kept open: waiting for a child would close it, and its end is a reason to end of its own.
    stdin: Option<ChildStdin>,
}

impl Program {
    /// Starts `name` with `arguments`; its log goes to `log`.
    ///
    /// # Panics
    /// When it does not start.
    #[must_use]
    pub fn start(name: &str, arguments: &[&str], log: &std::path::Path) -> Self {
        let log = std::fs::File::options().create(true).append(true).open(log).expect("opening the log");
        let mut child = Command::new(binary(name))
            .args(arguments)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(log)
            .kill_on_drop(true)
            .spawn()
            .unwrap_or_else(|error| panic!("starting {name}: {error}"));
        let stdout = child.stdout.take().expect("standard output is piped");
        let stdin = child.stdin.take();
        Self { name: name.to_owned(), child, lines: BufReader::new(stdout).lines(), stdin }
    }

    /// The next line of its standard output; none once it has ended.
    ///
    /// # Panics
    /// When none comes for too long.
    pub async fn line(&mut self) -> Option<String> {
        let line = tokio::time::timeout(PATIENCE, self.lines.next_line()).await;
        line.unwrap_or_else(|_| panic!("{} says nothing", self.name)).expect("reading standard output")
    }

    /// Its process number.
    #[must_use]
    pub fn id(&self) -> Option<u32> {
        self.child.id()
    }

    /// Closes its standard input.
    pub fn close_stdin(&mut self) {
        self.stdin = None;
    }

    /// Asks it to end by `signal` (such as `TERM`) and waits until it has.
    ///
    /// # Panics
    /// When it does not end.
    pub async fn signal(&mut self, signal: &str) -> std::process::ExitStatus {
        if let Some(id) = self.child.id() {
            let sent = Command::new("kill").arg(format!("-{signal}")).arg(id.to_string()).status().await;
            assert!(sent.is_ok_and(|status| status.success()), "kill -{signal} {id}");
        }
        self.ended().await
    }

    /// Waits until it has ended by itself.
    ///
    /// # Panics
    /// When it does not.
    pub async fn ended(&mut self) -> std::process::ExitStatus {
        let status = tokio::time::timeout(PATIENCE, self.child.wait()).await;
        status.unwrap_or_else(|_| panic!("{} does not end", self.name)).expect("waiting for the program")
    }
}

/// Runs a program to its end and returns all it said.
///
/// # Panics
/// When it cannot be started or does not end.
pub async fn run_to_end(name: &str, arguments: &[&str]) -> Output {
    let run = Command::new(binary(name)).args(arguments).stdin(Stdio::null()).kill_on_drop(true).output();
    let output = tokio::time::timeout(PATIENCE, run).await;
    output.unwrap_or_else(|_| panic!("{name} {arguments:?} does not end")).expect("running the program")
}

/// The command lines of the processes that run now and name `path` in theirs.
///
/// # Panics
/// When `/proc` cannot be read.
#[must_use]
pub fn processes_naming(path: &std::path::Path) -> Vec<String> {
    let path = path.to_str().expect("a temporary path is UTF-8");
    let entries = std::fs::read_dir("/proc").expect("the list of processes");
    // A process that ends meanwhile has no command line to read any more.
    let lines = entries.flatten().filter_map(|entry| std::fs::read(entry.path().join("cmdline")).ok());
    let lines = lines.map(|line| String::from_utf8_lossy(&line).replace('\0', " "));
    lines.filter(|line| line.contains(path)).collect()
}
