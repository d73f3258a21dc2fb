//! Files as people have them: each test is one habit of writing them.

#![allow(clippy::float_cmp)]

use super::*;
use crate::analysis::Samples;

/// 200 rows by `row(i, time, positive, negative)`, after `header`.
fn file(header: &str, row: impl Fn(f64, f64, f64) -> String) -> String {
    let mut text = header.to_owned();
    for i in 0..200 {
        let (p, n) = level(i);
        text.push_str(&row(f64::from(i) * 2e-9 - 1e-7, p, n));
    }
    text
}

/// What the legs read at sample i, in volts.
fn level(i: i32) -> (f64, f64) {
    (f64::from(i % 7) * 0.25 - 0.5, f64::from(i % 5) * 0.125)
}

fn read(text: &str) -> Imported {
    from_text(text, None, &Options::default()).unwrap_or_else(|error| panic!("{error}"))
}

/// Sees that the records are those of [`file`]; times and volts to a relative 1e-6.
fn check(imported: &Imported) {
    for (record, which) in [(&imported.positive, 0), (&imported.negative, 1)] {
        let volts = record.volts();
        assert_eq!(volts.len(), 200);
        for (i, volt) in volts.iter().enumerate() {
            let (p, n) = level(i32::try_from(i).unwrap());
            let wanted = if which == 0 { p } else { n };
            assert!((volt - wanted).abs() < 1e-6, "sample {i} of leg {which}: {volt}, not {wanted}");
        }
        assert!((record.interval_s / 2e-9 - 1.0).abs() < 1e-9, "{}", record.interval_s);
        assert!((record.start_s + 1e-7).abs() < 1e-15, "{}", record.start_s);
    }
}

fn taken<'a>(imported: &'a Imported, option: &str) -> &'a str {
    imported.guesses.iter().find(|guess| guess.option == option).map_or("", |guess| &guess.taken)
}

#[test]
fn our_own_export_with_its_empty_ends() {
    let text = file("time_s,positive_v,negative_v,difference_v\r\n", |t, p, n| {
        let difference = if t < 0.0 { String::new() } else { format!("{:e}", p - n) };
        format!("{t:.11e},{p:.9e},{n:.9e},{difference}\r\n")
    });
    let imported = read(&text);
    check(&imported);
    assert_eq!(taken(&imported, "separator"), "comma");
    assert_eq!(taken(&imported, "time"), "time_s");
    assert_eq!(taken(&imported, "positive"), "positive_v");
    assert_eq!(taken(&imported, "negative"), "negative_v");
}

#[test]
fn semicolons_with_decimal_commas_and_units_in_brackets() {
    let text = file("Zeit (ns);Kanal 1 (mV);Kanal 2 (mV)\n", |t, p, n| {
        format!("{};{};{}\n", t * 1e9, p * 1e3, n * 1e3).replace('.', ",")
    });
    let imported = read(&text);
    check(&imported);
    assert_eq!(taken(&imported, "decimal"), "comma");
    assert_eq!(taken(&imported, "time_unit"), "ns");
    assert_eq!(taken(&imported, "volt_unit"), "mV");
}

#[test]
fn tabs_with_a_line_of_units_below_the_names() {
    let text = file("saved on a Tuesday\n\ntime\tgate\tsource\nµs\tV\tmV\n", |t, p, n| {
        format!("{}\t{p}\t{}\n", t * 1e6, n * 1e3)
    });
    let imported = read(&text);
    check(&imported);
    assert_eq!(taken(&imported, "header_lines"), "4");
    assert_eq!((taken(&imported, "positive"), taken(&imported, "negative")), ("gate", "source"));
}

#[test]
fn blanks_and_a_comment_sign_before_the_names() {
    let text = file("# t minus plus\n", |t, p, n| format!("  {t:e}   {n}  {p}\n"));
    let imported = read(&text);
    check(&imported);
    assert_eq!((taken(&imported, "positive"), taken(&imported, "negative")), ("plus", "minus"));
}

#[test]
fn no_header_at_all_and_old_line_ends() {
    let text = file("", |t, p, n| format!("{t:e},{p},{n}\r"));
    let imported = read(&text);
    check(&imported);
    assert!(taken(&imported, "volt_unit").contains("none"), "{:?}", imported.guesses);
}

