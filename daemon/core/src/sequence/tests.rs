//! Sequences are unrolled in order, and each mistake is named at its place.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::*;
use crate::bench::tests::GREENHOUSE;
use crate::bench::{self, Bench};
use crate::document::line_and_column;
use crate::units::Unit;

const NIGHT: &str = include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../../configs/sequences/gate-night.toml"));
const QUICK: &str = include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../../configs/sequences/quick-look.toml"));

fn greenhouse() -> Bench {
    bench::read(GREENHOUSE).unwrap()
}

fn figures(name: &str) -> Option<Unit> {
    match name {
        "high_level" | "low_level" => Some(Unit::Volt),
        "rise_time" => Some(Unit::Second),
        "overshoot" => Some(Unit::One),
        _ => None,
    }
}

fn steps(text: &str, bench: &Bench) -> Vec<String> {
    let sequence = read(text, bench, &figures).unwrap_or_else(|mistakes| panic!("{mistakes:#?}"));
    sequence.steps.into_iter().map(|step| step.text).collect()
}

fn mistakes(text: &str, bench: &Bench) -> Vec<(u32, String)> {
    read(text, bench, &figures)
        .unwrap_err()
        .into_iter()
        .map(|mistake| (line_and_column(text, mistake.span.start).0, mistake.what))
        .collect()
}

#[test]
fn the_bundled_sequences_are_right() {
    let bench = greenhouse();
    let night = read(NIGHT, &bench, &figures).unwrap_or_else(|mistakes| panic!("{mistakes:#?}"));
    assert_eq!(night.captures(), 12);
    assert_eq!(night.always.len(), 2);
    assert_eq!(night.steps[0].action, Action::Prepare);
    assert_eq!(night.steps[0].text, "prepare the bench");
    let last = night.steps.last().unwrap();
    assert_eq!(last.conditions, [("bus_voltage".to_owned(), 60.0), ("brake_current".to_owned(), 1.5)]);
    let Action::Capture(plan) = &last.action else { panic!("{last:?}") };
    assert_eq!((plan.acquisition.averages, plan.acquisition.span_v), (16, 100.0));
    assert_eq!(plan.limits.len(), 2);
    let set = &night.steps[3];
    assert_eq!((set.text.as_str(), set.rest_s), ("set bus_voltage to 24 V", 0.02));
    let plan = night.plan();
    assert_eq!((plan.steps.len(), plan.always.len()), (night.steps.len(), 2));
    assert!(plan.steps.iter().all(|step| step.perform));
    assert_eq!(plan.steps[3].rest_s, 0.02);
    assert_eq!(read(QUICK, &bench, &figures).unwrap_or_else(|mistakes| panic!("{mistakes:#?}")).captures(), 2);
}

#[test]
fn a_sweep_is_unrolled_with_the_first_axis_outermost() {
    let text = r#"
title = "t"
[[stage]]
do = "route"
route = "device"
[[stage]]
do = "sweep"
axes = [
    { setting = "bus_voltage", list = ["24 V", 48] },
    { setting = "brake_current", from = "0.5 A", to = "1.5 A", count = 3 },
]
[[stage.stage]]
do = "wait"
time = "250 ms"
[[stage.stage]]
do = "capture"
pair = "gate"
"#;
    let one = |brake: &str| [format!("set brake_current to {brake}"), "wait 250 ms".into(), "capture gate".into()];
    let mut wanted = vec![
        "prepare the bench".to_owned(),
        "route device: the gate on the positive tip, the switching node on the negative one".to_owned(),
    ];
    for bus in ["24 V", "48 V"] {
        wanted.push(format!("set bus_voltage to {bus}"));
        wanted.extend(["500 mA", "1 A", "1.5 A"].into_iter().flat_map(one));
    }
    assert_eq!(steps(text, &greenhouse()), wanted);
}

