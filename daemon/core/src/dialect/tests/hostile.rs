//! What must never happen: a second command smuggled in, a panic, a value taken for another.

use proptest::prelude::*;

use super::*;

/// How many intents there are.
const INTENTS: usize = 37;

fn vertical(channel: impl Into<Value>, span_v: impl Into<Value>) -> Call {
    Call::new(Intent::VerticalSet).with("channel", channel).with("span_v", span_v).with("offset_v", 0.0)
}

#[test]
fn wrong_arguments_are_refused_by_name() {
    let dialect = scpi_99();
    let refused = |call: &Call| dialect.plan(call).unwrap_err();
    let text = |text: &str| Value::Text(text.to_owned());
    assert!(matches!(refused(&vertical(0, 1.0)), DialectError::OutOfRange { name, .. } if name == "channel"));
    assert!(matches!(refused(&vertical(1.5, 1.0)), DialectError::WrongKind { name, .. } if name == "channel"));
    assert!(matches!(refused(&vertical(1, f64::NAN)), DialectError::OutOfRange { name, .. } if name == "span_v"));
    assert!(matches!(refused(&vertical(1, text("1;*RST"))), DialectError::WrongKind { name, .. } if name == "span_v"));
    assert!(matches!(refused(&Call::new(Intent::VerticalSet)), DialectError::Missing { .. }));
    let extra = Call::new(Intent::Reset).with("how", 1);
    assert!(matches!(refused(&extra), DialectError::UnknownArgument { name, .. } if name == "how"));
    for word in ["dc;*RST", "dc\n*RST", "DC", "*", ""] {
        let call = Call::new(Intent::CouplingSet).with("channel", 1).with("coupling", Value::Keyword(word.to_owned()));
        assert!(matches!(refused(&call), DialectError::OutOfRange { .. }), "{word:?}");
    }
    for channels in [vec![], vec![0], vec![101, -1], vec![1; MOST_CHANNELS + 1]] {
        let call = Call::new(Intent::RouteClose).with("channels", channels);
        assert!(matches!(refused(&call), DialectError::OutOfRange { .. }));
    }
    // A whole number written as a number is still the same channel, spelled as one.
    assert!(said(&dialect, &vertical(2.0, 1)).starts_with("SENSe2:VOLTage:RANGe:PTPeak 1E0\n"));
}

#[test]
fn wrong_replies_are_refused_with_the_question() {
    let dialect = scpi_99();
    let get = Call::new(Intent::VerticalGet).with("channel", 1);
    let refused = |replies: &[Message]| dialect.parse(&get, replies).unwrap_err();
    assert!(matches!(refused(&[]), DialectError::Replies { wanted: 2, found: 0, .. }));
    assert!(matches!(refused(&lines(&["1,2", "0"])), DialectError::Parts { wanted: 1, found: 2, .. }));
    assert!(matches!(refused(&lines(&["", "0"])), DialectError::Parts { found: 0, .. }));
    assert!(matches!(refused(&lines(&["9.91E37", "0"])), DialectError::Read { .. }));
    assert!(matches!(refused(&[Message::Block(vec![]), Message::Block(vec![])]), DialectError::WrongMessage { .. }));
    let error = refused(&lines(&["eight", "0"])).to_string();
    assert_eq!(
        error,
        "the reply to `SENSe1:VOLTage:RANGe:PTPeak?` was `eight`: `span_v` cannot be read: `eight` is not a number"
    );
    let data = Call::new(Intent::RecordData).with("channel", 1);
    assert!(matches!(dialect.parse(&data, &lines(&["1,2"])), Err(DialectError::WrongMessage { .. })));
    let coupling = Call::new(Intent::CouplingGet).with("channel", 1);
    let error = dialect.parse(&coupling, &lines(&["FIFTY"])).unwrap_err();
    assert!(matches!(error, DialectError::NoWord { words, value } if words == "coupling" && value == "FIFTY"));
}

#[test]
fn typed_text_is_one_line() {
    let dialect = scpi_99();
    let exchange = dialect.raw("*IDN?", true).unwrap();
    assert_eq!((exchange.send.as_slice(), exchange.expect), (b"*IDN?\n".as_slice(), Expect::Line));
    for bad in ["*CLS\n*RST", "a\r", "\0", "grün"] {
        assert!(matches!(dialect.raw(bad, false), Err(DialectError::Raw { .. })), "{bad:?}");
    }
}

fn value() -> impl Strategy<Value = Value> {
    prop_oneof![
        any::<bool>().prop_map(Value::Flag),
        any::<f64>().prop_map(Value::Number),
        any::<i64>().prop_map(Value::Whole),
        "[ -~\n;]{0,12}".prop_map(Value::Keyword),
        "\\PC{0,12}".prop_map(Value::Text),
        prop::collection::vec(any::<i64>(), 0..4).prop_map(Value::List),
    ]
}

