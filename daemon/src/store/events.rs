//! What happened to a run, kept so that a stream can be taken up again where it broke off.

use evenpair_api::{Event, EventKind, Run};
use rusqlite::{Connection, Row, named_params};
use uuid::Uuid;

use super::convert::{all, change, from_integer, from_json, integer, json, number, owned_by, unless_there};
use super::error::{Fault, StoreError};
use super::rows::read_capture;
use super::runs::write_run;
use super::{LARGEST_PAGE, Store};

impl Store {
    /// Appends an event. The capture that a `captured` event names must be stored before it.
    ///
    /// # Errors
    /// [`StoreError::AlreadyThere`] when the run has an event of this generation, [`StoreError::Unknown`] when the run
    /// or the capture is not stored, or what the database says.
    #[cfg(test)]
    pub(crate) async fn append_event(&self, run: Uuid, event: &Event) -> Result<(), StoreError> {
        let event = event.clone();
        self.inner.writer.ask("store an event", move |connection| insert_event(connection, run, &event)).await
    }

    /// Stores how a run stands now together with the event that tells of it: both or neither.
    ///
    /// # Errors
    /// [`StoreError::AlreadyThere`] when the run has an event of this generation, [`StoreError::Unknown`] when the run
    /// or the capture that the event names is not stored, or what the database says.
    pub(crate) async fn publish(&self, run: &Run, event: &Event) -> Result<(), StoreError> {
        let (run, event) = (run.clone(), event.clone());
        self.inner
            .writer
            .ask("store a run's state and its event", move |connection| {
                let transaction = connection.transaction()?;
                write_run(&transaction, &run)?;
                insert_event(&transaction, run.id, &event)?;
                Ok(transaction.commit()?)
            })
            .await
    }

    /// A run's events after a generation, in order; at most `limit` and [`LARGEST_PAGE`].
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn events(&self, run: Uuid, after: u64, limit: u32) -> Result<Vec<Event>, StoreError> {
        self.inner
            .reader
            .ask("read a run's events", move |connection| {
                let transaction = connection.transaction()?;
                let sql =
                    "select * from events where run = :run and generation > :after order by generation limit :limit";
                let params = named_params! {
                    ":run": run.to_string(), ":after": integer(after), ":limit": limit.min(LARGEST_PAGE),
                };
                all(&transaction, sql, params, |row| read_event(&transaction, run, row))
            })
            .await
    }
}

/// Inserts an event's row.
fn insert_event(connection: &Connection, run: Uuid, event: &Event) -> Result<(), Fault> {
    let (kind, capture) = match &event.kind {
        EventKind::Captured { capture } => ("captured", Some(capture.number)),
        EventKind::Corrected { .. } => ("corrected", None),
        EventKind::Progressed { .. } => ("progressed", None),
        EventKind::StateChanged { .. } => ("state_changed", None),
    };
    let text = if capture.is_none() { Some(json(event)?) } else { None };
    let sql = "insert into events (run, generation, at_s, kind, capture, event_json) \
               values (:run, :generation, :at_s, :kind, :capture, :event)";
    let params = named_params! {
        ":run": run.to_string(),
        ":generation": integer(event.generation),
        ":at_s": event.at_s,
        ":kind": kind,
        ":capture": capture,
        ":event": text,
    };
    let owner = || match capture {
        Some(number) => format!("{run}/{number}"),
        None => run.to_string(),
    };
    let what = if capture.is_some() { "run or capture" } else { "run" };
    change(connection, sql, params)
        .map_err(|fault| unless_there(fault, "event", || format!("{run}/{}", event.generation)))
        .map_err(|fault| owned_by(fault, what, owner))?;
    Ok(())
}

/// A row of `events`; a capture is read from its own rows.
fn read_event(connection: &Connection, run: Uuid, row: &Row<'_>) -> Result<Event, Fault> {
    let damaged = |why: &str| Fault::Damaged { what: "an event", why: why.to_owned() };
    if let Some(text) = row.get::<_, Option<String>>("event_json")? {
        return from_json("an event", &text);
    }
    let number_of: Option<u32> = row.get("capture")?;
    let capture = number_of.ok_or_else(|| damaged("it has neither text nor a capture"))?;
    let capture = read_capture(connection, run, capture)?.ok_or_else(|| damaged("its capture is not stored"))?;
    Ok(Event {
        generation: from_integer("an event's generation", row.get("generation")?)?,
        at_s: number(row, "at_s")?,
        kind: EventKind::Captured { capture: Box::new(capture) },
    })
}

#[cfg(test)]
mod tests;