#[test]
fn nested_sweeps_are_unrolled_like_axes() {
    let text = r#"
title = "t"
[[stage]]
do = "sweep"
axes = [{ setting = "bus_voltage", list = [24, 48] }]
[[stage.stage]]
do = "sweep"
axes = [{ setting = "brake_current", from = 0.5, to = 2, count = 3, spacing = "logarithmic" }]
[[stage.stage.stage]]
do = "wait"
time = 0
"#;
    let sequence = read(text, &greenhouse(), &figures).unwrap();
    let waits: Vec<Vec<f64>> = sequence
        .steps
        .iter()
        .filter(|step| step.action == Action::Wait)
        .map(|step| step.conditions.iter().map(|(_, value)| *value).collect())
        .collect();
    assert_eq!(waits, [[24.0, 0.5], [24.0, 1.0], [24.0, 2.0], [48.0, 0.5], [48.0, 1.0], [48.0, 2.0]]);
}

/// A sequence with one stage after a route.
fn staged(stage: &str) -> String {
    format!("title = \"t\"\n[[stage]]\ndo = \"route\"\nroute = \"device\"\n[[stage]]\n{stage}\n")
}

#[test]
fn each_mistake_is_named_at_its_place() {
    // The stage from line 6 on, the line of the mistake, the mistake.
    let table: &[(&str, u32, &str)] = &[
        ("do = \"dance\"", 6, "`do` cannot be `dance`"),
        ("pair = \"gate\"", 5, "`stage` has no `do`"),
        ("do = \"route\"\nroute = \"away\"", 7, "there is no route `away`"),
        ("do = \"route\"\nroute = \"device\"\nspeed = 1", 8, "`speed` is not a key of `stage`"),
        ("do = \"set\"\nsetting = \"fan\"\nvalue = 1", 7, "there is no setting `fan`"),
        ("do = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"61 V\"", 8, "`value` is 61 V"),
        ("do = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"61 A\"", 8, "this is in A, but it must be in V"),
        ("do = \"set\"\nsetting = \"bus_voltage\"", 5, "`stage` has no `value`"),
        ("do = \"wait\"\ntime = \"-1 s\"", 7, "`time` is -1 s"),
        ("do = \"wait\"", 5, "`stage` has no `time`"),
        ("do = \"send\"\ninstrument = \"supply\"\ncommand = \"*RST\"", 5, "does not allow free commands to `supply`"),
        ("do = \"send\"\ninstrument = \"scope\"\ncommand = \"*RST\\nX\"", 8, "this is no command of one line"),
        ("do = \"send\"\ninstrument = \"scope\"\ncommand = \"*IDN?\"", 8, "`send` reads no reply"),
        ("do = \"ask\"\ninstrument = \"scope\"\ncommand = \"*RST\"", 8, "this has no `?`"),
        ("do = \"capture\"\npair = \"bus\"", 7, "there is no pair `bus`"),
        ("do = \"capture\"\npair = \"gate\"\nspan = \"50 V\"", 5, "is on another range than the corrections"),
        ("do = \"capture\"\npair = \"gate\"\naverages = 0", 8, "`averages` is 0"),
        ("do = \"capture\"\npair = \"gate\"\non_void = \"shrug\"", 8, "`on_void` cannot be `shrug`"),
        (
            "do = \"capture\"\npair = \"gate\"\ntrigger = { channel = 4, level = 1 }",
            5,
            "triggered by channel 4, which is no leg of pair `gate`",
        ),
        (
            "do = \"capture\"\npair = \"gate\"\n[[stage.limit]]\nfigure = \"beauty\"\nmin = 1",
            9,
            "there is no figure `beauty`",
        ),
        (
            "do = \"capture\"\npair = \"gate\"\n[[stage.limit]]\nfigure = \"high_level\"",
            8,
            "a limit needs `min`, `max`",
        ),
        (
            "do = \"capture\"\npair = \"gate\"\n[[stage.limit]]\nfigure = \"rise_time\"\nmax = \"3 V\"",
            10,
            "this is in V, but it must be in s",
        ),
        (
            "do = \"capture\"\npair = \"gate\"\n[[stage.limit]]\nfigure = \"high_level\"\nmin = 3\nmax = 2",
            11,
            "nothing could keep this limit",
        ),
        ("do = \"deskew\"\npair = \"gate\"\ngain_reference = \"fast\"", 5, "do not carry over"),
        ("do = \"verify\"\npair = \"gate\"\nreference = \"fast\"", 5, "do not carry over"),
        ("do = \"verify\"\npair = \"gate\"\nreference = \"none\"", 8, "there is no reference `none`"),
        (
            "do = \"verify\"\npair = \"gate\"\n[[stage]]\ndo = \"capture\"\npair = \"gate\"",
            8,
            "the tips are still on its reference",
        ),
        (
            "do = \"transfer\"\npair = \"gate\"\nreference = \"fast\"\nspan = \"8 V\"",
            5,
            "records of pair `gate` would hold 1 V to 9 V",
        ),
        (
            "do = \"transfer\"\npair = \"gate\"\nreference = \"fast\"\nspan = \"100 V\"\noffset = \"35 V\"",
            5,
            "a deskew makes the correction of that range",
        ),
        ("do = \"transfer\"\npair = \"gate\"\nspan = \"20 V\"", 5, "`stage` has no `reference`"),
        ("do = \"transfer\"\npair = \"gate\"\nreference = \"fast\"", 5, "`stage` has no `span`"),
        (
            "do = \"transfer\"\npair = \"gate\"\nreference = \"fast\"\nspan = \"20 V\"\nby = \"luck\"",
            10,
            "`by` cannot be `luck`",
        ),
        (
            "do = \"transfer\"\npair = \"gate\"\nreference = \"fast\"\nspan = \"20 V\"\n[[stage]]\ndo = \"capture\"\npair = \"gate\"",
            10,
            "the tips are still on its reference",
        ),
        ("do = \"sweep\"\naxes = []\n[[stage.stage]]\ndo = \"wait\"\ntime = 1", 5, "at least one axis"),
        (
            "do = \"sweep\"\naxes = [{ setting = \"bus_voltage\", list = [1, 99] }]\n[[stage.stage]]\ndo = \"wait\"\ntime = 1",
            7,
            "`list` is 99 V",
        ),
        (
            "do = \"sweep\"\naxes = [{ setting = \"bus_voltage\", from = 1 }]\n[[stage.stage]]\ndo = \"wait\"\ntime = 1",
            7,
            "has no `to`",
        ),
        (
            "do = \"sweep\"\naxes = [{ setting = \"bus_voltage\", from = 1, list = [1] }]\n[[stage.stage]]\ndo = \"wait\"\ntime = 1",
            7,
            "either a `list`, or",
        ),
        (
            "do = \"sweep\"\naxes = [{ setting = \"bus_voltage\", from = 0, to = 5, count = 3, spacing = \"logarithmic\" }]\n[[stage.stage]]\ndo = \"wait\"\ntime = 1",
            7,
            "cannot reach zero",
        ),
        (
            "do = \"sweep\"\naxes = [{ setting = \"bus_voltage\", list = [1] }, { setting = \"bus_voltage\", list = [2] }]\n[[stage.stage]]\ndo = \"wait\"\ntime = 1",
            7,
            "an axis of this sweep twice",
        ),
        ("do = \"sweep\"\naxes = [{ setting = \"bus_voltage\", list = [1] }]", 5, "`stage` has no `stage`"),
        (
            "do = \"wait\"\ntime = 1\n[[always]]\ndo = \"capture\"\npair = \"gate\"",
            8,
            "the `always` part neither measures nor sweeps",
        ),
    ];
    let mut bench = greenhouse();
    bench.instruments[0].free_commands = true;
    for (stage, line, wanted) in table {
        let found = mistakes(&staged(stage), &bench);
        assert!(
            found.iter().any(|(at, what)| at == line && what.contains(wanted)),
            "`{stage}`: wanted line {line} `{wanted}`, found {found:#?}"
        );
    }
}

