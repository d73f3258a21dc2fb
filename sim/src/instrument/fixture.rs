//! Benches of one personality for the tests.

use std::sync::Arc;

use super::{Bench, Device, kind_name};
use crate::scenario::{InstrumentSpec, Kind, PersonalitySpec, Protocol, Scenario};

/// All four instruments on one bench, which speak alike.
pub(crate) struct Rack {
    pub(crate) scope: Device,
    pub(crate) generator: Device,
    pub(crate) supply: Device,
    pub(crate) switch: Device,
}

/// The demo's bench with instruments of one personality.
pub(crate) fn rack(personality: PersonalitySpec) -> Rack {
    let scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    let bench = Arc::new(Bench::new(&scenario));
    let device = |kind| Device::new(&spec(kind, personality), &bench);
    Rack {
        scope: device(Kind::Scope),
        generator: device(Kind::Generator),
        supply: device(Kind::Supply),
        switch: device(Kind::Switch),
    }
}

/// An instrument named after its kind.
pub(crate) fn spec(kind: Kind, personality: PersonalitySpec) -> InstrumentSpec {
    let name = kind_name(kind).to_owned();
    InstrumentSpec {
        name,
        kind,
        protocol: Protocol::Socket,
        personality,
        port: 0,
        serial: None,
        identity: Some("A,B,C,D".into()),
    }
}

/// Asserts replies one after the other, with whatever ends them.
pub(crate) async fn dialogue(device: &Device, lines: &[(&str, &str)]) {
    for (message, reply) in lines {
        let found = device.run(message.as_bytes()).await;
        assert_eq!(String::from_utf8_lossy(&found), *reply, "{message}");
    }
}
