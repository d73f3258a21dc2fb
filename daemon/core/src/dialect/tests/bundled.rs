//! Every intent of the bundled dialect: the literal text that goes out, and literal replies that come back.

use super::*;

/// A call with these arguments.
fn call(intent: Intent, args: &[(&str, Value)]) -> Call {
    args.iter().fold(Call::new(intent), |call, (name, value)| call.with(*name, value.clone()))
}

fn word(word: &str) -> Value {
    Value::Keyword(word.to_owned())
}

/// An intent, its arguments, and the text that must go out.
type Row = (Intent, Vec<(&'static str, Value)>, &'static str);

/// An intent, the lines that come back, and the fields that they hold.
type Reply<'r> = (Intent, &'r [&'r str], Vec<(&'static str, Value)>);

/// Every intent with arguments and the text that must go out.
fn table() -> Vec<Row> {
    use Intent::*;
    let channel = |number: i64| ("channel", Value::Whole(number));
    let number = |name: &'static str, value: f64| (name, Value::Number(value));
    let shape = || vec![channel(1), number("frequency_hz", 1e6), number("amplitude_v", 10.0), number("offset_v", 5.0)];
    let with = |mut args: Vec<(&'static str, Value)>, more: Vec<(&'static str, Value)>| {
        args.extend(more);
        args
    };
    let channels = || vec![("channels", Value::List(vec![101, 103]))];
    vec![
        (Identify, vec![], "~*IDN?\n"),
        (Options, vec![], "~*OPT?\n"),
        (Clear, vec![], "*CLS\n"),
        (Reset, vec![], "*RST\n"),
        (Error, vec![], "~SYSTem:ERRor?\n"),
        (Complete, vec![], "~*OPC?\n"),
        (
            VerticalSet,
            vec![channel(2), number("span_v", 8.0), number("offset_v", -0.25)],
            "SENSe2:VOLTage:RANGe:PTPeak 8E0\nSENSe2:VOLTage:RANGe:OFFSet -2.5E-1\n",
        ),
        (VerticalGet, vec![channel(2)], "~SENSe2:VOLTage:RANGe:PTPeak?\n~SENSe2:VOLTage:RANGe:OFFSet?\n"),
        (CouplingSet, vec![channel(1), ("coupling", word("ground"))], "INPut1:COUPling GROund\n"),
        (CouplingGet, vec![channel(1)], "~INPut1:COUPling?\n"),
        (
            TimebaseSet,
            vec![number("interval_s", 2e-10), ("points", Value::Whole(20_000)), number("position", 0.5)],
            "SENSe:SWEep:TINTerval 2E-10\nSENSe:SWEep:POINts 20000\nSENSe:SWEep:OREFerence:LOCation 5E-1\n",
        ),
        (TimebaseGet, vec![], "~SENSe:SWEep:TINTerval?\n~SENSe:SWEep:POINts?\n~SENSe:SWEep:OREFerence:LOCation?\n"),
        (
            TriggerSet,
            vec![channel(1), number("level_v", 0.1), ("slope", word("positive"))],
            "TRIGger:SOURce INTernal1\nTRIGger:LEVel 1E-1\nTRIGger:SLOPe POSitive\n",
        ),
        (
            TriggerSet,
            vec![channel(0), number("level_v", 0.0), ("slope", word("negative"))],
            "TRIGger:SOURce EXTernal\nTRIGger:LEVel 0E0\nTRIGger:SLOPe NEGative\n",
        ),
        (
            TriggerSet,
            vec![channel(-1), number("level_v", 0.0), ("slope", word("negative"))],
            "TRIGger:SOURce IMMediate\nTRIGger:LEVel 0E0\nTRIGger:SLOPe NEGative\n",
        ),
        (TriggerGet, vec![], "~TRIGger:SOURce?\n~TRIGger:LEVel?\n~TRIGger:SLOPe?\n"),
        (AverageSet, vec![("count", Value::Whole(64))], "SENSe:AVERage:COUNt 64\nSENSe:AVERage:STATe ON\n"),
        (AverageSet, vec![("count", Value::Whole(1))], "SENSe:AVERage:COUNt 1\nSENSe:AVERage:STATe OFF\n"),
        (AverageGet, vec![], "~SENSe:AVERage:STATe?\n~SENSe:AVERage:COUNt?\n"),
        (FormatSet, vec![], "FORMat:DATA INTeger,16\nFORMat:BORDer SWAPped\n"),
        (AcquireStart, vec![], "INITiate:IMMediate\n"),
        (AcquireAbort, vec![], "ABORt\n"),
        (RecordPreamble, vec![channel(2)], "~TRACe:DATA:PREamble? CHANnel2\n"),
        (RecordData, vec![channel(2)], "#TRACe:DATA? CHANnel2\n"),
        (SkewSet, vec![channel(2), number("delay_s", 2.3e-9)], "INPut2:DELay 2.3E-9\n"),
        (SkewGet, vec![channel(2)], "~INPut2:DELay?\n"),
        (
            SourceSquare,
            with(shape(), vec![number("edge_s", 3e-9)]),
            "SOURce1:FUNCtion:SHAPe SQUare\nSOURce1:FREQuency 1E6\nSOURce1:VOLTage 1E1\nSOURce1:VOLTage:OFFSet 5E0\n\
             SOURce1:PULSe:TRANsition 3E-9\n",
        ),
        (
            SourceSine,
            shape(),
            "SOURce1:FUNCtion:SHAPe SINusoid\nSOURce1:FREQuency 1E6\nSOURce1:VOLTage 1E1\nSOURce1:VOLTage:OFFSet 5E0\n",
        ),
        (
            SourcePulse,
            with(shape(), vec![number("duty", 0.07), number("edge_s", 5e-9)]),
            "SOURce1:FUNCtion:SHAPe PULSe\nSOURce1:FREQuency 1E6\nSOURce1:VOLTage 1E1\nSOURce1:VOLTage:OFFSet 5E0\n\
             SOURce1:PULSe:DCYCle 7E0\nSOURce1:PULSe:TRANsition 5E-9\n",
        ),
        (
            SourceMultitone,
            shape(),
            "SOURce1:FUNCtion:SHAPe MTONe\nSOURce1:FREQuency 1E6\nSOURce1:VOLTage 1E1\nSOURce1:VOLTage:OFFSet 5E0\n",
        ),
        (SourceVoltage, vec![channel(1), number("value", 48.0)], "SOURce1:VOLTage 4.8E1\n"),
        (SourceCurrent, vec![channel(2), number("value", 0.35)], "SOURce2:CURRent 3.5E-1\n"),
        (OutputSet, vec![channel(2), ("state", Value::Flag(true))], "OUTPut2:STATe 1\n"),
        (OutputSet, vec![channel(2), ("state", Value::Flag(false))], "OUTPut2:STATe 0\n"),
        (OutputGet, vec![channel(2)], "~OUTPut2:STATe?\n"),
        (MeasureVoltage, vec![channel(1)], "~MEASure1:VOLTage?\n"),
        (MeasureCurrent, vec![channel(1)], "~MEASure1:CURRent?\n"),
        (RouteClose, channels(), "ROUTe:CLOSe (@101,103)\n"),
        (RouteOpen, channels(), "ROUTe:OPEN (@101,103)\n"),
        (RouteOpenAll, vec![], "ROUTe:OPEN:ALL\n"),
        (RouteGet, channels(), "~ROUTe:CLOSe? (@101,103)\n"),
    ]
}

