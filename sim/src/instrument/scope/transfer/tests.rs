//! Records as bytes and text.

use super::*;
use crate::world::{Acquisition, ChannelSettings, Coupling, ScopeSettings, Trigger, TriggerSource};

fn record(codes: Vec<i16>, fine: i32) -> Record {
    let step_v = 0.5;
    let data = ChannelData {
        codes,
        volts_per_code: step_v / f64::from(fine),
        zero_v: 1.0,
        low_code: -128 * fine,
        high_code: 127 * fine,
        step_v,
    };
    let channel = ChannelSettings { span_v: 128.0, offset_v: 1.0, coupling: Coupling::Dc, delay_s: 0.0 };
    Record {
        acquisition: Acquisition { channels: vec![data], start_s: -2e-9, number: 7 },
        settings: ScopeSettings {
            channels: vec![channel],
            interval_s: 1e-9,
            points: 4,
            trigger_position: 0.5,
            trigger: Trigger { source: TriggerSource::Immediate, level_v: 0.0, rising: true },
            averages: if fine == 1 { 1 } else { 16 },
        },
    }
}

#[test]
fn single_sweeps_are_converter_codes() {
    let record = record(vec![-128, -1, 0, 127], 1);
    assert_eq!(binary(&record, 0, Encoding::Integer8, false), Ok(vec![0x80, 0xFF, 0x00, 0x7F]));
    assert_eq!(binary(&record, 0, Encoding::Integer16, false), Ok(vec![0xFF, 0x80, 0xFF, 0xFF, 0, 0, 0, 0x7F]));
    assert_eq!(binary(&record, 0, Encoding::Integer16, true), Ok(vec![0x80, 0xFF, 0xFF, 0xFF, 0, 0, 0x7F, 0]));
    let preamble = preamble(&record, 0, Encoding::Integer8).unwrap();
    assert_eq!(preamble, "4,1.0E-9,-2.0E-9,5.0E-1,1.0E+0,-128,127,5.0E-1,1,7");
}

#[test]
fn averaged_sweeps_have_a_finer_grid_in_two_bytes_and_whole_steps_in_one() {
    let record = record(vec![-32768, -129, 127, 32512], 256);
    assert_eq!(binary(&record, 0, Encoding::Integer16, false), Ok(vec![0x80, 0, 0xFF, 0x7F, 0, 0x7F, 0x7F, 0]));
    // -129/256 is nearest to -1, 127/256 to 0.
    assert_eq!(binary(&record, 0, Encoding::Integer8, false), Ok(vec![0x80, 0xFF, 0x00, 0x7F]));
    assert_eq!(
        preamble(&record, 0, Encoding::Integer16).unwrap(),
        "4,1.0E-9,-2.0E-9,1.953125E-3,1.0E+0,-32768,32512,5.0E-1,16,7"
    );
    assert_eq!(
        preamble(&record, 0, Encoding::Integer8).unwrap(),
        "4,1.0E-9,-2.0E-9,5.0E-1,1.0E+0,-128,127,5.0E-1,16,7"
    );
}

#[test]
fn volts_as_text_and_as_numbers() {
    let record = record(vec![-2, 0, 1], 1);
    assert_eq!(text(&record, 0, ""), Ok("0.0E+0,1.0E+0,1.5E+0".to_owned()));
    // IEEE 754: 1.0 is 3F800000, 1.5 is 3FC00000.
    let bytes = vec![0, 0, 0, 0, 0x3F, 0x80, 0, 0, 0x3F, 0xC0, 0, 0];
    assert_eq!(binary(&record, 0, Encoding::Real32, false), Ok(bytes.clone()));
    let swapped: Vec<u8> = bytes.chunks(4).flat_map(|four| four.iter().rev().copied()).collect();
    assert_eq!(binary(&record, 0, Encoding::Real32, true), Ok(swapped));
}

#[test]
fn a_channel_that_was_not_taken_has_no_data() {
    assert_eq!(text(&record(vec![0], 1), 3, ""), Err(Fault::Stale));
}
