//! The conductor: takes what people ask for, lets one run at a time have the bench, and tells what happens.
//!
//! Everything that takes time is a run, also a deskew asked for by itself. A run is a task of its own: it waits for the
//! bench, carries out what the state machine asks for, and persists a record of each thing before doing it.

mod adjusted;
mod analyse;
mod beyond;
mod capture;
mod correction;
mod deskew;
mod follow;
mod instruments;
mod limits;
mod live;
mod perform;
mod plan;
mod refusal;
mod rest;
mod resume;
mod run;
mod scope;
mod settle;
mod spectrum;
mod tell;
mod transfer;
mod trouble;
mod verify;
mod workshop;

use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::{Arc, Mutex, PoisonError};

use evenpair_api::{self as api, Run, RunKind, RunProgress, RunState};
use evenpair_core::sequence::Sequence;
use evenpair_core::sequence::machine::{Event, Machine};
use tokio::sync::{OwnedSemaphorePermit, Semaphore};
use tokio_stream::wrappers::ReceiverStream;
use tokio_util::sync::CancellationToken;
use tokio_util::task::TaskTracker;
use uuid::Uuid;

pub(crate) use analyse::analyse;
pub(crate) use instruments::Instruments;
pub(crate) use refusal::Refusal;
pub(crate) use workshop::Workshop;

use live::LiveRun;
use rest::{RestKeeper, RestState};

/// The most runs that may wait for the bench: a queue that grows beyond this is a client gone wild.
const MOST_WAITING: usize = 64;

/// The most runs that a list shows.
const LONGEST_LIST: u32 = 500;

/// The front of everything that happens on the bench. Clones are the same conductor.
#[derive(Clone)]
pub(crate) struct Conductor(Arc<Inner>);

struct Inner {
    workshop: Workshop,
    /// Where the bench's sequences lie.
    sequences: Option<PathBuf>,
    rest: RestKeeper,
    /// Who has it, has the bench. Fair: runs get it in the order in which they were accepted.
    bench: Arc<Semaphore>,
    /// Runs that have not ended, and those whose end could not be written.
    live: Mutex<BTreeMap<Uuid, Arc<LiveRun>>>,
    current: Mutex<Option<Uuid>>,
    closing: CancellationToken,
    runs: TaskTracker,
}

impl Inner {
    /// Lets go of a run that has ended. One whose end the store does not have stays visible from memory.
    fn forget(&self, live: &LiveRun) {
        if *live.generations().borrow() == live.run().generation {
            self.live.lock().unwrap_or_else(PoisonError::into_inner).remove(&live.id());
        }
    }
}

impl Conductor {
    /// Begins: ends what an earlier life of the daemon left open, and brings the bench to rest.
    pub(crate) async fn begin(workshop: Workshop, sequences: Option<PathBuf>) -> Result<Self, Refusal> {
        let inner = Inner {
            workshop,
            sequences,
            rest: RestKeeper::new(),
            bench: Arc::new(Semaphore::new(1)),
            live: Mutex::default(),
            current: Mutex::default(),
            closing: CancellationToken::new(),
            runs: TaskTracker::new(),
        };
        let conductor = Self(Arc::new(inner));
        // The bench is nobody's until it is at rest.
        let permit = Arc::clone(&conductor.0.bench).acquire_owned().await.ok();
        let unfinished = conductor.0.workshop.store.unfinished().await?;
        let again = |run| Arc::new(LiveRun::again(run, conductor.0.workshop.store.clone()));
        let unfinished: Vec<Arc<LiveRun>> = unfinished.into_iter().map(again).collect();
        // Live until they have ended: whoever follows one now is told its end, too.
        let lives = unfinished.iter().map(|live| (live.id(), Arc::clone(live)));
        conductor.0.live.lock().unwrap_or_else(PoisonError::into_inner).extend(lives);
        let inner = Arc::clone(&conductor.0);
        conductor.0.runs.spawn(async move {
            for live in &unfinished {
                resume::end(&inner.workshop, &inner.rest, live).await;
                inner.forget(live);
            }
            if inner.rest.now() == RestState::Unknown {
                let _ = inner.rest.settle(&inner.workshop.bench, &inner.workshop.instruments).await;
            }
            drop(permit);
        });
        Ok(conductor)
    }