#[test]
fn every_intent_goes_out_as_written() {
    let dialect = scpi_99();
    for (intent, args, text) in table() {
        assert_eq!(said(&dialect, &call(intent, &args)), text, "{intent}");
        assert!(dialect.supports(intent), "{intent}");
    }
    for intent in Intent::all() {
        assert!(table().iter().any(|(known, ..)| *known == intent), "{intent} is not in the table");
    }
}

#[test]
fn every_query_reads_literal_replies() {
    use Intent::*;
    let dialect = scpi_99();
    let preamble = ["1000,2.0E-10,-1.0E-07,3.125E-04,0.25,-32768,32512,8.0E-02,16,7"];
    let cases: Vec<Reply<'_>> = vec![
        (
            Identify,
            &["ACME,Model 1,\"a,b\",Joe's 1.0"],
            vec![("identity", Value::Text("ACME,Model 1,\"a,b\",Joe's 1.0".to_owned()))],
        ),
        (Options, &["LONG,0"], vec![("options", Value::Text("LONG,0".to_owned()))]),
        (
            Error,
            &["-222,\"Data out of range; 5 V\""],
            vec![("number", Value::Whole(-222)), ("text", Value::Text("Data out of range; 5 V".to_owned()))],
        ),
        (Error, &["0,\"No error\""], vec![("number", Value::Whole(0)), ("text", Value::Text(String::new()))]),
        (Complete, &["1"], vec![("done", Value::Flag(true))]),
        (Complete, &["0"], vec![("done", Value::Flag(false))]),
        (VerticalGet, &["8.0", "+1.50E-01"], vec![("span_v", Value::Number(8.0)), ("offset_v", Value::Number(0.15))]),
        (CouplingGet, &["GRO"], vec![("coupling", word("ground"))]),
        (CouplingGet, &["ground"], vec![("coupling", word("ground"))]),
        (
            TimebaseGet,
            &["2E-10", "20000", "0.5"],
            vec![
                ("interval_s", Value::Number(2e-10)),
                ("points", Value::Whole(20_000)),
                ("position", Value::Number(0.5)),
            ],
        ),
        (
            TriggerGet,
            &["INT2", "0.1", "NEG"],
            vec![("channel", Value::Whole(2)), ("level_v", Value::Number(0.1)), ("slope", word("negative"))],
        ),
        (
            TriggerGet,
            &["EXTERNAL", "0", "POSITIVE"],
            vec![("channel", Value::Whole(0)), ("level_v", Value::Number(0.0)), ("slope", word("positive"))],
        ),
        (AverageGet, &["1", "+16"], vec![("count", Value::Whole(16))]),
        (AverageGet, &["0", "+16"], vec![("count", Value::Whole(1))]),
        (SkewGet, &["2.3E-9"], vec![("delay_s", Value::Number(2.3e-9))]),
        (OutputGet, &["0"], vec![("state", Value::Flag(false))]),
        (MeasureVoltage, &["47.98"], vec![("value", Value::Number(47.98))]),
        (MeasureCurrent, &["1.25E-1"], vec![("value", Value::Number(0.125))]),
        (RouteGet, &["1,0"], vec![("closed", Value::List(vec![1, 0]))]),
        (
            RecordPreamble,
            &preamble,
            vec![
                ("points", Value::Whole(1000)),
                ("interval_s", Value::Number(2e-10)),
                ("start_s", Value::Number(-1e-7)),
                ("volts_per_code", Value::Number(3.125e-4)),
                ("zero_v", Value::Number(0.25)),
                ("low_code", Value::Number(-32768.0)),
                ("high_code", Value::Number(32512.0)),
                ("step_v", Value::Number(0.08)),
                ("averages", Value::Whole(16)),
                ("acquisition", Value::Whole(7)),
            ],
        ),
    ];
    for (intent, replies, fields) in cases {
        let args = table().into_iter().find(|(known, ..)| *known == intent).unwrap().1;
        let read = dialect.parse(&call(intent, &args), &lines(replies)).unwrap();
        let wanted = fields.into_iter().fold(Fields::new(), |mut all, (name, value)| {
            all.set(name, value);
            all
        });
        assert_eq!(read, wanted, "{intent}");
    }
}

