//! Settings converted on their way out and back.

use super::*;

/// Vertical range per division and an offset of the other sign; a rate and seconds per division; codes of channels
/// from 0; averages in words.
const OTHERWISE: &str = r#"
name = "otherwise"

[words.depth]
1000 = "1K"
10000 = "10K"

[convert."vertical.set"]
per_division = "span_v / 8.0"
offset_v = "-offset_v"
index = "channel - 1.0"

[intent."vertical.set"]
send = ["A{index:whole}:DIV {per_division}", "A{index:whole}:POS {offset_v}"]

[convert."vertical.get"]
index = "channel - 1.0"
span_v = "per_division * 8.0"
offset_v = "-position"

[intent."vertical.get"]
ask = [
    { send = "A{index:whole}:DIV?", reply = ["per_division"] },
    { send = "A{index:whole}:POS?", reply = ["position"] },
]

[convert."timebase.set"]
per_division = "interval_s * points / 10.0"
rate = "1.0 / interval_s"
delay = "(0.5 - position) * interval_s * points"
length = "points"

[intent."timebase.set"]
send = ["T:DIV {per_division}", "T:RATE {rate:whole}", "T:LEN {length:depth}", "T:DEL {delay}", "T:REF {position:percent}"]

[convert."timebase.get"]
interval_s = "1.0 / rate"
points = "per_division * 10.0 * rate"
position = "percent / 100.0"

[intent."timebase.get"]
ask = [{ send = "T?", keys = { per_division = "DIVision", rate = "RATE", percent = "REFerence" }, between = ";", joint = "=" }]
"#;

fn timebase(interval_s: f64, points: i64) -> Call {
    Call::new(Intent::TimebaseSet).with("interval_s", interval_s).with("points", points).with("position", 0.25)
}

#[test]
fn settings_go_out_converted() {
    let dialect = dialect(OTHERWISE);
    let vertical = Call::new(Intent::VerticalSet).with("channel", 2).with("span_v", 8.0).with("offset_v", -0.5);
    assert_eq!(said(&dialect, &vertical), "A1:DIV 1E0\nA1:POS 5E-1\n");
    // 1 / 3 ns is no whole number of samples per second: the nearest one is asked for.
    assert_eq!(
        said(&dialect, &timebase(3e-9, 10_000)),
        "T:DIV 3E-6\nT:RATE 333333333\nT:LEN 10K\nT:DEL 7.5E-6\nT:REF 2.5E1\n"
    );
    let error = dialect.plan(&timebase(1e-9, 500)).unwrap_err();
    assert!(matches!(error, DialectError::NoWord { words, value } if words == "depth" && value == "500"));
    let error = dialect.plan(&timebase(0.0, 1000)).unwrap_err();
    assert_eq!(
        error.to_string(),
        "the expression `1.0 / interval_s` at the dialect's `convert.\"timebase.set\".rate` cannot be evaluated: the \
         result is inf"
    );
}

#[test]
fn replies_come_back_converted_and_bare_of_the_instruments_own_names() {
    let dialect = dialect(OTHERWISE);
    let get = Call::new(Intent::VerticalGet).with("channel", 1);
    assert_eq!(said(&dialect, &get), "~A0:DIV?\n~A0:POS?\n");
    let fields = dialect.parse(&get, &lines(&["0.5", "-0.25"])).unwrap();
    assert_eq!((fields.number("span_v"), fields.number("offset_v")), (Ok(4.0), Ok(0.25)));
    assert_eq!(fields.iter().count(), 2);
    let get = Call::new(Intent::TimebaseGet);
    let fields = dialect.parse(&get, &lines(&["ref=25;IGNORED=\"a;b=c\";DIV=1.0E-6;RATE=1E9"])).unwrap();
    // 1e-6 · 10 · 1e9 is 10000 but for the last digits.
    assert_eq!((fields.whole("points"), fields.number("position")), (Ok(10_000), Ok(0.25)));
    assert_eq!(fields.number("interval_s"), Ok(1e-9));
    let error = dialect.parse(&get, &lines(&["REF=25;DIV=1.23456E-6;RATE=1E8"])).unwrap_err();
    assert!(matches!(error, DialectError::NotWhole { name: "points", .. }), "{error}");
    let error = dialect.parse(&get, &lines(&["REF=25;DIV=1E-6;RATE=1E9;DIVISION=2E-6"])).unwrap_err();
    assert!(matches!(&error, DialectError::Key { key, found: 2, .. } if key == "DIVision"), "{error}");
    let error = dialect.parse(&get, &lines(&["REF=25;DIV=1E-6"])).unwrap_err();
    assert!(matches!(&error, DialectError::Key { key, found: 0, .. } if key == "RATE"), "{error}");
}