#[test]
fn all_mistakes_come_at_once() {
    let text = "[[stage]]\ndo = \"wait\"\n[[stage]]\ndo = \"route\"\nroute = \"x\"\n[[stage]]\ndo = \"fly\"\n";
    let found: Vec<String> = mistakes(text, &greenhouse()).into_iter().map(|(_, what)| what).collect();
    assert_eq!(found.len(), 4, "{found:?}");
    assert!(found.contains(&"the file has no `title`".to_owned()));
    assert_eq!(mistakes("title = \"t\"", &greenhouse()).len(), 1, "a sequence without stages");
}

#[test]
fn a_capture_needs_a_route() {
    let text = "title = \"t\"\n[[stage]]\ndo = \"capture\"\npair = \"gate\"\n";
    assert_eq!(mistakes(text, &greenhouse()), [(2, "nothing is routed to the tips before this capture".to_owned())]);
    let mut bench = greenhouse();
    bench.routes.clear();
    assert_eq!(steps(text, &bench).len(), 2, "a bench without a switch unit has nothing to route");
}

#[test]
fn a_voltage_beyond_the_rating_is_refused() {
    let bench = bench::read(&GREENHOUSE.replace("rating = \"300 V\"", "rating = \"80 V\"")).unwrap();
    let found = mistakes(&staged("do = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"60 V\""), &bench);
    assert_eq!(
        found,
        [(
            5,
            "`bus_voltage` at 60 V brings up to 85 V to the tips of pair `gate`, whose probes are rated for 80 V"
                .to_owned()
        )]
    );
    assert_eq!(steps(&staged("do = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"55 V\""), &bench).len(), 3);
    assert_eq!(mistakes(NIGHT, &bench).len(), 1, "a sweep is looked at as well");
}