#[test]
fn settings_bring_no_fields() {
    let dialect = scpi_99();
    for (intent, args, _) in table() {
        if dialect.plan(&call(intent, &args)).unwrap().iter().all(|exchange| exchange.expect == Expect::Nothing) {
            assert_eq!(dialect.parse(&call(intent, &args), &[]).unwrap(), Fields::new(), "{intent}");
        }
    }
}

#[test]
fn the_error_queue_is_read_one_by_one() {
    let dialect = scpi_99();
    assert_eq!(dialect.error_query().unwrap().command(), "SYSTem:ERRor?");
    assert_eq!(dialect.parse_error("0,\"No error\""), Ok(None));
    assert_eq!(dialect.parse_error("+0"), Ok(None));
    assert_eq!(dialect.parse_error("-113,\"Undefined header\""), Ok(Some((-113, "Undefined header".to_owned()))));
    assert_eq!(dialect.parse_error("-113,\"unclosed"), Ok(Some((-113, "\"unclosed".to_owned()))));
    assert!(matches!(dialect.parse_error("8.0 V"), Err(DialectError::Read { .. })));
}

#[test]
fn the_skew_setting_rounds_to_its_step_within_its_range() {
    let skew = scpi_99().skew().unwrap();
    assert_eq!((skew.step_s, skew.range_s), (50e-12, 100e-9));
    assert!((skew.round(2.33e-9) - 2.35e-9).abs() < 1e-20);
    assert!((skew.round(-1.0) + 100e-9).abs() < 1e-20);
}

#[test]
fn settings_replace_one_another_by_intent_and_channel() {
    let key = |call: Call| call.setting_key();
    assert_eq!(key(Call::new(Intent::SourceSquare).with("channel", 1)), Some("source.shape 1".to_owned()));
    assert_eq!(key(Call::new(Intent::SourceSine).with("channel", 1)), Some("source.shape 1".to_owned()));
    assert_eq!(key(Call::new(Intent::VerticalSet).with("channel", 2)), Some("vertical.set 2".to_owned()));
    assert_eq!(key(Call::new(Intent::TriggerSet).with("channel", 2)), Some("trigger.set".to_owned()));
    assert_eq!(key(Call::new(Intent::FormatSet)), Some("format.set".to_owned()));
    assert_eq!(key(Call::new(Intent::AcquireStart)), None);
}

#[test]
fn what_is_read_can_be_set_again() {
    // A scope's settings are asked for and given back: the reply's fields and the channel are all the arguments.
    for (get, set) in [
        (Intent::VerticalGet, Intent::VerticalSet),
        (Intent::CouplingGet, Intent::CouplingSet),
        (Intent::TimebaseGet, Intent::TimebaseSet),
        (Intent::TriggerGet, Intent::TriggerSet),
        (Intent::AverageGet, Intent::AverageSet),
        (Intent::SkewGet, Intent::SkewSet),
        (Intent::OutputGet, Intent::OutputSet),
    ] {
        let mut read: Vec<&str> = get.spec().args.iter().map(|(name, _)| *name).collect();
        read.extend(get.spec().reply.iter().map(|(name, _)| *name));
        let wanted: Vec<&str> = set.spec().args.iter().map(|(name, _)| *name).collect();
        assert_eq!(read, wanted, "{get}");
    }
}
