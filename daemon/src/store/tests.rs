//! Opening, closing, locking; and what every other test of the store starts from: samples of each thing, and a disk
//! that fails on demand.
#![allow(clippy::unwrap_used)]

use std::collections::BTreeMap;
use std::io::{self, Write};
use std::sync::Mutex;
use std::sync::atomic::{AtomicUsize, Ordering};

use evenpair_api::{
    Capture, Carried, Condition, Correction, CorrectionConditions, CorrectionFreedom, CorrectionState, CorrelatedTerm,
    Coverage, CoverageBasis, Figure, Grade, LeakBound, LegConditions, LimitFailure, LimitVerdict, Quantity,
    RejectionPoint, Run, RunKind, RunProgress, RunState, StageReport, UncertaintyTerm,
};
use evenpair_core::analysis::{Record, Samples};
use rusqlite::types::Value;
use tempfile::TempDir;
use uuid::Uuid;

use super::disk::Output;
use super::*;

pub(super) fn open(folder: &TempDir) -> Store {
    Store::open(folder.path()).unwrap()
}

pub(super) fn a_run(second: i64) -> Run {
    Run {
        id: Uuid::now_v7(),
        kind: RunKind::Sequence,
        title: "gate over supply and load".to_owned(),
        state: RunState::Running,
        created_at: jiff::Timestamp::new(1_790_000_000 + second, 120_000_000).unwrap(),
        started_at: Some(jiff::Timestamp::new(1_790_000_001 + second, 7).unwrap()),
        ended_at: None,
        progress: RunProgress { done: 3, total: 40, doing: "set bus_voltage to 48 V".to_owned(), captures: 0 },
        reason: None,
        failures: vec![LimitFailure { capture: 1, figure: "high_level".to_owned(), text: "13.2 V > 13 V".to_owned() }],
        stages: vec![StageReport {
            step: 0,
            text: "route to the gate".to_owned(),
            started_s: 0.1,
            ended_s: None,
            outcome: None,
        }],
        generation: 4,
    }
}

pub(super) fn a_correction(pair: &str, second: i64) -> Correction {
    let leg = |channel, offset| LegConditions {
        channel,
        span: Quantity::exact(80.0, "V"),
        offset: Quantity::exact(offset, "V"),
        coupling: "DC".to_owned(),
        attenuation: 10.0,
        probe: "p10a".to_owned(),
    };
    Correction {
        id: Uuid::now_v7(),
        pair: pair.to_owned(),
        made_at: jiff::Timestamp::new(1_790_000_000 + second, 0).unwrap(),
        skew: Quantity::new(1.234_567_890_123e-9, 4.5e-12, "s"),
        gain: Quantity::new(0.987_654_321, 1.0 / 3.0e4, "1"),
        offset: Quantity::new(-0.1 - 0.2, 1e-3, "V"),
        gain_offset_correlation: Some(-0.7),
        compensation: None,
        response: None,
        limit: None,
        freedom: CorrectionFreedom { skew: None, gain: Some(3.0), offset: Some(11.0 / 3.0) },
        limited_by: Some("noise: more acquisitions or faster edges help".to_owned()),
        scope_skew: Quantity::exact(1.2e-9, "s"),
        state: CorrectionState::Fresh,
        reasons: Vec::new(),
        rejection: vec![RejectionPoint {
            frequency_hz: 1e6,
            before_db: 39.96,
            after_db: 78.5,
            floor_db: 78.5,
            at_least: true,
        }],
        conditions: CorrectionConditions {
            scope_identity: "EVENPAIR,SIMULATED SCOPE,1,0".to_owned(),
            positive: leg(1, 24.0),
            negative: leg(2, 20.0),
            skew_reference: "square".to_owned(),
            gain_reference: "node".to_owned(),
            carried: Some(Carried { from_span: Quantity::exact(8.0, "V"), added: Quantity::exact(20e-12, "s") }),
        },
        transferred_from: None,
        acquisitions: 12,
        warnings: vec!["little dither".to_owned()],
    }
}

