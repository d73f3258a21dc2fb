//! Error queues, words, keys and leads in every form that instruments have.

use super::*;

fn errors(table: &str) -> Dialect {
    dialect(&format!("name = \"x\"\n[errors]\nask = \"E?\"\n{table}\n"))
}

#[test]
fn error_queues_of_every_form() {
    let read = |table: &str, line: &str| errors(table).parse_error(line);
    let entry = |number, text: &str| Ok(Some((number, text.to_owned())));
    let usual = "reply = [\"number\", \"text\"]";
    assert_eq!(read(usual, "-222,\"Data out of range, 5 V\""), entry(-222, "Data out of range, 5 V"));
    assert_eq!(read(usual, "-222,Data out of range, 5 V"), entry(-222, "Data out of range, 5 V"));
    assert_eq!(read(usual, "-222,\"Data out of range\",17"), entry(-222, "Data out of range"));
    assert_eq!(read(usual, "0,No error"), Ok(None));
    assert_eq!(read("reply = [\"number\"]", "17"), entry(17, ""));
    assert_eq!(read("reply = [\"number\"]", "+0"), Ok(None));
    assert_eq!(read("reply = [\"number\"]\nempty = -1", "-1"), Ok(None));
    assert_eq!(read("reply = [\"number\"]\nempty = -1", "0"), entry(0, ""));
    let words = "reply = [\"number\", \"text\"]\nbetween = \" \"\nempty = \"ALL QUIET\"";
    assert_eq!(read(words, "all quiet"), Ok(None));
    assert_eq!(read(words, "12 too hot, switch off"), entry(12, "too hot, switch off"));
    assert_eq!(read(words, "0 odd"), entry(0, "odd"));
    assert!(matches!(read(words, "hello"), Err(DialectError::Read { .. })));
    assert_eq!(read("reply = [\"_\", \"number\", \"text\"]\nbetween = \";\"", "E;3;\"a;b\""), entry(3, "a;b"));
    // Without a table there is no queue.
    assert!(dialect("name = \"x\"\n").error_query().is_none());
    for bad in ["between = \"\"", "between = \"ab\"", "between = \"-\"", "between = \"x\""] {
        let text = format!("name = \"x\"\n[errors]\nask = \"E?\"\nreply = [\"number\"]\n{bad}\n");
        assert!(Dialect::read(&text).unwrap_err()[0].what.starts_with("`between` cannot be"), "{bad}");
    }
}

#[test]
fn states_in_long_and_short_words() {
    let dialect = dialect(
        r#"
name = "x"
[words.mode]
true = "RUNning"
false = "HALTed"
[words.level]
1 = "SINGle"
"*" = "MANY{}"
[intent."output.set"]
send = ["OUT{channel} {state:mode}"]
[intent."output.get"]
ask = [{ send = "OUT{channel}?", reply = ["state:mode"] }]
[intent."average.get"]
ask = [{ send = "AV?", keys = { "count:level" = "AVerage" } }]
"#,
    );
    let get = Call::new(Intent::OutputGet).with("channel", 1);
    let state = |line: &str| dialect.parse(&get, &lines(&[line])).and_then(|fields| fields.flag("state"));
    for word in ["RUN", "running", "RUNNING", "\"RUN\""] {
        assert_eq!(state(word), Ok(true), "{word}");
    }
    assert_eq!((state("HALT"), state("halted")), (Ok(false), Ok(false)));
    assert!(matches!(state("RUNN"), Err(DialectError::NoWord { .. })));
    assert_eq!(said(&dialect, &Call::new(Intent::OutputSet).with("channel", 1).with("state", true)), "OUT1 RUNning\n");
    let average =
        |line: &str| dialect.parse(&Call::new(Intent::AverageGet), &lines(&[line])).and_then(|f| f.whole("count"));
    assert_eq!((average("AV SING"), average("ZOOM 1,AVERAGE MANY64")), (Ok(1), Ok(64)));
    // Flags without a map are 1 and 0, ON and OFF.
    let plain = super::dialect(
        "name = \"x\"\n[intent.\"output.get\"]\nask = [{ send = \"O{channel}?\", reply = [\"state\"] }]\n",
    );
    let state = |line: &str| plain.parse(&get, &lines(&[line])).and_then(|fields| fields.flag("state"));
    assert_eq!((state("ON"), state("0")), (Ok(true), Ok(false)));
}

