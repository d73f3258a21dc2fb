//! The bundled bench file is right, and each mistake is named at its place.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::*;
use crate::dialect::Value;
use crate::document::line_and_column;

/// The bench that comes with the program.
pub(crate) const GREENHOUSE: &str =
    include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../../configs/benches/greenhouse-fan.toml"));

/// What was found wrong: line, and what.
fn mistakes(text: &str) -> Vec<(u32, String)> {
    read(text)
        .unwrap_err()
        .into_iter()
        .map(|mistake| (line_and_column(text, mistake.span.start).0, mistake.what))
        .collect()
}

#[test]
fn the_bundled_bench_is_right() {
    let bench = read(GREENHOUSE).unwrap_or_else(|mistakes| panic!("{mistakes:#?}"));
    assert_eq!(bench.name, "greenhouse fan");
    let names: Vec<&str> = bench.instruments.iter().map(|spec| spec.name.as_str()).collect();
    assert_eq!(names, ["scope", "generator", "supply", "switch"], "in the order of the file");
    let pair = bench.pair("gate").unwrap();
    assert_eq!(pair.acquisition.window_v(), (-15.0, 85.0));
    assert_eq!((pair.positive.channel, pair.negative.channel), (1, 2));
    assert_eq!(pair.rating_v(), 300.0);

    let fast = bench.reference_acquisition(pair, bench.reference("fast").unwrap());
    assert_eq!((fast.span_v, fast.points, fast.averages), (20.0, 10_000, 64));
    let in_situ = bench.reference_acquisition(pair, bench.reference("in_situ").unwrap());
    assert!(in_situ.same_range(&pair.acquisition), "what a reference does not say is as the pair has it");

    let bus = bench.setting("bus_voltage").unwrap();
    let call = bus.call(48.0);
    assert_eq!(call.instrument, "supply");
    assert_eq!(call.call.intent.name(), "source.voltage");
    assert_eq!(call.call.args.value("value"), Some(&Value::Number(48.0)));
    assert_eq!(call.call.args.value("channel"), Some(&Value::Whole(1)));
    assert_eq!(bus.tip_v(48.0), 73.0);
    assert_eq!(bench.setting("brake_current").unwrap().tip_v(2.0), 0.0);
    assert_eq!(bench.safe.first().map(|call| call.instrument.as_str()), Some("supply"), "power goes first");
}

/// The bundled bench with one line exchanged; the mistake is expected on that line unless another is given.
fn changed(from: &str, to: &str) -> (String, u32) {
    assert_eq!(GREENHOUSE.matches(from).count(), 1, "`{from}` must stand once");
    let line = line_and_column(GREENHOUSE, GREENHOUSE.find(from).unwrap()).0;
    (GREENHOUSE.replace(from, to), line)
}

