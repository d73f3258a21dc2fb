//! Corrections and the rejection that they reach.

use evenpair_api::{
    Carried, Correction, CorrectionConditions, CorrectionFreedom, LegConditions, RejectionLimit, RejectionPoint,
};
use rusqlite::{Connection, Row, named_params, params};
use serde::de::DeserializeOwned;
use uuid::Uuid;

use super::Store;
use super::convert::{
    all, change, first, from_id, from_json, from_time, from_word, json, number, numbers, quantity, time, unless_there,
    word,
};
use super::error::{Fault, StoreError};
use super::transfers::{insert_transfer, read_transfer};

impl Store {
    /// Stores a new correction.
    ///
    /// # Errors
    /// [`StoreError::AlreadyThere`] when it is stored already, [`StoreError::Inconsistent`] when a quantity has an
    /// unexpected unit, or what the database says.
    pub(crate) async fn put_correction(&self, correction: &Correction) -> Result<(), StoreError> {
        let correction = correction.clone();
        self.inner
            .writer
            .ask("store a correction", move |connection| {
                let transaction = connection.transaction()?;
                insert(&transaction, &correction)
                    .map_err(|fault| unless_there(fault, "correction", || correction.id.to_string()))?;
                let conditions = &correction.conditions;
                insert_leg(&transaction, correction.id, "positive", &conditions.positive)?;
                insert_leg(&transaction, correction.id, "negative", &conditions.negative)?;
                insert_transfer(&transaction, &correction)?;
                write_rejection(&transaction, correction.id, &correction.rejection)?;
                Ok(transaction.commit()?)
            })
            .await
    }

    /// Stores what can change in a correction: its state with the reasons, its warnings, its rejection. The estimates
    /// and the conditions of a stored correction never change; a new deskew is a new correction.
    ///
    /// # Errors
    /// [`StoreError::Unknown`] when it is not stored, or what the database says.
    #[cfg(test)]
    pub(crate) async fn update_correction(&self, correction: &Correction) -> Result<(), StoreError> {
        let correction = correction.clone();
        self.inner
            .writer
            .ask("store a correction's state", move |connection| {
                let transaction = connection.transaction()?;
                let id = correction.id.to_string();
                let sql = "update corrections set state = ?2, reasons_json = ?3, warnings_json = ?4 where id = ?1";
                let state = word(&correction.state)?;
                let params = params![id, state, json(&correction.reasons)?, json(&correction.warnings)?];
                if change(&transaction, sql, params)? == 0 {
                    return Err(StoreError::Unknown { what: "correction", id }.into());
                }
                write_rejection(&transaction, correction.id, &correction.rejection)?;
                Ok(transaction.commit()?)
            })
            .await
    }

    /// Stores the rejection that a verification found, in place of what was found before, and the converters' limit if
    /// it showed one.
    ///
    /// # Errors
    /// [`StoreError::Unknown`] when the correction is not stored, or what the database says.
    pub(crate) async fn set_rejection(
        &self,
        id: Uuid,
        points: &[RejectionPoint],
        limit: Option<&RejectionLimit>,
    ) -> Result<(), StoreError> {
        let points = points.to_vec();
        let limit = limit.cloned();
        self.inner
            .writer
            .ask("store a correction's rejection", move |connection| {
                let transaction = connection.transaction()?;
                let sql = "select 1 from corrections where id = ?1";
                if first(&transaction, sql, [id.to_string()], |_| Ok(()))?.is_none() {
                    return Err(StoreError::Unknown { what: "correction", id: id.to_string() }.into());
                }
                write_rejection(&transaction, id, &points)?;
                if let Some(limit) = &limit {
                    let sql = "update corrections set limit_json = ?2 where id = ?1";
                    change(&transaction, sql, params![id.to_string(), json(limit)?])?;
                }
                Ok(transaction.commit()?)
            })
            .await
    }

    /// A correction.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    #[cfg(test)]
    pub(crate) async fn correction(&self, id: Uuid) -> Result<Option<Correction>, StoreError> {
        self.inner
            .reader
            .ask("read a correction", move |connection| {
                let transaction = connection.transaction()?;
                read_correction(&transaction, id)
            })
            .await
    }

    /// A pair's latest correction, whatever its state.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] when a row cannot be understood, or what the database says.
    pub(crate) async fn latest_correction(&self, pair: &str) -> Result<Option<Correction>, StoreError> {
        let pair = pair.to_owned();
        self.inner
            .reader
            .ask("read a pair's correction", move |connection| {
                let transaction = connection.transaction()?;
                let sql = "select id from corrections where pair = ?1 order by made_at desc, id desc limit 1";
                let id = first(&transaction, sql, [pair], |row| {
                    from_id("a correction's identity", &row.get::<_, String>(0)?)
                })?;
                id.map_or(Ok(None), |id| read_correction(&transaction, id))
            })
            .await
    }
}

