//! Between the API's types and the columns: words, times, quantities, lists.

use evenpair_api::Quantity;
use jiff::Timestamp;
use rusqlite::{Connection, Params, Row};
use serde::Serialize;
use serde::de::DeserializeOwned;
use uuid::Uuid;

use super::error::{Fault, StoreError};

/// The word that the API writes an enum's variant as, so that the columns and the API have one vocabulary.
pub(super) fn word<T: Serialize>(value: &T) -> Result<String, Fault> {
    match serde_json::to_value(value) {
        Ok(serde_json::Value::String(word)) => Ok(word),
        Ok(other) => Err(Fault::Damaged { what: "a word", why: format!("`{other}` is no text") }),
        Err(error) => Err(Fault::Damaged { what: "a word", why: error.to_string() }),
    }
}

/// The variant that a word stands for.
pub(super) fn from_word<T: DeserializeOwned>(what: &'static str, word: String) -> Result<T, Fault> {
    serde_json::from_value(serde_json::Value::String(word))
        .map_err(|error| Fault::Damaged { what, why: error.to_string() })
}

/// A list or an entry as JSON text.
pub(super) fn json<T: Serialize + ?Sized>(value: &T) -> Result<String, Fault> {
    serde_json::to_string(value)
        .map_err(|error| Fault::Damaged { what: "what is to be stored", why: error.to_string() })
}

/// The list or entry that JSON text stands for.
pub(super) fn from_json<T: DeserializeOwned>(what: &'static str, text: &str) -> Result<T, Fault> {
    serde_json::from_str(text).map_err(|error| Fault::Damaged { what, why: error.to_string() })
}

/// A time with nine decimals always, so that times sort as text.
pub(super) fn time(time: Timestamp) -> String {
    format!("{time:.9}")
}

/// The time that a text stands for.
pub(super) fn from_time(what: &'static str, text: &str) -> Result<Timestamp, Fault> {
    text.parse().map_err(|error: jiff::Error| Fault::Damaged { what, why: error.to_string() })
}

/// The identity that a text stands for.
pub(super) fn from_id(what: &'static str, text: &str) -> Result<Uuid, Fault> {
    text.parse().map_err(|error: uuid::Error| Fault::Damaged { what, why: error.to_string() })
}

/// A count as the database's integer. No count of ours comes near the end of the range.
pub(super) fn integer(count: u64) -> i64 {
    i64::try_from(count).unwrap_or(i64::MAX)
}

/// The database's integer as a count.
pub(super) fn from_integer(what: &'static str, integer: i64) -> Result<u64, Fault> {
    u64::try_from(integer).map_err(|_| Fault::Damaged { what, why: format!("{integer} is negative") })
}

/// The value and standard uncertainty of a quantity whose unit the column's name fixes.
///
/// # Errors
/// [`StoreError::Inconsistent`] when the quantity has another unit.
pub(super) fn numbers(what: &'static str, quantity: &Quantity, unit: &str) -> Result<(f64, Option<f64>), StoreError> {
    if quantity.unit == unit {
        Ok((quantity.value, quantity.u))
    } else {
        let why = format!("{what} is in `{}`, not in `{unit}`", quantity.unit);
        Err(StoreError::Inconsistent { doing: "store a quantity", why })
    }
}

/// The quantity in two columns, the value and after it the uncertainty; null is not a number.
pub(super) fn quantity(row: &Row<'_>, value: &str, u: &str, unit: &str) -> Result<Quantity, Fault> {
    Ok(Quantity { value: number(row, value)?, u: row.get(u)?, unit: unit.to_owned() })
}

/// The number in a column; null is not a number.
pub(super) fn number(row: &Row<'_>, column: &str) -> Result<f64, Fault> {
    Ok(row.get::<_, Option<f64>>(column)?.unwrap_or(f64::NAN))
}

/// Every row of a query, each turned into a `T`.
pub(super) fn all<T>(
    connection: &Connection,
    sql: &str,
    params: impl Params,
    mut read: impl FnMut(&Row<'_>) -> Result<T, Fault>,
) -> Result<Vec<T>, Fault> {
    let mut statement = connection.prepare_cached(sql)?;
    let mut rows = statement.query(params)?;
    let mut items = Vec::new();
    while let Some(row) = rows.next()? {
        items.push(read(row)?);
    }
    Ok(items)
}

/// The first row of a query, if there is one.
pub(super) fn first<T>(
    connection: &Connection,
    sql: &str,
    params: impl Params,
    read: impl FnOnce(&Row<'_>) -> Result<T, Fault>,
) -> Result<Option<T>, Fault> {
    let mut statement = connection.prepare_cached(sql)?;
    let mut rows = statement.query(params)?;
    rows.next()?.map(read).transpose()
}

/// Carries out a change and returns how many rows it touched.
pub(super) fn change(connection: &Connection, sql: &str, params: impl Params) -> Result<usize, Fault> {
    Ok(connection.prepare_cached(sql)?.execute(params)?)
}

/// Turns the refusal of a second row with the same identity into [`StoreError::AlreadyThere`].
pub(super) fn unless_there(fault: Fault, what: &'static str, id: impl FnOnce() -> String) -> Fault {
    use rusqlite::ffi::{SQLITE_CONSTRAINT_PRIMARYKEY, SQLITE_CONSTRAINT_UNIQUE};
    match fault {
        Fault::Sql(rusqlite::Error::SqliteFailure(error, _))
            if matches!(error.extended_code, SQLITE_CONSTRAINT_PRIMARYKEY | SQLITE_CONSTRAINT_UNIQUE) =>
        {
            Fault::Store(StoreError::AlreadyThere { what, id: id() })
        }
        other => other,
    }
}

/// Turns the refusal of a row that belongs to nothing stored into [`StoreError::Unknown`].
pub(super) fn owned_by(fault: Fault, what: &'static str, id: impl FnOnce() -> String) -> Fault {
    use rusqlite::ffi::SQLITE_CONSTRAINT_FOREIGNKEY;
    match fault {
        Fault::Sql(rusqlite::Error::SqliteFailure(error, _)) if error.extended_code == SQLITE_CONSTRAINT_FOREIGNKEY => {
            Fault::Store(StoreError::Unknown { what, id: id() })
        }
        other => other,
    }
}
