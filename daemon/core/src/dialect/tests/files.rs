//! What dialect files may say, and how their mistakes are shown.

use super::*;

/// The text that each mistake is marked at, with what is wrong.
fn mistakes(text: &str) -> Vec<(&str, String)> {
    Dialect::read(text).unwrap_err().into_iter().map(|mistake| (&text[mistake.span.clone()], mistake.what)).collect()
}

#[test]
fn every_mistake_is_shown_at_its_place() {
    let text = r#"
name = 3
[line]
ending = "cr"
[skew]
step = "50 ps"
range = "1 ps"
positive = "up"
[words.slope]
positive = "POS;*RST"
[intent."vertical.set"]
send = ["RANGe {span}", "OFFSet {offset_v", "A?"]
[intent."vertikal.get"]
ask = []
[intent.error]
send = ["X"]
[intent."trigger.set"]
send = ["LEVel {level_v:list}", "SLOPe {slope}", "SLOPe {slope:edge}", "SLOPe {slope:slope}"]
[intent."measure.voltage"]
ask = [{ send = "MEAS{channel}?", reply = ["volts"] }, { send = "B?" }]
[intent."skew.set"]
send = ["DELay {delay_s}"]
[completion]
ask = "*OPC?"
equals = "1"
clear = 1
"#;
    let found = mistakes(text);
    let expected = [
        ("3", "`name` must be a text in quotes"),
        ("\"cr\"", "`ending` cannot be `cr`"),
        ("\"50 ps\"", "the step must be above 0 and no larger than the range"),
        ("\"up\"", "`positive` cannot be `up`"),
        ("\"POS;*RST\"", "`POS;*RST`: a word must not hold `;` or `?`: it is one word of a command"),
        ("\"RANGe {span}\"", "`{span}` names no argument"),
        ("\"OFFSet {offset_v\"", "a `{` has no `}`"),
        ("\"A?\"", "`A?` asks for something"),
        ("\"vertikal.get\"", "`vertikal.get` is no intent"),
        ("error", "the error queue has a table of its own"),
        ("\"LEVel {level_v:list}\"", "`{level_v:list}` cannot be spelled so: it is of another kind"),
        ("\"SLOPe {slope}\"", "`slope` is a keyword"),
        (
            "\"SLOPe {slope:edge}\"",
            "`{slope:edge}` cannot be spelled so: `edge` is neither a spelling nor a map of words",
        ),
        (
            "\"SLOPe {slope:slope}\"",
            "`{slope:slope}` cannot be spelled so: its words have nothing for positive, negative",
        ),
        ("\"volts\"", "`volts` is no field of `measure.voltage`"),
        ("{ send = \"B?\" }", "how the reply looks must be said once"),
        ("\"skew.set\"", "`channel` of `skew.set` is used nowhere"),
        ("[completion]", "which reply means complete must be said once"),
    ];
    for (place, what) in expected {
        assert!(found.iter().any(|(p, w)| *p == place && w == what), "{place}: {what}\nfound: {found:#?}");
    }
    // `[skew]` is there, though not usable, so nothing is said of `skew.set` lacking it.
    assert_eq!(found.len(), expected.len(), "{found:#?}");
}

#[test]
fn an_argument_is_left_out_only_on_purpose() {
    let silent = "name = \"x\"\n[intent.\"source.voltage\"]\nsend = [\"VOLT {value}\"]\n";
    assert_eq!(mistakes(silent)[0].1, "`channel` of `source.voltage` is used nowhere");
    let said_so = "name = \"x\"\n[intent.\"source.voltage\"]\nsend = [\"VOLT {value}\"]\nignore = [\"channel\"]\n";
    let call = Call::new(Intent::SourceVoltage).with("channel", 1).with("value", 5.0);
    assert_eq!(said(&dialect(said_so), &call), "VOLT 5E0\n");
}

#[test]
fn a_reply_that_lacks_a_field_is_a_mistake() {
    let text =
        "name = \"x\"\n[intent.\"vertical.get\"]\nask = [{ send = \"R{channel}?\", reply = [\"span_v\", \"_\"] }]\n";
    assert_eq!(mistakes(text)[0].1, "no reply of `vertical.get` gives offset_v");
}

