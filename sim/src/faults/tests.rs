//! When faults strike, and what is written down.

#![allow(clippy::float_cmp, reason = "a clamped value is the very limit")]

use super::*;
use crate::scenario::When;

fn faults() -> Faults {
    Faults::new("scope", 7, Arc::default())
}

/// A fault in the words of the control port.
fn spec(text: &str) -> FaultSpec {
    toml::from_str(&format!("instrument = \"scope\"\n{text}")).unwrap()
}

/// Which of `count` replies `1\n` to `ask` are struck, counted from 1.
fn struck(faults: &Faults, ask: &str, count: usize) -> Vec<usize> {
    (1..=count).filter(|_| !faults.reply(ask.as_bytes(), b"1\n").is_empty()).collect()
}

#[test]
fn without_a_condition_the_next_reply_is_struck_once() {
    let faults = faults();
    assert_eq!(faults.arm(spec("what = \"mute\"")), 1);
    assert_eq!(struck(&faults, "A?", 3), [1]);
}

#[test]
fn every_so_many_th_reply() {
    let faults = faults();
    faults.arm(spec("what = \"mute\"\nwhen = { queries = 3 }\ntimes = 2"));
    assert_eq!(struck(&faults, "A?", 10), [3, 6]);
}

#[test]
fn only_replies_to_what_holds_a_text_count() {
    let faults = faults();
    faults.arm(spec("what = \"mute\"\nwhen = { queries = 2 }\nto = \"*opc\""));
    assert_eq!(struck(&faults, "*IDN?", 5), [0; 0]);
    assert_eq!(struck(&faults, "INIT;*OPC?", 5), [2]);
}

#[test]
fn bytes_are_counted_to_the_place_in_the_reply() {
    let faults = faults();
    faults.arm(spec("what = \"cut\"\nwhen = { bytes = 25 }"));
    assert_eq!(faults.reply(b"A?", &[b'x'; 20]), []);
    let strikes = faults.reply(b"A?", &[b'x'; 20]);
    assert_eq!(strikes.iter().map(|strike| strike.offset).collect::<Vec<_>>(), [Some(5)]);
}

#[test]
fn chance_comes_from_the_seed() {
    let draw = |seed| {
        let faults = Faults::new("scope", seed, Arc::default());
        faults.arm(spec("what = \"mute\"\nwhen = { chance = 0.1 }"));
        struck(&faults, "A?", 2000)
    };
    assert_eq!(draw(7), draw(7));
    assert_ne!(draw(7), draw(8));
    // Binomial: 200 expected, standard deviation 13.4; five of them either way.
    let count = draw(7).len();
    assert!((133..=267).contains(&count), "{count}");
}

#[test]
fn one_fault_of_the_wire_at_a_time() {
    let faults = faults();
    faults.arm(spec("what = \"mute\""));
    faults.arm(spec("what = \"twice\""));
    faults.arm(spec("what = \"meddle\"\nsend = \"*RST\""));
    let names = |strikes: Vec<Struck>| strikes.iter().map(|strike| strike.spec.what.name()).collect::<Vec<_>>();
    assert_eq!(names(faults.reply(b"A?", b"1\n")), ["mute", "meddle"]);
    assert_eq!(names(faults.reply(b"A?", b"1\n")), ["twice"]);
    assert_eq!(names(faults.reply(b"A?", b"1\n")), [""; 0]);
}

#[test]
fn faults_of_blocks_wait_for_one() {
    let faults = faults();
    faults.arm(spec("what = \"truncate\""));
    assert_eq!(faults.reply(b"A?", b"1\n"), []);
    assert_eq!(faults.reply(b"A?", b"#15hello\n").len(), 1);
}