    /// Ends: stops every run, brings the bench to rest. The caller sets the deadline.
    pub(crate) async fn end(&self, why: &str) {
        self.0.closing.cancel();
        for live in self.lives().values() {
            live.ask_to_stop(why);
        }
        self.0.runs.close();
        self.0.runs.wait().await;
        let _ = self.0.rest.settle(&self.0.workshop.bench, &self.0.workshop.instruments).await;
    }

    /// The bench as it is now.
    pub(crate) async fn bench(&self) -> Result<api::Bench, Refusal> {
        let mut bench = self.bench_itself();
        for pair in &mut bench.pairs {
            pair.correction = match self.correction(&pair.name).await {
                Ok(correction) => Some(correction.state),
                Err(Refusal::NoCorrection { .. }) => None,
                Err(refusal) => return Err(refusal),
            };
        }
        Ok(bench)
    }

    /// The bench without the state of its corrections, which only the store knows.
    pub(crate) fn bench_itself(&self) -> api::Bench {
        plan::describe(
            &self.0.workshop,
            &self.0.rest.now(),
            *self.0.current.lock().unwrap_or_else(PoisonError::into_inner),
        )
    }

    /// A person has looked at the bench: apply the safe state again.
    pub(crate) async fn settle(&self) -> Result<api::Bench, Refusal> {
        self.admit_any()?;
        let unsettled = |why| Refusal::Unsettled { why };
        let _permit = Arc::clone(&self.0.bench)
            .try_acquire_owned()
            .map_err(|_| unsettled("a run has the bench; stop it first".to_owned()))?;
        self.0.rest.settle(&self.0.workshop.bench, &self.0.workshop.instruments).await.map_err(unsettled)?;
        self.bench().await
    }

    /// A pair's correction, judged by what a measurement would be set to now.
    pub(crate) async fn correction(&self, pair: &str) -> Result<api::Correction, Refusal> {
        let spec = plan::pair(&self.0.workshop.bench, pair)?;
        let newest = correction::newest_by_bench(&self.0.workshop, spec).await?;
        newest.ok_or_else(|| Refusal::NoCorrection { pair: pair.to_owned() })
    }

    /// A pair's corrections, one for each set of conditions, each judged on its own range.
    pub(crate) async fn corrections(&self, pair: &str) -> Result<api::Corrections, Refusal> {
        let spec = plan::pair(&self.0.workshop.bench, pair)?;
        let mut items = self.0.workshop.store.newest_corrections(pair).await?;
        items.iter_mut().for_each(|one| correction::judge_on_its_range(&self.0.workshop, one, spec));
        Ok(api::Corrections { items })
    }

    /// Transfers a pair's correction to another range.
    pub(crate) async fn transfer(&self, pair: &str, request: api::TransferRequest) -> Result<Run, Refusal> {
        let sequence = plan::transfer(&self.0.workshop.bench, pair, &request)?;
        self.admit_corrected(pair).await?;
        self.accept(RunKind::Transfer, sequence, String::new()).await
    }

    /// Deskews a pair.
    pub(crate) async fn deskew(&self, pair: &str, request: api::DeskewRequest) -> Result<Run, Refusal> {
        let sequence = plan::deskew(&self.0.workshop.bench, pair, &request)?;
        self.accept(RunKind::Deskew, sequence, String::new()).await
    }

    /// Verifies a pair's correction.
    pub(crate) async fn verify(&self, pair: &str, request: api::VerifyRequest) -> Result<Run, Refusal> {
        let sequence = plan::verify(&self.0.workshop.bench, pair, &request)?;
        self.admit_corrected(pair).await?;
        self.accept(RunKind::Verify, sequence, String::new()).await
    }

    /// The sequences in the bench's folder, each checked.
    pub(crate) async fn sequences(&self) -> api::Sequences {
        plan::sequences(&self.0.workshop.bench, self.0.sequences.as_deref()).await
    }

