//! A waveform as a Parquet file.
//!
//! Three columns, a row per sample: `positive` and `negative` (int16 codes, or float32 where the instrument sent
//! numbers) and `difference` (float32 volts, null where it has no support). What turns codes into volts and rows into
//! seconds stands in the file's key-value metadata, so the file can be read without the database.

use std::fs::File;
use std::path::Path;
use std::sync::Arc;

use ::parquet::arrow::ArrowWriter;
use ::parquet::arrow::arrow_reader::ParquetRecordBatchReaderBuilder;
use ::parquet::arrow::arrow_writer::ArrowWriterOptions;
use ::parquet::basic::{Compression, Encoding, ZstdLevel};
use ::parquet::errors::ParquetError;
use ::parquet::file::metadata::KeyValue;
use ::parquet::file::properties::{WriterProperties, WriterPropertiesBuilder};
use ::parquet::file::reader::{FileReader, SerializedFileReader};
use ::parquet::schema::types::ColumnPath;
use arrow_array::cast::AsArray;
use arrow_array::types::{Float32Type, Int16Type};
use arrow_array::{Array, ArrayRef, Float32Array, Int16Array, RecordBatch};
use arrow_schema::{DataType, Field, Schema};
use evenpair_api::{Capture, Correction};
use evenpair_core::analysis::{Record, Samples};

use super::Waveform;
use crate::store::disk::Output;
use crate::store::error::StoreError;

mod keys;

use keys::Keys;

/// Rows of a row group. The writer holds the compressed pages of one group in memory, so this bounds it to about 1 MB.
const GROUP_ROWS: usize = 131_072;

/// The legs, in the order of their columns.
const LEGS: [&str; 2] = ["positive", "negative"];

/// Writes a waveform; the file is not synced.
///
/// # Errors
/// What the encoder or the output says.
pub(in crate::store) fn write(
    output: &mut dyn Output,
    waveform: &Waveform,
    capture: &Capture,
    correction: Option<&Correction>,
) -> Result<(), ParquetError> {
    let legs = [&waveform.positive, &waveform.negative];
    let schema = Arc::new(Schema::new(vec![
        Field::new(LEGS[0], kind(legs[0]), false),
        Field::new(LEGS[1], kind(legs[1]), false),
        Field::new("difference", DataType::Float32, true),
    ]));
    let keys: Vec<KeyValue> = keys::of(waveform, capture, correction)
        .into_iter()
        .map(|(key, value)| KeyValue { key, value: Some(value) })
        .collect();
    let properties = WriterProperties::builder()
        .set_created_by(concat!("evenpair ", env!("CARGO_PKG_VERSION")).to_owned())
        .set_compression(Compression::ZSTD(ZstdLevel::try_new(1)?))
        .set_max_row_group_row_count(Some(GROUP_ROWS))
        .set_dictionary_enabled(false)
        .set_key_value_metadata(Some(keys));
    let properties = encode(encode(properties, LEGS[0], legs[0]), LEGS[1], legs[1])
        .set_column_encoding(ColumnPath::from("difference"), Encoding::BYTE_STREAM_SPLIT)
        .build();
    // The columns' types say it all, so Arrow's own copy of the schema is not needed.
    let options = ArrowWriterOptions::new().with_properties(properties).with_skip_arrow_metadata(true);
    let mut writer = ArrowWriter::try_new_with_options(output, schema.clone(), options)?;
    let points = waveform.points();
    for start in (0..points).step_by(GROUP_ROWS) {
        let end = points.min(start + GROUP_ROWS);
        let difference: Float32Array = (start..end).map(|sample| waveform.difference_at(sample)).collect();
        let columns = vec![column(legs[0], start, end), column(legs[1], start, end), Arc::new(difference) as ArrayRef];
        writer.write(&RecordBatch::try_new(schema.clone(), columns)?)?;
    }
    writer.finish()?;
    Ok(())
}