/// Reads a correction from its rows. The caller's transaction makes them belong together.
pub(super) fn read_correction(connection: &Connection, id: Uuid) -> Result<Option<Correction>, Fault> {
    let key = id.to_string();
    let leg = |name: &str| -> Result<LegConditions, Fault> {
        let sql = "select * from correction_legs where correction = ?1 and leg = ?2";
        first(connection, sql, params![key, name], read_leg)?
            .ok_or_else(|| Fault::Damaged { what: "a correction", why: format!("its {name} leg is missing") })
    };
    let sql = "select * from rejection_points where correction = ?1 order by place";
    let rejection = all(connection, sql, [&key], |row| {
        Ok(RejectionPoint {
            frequency_hz: number(row, "frequency_hz")?,
            before_db: number(row, "before_db")?,
            after_db: number(row, "after_db")?,
            floor_db: number(row, "floor_db")?,
            at_least: row.get("at_least")?,
        })
    })?;
    let sql = "select * from corrections where id = ?1";
    let transferred_from = read_transfer(connection, id)?;
    first(connection, sql, [&key], |row| {
        let head = read_head(row, leg("positive")?, leg("negative")?, rejection)?;
        Ok(Correction { transferred_from, ..head })
    })
}

/// Inserts the row of `corrections`.
fn insert(connection: &Connection, correction: &Correction) -> Result<(), Fault> {
    let (skew_s, skew_u) = numbers("the skew", &correction.skew, "s")?;
    let (gain, gain_u) = numbers("the gain", &correction.gain, "1")?;
    let (offset_v, offset_u) = numbers("the offset", &correction.offset, "V")?;
    let (scope_skew_s, scope_skew_u) = numbers("the scope's skew", &correction.scope_skew, "s")?;
    let conditions = &correction.conditions;
    let from_span = conditions.carried.as_ref().map(|c| numbers("the span", &c.from_span, "V")).transpose()?;
    let added = conditions.carried.as_ref().map(|c| numbers("the added uncertainty", &c.added, "s")).transpose()?;
    let sql = "insert into corrections (id, pair, made_at, state, skew_s, skew_u, gain, gain_u, offset_v, offset_u, \
               gain_offset_r, skew_freedom, gain_freedom, offset_freedom, limited_by, scope_skew_s, scope_skew_u, \
               acquisitions, scope_identity, skew_reference, gain_reference, carried, carried_from_span_v, \
               carried_from_span_u, carried_added_s, carried_added_u, reasons_json, warnings_json, compensation_json, \
               response_json, limit_json) values (:id, :pair, :made_at, :state, \
               :skew_s, :skew_u, :gain, :gain_u, :offset_v, :offset_u, :gain_offset_r, :skew_freedom, :gain_freedom, \
               :offset_freedom, :limited_by, :scope_skew_s, :scope_skew_u, :acquisitions, :scope_identity, \
               :skew_reference, :gain_reference, :carried, :from_span_v, :from_span_u, :added_s, :added_u, :reasons, \
               :warnings, :compensation, :response, :limit)";
    let params = named_params! {
        ":id": correction.id.to_string(),
        ":pair": correction.pair,
        ":made_at": time(correction.made_at),
        ":state": word(&correction.state)?,
        ":skew_s": skew_s,
        ":skew_u": skew_u,
        ":gain": gain,
        ":gain_u": gain_u,
        ":offset_v": offset_v,
        ":offset_u": offset_u,
        ":gain_offset_r": correction.gain_offset_correlation,
        ":skew_freedom": correction.freedom.skew,
        ":gain_freedom": correction.freedom.gain,
        ":offset_freedom": correction.freedom.offset,
        ":limited_by": correction.limited_by,
        ":scope_skew_s": scope_skew_s,
        ":scope_skew_u": scope_skew_u,
        ":acquisitions": correction.acquisitions,
        ":scope_identity": conditions.scope_identity,
        ":skew_reference": conditions.skew_reference,
        ":gain_reference": conditions.gain_reference,
        ":carried": conditions.carried.is_some(),
        ":from_span_v": from_span.map(|(value, _)| value),
        ":from_span_u": from_span.and_then(|(_, u)| u),
        ":added_s": added.map(|(value, _)| value),
        ":added_u": added.and_then(|(_, u)| u),
        ":reasons": json(&correction.reasons)?,
        ":warnings": json(&correction.warnings)?,
        ":compensation": correction.compensation.as_ref().map(json).transpose()?,
        ":response": correction.response.as_ref().map(json).transpose()?,
        ":limit": correction.limit.as_ref().map(json).transpose()?,
    };
    change(connection, sql, params)?;
    Ok(())
}