#[test]
fn replies_with_header_and_units_are_stripped() {
    let text = r#"
name = "x"
[line]
ending = "crlf"
pause = "20 ms"
[reply]
header = true
units = true
[intent."measure.voltage"]
ask = [{ send = "MEAS{channel}?", reply = ["value"], pause = "0 s" }]
[intent."source.voltage"]
send = ["VOLT{channel} {value}"]
[errors]
ask = "ERR?"
reply = ["text", "_", "number"]
empty = 100
"#;
    let dialect = dialect(text);
    let call = Call::new(Intent::MeasureVoltage).with("channel", 1);
    let plan = dialect.plan(&call).unwrap();
    assert_eq!((plan[0].send.as_slice(), plan[0].pause_after_s), (b"MEAS1?\r\n".as_slice(), 0.0));
    let fields = dialect.parse(&call, &lines(&["MEAS1:VOLT 48.0E0 MV"])).unwrap();
    assert_eq!(fields.number("value"), Ok(0.048));
    let set = Call::new(Intent::SourceVoltage).with("channel", 1).with("value", 5);
    assert_eq!(dialect.plan(&set).unwrap()[0].pause_after_s, 0.02);
    assert_eq!(dialect.parse_error("ERR \"fine\",7,100"), Ok(None));
    assert_eq!(dialect.parse_error("\"hot, very\",7,3"), Ok(Some((3, "hot, very".to_owned()))));
    assert!(dialect.most_lead_bytes() > 0);
    assert_eq!(dialect.completion(), None);
    assert!(matches!(dialect.plan(&Call::new(Intent::Complete)), Err(DialectError::Unsupported { .. })));
}

#[test]
fn completion_by_polling_bits() {
    let text = |until: &str| format!("name = \"x\"\n[completion]\nask = \"STAT?\"\nevery = \"50 ms\"\n{until}\n");
    let done = |until: &str, reply: &str| {
        let dialect = dialect(&text(until));
        assert_eq!(dialect.completion(), Some(&Completion::Poll { every_s: 0.05 }));
        dialect.parse(&Call::new(Intent::Complete), &lines(&[reply])).unwrap().flag("done").unwrap()
    };
    assert!(done("clear = 56", "128"));
    assert!(!done("clear = 56", "#B100000"));
    assert!(done("set = 3", "7"));
    assert!(!done("set = 3", "5"));
    assert!(done("equals = \"READY\"", "\"ready\""));
    assert!(!done("equals = \"READY\"", "BUSY"));
}

#[test]
fn a_skew_setting_that_counts_the_other_way_is_turned() {
    let text = r#"
name = "x"
[skew]
step = "10 ps"
range = "1 ns"
positive = "later"
[intent."skew.set"]
send = ["SKEW{channel} {delay_s}"]
[intent."skew.get"]
ask = [{ send = "SKEW{channel}?", reply = ["delay_s"] }]
"#;
    let dialect = dialect(text);
    let set = |delay_s: f64| Call::new(Intent::SkewSet).with("channel", 2).with("delay_s", delay_s);
    assert_eq!(said(&dialect, &set(5e-10)), "SKEW2 -5E-10\n");
    assert_eq!(said(&dialect, &set(0.0)), "SKEW2 0E0\n");
    let get = Call::new(Intent::SkewGet).with("channel", 2);
    assert_eq!(dialect.parse(&get, &lines(&["-5E-10"])).unwrap().number("delay_s"), Ok(5e-10));
}

#[test]
fn expressions_are_checked_when_they_are_read() {
    let text = r#"
name = "x"
[samples]
format = "u8"
[record]
volts = "(raw - yref) * yinc + yorg"
seconds = "xorg + index * 2"
averages = "1 +"
[intent."record.preamble"]
ask = [{ send = "PRE? {channel}", reply = ["points", "xinc", "xorg", "yinc"] }]
"#;
    let found = mistakes(text);
    let has = |place: &str, what: &str| found.iter().any(|(p, w)| p.contains(place) && w.contains(what));
    assert!(has("yref", "it uses yorg, yref, which no reply gives"), "{found:#?}");
    assert!(has("index * 2", "write constants as `2.0`"), "{found:#?}");
    assert!(has("1 +", "`averages`: "), "{found:#?}");
    assert!(has("[samples]", "nothing gives"), "{found:#?}");
}

#[test]
fn a_dialect_can_be_shared_between_tasks() {
    fn shared<T: Send + Sync>(_: &T) {}
    shared(&scpi_99());
}

#[test]
fn only_numbers_from_one_are_suffixes() {
    let text = r#"
name = "x"
[words.from]
"*" = "CHAN{}"
[intent."trigger.set"]
send = ["SOUR {channel:from}"]
ignore = ["level_v", "slope"]
"#;
    let dialect = dialect(text);
    let call = |channel: i64| {
        let slope = Value::Keyword("positive".to_owned());
        Call::new(Intent::TriggerSet).with("channel", channel).with("level_v", 0.0).with("slope", slope)
    };
    assert_eq!(said(&dialect, &call(3)), "SOUR CHAN3\n");
    for channel in [0, -1] {
        assert!(matches!(dialect.plan(&call(channel)), Err(DialectError::NoWord { words, .. }) if words == "from"));
    }
}
