//! Reading a scenario: what is accepted and what is refused, and how it is said.

use super::*;

const DEMO: &str = include_str!("../../../configs/scenarios/greenhouse-fan.toml");

#[test]
fn reads_the_demo() {
    let scenario = Scenario::read(DEMO).unwrap();
    let kinds: Vec<Kind> = scenario.instruments.iter().map(|instrument| instrument.kind).collect();
    assert_eq!(kinds, [Kind::Scope, Kind::Generator, Kind::Supply, Kind::Switch]);
    assert_eq!(scenario.legs.iter().map(|leg| (leg.channel, leg.tip)).collect::<Vec<_>>(), [(1, Tip::P), (2, Tip::N)]);
    assert!(matches!(scenario.device, DeviceSpec::HalfBridge(_)));
}

#[test]
fn refuses_keys_it_does_not_know_everywhere() {
    for (from, to) in [
        ("seed = ", "sed = 1\nseed = "),
        ("converter_bits = 8", "converter_bits = 8\nbits = 8"),
        ("source_ohm = 50.0", "source_ohm = 50.0\nohm = 50"),
        ("tip = \"P\"", "tip = \"P\"\ntop = 1"),
        ("span_v = 1.0", "span_v = 1.0\nspan = 1"),
        ("kind = \"half-bridge\"", "kind = \"half-bridge\"\nbridge = 1"),
        ("kind = \"supply\"", "kind = \"supply\"\nnumber = 1"),
        ("unlisted = { gain", "unlisted = { again = 0, gain"),
    ] {
        let text = DEMO.replacen(from, to, 1);
        assert_ne!(text, DEMO, "{from}");
        let error = Scenario::read(&text).unwrap_err();
        assert!(error.to_string().contains("unknown field"), "{to}: {error}");
    }
}

#[test]
fn refuses_values_out_of_range_by_their_key() {
    for (from, to, key) in [
        ("converter_bits = 8", "converter_bits = 12", "scope.converter_bits"),
        ("channel = 2", "channel = 1", "leg.channel"),
        ("channel = 2", "channel = 5", "leg.channel"),
        ("bandwidth_hz = 350e6", "bandwidth_hz = 0.0", "leg.bandwidth_hz"),
        ("noise_v = 100e-6", "noise_v = -1.0", "leg.noise_v"),
        ("delay_s = 5.0e-9", "delay_s = nan", "leg.delay_s"),
        ("ring_hz = 35e6", "ring_hz = inf", "device.ring_hz"),
        ("switch_threshold_v = 4.0", "switch_threshold_v = 14.0", "device.switch_threshold_v"),
        ("name = \"supply\"", "name = \"scope\"", "instrument.name"),
    ] {
        let text = DEMO.replacen(from, to, 1);
        let error = Scenario::read(&text).unwrap_err();
        assert!(matches!(&error, ScenarioError::Range { key: found, .. } if found == key), "{to}: {error}");
    }
}

#[test]
fn a_balanced_line_s_sine_is_a_multiple_and_its_edges_fit() {
    let text = |edge_s: &str, sine_hz: &str| {
        let device = "frequency_hz = 1e5\nswing_v = 2.0\nmiddle_v = 0.0\nsource_ohm = 50.0\nsine_v = 3.0\n";
        format!(
            "seed = 1\ninstrument = []\n[device]\nkind = \"balanced\"\n{device}edge_s = {edge_s}\nsine_hz = {sine_hz}\n"
        )
    };
    assert!(Scenario::read(&text("20e-9", "1e6")).is_ok());
    for (edge_s, sine_hz, key) in
        [("20e-9", "1.05e6", "sine_hz"), ("20e-9", "5e4", "sine_hz"), ("4e-6", "1e6", "edge_s")]
    {
        let error = Scenario::read(&text(edge_s, sine_hz)).unwrap_err();
        assert!(error.to_string().contains(&format!("`device.{key}`")), "{error}");
    }
}