/// Reads a waveform.
///
/// # Errors
/// [`StoreError::Damaged`] when the file does not hold what it must, or what the disk or the decoder says.
pub(in crate::store) fn read(path: &Path) -> Result<Waveform, StoreError> {
    let doing = "read a waveform";
    let file = File::open(path).map_err(|source| StoreError::file(doing, path, source))?;
    let failed = |source| StoreError::waveform(doing, path, source);
    let damaged =
        |why: String| StoreError::Damaged { doing, what: "the waveform".to_owned(), path: path.to_owned(), why };
    let builder = ParquetRecordBatchReaderBuilder::try_new(file).map_err(failed)?;
    let pairs = builder.metadata().file_metadata().key_value_metadata();
    let pairs = pairs.into_iter().flatten().map(|pair| (pair.key.clone(), pair.value.clone().unwrap_or_default()));
    let mut keys = Keys::new(pairs.collect());
    let mut legs = [None, None];
    let mut difference_v = Vec::new();
    let mut first_valid = None;
    let mut points = 0_usize;
    for batch in builder.with_batch_size(GROUP_ROWS).build().map_err(failed)? {
        let batch = batch.map_err(|error| failed(error.into()))?;
        for (leg, name) in legs.iter_mut().zip(LEGS) {
            let column = batch.column_by_name(name).ok_or_else(|| damaged(format!("it has no column `{name}`")))?;
            append(leg, column).map_err(|why| damaged(format!("column `{name}`: {why}")))?;
        }
        let column = batch.column_by_name("difference").and_then(|column| column.as_primitive_opt::<Float32Type>());
        let column = column.ok_or_else(|| damaged("it has no column `difference` of float32".to_owned()))?;
        for (offset, value) in column.iter().enumerate() {
            let Some(value) = value else { continue };
            let sample = points + offset;
            let first = *first_valid.get_or_insert(sample);
            if sample - first != difference_v.len() {
                return Err(damaged(format!("the difference has a hole before sample {sample}")));
            }
            difference_v.push(value);
        }
        points += batch.num_rows();
    }
    let [positive, negative] = legs.map(|leg| leg.unwrap_or(Samples::Codes(Vec::new())));
    let positive = keys.record(LEGS[0], positive).map_err(damaged)?;
    let negative = keys.record(LEGS[1], negative).map_err(damaged)?;
    Ok(Waveform { positive, negative, difference_v, first_valid: first_valid.unwrap_or(0), metadata: keys.rest() })
}

/// How many rows a file says it has, from its end alone.
///
/// # Errors
/// What the disk or the decoder says.
pub(in crate::store) fn rows(path: &Path) -> Result<i64, StoreError> {
    let doing = "look into a waveform's file";
    let file = File::open(path).map_err(|source| StoreError::file(doing, path, source))?;
    let reader = SerializedFileReader::new(file).map_err(|source| StoreError::waveform(doing, path, source))?;
    Ok(reader.metadata().file_metadata().num_rows())
}

/// The column type that a record's samples need.
fn kind(record: &Record) -> DataType {
    match record.samples {
        Samples::Codes(_) => DataType::Int16,
        Samples::Numbers(_) => DataType::Float32,
    }
}

/// The encoding that a record's samples compress best with.
fn encode(properties: WriterPropertiesBuilder, name: &str, record: &Record) -> WriterPropertiesBuilder {
    let encoding = match record.samples {
        Samples::Codes(_) => Encoding::DELTA_BINARY_PACKED,
        Samples::Numbers(_) => Encoding::BYTE_STREAM_SPLIT,
    };
    properties.set_column_encoding(ColumnPath::from(name), encoding)
}

/// A stretch of a record as a column. Both ends lie within the record, which was checked before.
fn column(record: &Record, start: usize, end: usize) -> ArrayRef {
    match &record.samples {
        Samples::Codes(codes) => Arc::new(Int16Array::from_iter_values(codes[start..end].iter().copied())),
        Samples::Numbers(numbers) => Arc::new(Float32Array::from_iter_values(numbers[start..end].iter().copied())),
    }
}

/// Appends a column to a record's samples.
fn append(samples: &mut Option<Samples>, column: &ArrayRef) -> Result<(), String> {
    if column.null_count() > 0 {
        return Err("samples are missing".to_owned());
    }
    if let Some(codes) = column.as_primitive_opt::<Int16Type>() {
        match samples.get_or_insert_with(|| Samples::Codes(Vec::new())) {
            Samples::Codes(all) => all.extend_from_slice(codes.values()),
            Samples::Numbers(_) => return Err("its type changes".to_owned()),
        }
    } else if let Some(numbers) = column.as_primitive_opt::<Float32Type>() {
        match samples.get_or_insert_with(|| Samples::Numbers(Vec::new())) {
            Samples::Numbers(all) => all.extend_from_slice(numbers.values()),
            Samples::Codes(_) => return Err("its type changes".to_owned()),
        }
    } else {
        return Err(format!("{} is neither int16 nor float32", column.data_type()));
    }
    Ok(())
}