#[test]
fn too_many_steps_are_refused_without_being_made() {
    let axis = |name: &str| format!("{{ setting = \"{name}\", from = 0, to = 1, count = 10000 }}");
    let text = staged(&format!(
        "do = \"sweep\"\naxes = [{}, {}]\n[[stage.stage]]\ndo = \"wait\"\ntime = 0",
        axis("bus_voltage"),
        axis("brake_current")
    ));
    let found = mistakes(&text, &greenhouse());
    assert_eq!(found.len(), 1);
    assert!(found[0].1.contains("more than 50000 steps"), "{found:?}");
}

#[test]
fn a_deskew_or_a_verification_alone_is_a_sequence_too() {
    let bench = greenhouse();
    let plan = DeskewPlan::of(&bench, "gate", None, None).unwrap();
    assert_eq!((plan.skew_reference.as_str(), plan.gain_reference.as_str()), ("fast", "in_situ"));
    let sequence = deskew_alone(&bench, plan);
    assert_eq!(sequence.title, "deskew gate");
    assert_eq!(sequence.steps.len(), 2, "the bench is prepared first");
    let sequence = verify_alone(&bench, VerifyPlan::of(&bench, "gate", None).unwrap());
    assert_eq!(sequence.steps[1].text, "verify gate on in_situ");
    assert!(matches!(DeskewPlan::of(&bench, "bus", None, None), Err(PlanError::UnknownPair { .. })));
    assert!(matches!(DeskewPlan::of(&bench, "gate", Some("x"), None), Err(PlanError::UnknownReference { .. })));
    assert!(matches!(DeskewPlan::of(&bench, "gate", None, Some("fast")), Err(PlanError::Misfit { .. })));
}

#[test]
fn a_capture_on_another_range_needs_a_transfer_to_it() {
    let bench = greenhouse();
    let with = |span: &str| {
        format!(
            "title = \"t\"\n[[stage]]\ndo = \"transfer\"\npair = \"gate\"\nreference = \"fast\"\nspan = \"{span}\"\n\
             [[stage]]\ndo = \"route\"\nroute = \"device\"\n\
             [[stage]]\ndo = \"capture\"\npair = \"gate\"\nspan = \"50 V\"\noffset = \"5 V\"\n"
        )
    };
    let found = steps(&with("50 V"), &bench);
    assert_eq!(found[1], "transfer gate to a span of 50 V around 5 V by fast");
    assert!(mistakes(&with("20 V"), &bench)[0].1.contains("another range than the corrections"));
    let plan = TransferPlan::of(&bench, "gate", "fast", 50.0, None).unwrap();
    let (pair, reference) = (bench.pair("gate").unwrap(), bench.reference("fast").unwrap());
    let [old, new] = plan.acquisitions(pair, reference);
    assert_eq!((old.span_v, old.offset_v, new.span_v, new.offset_v), (100.0, 35.0, 50.0, 5.0));
    assert_eq!((old.averages, new.points), (64, 10_000), "all else as the reference has it");
    assert_eq!(transfer_alone(&bench, plan).steps.len(), 2, "the bench is prepared first");
}