    /// Starts a sequence.
    pub(crate) async fn start(&self, request: api::RunRequest) -> Result<Run, Refusal> {
        let text = plan::text_of(self.0.sequences.as_deref(), request).await?;
        let sequence = plan::read(&self.0.workshop.bench, &text)?;
        self.accept(RunKind::Sequence, sequence, text).await
    }

    /// All runs, the latest first.
    pub(crate) async fn runs(&self) -> Result<api::Runs, Refusal> {
        let mut items = self.0.workshop.store.runs(LONGEST_LIST).await?;
        let lives = self.lives();
        for item in &mut items {
            if let Some(live) = lives.get(&item.id) {
                *item = live.run();
            }
            item.stages.clear();
        }
        Ok(api::Runs { items })
    }

    /// One run with its stages.
    pub(crate) async fn run(&self, id: &str) -> Result<Run, Refusal> {
        let (id, live) = self.find(id)?;
        let stored = self.0.workshop.store.run(id).await?;
        match (live, stored) {
            (Some(live), stored) => {
                let stages = stored.map(|run| run.stages);
                Ok(Run { stages: stages.unwrap_or_default(), ..live.run() })
            }
            (None, Some(stored)) => Ok(stored),
            (None, None) => Err(Refusal::UnknownRun { id: id.to_string() }),
        }
    }

    /// Stops a run; one that has ended stays as it is.
    pub(crate) async fn stop(&self, id: &str) -> Result<Run, Refusal> {
        if let (_, Some(live)) = self.find(id)? {
            live.ask_to_stop("a person stopped it");
        }
        self.run(id).await
    }

    /// A page of a run's captures.
    pub(crate) async fn captures(&self, id: &str, after: u32, limit: u32) -> Result<api::Captures, Refusal> {
        let id = self.run(id).await?.id;
        Ok(self.0.workshop.store.captures(id, after, limit).await?)
    }

    /// Where a capture's waveform file lies.
    pub(crate) async fn waveform_file(&self, id: &str, number: u32) -> Result<PathBuf, Refusal> {
        let run = self.run(id).await?.id;
        let path = self.0.workshop.store.waveform_path(run, number).await?;
        path.ok_or(Refusal::UnknownCapture { run, number })
    }

    /// A capture's waveform as CSV in seconds and volts.
    pub(crate) async fn waveform_csv(&self, id: &str, number: u32) -> Result<Vec<u8>, Refusal> {
        self.waveform_file(id, number).await?;
        let run = self.run(id).await?.id;
        Ok(self.0.workshop.store.waveform_csv(run, number).await?)
    }

    /// A run's events after a generation.
    pub(crate) async fn follow(&self, id: &str, after: u64) -> Result<ReceiverStream<api::Event>, Refusal> {
        let run = self.run(id).await?.id;
        let live = self.lives().get(&run).map(|live| live.generations());
        Ok(follow::follow(self.0.workshop.store.clone(), run, after, live))
    }

    fn lives(&self) -> BTreeMap<Uuid, Arc<LiveRun>> {
        self.0.live.lock().unwrap_or_else(PoisonError::into_inner).clone()
    }

    fn find(&self, id: &str) -> Result<(Uuid, Option<Arc<LiveRun>>), Refusal> {
        let uuid = Uuid::parse_str(id).map_err(|_| Refusal::UnknownRun { id: id.chars().take(60).collect() })?;
        Ok((uuid, self.lives().get(&uuid).cloned()))
    }

    /// Whether anything may be started at all.
    fn admit_any(&self) -> Result<(), Refusal> {
        if self.0.closing.is_cancelled() { Err(Refusal::ShuttingDown) } else { Ok(()) }
    }

    /// Whether the pair has a correction, so that what needs one may be started.
    async fn admit_corrected(&self, pair: &str) -> Result<(), Refusal> {
        match self.0.workshop.store.latest_correction(pair).await? {
            Some(_) => Ok(()),
            None => Err(Refusal::NoCorrection { pair: pair.to_owned() }),
        }
    }

