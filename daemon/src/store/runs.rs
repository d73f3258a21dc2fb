//! Runs, their stages and their journals.

use evenpair_api::{Run, RunProgress, StageReport};
use rusqlite::{Connection, Row, named_params, params};
use serde_json::Value;
use uuid::Uuid;

use super::convert::{
    all, change, first, from_id, from_integer, from_json, from_time, from_word, integer, json, number, owned_by, time,
    unless_there, word,
};
use super::error::{Fault, StoreError};
use super::{LARGEST_PAGE, Store};

impl Store {
    /// Stores a new run with the text that it executes. Stages that it already has are stored too.
    ///
    /// # Errors
    /// [`StoreError::AlreadyThere`] when the run is stored already, or what the database says.
    pub(crate) async fn create_run(&self, run: &Run, source: &str) -> Result<(), StoreError> {
        let (run, source) = (run.clone(), source.to_owned());
        self.inner
            .writer
            .ask("store a new run", move |connection| {
                let transaction = connection.transaction()?;
                insert_run(&transaction, &run, &source).map_err(|f| unless_there(f, "run", || run.id.to_string()))?;
                for stage in &run.stages {
                    write_stage(&transaction, run.id, stage)?;
                }
                Ok(transaction.commit()?)
            })
            .await
    }

    /// Stores how a run stands now: everything but its kind, its title, when it was accepted, and its stages
    /// ([`Store::put_stage`] stores those).
    ///
    /// # Errors
    /// [`StoreError::Unknown`] when the run is not stored, or what the database says.
    #[cfg(test)]
    pub(crate) async fn update_run(&self, run: &Run) -> Result<(), StoreError> {
        let run = run.clone();
        self.inner.writer.ask("store a run's state", move |connection| write_run(connection, &run)).await
    }

    /// Stores a stage, or how it stands now.
    ///
    /// # Errors
    /// [`StoreError::Unknown`] when the run is not stored, or what the database says.
    pub(crate) async fn put_stage(&self, run: Uuid, stage: &StageReport) -> Result<(), StoreError> {
        let stage = stage.clone();
        self.inner.writer.ask("store a stage", move |connection| write_stage(connection, run, &stage)).await
    }

    /// Appends an entry to a run's journal and returns its number, from 1. On the disk when this returns.
    ///
    /// # Errors
    /// [`StoreError::Unknown`] when the run is not stored, or what the database says.
    pub(crate) async fn append(&self, run: Uuid, entry: &Value) -> Result<u64, StoreError> {
        let entry = entry.to_string();
        self.inner
            .writer
            .ask("write to a run's journal", move |connection| {
                let sql = "insert into journal (run, number, entry_json) values (?1, \
                           (select coalesce(max(number), 0) + 1 from journal where run = ?1), ?2) returning number";
                let number = first(connection, sql, params![run.to_string(), entry], |row| Ok(row.get(0)?))
                    .map_err(|fault| owned_by(fault, "run", || run.to_string()))?;
                from_integer("a journal's number", number.unwrap_or(-1))
            })
            .await
    }

    /// A run's whole journal, in order; empty when the run is not stored.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when an entry is no JSON, or what the database says.
    pub(crate) async fn journal(&self, run: Uuid) -> Result<Vec<Value>, StoreError> {
        self.inner
            .reader
            .ask("read a run's journal", move |connection| {
                let sql = "select entry_json from journal where run = ?1 order by number";
                all(connection, sql, [run.to_string()], |row| {
                    from_json("an entry of a journal", &row.get::<_, String>(0)?)
                })
            })
            .await
    }

    /// A run with its stages.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn run(&self, id: Uuid) -> Result<Option<Run>, StoreError> {
        self.inner
            .reader
            .ask("read a run", move |connection| {
                // One transaction, so that the run and its stages belong together.
                let transaction = connection.transaction()?;
                let run = first(&transaction, "select * from runs where id = ?1", [id.to_string()], read_run)?;
                run.map(|run| with_stages(&transaction, run)).transpose()
            })
            .await
    }

    /// The text that a run executes, as it was accepted.
    ///
    /// # Errors
    /// What the database says.
    pub(crate) async fn source(&self, run: Uuid) -> Result<Option<String>, StoreError> {
        self.inner
            .reader
            .ask("read a run's text", move |connection| {
                first(connection, "select source from runs where id = ?1", [run.to_string()], |row| Ok(row.get(0)?))
            })
            .await
    }

    /// The latest runs, the latest first, without their stages; at most `limit` and [`LARGEST_PAGE`].
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn runs(&self, limit: u32) -> Result<Vec<Run>, StoreError> {
        self.inner
            .reader
            .ask("read the runs", move |connection| {
                let sql = "select * from runs order by created_at desc, id desc limit ?1";
                all(connection, sql, [limit.min(LARGEST_PAGE)], read_run)
            })
            .await
    }

    /// The runs that are waiting or running, the earliest first, with their stages. After a start these are the ones
    /// that a crash or a shutdown interrupted.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn unfinished(&self) -> Result<Vec<Run>, StoreError> {
        self.inner
            .reader
            .ask("read the unfinished runs", move |connection| {
                let transaction = connection.transaction()?;
                let sql = "select * from runs where state in ('waiting', 'running') order by created_at, id";
                let runs = all(&transaction, sql, [], read_run)?;
                runs.into_iter().map(|run| with_stages(&transaction, run)).collect()
            })
            .await
    }
}