/// The configuration guide names every key that the readers of benches and sequences ask for, every kind of stage and
/// every call that has an effect: a key that nobody can find is as good as none.
#[test]
fn every_key_and_call_is_documented() {
    let guide = include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../../configs/README.md"));
    let sources = [
        include_str!("../bench/call.rs"),
        include_str!("../bench/read/mod.rs"),
        include_str!("../bench/read/parts.rs"),
        include_str!("../bench/read/pair.rs"),
        include_str!("../bench/read/reference.rs"),
        include_str!("../bench/read/device.rs"),
        include_str!("read/mod.rs"),
        include_str!("read/axis.rs"),
        include_str!("read/stage.rs"),
    ];
    let mut seen = 0;
    for source in sources {
        // A key is asked for as `table.text("key")`, or `field::name(table, "key", …)`, whatever the table is called.
        for (at, _) in source.match_indices('"') {
            let before = source[..at].trim_end();
            let getter = ["text(", "texts(", "number(", "whole(", "flag(", "amount(", "amounts(", "table(", "tables("]
                .iter()
                .any(|getter| before.ends_with(getter));
            let helper = ["(table,", "(top,", "(&mut inner,", "(&mut entry,", "entries(top,"]
                .iter()
                .any(|helper| before.ends_with(helper));
            let key = source[at + 1..].split('"').next().unwrap_or_default();
            if (getter || helper) && key.chars().all(|c| c.is_ascii_lowercase() || c == '_') && !key.is_empty() {
                seen += 1;
                let named = [
                    format!("`{key}`"),
                    format!("`[{key}."),
                    format!("`[[{key}]]`"),
                    format!("`{{ {key} ="),
                    format!(".{key}]]`"),
                ];
                assert!(
                    named.iter().any(|name| guide.contains(name.as_str())) || guide.contains(&format!(", {key} = ")),
                    "`{key}` is not in configs/README.md"
                );
            }
        }
    }
    assert!(seen > 60, "the search itself works: {seen}");
    for intent in crate::dialect::Intent::all() {
        let kind = intent.spec().kind;
        let asks = matches!(kind, crate::dialect::IntentKind::Query | crate::dialect::IntentKind::Data);
        let internal = ["error", "acquire.start", "acquire.abort", "format.set"].contains(&intent.name());
        assert!(asks || internal || guide.contains(&format!("`{intent}`")), "`{intent}` is not in configs/README.md");
    }
}

#[test]
fn limits_hold_at_their_ends_and_never_for_no_number() {
    let limit = Limit { figure: "high_level".to_owned(), unit: Unit::Volt, min: Some(11.0), max: Some(13.0) };
    assert!(limit.holds(11.0) && limit.holds(13.0));
    assert!(!limit.holds(10.999) && !limit.holds(13.001) && !limit.holds(f64::NAN));
    assert!(Limit { min: None, ..limit }.holds(-1e9));
}

proptest::proptest! {
    #[test]
    fn no_damage_panics(at in 0usize..1500, length in 1usize..100) {
        let bench = greenhouse();
        let text: String = NIGHT.char_indices().filter(|(i, _)| *i < at || *i >= at + length).map(|(_, c)| c).collect();
        if let Err(mistakes) = read(&text, &bench, &figures) {
            proptest::prop_assert!(!mistakes.is_empty());
        }
    }
}
