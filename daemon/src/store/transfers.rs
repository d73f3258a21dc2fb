//! Corrections of several ranges: where a transferred one came from, and a pair's newest of each range.

use evenpair_api::{Correction, TransferredFrom};
use rusqlite::{Connection, params};
use uuid::Uuid;

use super::Store;
use super::convert::{all, change, first, from_id, from_time, from_word, numbers, quantity, time, word};
use super::corrections::read_correction;
use super::error::{Fault, StoreError};

impl Store {
    /// A pair's corrections, the newest for each set of conditions (scope, channels, ranges, couplings, probes), the
    /// newest first.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn newest_corrections(&self, pair: &str) -> Result<Vec<Correction>, StoreError> {
        let pair = pair.to_owned();
        self.inner
            .reader
            .ask("read a pair's corrections", move |connection| {
                let transaction = connection.transaction()?;
                let ids = all(&transaction, NEWEST, [pair], |row| {
                    from_id("a correction's identity", &row.get::<_, String>(0)?)
                })?;
                let read = |id| read_correction(&transaction, id).transpose();
                ids.into_iter().filter_map(read).collect()
            })
            .await
    }
}

/// Spans and offsets are what the scope itself said, so that those of one range are equal to the last digit.
const NEWEST: &str = "\
    select id from (
        select c.id as id, c.made_at as made_at, row_number() over (
            partition by c.scope_identity,
                p.channel, p.span_v, p.offset_v, p.coupling, p.attenuation, p.probe,
                n.channel, n.span_v, n.offset_v, n.coupling, n.attenuation, n.probe
            order by c.made_at desc, c.id desc) as place
        from corrections c
            join correction_legs p on p.correction = c.id and p.leg = 'positive'
            join correction_legs n on n.correction = c.id and n.leg = 'negative'
        where c.pair = ?1)
    where place = 1 order by made_at desc, id desc";

/// Inserts the row of `transfers`, if the correction was transferred.
pub(super) fn insert_transfer(connection: &Connection, correction: &Correction) -> Result<(), Fault> {
    let Some(from) = &correction.transferred_from else { return Ok(()) };
    let (span_v, span_u) = numbers("the old span", &from.span, "V")?;
    let (offset_v, offset_u) = numbers("the old offset", &from.offset, "V")?;
    let sql = "insert into transfers (correction, from_correction, from_made_at, from_span_v, from_span_u, \
               from_offset_v, from_offset_u, reference, skew_by, levels_by) \
               values (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10)";
    let (id, old, made_at) = (correction.id.to_string(), from.correction.to_string(), time(from.made_at));
    let (skew_by, levels_by) = (word(&from.skew_by)?, word(&from.levels_by)?);
    let reference = &from.reference;
    change(
        connection,
        sql,
        params![id, old, made_at, span_v, span_u, offset_v, offset_u, reference, skew_by, levels_by],
    )?;
    Ok(())
}

/// What a correction was transferred from, if it was.
pub(super) fn read_transfer(connection: &Connection, correction: Uuid) -> Result<Option<TransferredFrom>, Fault> {
    let sql = "select * from transfers where correction = ?1";
    first(connection, sql, [correction.to_string()], |row| {
        Ok(TransferredFrom {
            correction: from_id("a correction's identity", &row.get::<_, String>("from_correction")?)?,
            made_at: from_time("a correction's time", &row.get::<_, String>("from_made_at")?)?,
            span: quantity(row, "from_span_v", "from_span_u", "V")?,
            offset: quantity(row, "from_offset_v", "from_offset_u", "V")?,
            reference: row.get("reference")?,
            skew_by: from_word("a way of a transfer", row.get("skew_by")?)?,
            levels_by: from_word("a way of a transfer", row.get("levels_by")?)?,
        })
    })
}

#[cfg(test)]
mod tests;