pub(super) fn a_capture(run: Uuid, number: u32, correction: Option<&Correction>, points: usize) -> Capture {
    let term = |name: &str, u, share| UncertaintyTerm {
        name: name.to_owned(),
        u,
        sensitivity: None,
        distribution: "normal".to_owned(),
        correlated: None,
        kind: "B".to_owned(),
        freedom: None,
        share,
    };
    let correlated = |term: UncertaintyTerm, with: &str| UncertaintyTerm {
        sensitivity: Some(-48.0 / 7.0),
        freedom: Some(17.25),
        correlated: Some(CorrelatedTerm { with: with.to_owned(), coefficient: -0.7 }),
        ..term
    };
    Capture {
        run,
        number,
        pair: "gate".to_owned(),
        made_at: jiff::Timestamp::new(1_790_000_100 + i64::from(number), 5).unwrap(),
        conditions: vec![
            Condition { setting: "bus_voltage".to_owned(), value: Quantity::exact(48.0, "V") },
            Condition { setting: "fan_load".to_owned(), value: Quantity::new(0.5, 0.01, "A") },
        ],
        correction: correction.map(|correction| correction.id),
        correction_state: correction.map(|_| CorrectionState::Fresh),
        figures: vec![
            Figure {
                name: "high_level".to_owned(),
                quantity: Quantity::new(12.1 + f64::from(number) / 3.0, 0.011, "V"),
                coverage: Some(Coverage { low: 12.0, high: 12.2, basis: CoverageBasis::CommonMode }),
                plain: Some(12.9),
                grade: Grade::Shaded,
                valid: true,
                why: None,
                budget: vec![term("noise", 0.01, 0.8), correlated(term("gain", 0.005, 0.2), "offset")],
            },
            Figure {
                name: "rise_time".to_owned(),
                quantity: Quantity::exact(0.0, "s"),
                coverage: None,
                plain: None,
                grade: Grade::Clean,
                valid: false,
                why: Some("the record holds no rising edge".to_owned()),
                budget: vec![term("skew", 1e-12, 1.0)],
            },
        ],
        leak: LeakBound {
            rms: Quantity::exact(0.002, "V"),
            peak: Quantity::new(0.03, 0.004, "V"),
            common_rms: Quantity::exact(22.0, "V"),
            common_swing: Quantity::exact(48.3, "V"),
        },
        limits: vec![LimitVerdict {
            figure: "high_level".to_owned(),
            min: Some(11.0),
            max: None,
            passed: true,
            uncertain: false,
        }],
        warnings: vec!["3 samples clipped on the negative leg".to_owned()],
        points: points as u64,
        sample_interval: Quantity::exact(0.8e-9, "s"),
        file: String::new(),
    }
}

pub(super) fn a_waveform(points: usize) -> Waveform {
    let codes = |seed: i64| {
        let code = |k: usize| i16::try_from((k as i64 * 7919 + seed) % 60_001 - 30_000).unwrap();
        Samples::Codes((0..points).map(code).collect())
    };
    let record = |seed, zero_v| Record {
        samples: codes(seed),
        volts_per_code: 80.0 / 65_536.0 / 3.0,
        zero_v,
        interval_s: 0.8e-9,
        start_s: -1.0e-5 / 3.0,
        end_codes: (-32_768.0, 32_767.0),
        step_v: 80.0 / 256.0,
        averages: 16,
    };
    let first_valid = points.min(30);
    Waveform {
        positive: record(1, 24.1),
        negative: record(5, 23.9),
        difference_v: (first_valid..points.saturating_sub(20)).map(|k| (k as f32 * 0.01).sin() / 3.0).collect(),
        first_valid,
        metadata: BTreeMap::from([("note".to_owned(), "warm".to_owned())]),
    }
}

/// A disk that fails from its `fail_at`-th step on (from 0), or never. A crash is one whose clean-up fails as well; a
/// full disk can still remove.
pub(super) struct FaultyDisk {
    pub(super) fail_at: usize,
    pub(super) crash: bool,
    pub(super) steps: Arc<AtomicUsize>,
    pub(super) names: Arc<Mutex<Vec<&'static str>>>,
}

impl FaultyDisk {
    pub(super) fn new(fail_at: usize, crash: bool) -> Self {
        Self { fail_at, crash, steps: Arc::default(), names: Arc::default() }
    }

    fn step(&self, name: &'static str) -> io::Result<()> {
        step(&self.steps, self.fail_at, name, &self.names)
    }
}

fn step(steps: &AtomicUsize, fail_at: usize, name: &'static str, names: &Mutex<Vec<&'static str>>) -> io::Result<()> {
    if steps.fetch_add(1, Ordering::SeqCst) >= fail_at {
        return Err(io::ErrorKind::StorageFull.into());
    }
    names.lock().unwrap().push(name);
    Ok(())
}

impl Disk for FaultyDisk {
    fn make_folder(&self, path: &Path) -> io::Result<()> {
        self.step("make folder")?;
        RealDisk.make_folder(path)
    }

    fn create(&self, path: &Path) -> io::Result<Box<dyn Output>> {
        self.step("create")?;
        let inner = RealDisk.create(path)?;
        let (steps, fail_at, names) = (self.steps.clone(), self.fail_at, self.names.clone());
        Ok(Box::new(FaultyOutput { inner, written: false, steps, fail_at, names }))
    }

    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.step("rename")?;
        RealDisk.rename(from, to)
    }

    fn remove(&self, path: &Path) -> io::Result<()> {
        if self.crash { Err(io::ErrorKind::Other.into()) } else { RealDisk.remove(path) }
    }

    fn sync_folder(&self, path: &Path) -> io::Result<()> {
        self.step("sync folder")?;
        RealDisk.sync_folder(path)
    }
}

struct FaultyOutput {
    inner: Box<dyn Output>,
    written: bool,
    steps: Arc<AtomicUsize>,
    fail_at: usize,
    names: Arc<Mutex<Vec<&'static str>>>,
}

