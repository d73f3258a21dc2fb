//! Parquet files: captures as the daemon stores them, and any others with columns of numbers.

use std::collections::BTreeMap;

use ::parquet::arrow::arrow_reader::ParquetRecordBatchReaderBuilder;
use arrow_array::ArrayRef;
use arrow_array::cast::AsArray;
use arrow_array::types::{Float32Type, Float64Type, Int8Type, Int16Type, Int32Type, Int64Type, UInt8Type, UInt16Type};
use bytes::Bytes;
use evenpair_core::analysis::{Record, Samples};
use evenpair_core::import::{Column, Imported, Table};

use super::Content;

/// Whether a file is Parquet: it begins with its mark.
pub(super) fn is_parquet(bytes: &[u8]) -> bool {
    bytes.starts_with(b"PAR1")
}

/// Reads a file's columns, as a capture where it says that it is one.
pub(super) fn read(bytes: Vec<u8>) -> Result<Content, String> {
    let builder = ParquetRecordBatchReaderBuilder::try_new(Bytes::from(bytes)).map_err(|error| error.to_string())?;
    let pairs = builder.metadata().file_metadata().key_value_metadata().into_iter().flatten();
    let keys: BTreeMap<String, String> =
        pairs.map(|pair| (pair.key.clone(), pair.value.clone().unwrap_or_default())).collect();
    let mut columns: Vec<Column> = Vec::new();
    for batch in builder.build().map_err(|error| error.to_string())? {
        let batch = batch.map_err(|error| error.to_string())?;
        for (field, array) in batch.schema().fields().iter().zip(batch.columns()) {
            let Some(values) = numbers(array) else { continue };
            match columns.iter_mut().find(|column| column.name == *field.name()) {
                Some(column) => column.values.extend(values),
                None => columns.push(Column::named(field.name(), values)),
            }
        }
    }
    if keys.contains_key("evenpair.format") {
        return capture(&keys, columns).map(|capture| Content::Capture(Box::new(capture)));
    }
    Ok(Content::Columns(Table { columns, first_line: 1, ..Table::default() }))
}

/// A column's numbers, NaN where one is missing; none where it holds something else.
fn numbers(array: &ArrayRef) -> Option<Vec<f64>> {
    macro_rules! try_type {
        ($($kind:ty),*) => {$(
            if let Some(values) = array.as_primitive_opt::<$kind>() {
                return Some(values.iter().map(|value| value.map_or(f64::NAN, |value| value as f64)).collect());
            }
        )*};
    }
    try_type!(Float64Type, Float32Type, Int16Type, Int32Type, Int64Type, Int8Type, UInt8Type, UInt16Type);
    None
}

/// A stored capture: volts and seconds are told by its keys.
fn capture(keys: &BTreeMap<String, String>, columns: Vec<Column>) -> Result<Imported, String> {
    let number = |key: &str| {
        let text = keys.get(key).ok_or_else(|| format!("it is a stored capture without the key `{key}`"))?;
        text.parse::<f64>().map_err(|_| format!("its key `{key}` is `{text}`, which is no number"))
    };
    let leg = |name: &str| -> Result<Record, String> {
        let column = columns.iter().find(|column| column.name == name);
        let column = column.ok_or_else(|| format!("it is a stored capture without the column `{name}`"))?;
        let key = |part: &str| number(&format!("{name}.{part}"));
        Ok(Record {
            // Codes of 16 bits and numbers of single precision both fit.
            samples: Samples::Numbers(column.values.iter().map(|value| *value as f32).collect()),
            volts_per_code: key("volts_per_code")?,
            zero_v: key("zero_v")?,
            interval_s: number("interval_s")?,
            start_s: number("start_s")?,
            end_codes: (key("lowest_code")?, key("highest_code")?),
            step_v: key("step_v")?,
            averages: key("averages")? as u32,
        })
    };
    let mut notes = vec!["a stored capture: its own keys tell columns, volts and seconds".to_owned()];
    if keys.get("correction.scope_skew_s").and_then(|text| text.parse::<f64>().ok()).is_some_and(|skew| skew != 0.0) {
        notes.push(
            "the scope itself had taken off a part of the skew; reference and device must have the same".to_owned(),
        );
    }
    Ok(Imported { positive: leg("positive")?, negative: leg("negative")?, guesses: Vec::new(), notes })
}