/// Inserts a row of `correction_legs`.
fn insert_leg(connection: &Connection, correction: Uuid, name: &str, leg: &LegConditions) -> Result<(), Fault> {
    let (span_v, span_u) = numbers("a leg's span", &leg.span, "V")?;
    let (offset_v, offset_u) = numbers("a leg's offset", &leg.offset, "V")?;
    let sql = "insert into correction_legs (correction, leg, channel, span_v, span_u, offset_v, offset_u, coupling, \
               attenuation, probe) values (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10)";
    let id = correction.to_string();
    let (coupling, attenuation, probe) = (&leg.coupling, leg.attenuation, &leg.probe);
    change(
        connection,
        sql,
        params![id, name, leg.channel, span_v, span_u, offset_v, offset_u, coupling, attenuation, probe],
    )?;
    Ok(())
}

/// Replaces the rejection of a correction.
fn write_rejection(connection: &Connection, correction: Uuid, points: &[RejectionPoint]) -> Result<(), Fault> {
    let id = correction.to_string();
    change(connection, "delete from rejection_points where correction = ?1", [&id])?;
    for (place, point) in (0_u32..).zip(points) {
        let sql = "insert into rejection_points (correction, place, frequency_hz, before_db, after_db, floor_db, \
                   at_least) values (?1, ?2, ?3, ?4, ?5, ?6, ?7)";
        let (before_db, after_db) = (point.before_db, point.after_db);
        change(
            connection,
            sql,
            params![id, place, point.frequency_hz, before_db, after_db, point.floor_db, point.at_least],
        )?;
    }
    Ok(())
}

/// A row of `corrections` with what stands in the other tables.
fn read_head(
    row: &Row<'_>,
    positive: LegConditions,
    negative: LegConditions,
    rejection: Vec<RejectionPoint>,
) -> Result<Correction, Fault> {
    let carried = if row.get("carried")? {
        Some(Carried {
            from_span: quantity(row, "carried_from_span_v", "carried_from_span_u", "V")?,
            added: quantity(row, "carried_added_s", "carried_added_u", "s")?,
        })
    } else {
        None
    };
    Ok(Correction {
        id: from_id("a correction's identity", &row.get::<_, String>("id")?)?,
        pair: row.get("pair")?,
        made_at: from_time("a correction's time", &row.get::<_, String>("made_at")?)?,
        skew: quantity(row, "skew_s", "skew_u", "s")?,
        gain: quantity(row, "gain", "gain_u", "1")?,
        offset: quantity(row, "offset_v", "offset_u", "V")?,
        gain_offset_correlation: row.get("gain_offset_r")?,
        compensation: optional(row, "compensation_json", "a correction's compensation")?,
        response: optional(row, "response_json", "a correction's response")?,
        limit: optional(row, "limit_json", "a correction's limit")?,
        freedom: CorrectionFreedom {
            skew: row.get("skew_freedom")?,
            gain: row.get("gain_freedom")?,
            offset: row.get("offset_freedom")?,
        },
        limited_by: row.get("limited_by")?,
        scope_skew: quantity(row, "scope_skew_s", "scope_skew_u", "s")?,
        state: from_word("a correction's state", row.get("state")?)?,
        reasons: from_json("a correction's reasons", &row.get::<_, String>("reasons_json")?)?,
        rejection,
        conditions: CorrectionConditions {
            scope_identity: row.get("scope_identity")?,
            positive,
            negative,
            skew_reference: row.get("skew_reference")?,
            gain_reference: row.get("gain_reference")?,
            carried,
        },
        transferred_from: None,
        acquisitions: row.get("acquisitions")?,
        warnings: from_json("a correction's warnings", &row.get::<_, String>("warnings_json")?)?,
    })
}

/// What a column holds as JSON, if it holds anything.
fn optional<T: DeserializeOwned>(row: &Row<'_>, column: &str, what: &'static str) -> Result<Option<T>, Fault> {
    row.get::<_, Option<String>>(column)?.map(|text| from_json(what, &text)).transpose()
}

/// A row of `correction_legs`.
fn read_leg(row: &Row<'_>) -> Result<LegConditions, Fault> {
    Ok(LegConditions {
        channel: row.get("channel")?,
        span: quantity(row, "span_v", "span_u", "V")?,
        offset: quantity(row, "offset_v", "offset_u", "V")?,
        coupling: row.get("coupling")?,
        attenuation: number(row, "attenuation")?,
        probe: row.get("probe")?,
    })
}

#[cfg(test)]
mod tests;