proptest! {
    #[test]
    fn one_exchange_is_one_command(which in 0_usize..INTENTS, values in prop::collection::vec(value(), 6)) {
        let dialect = scpi_99();
        let intent = Intent::all().nth(which).unwrap();
        let call = intent.spec().args.iter().zip(values).fold(Call::new(intent), |call, ((name, _), value)| call.with(*name, value));
        if let Ok(exchanges) = dialect.plan(&call) {
            for exchange in exchanges {
                let text = exchange.command();
                prop_assert_eq!(exchange.send.len(), text.len() + 1);
                prop_assert!(text.bytes().all(|byte| matches!(byte, b' '..=b'~') && byte != b';'), "{}", text);
            }
        }
    }

    #[test]
    fn no_reply_panics(which in 0_usize..INTENTS, replies in prop::collection::vec("\\PC{0,40}", 0..4), block in any::<bool>()) {
        let dialect = scpi_99();
        let intent = Intent::all().nth(which).unwrap();
        let call = intent.spec().args.iter().fold(Call::new(intent), |call, (name, kind)| match kind {
            ArgKind::Channels => call.with(*name, vec![1]),
            ArgKind::Flag => call.with(*name, true),
            ArgKind::Keyword(words) => call.with(*name, Value::Keyword(words[0].to_owned())),
            _ => call.with(*name, 1),
        });
        prop_assert!(dialect.plan(&call).is_ok());
        let messages: Vec<Message> = replies
            .into_iter()
            .map(|reply| if block { Message::Block(reply.into_bytes()) } else { Message::Line(reply) })
            .collect();
        let _ = dialect.parse(&call, &messages);
        if let Some(Message::Line(line)) = messages.first() {
            let _ = dialect.parse_error(line);
        }
    }

    #[test]
    fn no_file_panics(text in "\\PC{0,200}", at in 0_usize..4000, cut in 0_usize..60) {
        let _ = Dialect::read(&text);
        // The bundled file with a piece taken out and another put in.
        let good = bundled("scpi-99").unwrap();
        let (at, end) = (at.min(good.len()), (at + cut).min(good.len()));
        let _ = Dialect::read(&format!("{}{text}{}", &good[..at], &good[end..]));
    }

    #[test]
    fn no_variant_panics(lines in prop::collection::vec(0_usize..400, 1..12), to in prop::collection::vec(0_usize..400, 12), word in "[ -~]{0,12}") {
        // Lines of the bundled file moved about and mutilated, laid over the whole of it.
        let all: Vec<&str> = bundled("scpi-99").unwrap().lines().collect();
        let picked = |at: usize| all[at % all.len()];
        let mut text = "like = \"scpi-99\"\n".to_owned();
        for (at, to) in lines.iter().zip(&to) {
            let line = picked(*at);
            let cut = line.char_indices().nth(to % 40).map_or(line.len(), |(cut, _)| cut);
            text += &if to % 3 == 0 { format!("{}{word}{}\n", &line[..cut], &line[cut..]) } else { format!("{line}\n") };
        }
        if let Err(found) = Dialect::read(&text) {
            prop_assert!(!found.is_empty());
            for mistake in found {
                prop_assert!(text.get(mistake.span.clone()).is_some(), "{:?} lies outside", mistake);
            }
        }
    }

    #[test]
    fn no_expression_panics(text in "[a-z0-9_ .+*/()?:<>=!&|\\[\\]\"'{},-]{0,40}") {
        let quoted = text.replace('\\', "").replace('"', "'");
        let file = format!("name = \"x\"\n[convert.\"source.voltage\"]\nx = \"{quoted}\"\n[intent.\"source.voltage\"]\nsend = [\"V{{channel}} {{x}}\"]\n");
        if let Ok(dialect) = Dialect::read(&file) {
            let call = Call::new(Intent::SourceVoltage).with("channel", 1).with("value", 3.0);
            if let Ok(exchanges) = dialect.plan(&call) {
                for exchange in exchanges {
                    prop_assert!(exchange.command().bytes().all(|byte| matches!(byte, b' '..=b'~') && byte != b';'));
                }
            }
        }
    }

    #[test]
    fn numbers_come_back_as_they_went(span_v in any::<f64>().prop_filter("finite", |v| v.is_finite() && v.abs() < 9e37)) {
        let dialect = scpi_99();
        let out = dialect.plan(&vertical(1, span_v)).unwrap()[0].command();
        let sent = out.rsplit(' ').next().unwrap().to_owned();
        let get = Call::new(Intent::VerticalGet).with("channel", 1);
        let back = dialect.parse(&get, &lines(&[&sent, "0"])).unwrap();
        prop_assert_eq!(back.number("span_v").unwrap(), span_v);
    }
}
