//! Records out of literal bytes, in every format.

use super::*;
use crate::analysis::record::Samples;

const PREAMBLE: &str = "3,2.0E-10,-1.0E-07,0.5,0.25,-128,127,0.5,1,7";

fn preamble(dialect: &Dialect, line: &str) -> Fields {
    dialect.parse(&Call::new(Intent::RecordPreamble).with("channel", 1), &lines(&[line])).unwrap()
}

/// The bundled dialect with other samples.
fn with_samples(samples: &str) -> Dialect {
    dialect(&bundled("scpi-99").unwrap().replace("format = \"i16\"\norder = \"little\"", samples))
}

fn decoded(samples: &str, data: &Message) -> RawRecord {
    let dialect = with_samples(samples);
    dialect.record(&preamble(&dialect, PREAMBLE), std::slice::from_ref(data)).unwrap()
}

#[test]
fn integers_of_every_width_sign_and_order() {
    let codes = |samples: &str, bytes: &[u8]| match decoded(samples, &Message::Block(bytes.to_vec())).samples {
        Samples::Codes(codes) => codes,
        Samples::Numbers(numbers) => panic!("{numbers:?}"),
    };
    assert_eq!(codes("format = \"i8\"", &[0x00, 0x7F, 0x80]), [0, 127, -128]);
    assert_eq!(codes("format = \"u8\"", &[0x00, 0x7F, 0x80]), [0, 127, 128]);
    let bytes = [0x00, 0x01, 0x7F, 0xFF, 0x80, 0x00];
    assert_eq!(codes("format = \"i16\"\norder = \"big\"", &bytes), [1, 32767, -32768]);
    assert_eq!(codes("format = \"i16\"\norder = \"little\"", &bytes), [256, -129, 128]);
    assert_eq!(codes("format = \"u16\"\norder = \"big\"", &bytes), [-32767, -1, 0]);
    assert_eq!(codes("format = \"u16\"\norder = \"little\"", &bytes), [-32512, 32639, -32640]);
}

#[test]
fn shifting_codes_without_sign_leaves_the_volts() {
    let record =
        decoded("format = \"u16\"\norder = \"big\"", &Message::Block(vec![0x00, 0x01, 0x7F, 0xFF, 0x80, 0x00]));
    let Samples::Codes(codes) = &record.samples else { panic!() };
    let volts: Vec<f64> = codes.iter().map(|&code| f64::from(code) * record.volts_per_code + record.zero_v).collect();
    // 0.5 V per code and 0.25 V at code 0, on the codes 1, 32767 and 32768 that were sent.
    assert_eq!(volts, [0.75, 16383.75, 16384.25]);
    assert_eq!(record.end_codes, (-128.0 - 32768.0, 127.0 - 32768.0));
}

#[test]
fn numbers_in_bytes_and_in_text() {
    let numbers = |samples: &str, data: &Message| match decoded(samples, data).samples {
        Samples::Numbers(numbers) => numbers,
        Samples::Codes(codes) => panic!("{codes:?}"),
    };
    let mut bytes = Vec::new();
    for number in [0.0_f32, -1.5, 3.25e-3] {
        bytes.extend(number.to_be_bytes());
    }
    let wanted = [0.0, -1.5, 3.25e-3];
    assert_eq!(numbers("format = \"f32\"\norder = \"big\"", &Message::Block(bytes.clone())), wanted);
    bytes.chunks_exact_mut(4).for_each(<[u8]>::reverse);
    assert_eq!(numbers("format = \"f32\"\norder = \"little\"", &Message::Block(bytes)), wanted);
    assert_eq!(numbers("format = \"text\"", &Message::Line("0, -1.5E0,+3.25E-03".to_owned())), wanted);
    assert_eq!(numbers("format = \"text\"", &Message::Block(b"0,-1.5,3.25E-3\n".to_vec())), wanted);
}

#[test]
fn a_whole_record_in_the_bundled_dialect() {
    let dialect = scpi_99();
    let call = Call::new(Intent::RecordData).with("channel", 1);
    let data = Message::Block(vec![0, 1, 0xFF, 0xFF, 0, 0x80]);
    assert_eq!(dialect.parse(&call, std::slice::from_ref(&data)).unwrap(), Fields::new());
    assert_eq!(dialect.most_block_bytes(3), 6);
    assert_eq!(
        dialect.record(&preamble(&dialect, PREAMBLE), std::slice::from_ref(&data)).unwrap(),
        RawRecord {
            samples: Samples::Codes(vec![256, -1, -32768]),
            volts_per_code: 0.5,
            zero_v: 0.25,
            interval_s: 2e-10,
            start_s: -1e-7,
            end_codes: (-128.0, 127.0),
            step_v: 0.5,
            averages: 1,
            acquisition: 7,
        }
    );
}