#[test]
fn acquisitions_are_disturbed_and_counted_for_the_wire() {
    let faults = faults();
    faults.arm(spec("what = \"flat\"\nchannel = 2\nwhen = { acquisitions = 2 }"));
    faults.arm(spec("what = \"stuck-bit\"\nchannel = 1\nbit = 3"));
    faults.arm(spec("what = \"cut\"\nwhen = { acquisitions = 2 }"));
    let first = Disturbance { stuck: vec![(0, 3)], ..Disturbance::default() };
    assert_eq!(faults.acquisition().0, first);
    assert_eq!(struck(&faults, "A?", 2), [0; 0]);
    assert_eq!(faults.acquisition().0, Disturbance { flat: vec![1], ..Disturbance::default() });
    assert_eq!(struck(&faults, "A?", 2), [1]);
    assert_eq!(faults.acquisition().0, Disturbance::default());
    let others = ["clipped\"\nchannel = 3\nlevel = 0.25", "swapped\"", "no-trigger\""];
    for what in others {
        faults.arm(spec(&format!("what = \"{what}")));
    }
    let all = Disturbance { clipped: vec![(2, 0.25)], swapped: true, no_trigger: true, ..Disturbance::default() };
    assert_eq!(faults.acquisition().0, all);
}

#[test]
fn a_clamp_holds_until_it_is_disarmed() {
    let faults = faults();
    let number = faults.arm(spec("what = \"clamp\"\nsetting = \"span\"\nmost = 5.0"));
    assert_eq!(faults.clamped(Setting::Span, 10.0), 5.0);
    assert_eq!(faults.clamped(Setting::Span, 2.0), 2.0);
    assert_eq!(faults.clamped(Setting::Points, 10.0), 10.0);
    assert_eq!((faults.disarm(Some(number)), faults.disarm(Some(number))), (1, 0));
    assert_eq!(faults.clamped(Setting::Span, 10.0), 10.0);
    faults.arm(spec("what = \"clamp\"\nsetting = \"span\"\nmost = 5.0\nwhen = { queries = 1 }"));
    assert_eq!(faults.clamped(Setting::Span, 10.0), 10.0);
    faults.reply(b"A?", b"1\n");
    assert_eq!(faults.clamped(Setting::Span, 10.0), 5.0);
}

#[tokio::test(start_paused = true)]
async fn connections_are_refused_by_number_or_by_time() {
    let faults = faults();
    faults.arm(spec("what = \"refuse\"\nconnections = 2"));
    assert!(!faults.refuses());
    faults.reply(b"A?", b"1\n");
    assert_eq!([faults.refuses(), faults.refuses(), faults.refuses()], [true, true, false]);
    faults.arm(spec("what = \"refuse\"\nseconds = 2.0"));
    faults.reply(b"A?", b"1\n");
    assert!(faults.refuses());
    tokio::time::advance(Duration::from_millis(1999)).await;
    assert!(faults.refuses());
    tokio::time::advance(Duration::from_millis(1)).await;
    assert!(!faults.refuses());
}

#[test]
fn the_ledger_holds_the_order() {
    let ledger = Arc::<Ledger>::default();
    let scope = Faults::new("scope", 7, Arc::clone(&ledger));
    let supply = Faults::new("supply", 7, Arc::clone(&ledger));
    scope.arm(spec("what = \"twice\""));
    scope.arm(spec("what = \"flat\"\nchannel = 1"));
    supply.arm(spec("what = \"mute\""));
    supply.reply(b"A?", b"1\n");
    let (_, struck) = scope.acquisition();
    scope.confirm(&struck, 4);
    scope.reply(b"A?", b"1\n");
    let entry = |fault, instrument: &str, what, at| Entry { fault, instrument: instrument.to_owned(), what, at };
    let expected =
        vec![entry(3, "supply", What::Mute, 1), entry(2, "scope", What::Flat, 4), entry(1, "scope", What::Twice, 1)];
    assert_eq!(ledger.read(), (expected, 3));
}

#[test]
fn a_disarmed_fault_does_not_strike() {
    let faults = faults();
    faults.arm(spec("what = \"mute\"\ntimes = 0"));
    assert_eq!(faults.disarm(None), 1);
    assert_eq!(struck(&faults, "A?", 2), [0; 0]);
    assert_eq!(spec("what = \"mute\"").when, When::default());
}
