//! Lines to the control port and what they do.

use super::*;
use crate::scenario::Scenario;

fn control() -> Control {
    let scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    let bench = Arc::new(Bench::new(&scenario));
    let device = |spec| Arc::new(Device::new(spec, &bench));
    let devices = scenario.instruments.iter().map(|spec| (spec.name.clone(), device(spec))).collect();
    Control::new(&scenario, bench, devices)
}

#[test]
fn faults_are_armed_reported_and_counted() {
    let control = control();
    assert_eq!(control.answer("arm { instrument = \"scope\", what = \"twice\", times = 2 }"), "ok 1\n");
    assert_eq!(control.answer("arm { instrument = \"supply\", what = \"mute\", when = { queries = 1 } }"), "ok 2\n");
    assert_eq!(control.answer("report"), "ok 0\n");
    control.devices["scope"].faults().reply(b"A?", b"1\n");
    control.devices["supply"].faults().reply(b"A?", b"1\n");
    control.devices["scope"].faults().reply(b"A?", b"1\n");
    let report = "fault=1 instrument=scope what=twice reply=1\nfault=2 instrument=supply what=mute reply=1\n\
                  fault=1 instrument=scope what=twice reply=2\nok 3\n";
    assert_eq!(control.answer("report"), report);
    let count = "instrument=scope what=twice count=2\ninstrument=supply what=mute count=1\nok 3\n";
    assert_eq!(control.answer("count"), count);
    assert_eq!(control.answer("disarm 1"), "ok 1\n");
    assert_eq!(control.answer("disarm all"), "ok 1\n");
}

#[test]
fn mistakes_are_told_on_one_line() {
    let control = control();
    for (line, part) in [
        ("", "is not understood"),
        ("arm", "fault"),
        ("arm { instrument = \"scope\", what = \"explode\" }", "unknown variant"),
        ("arm { instrument = \"scope\", what = \"cut\", colour = 1 }", "unknown field"),
        ("arm { instrument = \"toaster\", what = \"cut\" }", "fault.instrument"),
        ("arm { instrument = \"scope\", what = \"stall\" }", "fault.seconds"),
        ("arm { instrument = \"scope\", what = \"mute\", bytes = 3 }", "fault.bytes"),
        ("arm { instrument = \"scope\", what = \"mute\", when = { queries = 1, chance = 0.1 } }", "fault.when"),
        ("disarm x", "fault's number"),
        ("report all", "is not understood"),
    ] {
        let answer = control.answer(line);
        assert!(answer.starts_with("error ") && answer.contains(part), "{line}: {answer}");
        assert_eq!(answer.matches('\n').count(), 1, "{answer}");
    }
}

#[tokio::test]
async fn lines_over_a_connection() {
    let control = control();
    let (mut near, far) = tokio::io::duplex(4096);
    near.write_all(b"help\r\nreport\n").await.unwrap();
    near.shutdown().await.unwrap();
    let mut answers = String::new();
    let (served, read) = tokio::join!(talk(far, &control), near.read_to_string(&mut answers));
    served.unwrap();
    read.unwrap();
    assert!(answers.starts_with("arm {") && answers.ends_with("help\nok\nok 0\n"), "{answers}");
}
