//! The schema's steps, and bringing a database up to the last of them.
//!
//! The database counts the steps it has in `user_version`. Each step is one file and one transaction, so a database is
//! never between two of them. A step that has been released is never edited; a change is a new step.

use std::path::Path;

use rusqlite::{Connection, TransactionBehavior};

use super::error::StoreError;

/// Every step, in order.
pub(super) const STEPS: &[&str] = &[
    include_str!("schema/0001.sql"),
    include_str!("schema/0002-response.sql"),
    include_str!("schema/0003-transfers.sql"),
    include_str!("schema/0004-freedom.sql"),
];

/// Marks a database file as ours (SQLite's `application_id`): the letters `EvPr`.
const APPLICATION: i64 = 0x4576_5072;

/// Brings a database up to the last of `steps`.
///
/// # Errors
/// [`StoreError::Newer`] when it has steps that are not among them, [`StoreError::Foreign`] when another program made
/// it, [`StoreError::Database`] or [`StoreError::DiskFull`] when a step fails; the steps before it hold.
pub(super) fn upgrade(connection: &mut Connection, path: &Path, steps: &[&str]) -> Result<(), StoreError> {
    let failed = |source| StoreError::database("bring the schema up to date", path, source);
    let found: i64 = connection.query_row("pragma user_version", [], |row| row.get(0)).map_err(failed)?;
    let application: i64 = connection.query_row("pragma application_id", [], |row| row.get(0)).map_err(failed)?;
    let objects: i64 =
        connection.query_row("select count(*) from sqlite_schema", [], |row| row.get(0)).map_err(failed)?;
    let untouched = application == 0 && found == 0 && objects == 0;
    if application != APPLICATION && !untouched {
        return Err(StoreError::Foreign { path: path.to_owned() });
    }
    let known = i64::try_from(steps.len()).unwrap_or(i64::MAX);
    if found > known {
        return Err(StoreError::Newer { path: path.to_owned(), found, known });
    }
    for (version, step) in (1_i64..).zip(steps).filter(|(version, _)| *version > found) {
        let mut carry_out = || {
            let transaction = connection.transaction_with_behavior(TransactionBehavior::Immediate)?;
            transaction.execute_batch(step)?;
            transaction.pragma_update(None, "application_id", APPLICATION)?;
            transaction.pragma_update(None, "user_version", version)?;
            transaction.commit()
        };
        carry_out().map_err(failed)?;
    }
    Ok(())
}

#[cfg(test)]
mod tests;