    /// Takes a checked sequence as a new run and lets it begin as soon as the bench is free.
    async fn accept(&self, kind: RunKind, sequence: Sequence, source: String) -> Result<Run, Refusal> {
        self.admit_any()?;
        if let RestState::Unsettled(why) = self.0.rest.now() {
            return Err(Refusal::Unsettled { why });
        }
        let waiting = self.lives().values().filter(|live| !live.run().state.ended()).count();
        if waiting >= MOST_WAITING {
            return Err(Refusal::BadRequest {
                what: format!("{waiting} runs wait for the bench already"),
                help: "let some end, or stop them".to_owned(),
            });
        }
        let run = Run {
            id: Uuid::now_v7(),
            kind,
            title: sequence.title.clone(),
            state: RunState::Waiting,
            created_at: self.0.workshop.clock.now(),
            started_at: None,
            ended_at: None,
            progress: RunProgress {
                done: 0,
                total: (sequence.steps.len() + sequence.always.len()) as u64,
                doing: String::new(),
                captures: 0,
            },
            reason: None,
            failures: Vec::new(),
            stages: Vec::new(),
            generation: 0,
        };
        // In a task of its own: a client that goes away now must not leave a run that is stored but never begins.
        let conductor = self.clone();
        let accepted = self.0.runs.spawn(async move {
            let live = Arc::new(LiveRun::create(run, &source, conductor.0.workshop.store.clone()).await?);
            conductor.0.live.lock().unwrap_or_else(PoisonError::into_inner).insert(live.id(), Arc::clone(&live));
            if conductor.0.closing.is_cancelled() {
                live.ask_to_stop("the daemon was shut down");
            }
            let run = live.run();
            conductor.0.runs.spawn(live_through(Arc::clone(&conductor.0), live, sequence));
            Ok::<Run, crate::store::StoreError>(run)
        });
        match accepted.await {
            Ok(run) => Ok(run?),
            Err(_) => Err(Refusal::ShuttingDown),
        }
    }
}

/// A run from its acceptance to its end.
async fn live_through(inner: Arc<Inner>, live: Arc<LiveRun>, sequence: Sequence) {
    let permit = tokio::select! {
        biased;
        () = live.stop.cancelled() => None,
        permit = Arc::clone(&inner.bench).acquire_owned() => permit.ok(),
    };
    carry(&inner, &live, sequence, permit.as_ref()).await;
    if permit.is_some() {
        *inner.current.lock().unwrap_or_else(PoisonError::into_inner) = None;
    }
    drop(permit);
    inner.forget(&live);
}

async fn carry(inner: &Arc<Inner>, live: &Arc<LiveRun>, sequence: Sequence, permit: Option<&OwnedSemaphorePermit>) {
    let now = || inner.workshop.clock.now();
    if permit.is_none() {
        return run::close(live, RunState::Stopped, Some(live.stopped_by()), now()).await;
    }
    if let RestState::Unsettled(why) = inner.rest.known().await {
        let reason = Refusal::Unsettled { why }.to_string();
        return run::close(live, RunState::Broken, Some(reason), now()).await;
    }
    *inner.current.lock().unwrap_or_else(PoisonError::into_inner) = Some(live.id());
    let (task_inner, task_live) = (Arc::clone(inner), Arc::clone(live));
    let task = tokio::spawn(async move {
        let machine = Machine::new(sequence.plan());
        run::carry_out(&task_inner.workshop, &task_inner.rest, &task_live, &sequence, machine, Event::Begin).await;
    });
    // A fault of ours must not leave the bench as it is.
    if task.await.is_err() {
        let settled = inner.rest.settle(&inner.workshop.bench, &inner.workshop.instruments).await;
        let what = if settled.is_ok() { "the bench is at rest" } else { "the bench is UNSETTLED" };
        let reason = format!("the run met a fault of the daemon, its log has more; {what}");
        run::close(live, RunState::Broken, Some(reason), now()).await;
    }
}