#[test]
fn an_instrument_speaks_plain_text_unless_told_otherwise() {
    let protocols = |text: &str| -> Result<Vec<Protocol>, ScenarioError> {
        Ok(Scenario::read(text)?.instruments.iter().map(|instrument| instrument.protocol).collect())
    };
    let (line, text) = ("protocol = \"socket\"\n", Protocol::Socket);
    assert_eq!(protocols(DEMO).unwrap(), [text; 4]);
    assert_eq!(protocols(&DEMO.replace(line, "")).unwrap(), [text; 4]);
    let hislip = DEMO.replacen(line, "protocol = \"hislip\"\n", 1);
    assert_eq!(protocols(&hislip).unwrap(), [Protocol::Hislip, text, text, text]);
    let error = protocols(&DEMO.replacen(line, "protocol = \"vxi\"\n", 1)).unwrap_err().to_string();
    assert!(error.contains("hislip") && error.contains("socket"), "{error}");
}

#[test]
fn leaves_out_what_has_a_default() {
    let text = "seed = 1\ninstrument = []\n[device]\nkind = \"divider\"\nresistors_ohm = [1.0, 2.0, 3.0]\n";
    let scenario = Scenario::read(text).unwrap();
    assert_eq!(scenario.scope, ScopeSpec::default());
    assert_eq!(scenario.reference, ReferenceSpec::default());
    let divider = DividerSpec { resistors_ohm: [1.0, 2.0, 3.0], earth_lead: false };
    assert_eq!(scenario.device, DeviceSpec::Divider(divider));
}

/// The demo with one more table.
fn with(text: &str) -> Result<Scenario, ScenarioError> {
    Scenario::read(&format!("{DEMO}\n{text}\n"))
}

#[test]
fn reads_personalities_faults_and_the_control_port() {
    let text = DEMO.replacen("kind = \"scope\"", "kind = \"scope\"\npersonality = \"wordy\"", 1);
    let scenario = Scenario::read(&text).unwrap();
    assert_eq!(scenario.instruments[0].personality, PersonalitySpec::Wordy);
    assert_eq!(scenario.instruments[1].personality, PersonalitySpec::Standard);
    let scenario = with(
        "[control]\nport = 0\n[[fault]]\ninstrument = \"scope\"\nwhat = \"length-absurd\"\nwhen = { chance = 0.1 }\n\
         [[fault]]\ninstrument = \"supply\"\nwhat = \"clamp\"\nsetting = \"voltage\"\nmost = 24.0\ntimes = 3",
    )
    .unwrap();
    assert_eq!(scenario.control, Some(ControlSpec { port: 0 }));
    let faults: Vec<_> = scenario.faults.iter().map(|fault| (fault.what, fault.most_times())).collect();
    assert_eq!(faults, [(What::LengthAbsurd, u32::MAX), (What::Clamp, 3)]);
}

#[test]
fn refuses_faults_that_mean_nothing() {
    for (fault, key) in [
        ("instrument = \"nobody\"\nwhat = \"cut\"", "fault.instrument"),
        ("instrument = \"scope\"\nwhat = \"flat\"", "fault.channel"),
        ("instrument = \"scope\"\nwhat = \"flat\"\nchannel = 5", "fault.channel"),
        ("instrument = \"scope\"\nwhat = \"flat\"\nchannel = 1\nto = \"x\"", "fault.to"),
        ("instrument = \"scope\"\nwhat = \"cut\"\nchannel = 1", "fault.channel"),
        ("instrument = \"scope\"\nwhat = \"stuck-bit\"\nchannel = 1\nbit = 8", "fault.bit"),
        ("instrument = \"scope\"\nwhat = \"clipped\"\nchannel = 1\nlevel = 0.0", "fault.level"),
        ("instrument = \"scope\"\nwhat = \"drip\"\nseconds = 1.0\nbytes = 0", "fault.bytes"),
        ("instrument = \"scope\"\nwhat = \"stall\"\nseconds = -1.0", "fault.seconds"),
        ("instrument = \"scope\"\nwhat = \"cut\"\nwhen = { queries = 0 }", "fault.when.queries"),
        ("instrument = \"scope\"\nwhat = \"cut\"\nwhen = { chance = 1.5 }", "fault.when.chance"),
    ] {
        let error = with(&format!("[[fault]]\n{fault}")).unwrap_err();
        assert!(matches!(&error, ScenarioError::Range { key: found, .. } if found == key), "{fault}: {error}");
    }
    let text = DEMO.replacen("name = \"supply\"", "name = \"control\"", 1);
    assert!(Scenario::read(&format!("{text}\n[control]\n")).is_err());
}