/// Inserts a run's row.
fn insert_run(connection: &Connection, run: &Run, source: &str) -> Result<(), Fault> {
    let sql = "insert into runs (id, kind, title, state, created_at, started_at, ended_at, done, total, doing, \
               captures, reason, failures_json, generation, source) values (:id, :kind, :title, :state, :created_at, \
               :started_at, :ended_at, :done, :total, :doing, :captures, :reason, :failures, :generation, :source)";
    let params = named_params! {
        ":id": run.id.to_string(),
        ":kind": word(&run.kind)?,
        ":title": run.title,
        ":state": word(&run.state)?,
        ":created_at": time(run.created_at),
        ":started_at": run.started_at.map(time),
        ":ended_at": run.ended_at.map(time),
        ":done": integer(run.progress.done),
        ":total": integer(run.progress.total),
        ":doing": run.progress.doing,
        ":captures": run.progress.captures,
        ":reason": run.reason,
        ":failures": json(&run.failures)?,
        ":generation": integer(run.generation),
        ":source": source,
    };
    change(connection, sql, params)?;
    Ok(())
}

/// Writes how a run stands now.
pub(super) fn write_run(connection: &Connection, run: &Run) -> Result<(), Fault> {
    let sql = "update runs set state = :state, started_at = :started_at, ended_at = :ended_at, done = :done, \
               total = :total, doing = :doing, captures = :captures, reason = :reason, failures_json = :failures, \
               generation = :generation where id = :id";
    let params = named_params! {
        ":id": run.id.to_string(),
        ":state": word(&run.state)?,
        ":started_at": run.started_at.map(time),
        ":ended_at": run.ended_at.map(time),
        ":done": integer(run.progress.done),
        ":total": integer(run.progress.total),
        ":doing": run.progress.doing,
        ":captures": run.progress.captures,
        ":reason": run.reason,
        ":failures": json(&run.failures)?,
        ":generation": integer(run.generation),
    };
    if change(connection, sql, params)? == 0 {
        return Err(StoreError::Unknown { what: "run", id: run.id.to_string() }.into());
    }
    Ok(())
}

/// Writes a stage, or how it stands now.
fn write_stage(connection: &Connection, run: Uuid, stage: &StageReport) -> Result<(), Fault> {
    let sql = "insert into stages (run, step, text, started_s, ended_s, outcome) values (?1, ?2, ?3, ?4, ?5, ?6) \
               on conflict (run, step) do update set text = excluded.text, started_s = excluded.started_s, \
               ended_s = excluded.ended_s, outcome = excluded.outcome";
    let params =
        params![run.to_string(), integer(stage.step), stage.text, stage.started_s, stage.ended_s, stage.outcome];
    change(connection, sql, params).map_err(|fault| owned_by(fault, "run", || run.to_string()))?;
    Ok(())
}

/// A row of `runs`; its stages stay empty.
fn read_run(row: &Row<'_>) -> Result<Run, Fault> {
    let optional_time = |column: &'static str| -> Result<_, Fault> {
        row.get::<_, Option<String>>(column)?.map(|text| from_time("a run's time", &text)).transpose()
    };
    Ok(Run {
        id: from_id("a run's identity", &row.get::<_, String>("id")?)?,
        kind: from_word("a run's kind", row.get("kind")?)?,
        title: row.get("title")?,
        state: from_word("a run's state", row.get("state")?)?,
        created_at: from_time("a run's time", &row.get::<_, String>("created_at")?)?,
        started_at: optional_time("started_at")?,
        ended_at: optional_time("ended_at")?,
        progress: RunProgress {
            done: from_integer("a run's steps", row.get("done")?)?,
            total: from_integer("a run's steps", row.get("total")?)?,
            doing: row.get("doing")?,
            captures: row.get("captures")?,
        },
        reason: row.get("reason")?,
        failures: from_json("a run's failures", &row.get::<_, String>("failures_json")?)?,
        stages: Vec::new(),
        generation: from_integer("a run's generation", row.get("generation")?)?,
    })
}

/// The run with its stages read.
fn with_stages(connection: &Connection, run: Run) -> Result<Run, Fault> {
    let stages = all(connection, "select * from stages where run = ?1 order by step", [run.id.to_string()], |row| {
        Ok(StageReport {
            step: from_integer("a stage's place", row.get("step")?)?,
            text: row.get("text")?,
            started_s: number(row, "started_s")?,
            ended_s: row.get("ended_s")?,
            outcome: row.get("outcome")?,
        })
    })?;
    Ok(Run { stages, ..run })
}

#[cfg(test)]
mod tests;