#[test]
fn an_interval_in_the_header_stands_for_a_time_column() {
    for line in ["Sample interval,2e-9", "sample interval: 2 ns", "\"Sample Rate\",500 MSa/s", "interval (ns);2"] {
        let text = file(&format!("{line}\nCH1,CH2\n"), |_, p, n| format!("{p},{n}\n"));
        let imported = read(&text);
        assert!((imported.positive.interval_s / 2e-9 - 1.0).abs() < 1e-12, "{line}");
        assert_eq!(imported.positive.start_s, 0.0);
        assert!(taken(&imported, "interval").contains(line), "{:?}", imported.guesses);
    }
    let text = file("CH1,CH2\n", |_, p, n| format!("{p},{n}\n"));
    assert_eq!(from_text(&text, None, &Options::default()), Err(ImportError::NoTime));
    let told = Options { interval_s: Some(2e-9), ..Options::default() };
    assert_eq!(from_text(&text, None, &told).unwrap().negative.interval_s, 2e-9);
}

#[test]
fn a_file_for_each_leg_and_a_time_column_for_each_leg() {
    let one =
        |leg: usize| file("time (s),voltage (V)\n", move |t, p, n| format!("{t:e},{}\n", if leg == 0 { p } else { n }));
    let imported = from_text(&one(0), Some(&one(1)), &Options::default()).unwrap();
    check(&imported);
    // The second leg's own times are 0.4 ns later.
    let text = file("t1 (s),a,t2 (s),b\n", |t, p, n| format!("{t:e},{p},{:e},{n}\n", t + 0.4e-9));
    let imported = read(&text);
    assert!((imported.negative.start_s - imported.positive.start_s - 0.4e-9).abs() < 1e-15);
    assert_eq!(taken(&imported, "negative_time"), "t2 (s)");
}

#[test]
fn what_is_told_is_taken_and_not_reported_as_a_guess() {
    let text = file("a,b,c,a\n", |t, p, n| format!("{n},{},{p},1\n", t * 1e9));
    let mut options = Options {
        time: Some("2".to_owned()),
        time_unit: Some("ns".to_owned()),
        positive: Some("c".to_owned()),
        negative: Some("1".to_owned()),
        attenuation: Some([1.0, 1.0]),
        ..Options::default()
    };
    let imported = from_text(&text, None, &options).unwrap();
    check(&imported);
    for option in ["time", "positive", "negative", "time_unit"] {
        assert_eq!(taken(&imported, option), "");
    }
    options.attenuation = Some([10.0, 1.0]);
    let ten = from_text(&text, None, &options).unwrap();
    assert!((ten.positive.volts()[3] - 10.0 * level(3).0).abs() < 1e-5);
    options.positive = Some("a".to_owned());
    assert!(matches!(from_text(&text, None, &options), Err(ImportError::AmbiguousColumn { count: 2, .. })));
    options.positive = Some("gate".to_owned());
    assert!(matches!(from_text(&text, None, &options), Err(ImportError::NoColumn { .. })));
    options.positive = Some("1".to_owned());
    assert!(matches!(from_text(&text, None, &options), Err(ImportError::SameColumn { .. })));
}

#[test]
fn times_with_few_digits_are_straightened() {
    // 5 µs with four digits: the times are on a grid of 1 ns, every second sample is off by 0.5 ns.
    let mut text = String::from("time_s,p,n\n");
    for i in 0..1500 {
        let t = 5e-6 + f64::from(i) * 2.5e-9;
        text.push_str(&format!("{:.3e},{},{}\n", t, f64::from(i % 7), f64::from(i % 5)));
    }
    let imported = read(&text);
    // The rounding is 1 ns wide: q/√12·√(12/n³) is 1.7e-14 s; five times that over 2.5 ns are 3.5e-5.
    assert!((imported.positive.interval_s / 2.5e-9 - 1.0).abs() < 3.5e-5, "{}", imported.positive.interval_s);
    assert!(imported.notes.iter().any(|note| note.contains("rounded")), "{:?}", imported.notes);
    let hole = file("t,p,n\n", |t, p, n| format!("{:e},{p},{n}\n", if t > 0.0 { t + 1e-8 } else { t }));
    assert!(matches!(from_text(&hole, None, &Options::default()), Err(ImportError::Axis { .. })));
    let back = file("t,p,n\n", |t, p, n| format!("{:e},{p},{n}\n", -t));
    assert!(matches!(from_text(&back, None, &Options::default()), Err(ImportError::AxisFalls { .. })));
}

