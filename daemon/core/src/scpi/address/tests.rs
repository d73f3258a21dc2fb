//! Resource strings, good and bad, and the way there and back.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

#[test]
fn the_forms_that_are_understood() {
    // VPP-4.3, 4.3.1 (from memory).
    for (text, shown) in [
        ("TCPIP::192.0.2.7::5025::SOCKET", "TCPIP::192.0.2.7::5025::SOCKET"),
        ("tcpip0::scope.lab::5025::socket", "TCPIP::scope.lab::5025::SOCKET"),
        ("TCPIP2::[2001:db8::1]::5025::SOCKET", "TCPIP2::[2001:db8::1]::5025::SOCKET"),
        ("TCPIP::[fe80::1%eth0]::1::SOCKET", "TCPIP::[fe80::1%eth0]::1::SOCKET"),
        ("TCPIP::scope::INSTR", "TCPIP::scope::inst0::INSTR"),
        ("TCPIP::scope::inst1::INSTR", "TCPIP::scope::inst1::INSTR"),
        ("TCPIP::scope::hislip0::INSTR", "TCPIP::scope::hislip0::INSTR"),
        ("TCPIP::[::1]::hislip0,4881::instr", "TCPIP::[::1]::hislip0,4881::INSTR"),
        ("TCPIP1::192.0.2.7::hislip0::INSTR", "TCPIP1::192.0.2.7::hislip0::INSTR"),
        ("  TCPIP::scope::HiSLIP1,4880::INSTR ", "TCPIP::scope::HiSLIP1::INSTR"),
    ] {
        let resource = Resource::parse(text).unwrap();
        assert_eq!(resource.to_string(), shown);
        assert_eq!(shown.parse(), Ok(resource));
    }
    let socket = Resource::parse("TCPIP::[::1]::5025::SOCKET").unwrap();
    assert_eq!(socket, Resource::Socket { board: 0, host: "::1".to_owned(), port: 5025 });
    assert_eq!((socket.host(), socket.port()), ("::1", Some(5025)));
    assert_eq!(Resource::parse("TCPIP::a::hislip0::INSTR").unwrap().port(), Some(HISLIP_PORT));
    assert_eq!(Resource::parse("TCPIP::a::INSTR").unwrap().port(), None);
}

#[test]
fn what_is_wrong_is_named() {
    let refused = |text: &str| Resource::parse(text).unwrap_err();
    for text in
        ["", "scope:5025", "TCPIP::scope", "TCPIP::scope::5025", "TCPIP::a::1::2::SOCKET", "TCPIP::[::1]5::SOCKET"]
    {
        assert!(matches!(refused(text), AddressError::Form { .. }), "{text}");
    }
    assert!(matches!(refused("GPIB0::7::INSTR"), AddressError::Interface { interface, .. } if interface == "GPIB"));
    assert!(matches!(refused("TCPIP70000::a::1::SOCKET"), AddressError::BadBoard { board, .. } if board == "70000"));
    for host in ["", "a b", "::1", "[::g]", "[::1", "[fe80::1%]", "a/b", "a@b"] {
        let error = refused(&format!("TCPIP::{host}::1::SOCKET"));
        // `::1` without brackets has an empty host before it.
        assert!(matches!(error, AddressError::BadHost { .. }), "{host}: {error}");
    }
    for port in ["0", "65536", "+1", "-1", "http", ""] {
        let error = refused(&format!("TCPIP::a::{port}::SOCKET"));
        assert!(matches!(error, AddressError::BadPort { .. }), "{port}: {error}");
    }
    for port in ["0", "65536", "", "4880,1", "x"] {
        let error = refused(&format!("TCPIP::a::hislip0,{port}::INSTR"));
        assert!(matches!(error, AddressError::BadPort { .. }), "{port}: {error}");
    }
    assert!(matches!(refused("TCPIP::a::hislip0::SOCKET"), AddressError::BadPort { .. }));
    assert!(matches!(refused("TCPIP::a::hislip0::4880::INSTR"), AddressError::Form { .. }));
    assert!(matches!(refused("TCPIP::a::inst0,5::INSTR"), AddressError::BadDevice { .. }));
    assert!(matches!(refused("TCPIP::a::in st::INSTR"), AddressError::BadDevice { .. }));
    assert!(matches!(refused(&format!("TCPIP::{}::1::SOCKET", "a".repeat(600))), AddressError::Form { .. }));
    assert_eq!(
        refused("GPIB0::7::INSTR").to_string(),
        "`GPIB0::7::INSTR`: instruments on `GPIB` cannot be reached; write `TCPIP::host::port::SOCKET`, \
         `TCPIP::host::hislip0::INSTR` or `TCPIP::host::inst0::INSTR`"
    );
}

fn resources() -> impl Strategy<Value = Resource> {
    let host = prop_oneof![
        "[a-zA-Z0-9][a-zA-Z0-9._-]{0,20}",
        any::<u128>().prop_map(|bits| core::net::Ipv6Addr::from(bits).to_string()),
        any::<u32>().prop_map(|bits| core::net::Ipv4Addr::from(bits).to_string()),
    ];
    (any::<u16>(), host, 1_u16.., "[a-z0-9]{0,4}", 0..3).prop_map(|(board, host, port, tail, form)| match form {
        0 => Resource::Socket { board, host, port },
        1 => Resource::Hislip { board, host, device: format!("hislip{tail}"), port },
        _ => Resource::Instr { board, host, device: format!("inst{tail}") },
    })
}

proptest! {
    #[test]
    fn shown_and_read_is_the_same(resource in resources()) {
        prop_assert_eq!(Resource::parse(&resource.to_string()), Ok(resource));
    }

    #[test]
    fn nothing_panics(text in "(TCPIP)?[0-9]{0,3}(::)?\\PC{0,40}") {
        if let Ok(resource) = Resource::parse(&text) {
            prop_assert_eq!(Resource::parse(&resource.to_string()), Ok(resource));
        }
    }
}
