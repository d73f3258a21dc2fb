//! A waveform comes back from its file as it went in, and its text says the same.
#![allow(clippy::unwrap_used, clippy::float_cmp)]

use std::fs::File;

use ::parquet::basic::Encoding;
use ::parquet::file::reader::{FileReader, SerializedFileReader};
use evenpair_core::analysis::Samples;
use proptest::prelude::*;
use tempfile::TempDir;
use uuid::Uuid;

use super::*;
use crate::store::disk::{Disk, RealDisk};
use crate::store::tests::{a_capture, a_correction, a_waveform};

fn through_a_file(waveform: &Waveform, folder: &TempDir) -> (Waveform, std::path::PathBuf) {
    let correction = a_correction("gate", 0);
    let capture = a_capture(Uuid::now_v7(), 3, Some(&correction), waveform.points());
    let path = folder.path().join("w.parquet");
    let mut output = RealDisk.create(&path).unwrap();
    parquet::write(output.as_mut(), waveform, &capture, Some(&correction)).unwrap();
    (parquet::read(&path).unwrap(), path)
}

fn same(read: &Waveform, written: &Waveform) {
    assert_eq!(read.positive, written.positive);
    assert_eq!(read.negative, written.negative);
    assert_eq!(read.difference_v, written.difference_v);
    if !written.difference_v.is_empty() {
        assert_eq!(read.first_valid, written.first_valid);
    }
    for (key, value) in &written.metadata {
        assert_eq!(read.metadata.get(key), Some(value));
    }
}

#[test]
fn codes_come_back_over_several_row_groups() {
    let folder = TempDir::new().unwrap();
    let written = a_waveform(300_000);
    let (read, path) = through_a_file(&written, &folder);
    same(&read, &written);
    let reader = SerializedFileReader::new(File::open(&path).unwrap()).unwrap();
    let groups = reader.metadata().row_groups();
    assert_eq!(groups.iter().map(|group| group.num_rows()).collect::<Vec<_>>(), [131_072, 131_072, 37_856]);
    let encodings = [Encoding::DELTA_BINARY_PACKED, Encoding::DELTA_BINARY_PACKED, Encoding::BYTE_STREAM_SPLIT];
    for (column, encoding) in groups[0].columns().iter().zip(encodings) {
        assert!(column.encodings().any(|used| used == encoding), "{}", column.column_path());
        assert!(column.dictionary_page_offset().is_none());
    }
    assert_eq!(parquet::rows(&path).unwrap(), 300_000);
}

#[test]
fn the_file_says_by_itself_how_to_read_it() {
    let folder = TempDir::new().unwrap();
    let written = a_waveform(100);
    let (read, path) = through_a_file(&written, &folder);
    let reader = SerializedFileReader::new(File::open(path).unwrap()).unwrap();
    let pairs = reader.metadata().file_metadata().key_value_metadata().unwrap().clone();
    let find = |key: &str| pairs.iter().find(|pair| pair.key == key).and_then(|pair| pair.value.clone()).unwrap();
    let number = |key: &str| find(key).parse::<f64>().unwrap();
    assert_eq!(number("negative.zero_v"), written.negative.zero_v);
    assert_eq!(number("positive.volts_per_code"), written.positive.volts_per_code);
    assert_eq!(number("interval_s"), written.positive.interval_s);
    assert_eq!(number("correction.skew_s"), 1.234_567_890_123e-9);
    assert_eq!(number("correction.skew_s.u"), 4.5e-12);
    assert_eq!(find("pair"), "gate");
    assert_eq!(find("condition.bus_voltage"), "4.8e1 V");
    assert!(find("about").contains("volts_per_code * code + zero_v"));
    assert_eq!(read.metadata.get("number").map(String::as_str), Some("3"));
}