#[test]
fn each_mistake_is_named_at_its_place() {
    // What is exchanged, for what, the text at whose line the mistake stands (the change's own if empty), the mistake.
    let table: &[(&str, &str, &str, &str)] = &[
        ("\"TCPIP::127.0.0.1::5027::SOCKET\"", "\"somewhere\"", "", "`somewhere`"),
        ("scale_spec = 0.015", "scale_spec = 1.5", "", "`scale_spec` is 1.5"),
        ("timeout = \"20 s\"", "timeout = \"20 V\"", "", "`timeout`: this is in V, but it must be in s"),
        ("timeout = \"20 s\"", "patience = \"20 s\"", "", "`patience` is not a key of `instrument.scope`"),
        (
            "negative = { channel = 2,",
            "negative = { channel = 1,",
            "[pair.gate]",
            "both legs of pair `gate` are on channel 1",
        ),
        ("probe = \"p10b\"", "probe = \"p10c\"", "", "there is no probe `p10c`"),
        ("scope = \"scope\"", "scope = \"skope\"", "", "there is no instrument `skope`"),
        ("skew_reference = \"fast\"", "skew_reference = \"slow\"", "", "there is no reference `slow`"),
        ("kind = \"square\"", "kind = \"round\"", "", "`kind` cannot be `round`"),
        ("route = \"reference\"", "route = \"away\"", "", "there is no route `away`"),
        ("points = 20_000", "points = 20", "", "`points` is 20"),
        (
            "position = 0.1\ntrigger = { channel = 1, level = \"15 V\"",
            "position = 2\ntrigger = { channel = 1, level = \"15 V\"",
            "",
            "`position` is 2",
        ),
        (
            "trigger = { channel = 1, level = \"15 V\"",
            "trigger = { channel = 3, level = \"15 V\"",
            "[pair.gate]",
            "pair `gate` is triggered by channel 3, which is none of its legs",
        ),
        ("carry = \"25 ps\"\n", "", "[pair.gate]", "`carry` does not say how much uncertainty"),
        (
            "skew_reference = \"fast\"\ngain_reference = \"in_situ\"",
            "skew_reference = \"fast\"\ngain_reference = \"fast\"",
            "[pair.gate]",
            "do not carry over from one range to another",
        ),
        (
            "level = \"5 V\"",
            "level = \"12 V\"",
            "[pair.gate]",
            "the trigger level 12 V is not between the levels of reference `fast`, 0 V and 10 V",
        ),
        ("high = \"10 V\"", "high = \"18 V\"", "[pair.gate]", "the records of pair `gate` would hold -5 V to 15 V"),
        ("high = \"10 V\"", "high = \"0 V\"", "", "`high` is not above `low`"),
        ("bus_voltage = \"48 V\",", "bus_voltage = \"480 V\",", "", "`bus_voltage` is 480 V"),
        ("bus_voltage = \"48 V\",", "bus = \"48 V\",", "", "there is no setting `bus`"),
        (
            "call = \"source.current\"\nchannel = 2\nunit",
            "call = \"source.power\"\nchannel = 2\nunit",
            "",
            "there is no call `source.power`",
        ),
        (
            "unit = \"A\"",
            "unit = \"V\"",
            "[setting.brake_current]",
            "has another unit than the argument `value` of `source.current`, which is in A",
        ),
        ("unit = \"A\"", "unit = \"A\"\nat_tip = true", "at_tip = true\nmin = 0\nmax = 2\n", "its unit is A"),
        ("max = 2\n", "max = -2\n", "", "`max` is below `min`"),
        (
            "    { instrument = \"switch\", call = \"route.open_all\" },\n    { instrument = \"switch\", call = \"route.close\", channels = [103] }",
            "    { instrument = \"switch\", call = \"route.close\", channels = [103] }",
            "[route.device]",
            "route `device` closes channels of `switch` before it opened the others",
        ),
        ("channels = [102]", "channels = [1.5]", "", "`channels` holds 1.5, which is no channel"),
        ("channels = [102]", "channels = []", "", "route.close"),
        ("channels = [102]", "channel = 102", "", "`route.in_situ.calls` has no `channels`"),
        ("edge_s = \"3 ns\" }", "edge_s = \"3 V\" }", "", "`edge_s`: this is in V, but it must be in s"),
        ("[setting.bus_voltage]", "[setting.\"bus voltage\"]", "", "`bus voltage` cannot be a name"),
        ("sequences = \"../sequences\"", "sequences = \"/etc\"", "", "`sequences` cannot be `/etc`"),
    ];
    for (from, to, place, wanted) in table {
        let (text, line) = changed(from, to);
        let found = mistakes(&text);
        let line = if place.is_empty() { line } else { line_and_column(&text, text.find(place).unwrap()).0 };
        assert!(
            found.iter().any(|(at, what)| *at == line && what.contains(wanted)),
            "`{to}`: wanted line {line} `{wanted}`, found {found:#?}"
        );
    }
}

#[test]
fn one_wrong_declaration_does_not_make_its_users_wrong() {
    let (text, _) = changed("scale_spec = 0.015", "scale_spec = 1.5");
    assert_eq!(mistakes(&text).len(), 1, "the pair still knows the scope");
    let (text, _) = changed("kind = \"square\"", "kind = \"round\"");
    assert_eq!(mistakes(&text).len(), 1, "the pair still knows the reference");
    let (text, _) = changed("unit = \"A\"", "unit = \"furlong\"");
    assert_eq!(mistakes(&text).len(), 1, "{:?}", mistakes(&text));
}

#[test]
fn all_mistakes_come_at_once_and_an_empty_bench_says_what_it_lacks() {
    let (text, _) = changed("scale_spec = 0.015", "scale_spec = 1.5");
    let text = text.replace("kind = \"square\"", "kind = \"round\"").replace("max = 60", "top = 60");
    assert_eq!(mistakes(&text).len(), 4, "the missing `max` and the strange `top` count apart: {:#?}", mistakes(&text));
    let lacks: Vec<String> = mistakes("").into_iter().map(|(_, what)| what).collect();
    for wanted in ["name", "instrument", "pair", "safe"] {
        assert!(lacks.contains(&format!("the file has no `{wanted}`")), "{lacks:?}");
    }
}