impl Write for FaultyOutput {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        // How often the encoder writes is its own business: the first write counts as the step.
        if !self.written {
            step(&self.steps, self.fail_at, "write", &self.names)?;
            self.written = true;
        }
        self.inner.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.inner.flush()
    }
}

impl Output for FaultyOutput {
    fn sync(&mut self) -> io::Result<()> {
        step(&self.steps, self.fail_at, "sync", &self.names)?;
        self.inner.sync()
    }
}

#[tokio::test]
async fn what_was_stored_is_there_after_a_restart() {
    let folder = TempDir::new().unwrap();
    let run = a_run(0);
    let correction = a_correction("gate", 0);
    let store = open(&folder);
    store.create_run(&run, "title = \"x\"").await.unwrap();
    store.put_correction(&correction).await.unwrap();
    let stored = store.put_capture(&a_capture(run.id, 1, Some(&correction), 100), a_waveform(100)).await.unwrap();
    store.close().await.unwrap();

    let store = open(&folder);
    assert_eq!(store.swept(), Swept::default());
    assert_eq!(store.run(run.id).await.unwrap(), Some(run.clone()));
    assert_eq!(store.source(run.id).await.unwrap().as_deref(), Some("title = \"x\""));
    assert_eq!(store.correction(correction.id).await.unwrap(), Some(correction));
    assert_eq!(store.capture(run.id, 1).await.unwrap(), Some(stored));
}

#[tokio::test]
async fn a_second_daemon_is_kept_out_until_the_first_has_closed() {
    let folder = TempDir::new().unwrap();
    let first = open(&folder);
    let refused = Store::open(folder.path()).err().unwrap();
    let StoreError::InUse { holder, .. } = &refused else { panic!("{refused}") };
    assert_eq!(holder, &std::process::id().to_string());
    assert!(refused.to_string().contains("--data"), "{refused}");
    let clone = first.clone();
    first.close().await.unwrap();
    assert!(Store::open(folder.path()).is_err(), "a clone still holds it");
    clone.close().await.unwrap();
    open(&folder).close().await.unwrap();
}

#[tokio::test]
async fn the_writer_is_set_up_to_survive_a_loss_of_power() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let ask = |pragma: &'static str| {
        let store = store.clone();
        async move {
            let job = move |c: &mut Connection| Ok(c.query_row(pragma, [], |row| row.get::<_, Value>(0))?);
            store.inner.writer.ask("ask", job).await.unwrap()
        }
    };
    assert_eq!(ask("pragma journal_mode").await, Value::Text("wal".to_owned()));
    // SQLite's documentation of the pragma: 2 is FULL.
    assert_eq!(ask("pragma synchronous").await, Value::Integer(2));
    assert_eq!(ask("pragma foreign_keys").await, Value::Integer(1));
    assert_eq!(ask("pragma busy_timeout").await, Value::Integer(i64::from(BUSY_MS)));
}

#[tokio::test]
async fn the_reader_cannot_write() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let job = |c: &mut Connection| Ok(c.execute("delete from runs", [])?);
    let refused = store.inner.reader.ask("write", job).await.unwrap_err();
    let StoreError::Database { source, .. } = refused else { panic!("{refused}") };
    assert_eq!(source.sqlite_error_code(), Some(rusqlite::ErrorCode::ReadOnly));
}

#[tokio::test]
async fn a_full_database_is_told_as_such_and_stays_readable() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    // SQLite's own limit on the file's pages gives the same error as a disk without space.
    let limit = |c: &mut Connection| {
        let pages: i64 = c.query_row("pragma page_count", [], |row| row.get(0))?;
        Ok(c.query_row(&format!("pragma max_page_count = {pages}"), [], |row| row.get::<_, i64>(0))?)
    };
    store.inner.writer.ask("limit", limit).await.unwrap();
    let entry = serde_json::json!({ "long": "x".repeat(100_000) });
    let refused = store.append(run.id, &entry).await.unwrap_err();
    assert!(matches!(refused, StoreError::DiskFull { .. }), "{refused}");
    assert!(refused.to_string().contains("free space or choose another --data"), "{refused}");
    assert_eq!(store.run(run.id).await.unwrap(), Some(run.clone()));
    assert!(store.journal(run.id).await.unwrap().is_empty());
}

#[tokio::test]
async fn a_job_is_carried_out_although_its_caller_went_away() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let run = a_run(0);
    store.create_run(&run, "").await.unwrap();
    {
        let entry = serde_json::json!(1);
        let mut append = Box::pin(store.append(run.id, &entry));
        let waker = std::task::Waker::noop();
        // Polled once, then dropped.
        let _ = append.as_mut().poll(&mut std::task::Context::from_waker(waker));
    }
    assert_eq!(store.append(run.id, &serde_json::json!(2)).await.unwrap(), 2);
    assert_eq!(store.journal(run.id).await.unwrap(), vec![serde_json::json!(1), serde_json::json!(2)]);
}