#[test]
fn what_is_missing_or_odd_is_told_with_its_line() {
    let mut lines: Vec<String> =
        file("t,p,n\n", |t, p, n| format!("{t:e},{p},{n}\n")).lines().map(str::to_owned).collect();
    let at = |lines: &[String]| from_text(&lines.join("\n"), None, &Options::default());
    let whole = lines[100].clone();
    let time = whole.split(',').next().unwrap().to_owned();
    lines[100] = format!("{time},,2");
    assert_eq!(at(&lines), Err(ImportError::Missing { leg: "positive", line: 101 }));
    // SCPI-99, volume 1, 7.2.1.5: 9.91E37 is no number.
    lines[100] = format!("{time},1.0,9.91E37");
    assert_eq!(at(&lines), Err(ImportError::Missing { leg: "negative", line: 101 }));
    lines[100] = "--- page 2 ---".to_owned();
    assert_eq!(at(&lines), Err(ImportError::NotNumbers { line: 101, text: "--- page 2 ---".to_owned() }));
    lines[100] = format!("{time},2.0");
    assert_eq!(at(&lines), Err(ImportError::Fields { line: 101, found: 2, wanted: 3 }));
    lines[100] = whole;
    lines.push("end of record".to_owned());
    let found = at(&lines).unwrap();
    check(&found);
    assert!(found.notes[0].contains("line 202"), "{:?}", found.notes);
    assert!(matches!(at(&[]), Err(ImportError::NoRows { .. })));
    assert!(matches!(at(&["only words".to_owned()]), Err(ImportError::NoRows { .. })));
}

#[test]
fn the_converters_step_is_seen_or_told() {
    // Codes of 31.25 mV with noise about two levels, written with three decimals.
    let code = |i: i32| f64::from((i * 7919) % 5 + if (i / 50) % 2 == 0 { 20 } else { 120 }) * 0.031_25;
    let mut text = String::from("time_s,p_v,n_v\n");
    for i in 0..1000 {
        text.push_str(&format!("{:e},{:.3},{:.3}\n", f64::from(i) * 1e-9, code(i), code(i + 3)));
    }
    let imported = read(&text);
    assert!((imported.positive.step_v - 0.031_25).abs() < 2e-4, "{}", imported.positive.step_v);
    assert!(taken(&imported, "bits").contains("step"));
    let told = Options { bits: Some(8), span_v: Some(8.0), ..Options::default() };
    assert_eq!(from_text(&text, None, &told).unwrap().positive.step_v, 8.0 / 256.0);
    let half = Options { bits: Some(8), ..Options::default() };
    assert!(matches!(from_text(&text, None, &half), Err(ImportError::Option { option: "bits", .. })));
}

#[test]
fn a_record_of_numbers_that_were_computed_has_no_step() {
    let mut text = String::from("time_s,p_v,n_v\n");
    for i in 0..1000 {
        let x = f64::from(i) * 0.731;
        text.push_str(&format!("{:e},{},{}\n", f64::from(i) * 1e-9, x.sin(), x.cos()));
    }
    let imported = read(&text);
    assert_eq!(imported.positive.step_v, 0.0);
    assert!(matches!(imported.positive.samples, Samples::Numbers(_)));
}

#[test]
fn flat_tops_are_pointed_out() {
    let mut text = String::from("time_s,p_v,n_v\n");
    for i in 0..1000 {
        let x = ((f64::from(i) * 0.05).sin() * 140.0).round().clamp(-128.0, 127.0);
        text.push_str(&format!("{:e},{},{}\n", f64::from(i) * 1e-9, x * 0.01, (x / 2.0).round() * 0.01));
    }
    let imported = read(&text);
    assert!(imported.notes.iter().any(|note| note.contains("positive leg stand")), "{:?}", imported.notes);
    let told = Options { bits: Some(8), span_v: Some(2.56), ..Options::default() };
    let told = from_text(&text, None, &told).unwrap();
    assert!(told.positive.clipped() > 100, "every code occurs, so its ends are the converter's");
    assert_eq!(told.negative.clipped(), 0);
}