#[test]
fn volts_and_seconds_by_expression() {
    let text = r#"
name = "x"
[samples]
format = "u8"
[record]
volts = "(raw - yref) * yinc + yorg"
seconds = "(index - xref) * xinc + xorg"
low_code = "0"
high_code = "255.0"
step_v = "yinc"
averages = "kind == 2.0 ? count : 1.0"
acquisition = "0"
[intent."record.preamble"]
ask = [
    { send = "PRE:COUNT? {channel}", reply = ["points"] },
    { send = "PRE? {channel}", reply = ["kind", "count", "xinc", "xorg", "xref", "yinc", "yorg", "yref", "_"] },
]
"#;
    let dialect = dialect(text);
    let call = Call::new(Intent::RecordPreamble).with("channel", 1);
    let fields = dialect.parse(&call, &lines(&["2", "2,64,1E-9,-1E-3,10,0.04,1.5,128,\"x\""])).unwrap();
    let record = dialect.record(&fields, &[Message::Block(vec![128, 255])]).unwrap();
    // By hand: (0 - 128)·0.04 + 1.5 = -3.62 and (0 - 10)·1e-9 - 1e-3 = -1.00001e-3.
    assert!((record.zero_v + 3.62).abs() < 1e-14);
    assert!((record.volts_per_code - 0.04).abs() < 1e-15);
    assert!((record.start_s + 1.00001e-3).abs() < 1e-18);
    // The slope keeps its digits beside a start a million times larger: 2^-52 · 1e-3 over 2^20 intervals.
    assert!((record.interval_s - 1e-9).abs() < 1e-24, "{}", record.interval_s - 1e-9);
    assert_eq!((record.end_codes, record.averages), ((0.0, 255.0), 64));
}

#[test]
fn records_that_cannot_be_are_refused() {
    let dialect = scpi_99();
    let refused = |line: &str, bytes: &[u8]| {
        dialect.record(&preamble(&dialect, line), &[Message::Block(bytes.to_vec())]).unwrap_err()
    };
    assert!(matches!(refused(PREAMBLE, &[0; 4]), DialectError::Length { wanted: 3, found: 2 }));
    assert!(matches!(refused(PREAMBLE, &[0; 5]), DialectError::Ragged { bytes: 5, each: 2 }));
    for (name, line) in [
        ("interval_s", "3,0,0,0.5,0,-128,127,0.5,1,7"),
        ("volts_per_code", "3,1,0,0,0,-128,127,0.5,1,7"),
        ("high_code", "3,1,0,0.5,0,127,127,0.5,1,7"),
        ("step_v", "3,1,0,0.5,0,-128,127,-1,1,7"),
        ("averages", "3,1,0,0.5,0,-128,127,0.5,0,7"),
    ] {
        let error = refused(line, &[0; 6]);
        assert!(matches!(&error, DialectError::Preamble { name: found, .. } if found == name), "{error}");
    }
    let nan = f32::NAN.to_be_bytes();
    let floats = with_samples("format = \"f32\"\norder = \"big\"");
    let data = Message::Block([nan, nan, nan].concat());
    let error = floats.record(&preamble(&floats, PREAMBLE), &[data]).unwrap_err();
    assert!(matches!(error, DialectError::Sample { index: 0, .. }));
    assert!(matches!(
        dialect.record(&preamble(&dialect, PREAMBLE), &[Message::Line("1,2,3".to_owned())]),
        Err(DialectError::WrongMessage { .. })
    ));
}

#[test]
fn a_bent_expression_is_refused() {
    let text = r#"
name = "x"
[samples]
format = "u8"
[record]
volts = "raw * raw * gain"
[intent."record.preamble"]
ask = [{ send = "PRE? {channel}", reply = ["points", "interval_s", "start_s", "gain", "low_code", "high_code", "step_v", "averages", "acquisition"] }]
"#;
    let dialect = dialect(text);
    let call = Call::new(Intent::RecordPreamble).with("channel", 1);
    let error = dialect.parse(&call, &lines(&["2,1,0,1,0,255,1,1,1"])).unwrap_err();
    assert!(matches!(error, DialectError::Expression { name, .. } if name == "record.volts"));
}