#[test]
fn numbers_and_empty_differences_come_back() {
    let folder = TempDir::new().unwrap();
    let mut written = a_waveform(1_000);
    written.negative.samples = Samples::Numbers((0..1_000).map(|k| (k as f32).sqrt()).collect());
    written.difference_v.clear();
    same(&through_a_file(&written, &folder).0, &written);
    let mut written = a_waveform(0);
    written.first_valid = 0;
    let (read, _) = through_a_file(&written, &folder);
    assert_eq!(read.points(), 0);
}

#[test]
fn what_is_no_waveform_is_refused_by_name() {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("w.parquet");
    std::fs::write(&path, b"PAR1 but not really").unwrap();
    let refused = parquet::read(&path).unwrap_err();
    assert!(matches!(refused, StoreError::Waveform { .. }), "{refused}");
    let refused = parquet::read(&folder.path().join("none.parquet")).unwrap_err();
    assert!(matches!(refused, StoreError::File { .. }), "{refused}");
}

#[test]
fn records_that_do_not_fit_are_told_apart() {
    let capture = a_capture(Uuid::now_v7(), 1, None, 100);
    assert!(a_waveform(100).check_against(&capture).is_ok());
    let spoilt: [fn(&mut Waveform); 5] = [
        |w| w.negative.samples = Samples::Codes(vec![0; 99]),
        |w| *w = a_waveform(99),
        |w| w.negative.interval_s *= 1.5,
        |w| w.negative.start_s = 0.0,
        |w| w.first_valid += 21,
    ];
    let mut reasons = Vec::new();
    for spoil in spoilt {
        let mut waveform = a_waveform(100);
        spoil(&mut waveform);
        reasons.push(waveform.check_against(&capture).unwrap_err().to_string());
    }
    assert_eq!(reasons[2], reasons[3]);
    reasons.sort();
    reasons.dedup();
    assert_eq!(reasons.len(), 4);
}

#[test]
fn text_has_a_line_per_sample_and_nothing_where_there_is_no_support() {
    let mut waveform = a_waveform(3);
    waveform.positive.samples = Samples::Codes(vec![0, 100, -100]);
    waveform.negative.samples = Samples::Numbers(vec![0.5, 1.5, 2.5]);
    for record in [&mut waveform.positive, &mut waveform.negative] {
        (record.volts_per_code, record.zero_v) = (0.25, 1.0);
        (record.start_s, record.interval_s) = (-1e-6, 1e-6);
    }
    (waveform.first_valid, waveform.difference_v) = (1, vec![-0.5]);
    let mut text = Vec::new();
    csv::write(&waveform, &mut text).unwrap();
    // Worked by hand: 0.25 V per code and 1 V at code 0.
    let expected = "time_s,positive_v,negative_v,difference_v\r\n\
                    -1.00000000000e-6,1.000000000e0,1.125000000e0,\r\n\
                    0.00000000000e0,2.600000000e1,1.375000000e0,-5.000000000e-1\r\n\
                    1.00000000000e-6,-2.400000000e1,1.625000000e0,\r\n";
    assert_eq!(String::from_utf8(text).unwrap(), expected);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(32))]
    #[test]
    fn any_scale_and_any_codes_come_back(
        codes in proptest::collection::vec(any::<i16>(), 1..400),
        scale in proptest::num::f64::NORMAL, zero in proptest::num::f64::NORMAL, start in proptest::num::f64::NORMAL,
        lead in 0_usize..50,
    ) {
        let folder = TempDir::new().unwrap();
        let mut written = a_waveform(codes.len());
        written.negative.samples = Samples::Codes(codes.iter().rev().copied().collect());
        written.positive.samples = Samples::Codes(codes);
        (written.positive.volts_per_code, written.positive.zero_v) = (scale, zero);
        (written.positive.start_s, written.negative.start_s) = (start, start);
        written.first_valid = lead.min(written.points());
        written.difference_v = vec![-0.0; written.points() - written.first_valid];
        same(&through_a_file(&written, &folder).0, &written);
    }
}