#[test]
fn mistakes_in_conversions_are_shown_at_their_place() {
    let text = r#"
name = "x"
[convert."vertical.set"]
per_division = "span / 8.0"
half = "span_v / 2"
quarter = "span_v / 4.0"
Big = "span_v"
[intent."vertical.set"]
send = ["R{channel} {half}", "O{channel} {offset_v}"]
[convert."vertical.get"]
span_v = "division * 8.0"
offset_v = "position"
[intent."vertical.get"]
ask = [{ send = "R{channel}?", reply = ["per_division", "position"] }]
[convert."coupling.get"]
coupling = "1.0"
[convert."output.set"]
level = "state"
[convert.error]
number = "1.0"
"#;
    let found: Vec<(&str, String)> = Dialect::read(text)
        .unwrap_err()
        .into_iter()
        .map(|mistake| (&text[mistake.span.clone()], mistake.what))
        .collect();
    for (place, what) in [
        ("\"span / 8.0\"", "it uses span, which no argument of `vertical.set` gives"),
        ("\"span_v / 2\"", "write constants as `2.0`"),
        ("quarter", "`quarter` is used in no command"),
        ("Big", "`Big` cannot name a number"),
        ("\"division * 8.0\"", "it uses division, which no reply of `vertical.get` gives"),
        ("coupling", "`coupling` of `coupling.get` is no number"),
        ("\"coupling.get\"", "there are no words for `coupling.get` to convert for"),
        ("\"output.set\"", "there are no words for `output.set`"),
        ("\"state\"", "it uses state, which no argument of `output.set` gives"),
        ("error", "`error` cannot be converted"),
    ] {
        assert!(found.iter().any(|(p, w)| p.contains(place) && w.contains(what)), "{place}: {what}\n{found:#?}");
    }
    // A misspelt field is told, whichever expression was meant to use it.
    assert!(found.iter().any(|(_, what)| what.contains("`per_division` is no field of `vertical.get`")), "{found:#?}");
}

#[test]
fn samples_are_read_in_windows_and_joined() {
    let text = bundled("scpi-99").unwrap().replace(
        "[intent.\"record.data\"]\nask = [{ send = \"TRACe:DATA? CHANnel{channel}\", block = true }]",
        "[window]\nmost = 16\n[convert.\"record.data\"]\nbegin = \"first + 1.0\"\nend = \"first + count\"\n\
         [intent.\"record.data\"]\nsend = [\"WIN {begin:whole},{end:whole}\"]\n\
         ask = [{ send = \"DATA? {channel}\", block = true }]",
    );
    let dialect = dialect(&text);
    let all: Vec<String> = dialect.data_calls(2, 40).map(|call| said(&dialect, &call)).collect();
    assert_eq!(all, ["WIN 1,16\n#DATA? 2\n", "WIN 17,32\n#DATA? 2\n", "WIN 33,40\n#DATA? 2\n"]);
    let preamble = |points: &str| {
        let line = format!("{points},2.0E-10,-1.0E-07,0.5,0.25,-128,127,0.5,1,7");
        dialect.parse(&Call::new(Intent::RecordPreamble).with("channel", 2), &lines(&[&line]))
    };
    let forty = preamble("40").unwrap();
    let window = |codes: std::ops::Range<i16>| Message::Block(codes.flat_map(i16::to_le_bytes).collect());
    let record = dialect.record(&forty, &[window(0..16), window(16..32), window(32..40)]).unwrap();
    assert_eq!(record.samples, Samples::Codes((0..40).collect()));
    let error = dialect.record(&forty, &[window(0..16), window(16..31), window(32..40)]).unwrap_err();
    assert_eq!(error, DialectError::Window { first: 16, wanted: 16, found: 15 });
    let error = dialect.record(&forty, &[window(0..16), window(16..32)]).unwrap_err();
    assert!(matches!(error, DialectError::Replies { wanted: 3, found: 2, .. }));
    // A preamble cannot make the daemon ask for ever.
    for points in ["67108865", "1E15", "-1"] {
        let error = preamble(points).unwrap_err();
        assert!(matches!(&error, DialectError::Preamble { name, .. } if name == "points"), "{error}");
    }
    // Without a window there are no numbers to ask by.
    assert_eq!(scpi_99().data_calls(2, 10).count(), 1);
    let bare = "name = \"x\"\n[samples]\nformat = \"u8\"\n[intent.\"record.data\"]\n\
                ask = [{ send = \"D{channel} {first}?\", block = true }]\n";
    assert_eq!(Dialect::read(bare).unwrap_err()[0].what, "`{first}` names no argument");
}