#[test]
fn a_preamble_by_keys_with_names_of_its_own() {
    let dialect = dialect(
        r#"
name = "x"
[reply]
header = true
units = true
[samples]
format = "text"
lead = 12
[words.kind]
1 = "PLAin"
2 = "MEAN"
[record]
volts = "(raw - mid) * gain"
low_code = "0.0"
high_code = "255.0"
step_v = "gain"
averages = "kind == 2.0 ? count : 1.0"
[intent."record.preamble"]
ask = [{ send = "PRE{channel}?", header = false, between = ";", keys = { points = "LENgth", interval_s = "DT", start_s = "T0", gain = "GAIN", mid = "MID", "kind:kind" = "KIND", count = "COUNt", acquisition = "SEQuence" } }]
[intent."record.data"]
ask = [{ send = "DATA{channel}?", line = "block" }]
"#,
    );
    let call = Call::new(Intent::RecordPreamble).with("channel", 1);
    let line = "LENGTH 3;DT 2 NS;T0 -1 US;GAIN 10 MV;MID 128;KIND MEAN;COUN 16;SEQ 4;NOTE \"a;DT 5\"";
    let fields = dialect.parse(&call, &lines(&[line])).unwrap();
    assert_eq!((fields.whole("averages"), fields.whole("acquisition")), (Ok(16), Ok(4)));
    let record = dialect.record(&fields, &lines(&["DATA1 1.0E0 V,2 MV, -3.5V"])).unwrap();
    assert_eq!(record.samples, Samples::Numbers(vec![1.0, 0.002, -3.5]));
    assert!((record.interval_s - 2e-9).abs() < 1e-24 && (record.zero_v + 1.28).abs() < 1e-15);
    // The header is longer than the lead, so it decides.
    assert_eq!(dialect.most_lead_bytes(), 512);
    let lead = |bytes: i64| Dialect::read(&format!("name = \"x\"\n[samples]\nformat = \"u8\"\nlead = {bytes}\n"));
    assert_eq!(lead(12).unwrap().most_lead_bytes(), 12);
    assert_eq!(lead(513).unwrap_err()[0].what, "a lead of 513 characters");
}

#[test]
fn a_scope_that_cannot_be_stopped_serves_no_pair() {
    let free = "name = \"x\"\n[acquisition]\nmode = \"free\"\n";
    let found = Dialect::read(free).unwrap_err();
    assert!(
        found.iter().any(|mistake| mistake.what.contains("cannot give both legs of one acquisition")),
        "{found:#?}"
    );
    assert!(found.iter().any(|mistake| mistake.help.contains("[completion]")), "{found:#?}");
    let good = "name = \"x\"\nlike = \"scpi-99\"\n[acquisition]\nmode = \"free\"\n[line]\none_client = true\n";
    let dialect = dialect(good);
    assert!(dialect.runs_freely() && dialect.one_client());
    assert!(!scpi_99().runs_freely() && !scpi_99().one_client());
}

#[test]
fn lists_with_other_signs_between() {
    let dialect = dialect(
        r#"
name = "x"
[intent."route.close"]
send = ["JOIN {channels:blanks}"]
[intent."route.open"]
send = ["PART {channels:commas}"]
[intent."route.get"]
ask = [{ send = "JOINED {channels:commas}?", line = "closed:blanks" }]
[intent."vertical.get"]
ask = [{ send = "V{channel}?", reply = ["span_v", "offset_v"], between = " " }]
"#,
    );
    let route = |intent| Call::new(intent).with("channels", vec![101, 103]);
    assert_eq!(said(&dialect, &route(Intent::RouteClose)), "JOIN 101 103\n");
    assert_eq!(said(&dialect, &route(Intent::RouteOpen)), "PART 101,103\n");
    let closed = dialect.parse(&route(Intent::RouteGet), &lines(&["1  0"])).unwrap();
    assert_eq!(closed.list("closed").unwrap(), [1, 0]);
    let vertical = dialect.parse(&Call::new(Intent::VerticalGet).with("channel", 1), &lines(&["8.0  -0.5"])).unwrap();
    assert_eq!((vertical.number("span_v"), vertical.number("offset_v")), (Ok(8.0), Ok(-0.5)));
}