#[test]
fn ratings_are_kept() {
    let bench = read(&GREENHOUSE.replace("rating = \"300 V\"", "rating = \"80 V\"")).unwrap();
    let pair = bench.pair("gate").unwrap();
    assert_eq!(bench.over_rating("bus_voltage", 55.0, pair), None, "55 V and 25 V of headroom are 80 V");
    assert_eq!(
        bench.over_rating("bus_voltage", 60.0, pair).as_deref(),
        Some("`bus_voltage` at 60 V brings up to 85 V to the tips of pair `gate`, whose probes are rated for 80 V")
    );
    assert_eq!(bench.over_rating("brake_current", 2.0, pair), None);
    // 48 V and its headroom are too much for a 60 V probe, and the reference's own levels for a 40 V one.
    let found = mistakes(&GREENHOUSE.replace("rating = \"300 V\"", "rating = \"60 V\""));
    assert_eq!(found.len(), 1);
    assert!(found[0].1.contains("brings up to 73 V"), "{found:?}");
    let found = mistakes(&GREENHOUSE.replace("rating = \"300 V\"", "rating = \"40 V\""));
    assert!(found.iter().any(|(_, what)| what.contains("reference `in_situ` brings 48 V to the tips")), "{found:?}");
}

#[test]
fn a_verification_needs_the_measuring_range() {
    let bench = read(GREENHOUSE).unwrap();
    let pair = bench.pair("gate").unwrap();
    let fast = bench.reference("fast").unwrap();
    assert!(bench.misfits(pair, fast, Role::Skew).is_empty());
    assert_eq!(bench.misfits(pair, fast, Role::Verify).len(), 1);
    assert!(bench.misfits(pair, bench.reference("in_situ").unwrap(), Role::Verify).is_empty());
}

proptest::proptest! {
    #[test]
    fn no_text_panics(text in "\\PC{0,300}") {
        let _ = read(&text);
    }

    /// A hundred bytes of the bundled file lost anywhere: mistakes or a bench, never a panic, and a bench only whole.
    #[test]
    fn no_damage_panics(at in 0usize..7000, length in 1usize..100) {
        let text: String = GREENHOUSE.char_indices().filter(|(i, _)| *i < at || *i >= at + length).map(|(_, c)| c).collect();
        if let Err(mistakes) = read(&text) {
            proptest::prop_assert!(!mistakes.is_empty());
        }
    }
}

#[test]
fn the_bundled_dialect_has_words_for_all_that_the_bundled_bench_does() {
    let bench = read(GREENHOUSE).unwrap();
    let dialect = crate::dialect::Dialect::read(crate::dialect::bundled("scpi-99").unwrap()).unwrap();
    assert!(bench.instruments.iter().all(|instrument| instrument.dialect == dialect.name()));
    let settings: Vec<BenchCall> = bench.settings.iter().map(|setting| setting.call(setting.max)).collect();
    let routes = bench.routes.iter().flat_map(|route| &route.calls);
    let references = bench.references.iter().flat_map(|reference| reference.start.iter().chain(&reference.stop));
    for entry in settings.iter().chain(routes).chain(references).chain(&bench.prepare).chain(&bench.safe) {
        assert!(dialect.plan(&entry.call).is_ok(), "{entry:?}: {:?}", dialect.plan(&entry.call));
    }
}

/// What a correction may move by: each key in its own unit, the gain as a ratio; a slip of the pen is a mistake.
#[test]
fn drift_is_read_and_its_mistakes_are_named() {
    assert_eq!(read(GREENHOUSE).unwrap().pair("gate").unwrap().drift, crate::analysis::Drift::default());
    let line = "max_age = \"43200 s\"";
    let drift = format!("{line}\ndrift = {{ gain = \"0.05 %\", skew = \"20 ps\", offset = \"1 mV\" }}");
    let found = read(&GREENHOUSE.replace(line, &drift)).unwrap().pair("gate").unwrap().drift;
    assert!((found.gain - 5e-4).abs() < 1e-15 && (found.skew_s - 20e-12).abs() < 1e-21, "{found:?}");
    assert!((found.offset_v - 1e-3).abs() < 1e-15);
    let after = found.after(86_400.0, 43_200.0);
    assert!((after.skew_s - 40e-12).abs() < 1e-21 && found.after(60.0, 43_200.0) == found, "{after:?}");
    for (wrong, what) in
        [("gain = \"1 V\"", "`gain`"), ("skew = \"1 s\"", "`skew` is 1 s"), ("time = 1", "`time` is not a key")]
    {
        let text = GREENHOUSE.replace(line, &format!("{line}\ndrift = {{ {wrong} }}"));
        let found = mistakes(&text);
        assert!(found.iter().any(|(_, text)| text.contains(what)), "{wrong}: {found:?}");
    }
}
