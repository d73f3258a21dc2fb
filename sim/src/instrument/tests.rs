//! Devices told literal program messages (IEEE 488.2 and SCPI-99 clauses from memory). No connection is involved.

use super::*;
use crate::scenario::{PersonalitySpec, Protocol, Scenario};

/// The demo's scenario: these tests use none of its physics.
const SCENARIO: &str = include_str!("../../../configs/scenarios/greenhouse-fan.toml");

/// All four instruments on one bench.
struct Rack {
    scope: Device,
    generator: Device,
    supply: Device,
    switch: Device,
}

fn rack() -> Rack {
    let bench = Arc::new(Bench::new(&Scenario::read(SCENARIO).unwrap()));
    let device = |kind, serial: Option<&str>| {
        let name = kind_name(kind).to_owned();
        Device::new(
            &InstrumentSpec {
                name,
                kind,
                protocol: Protocol::Socket,
                personality: PersonalitySpec::Standard,
                port: 0,
                serial: serial.map(str::to_owned),
                identity: None,
            },
            &bench,
        )
    };
    Rack {
        scope: device(Kind::Scope, Some("SN7")),
        generator: device(Kind::Generator, None),
        supply: device(Kind::Supply, None),
        switch: device(Kind::Switch, None),
    }
}

/// What a device answers, as text without its NL.
async fn ask(device: &Device, message: &str) -> String {
    let reply = String::from_utf8(device.run(message.as_bytes()).await).unwrap();
    if reply.is_empty() { reply } else { reply.strip_suffix('\n').unwrap().to_owned() }
}

/// Sends a message and returns the numbers of the errors it made.
async fn errors(device: &Device, message: &str) -> Vec<i32> {
    device.run(message.as_bytes()).await;
    let mut numbers = Vec::new();
    loop {
        let error = ask(device, "SYST:ERR?").await;
        match error.split(',').next().unwrap().parse().unwrap() {
            0 => return numbers,
            number => numbers.push(number),
        }
    }
}

/// Asserts replies one after the other.
async fn dialogue(device: &Device, lines: &[(&str, &str)]) {
    for (message, reply) in lines {
        assert_eq!(ask(device, message).await, *reply, "{message}");
    }
}

#[tokio::test]
async fn common_commands() {
    // IEEE 488.2 chapter 10
    let rack = rack();
    let lines = [
        ("*IDN?", "EVENPAIR-SIM,SCOPE,SN7,1.0"),
        ("*ESR?", "128"),
        ("*TST?;*OPC?;*OPC;*ESR?", "0;1;1"),
        ("*ESE 60;*SRE 255;*ESE?;*SRE?", "60;191"),
        ("SYST:VERS?;:SYST:ERR:COUN?", "1999.0;0"),
        ("SYSTEM:ERROR:NEXT?", "0,\"No error\""),
        ("NONSENSE", ""),
        ("*STB?", "100"),
        ("*ESR?;*STB?", "32;84"),
        ("SYST:ERR?", "-113,\"Undefined header\""),
        ("NONSENSE;*IDN?", ""),
        ("*CLS;*ESR?;*ESE?;:SYST:ERR?", "0;60;0,\"No error\""),
        ("  ", ""),
    ];
    dialogue(&rack.scope, &lines).await;
    assert_eq!(ask(&rack.switch, "*IDN?").await, "EVENPAIR-SIM,SWITCH,0,1.0");
}

#[tokio::test]
async fn message_available_is_bit_four() {
    // IEEE 488.2 11.2.1.2: set while the output queue holds something, here the reply to *TST?.
    let rack = rack();
    dialogue(&rack.scope, &[("*CLS;*STB?", "0"), ("*TST?;*STB?", "0;16")]).await;
}

#[tokio::test]
async fn the_header_path() {
    // SCPI-99 vol. 1, 6.2.4; common commands leave it alone (IEEE 488.2 10).
    let rack = rack();
    let lines = [
        ("SWE:TINT 4 NS;POIN 2000;*CLS;OREF:LOC .25;:SWE:TINT?;POIN?", "4.0E-9;2000"),
        ("SENSE:SWEEP:OREFERENCE:LOCATION?", "2.5E-1"),
        ("SENS2:VOLT:RANG:PTP 4;OFFS -1;:SENS2:VOLT:RANG:PTP?;OFFS?", "5.0E+0;-1.0E+0"),
        ("volt:dc:range:ptpeak?", "1.0E+1"),
        ("INP2:COUP AC;DEL 2.32E-9;COUP?;DEL?;:INP:COUP?", "AC;2.3E-9;DC"),
    ];
    dialogue(&rack.scope, &lines).await;
    assert_eq!(errors(&rack.scope, "SWE:TINT 1E-9;AVER ON").await, [-113], "AVER is not below SWE");
    assert_eq!(errors(&rack.scope, "SWE:TINT 1E-9;:AVER ON").await, [0; 0]);
}

#[tokio::test]
async fn mistakes_and_what_becomes_of_the_rest_of_the_message() {
    let rack = rack();
    for (message, numbers) in [
        ("VOLTA:RANG:PTP 1", vec![-113]),
        ("SENS5:VOLT:RANG:PTP 1", vec![-114]),
        ("SENS0:VOLT:RANG:PTP 1", vec![-114]),
        ("SWE2:POIN 100", vec![-114]),
        ("SWE:POIN", vec![-109]),
        ("SWE:POIN 100,200", vec![-108]),
        ("SWE:POIN 'x'", vec![-104]),
        ("SWE:POIN 100 V", vec![-138]),
        ("SWE:TINT 1 V", vec![-131]),
        ("INP:COUP MAYBE", vec![-141]),
        ("ABOR?", vec![-113]),
        ("TRAC:PRE CHAN1", vec![-113]),
        ("TRAC? CHAN1", vec![-230]),
        ("TRAC? CHAN5", vec![-222]),
        ("*ESE 256", vec![-222]),
        ("*RST 1", vec![-108]),
        ("*FOO", vec![-113]),
        ("SWE:POIN\"x\"", vec![-111]),
        ("SYST:FOO?", vec![-113]),
        ("FORM INT,12", vec![-222]),
        // A command error ends the message, an execution error does not.
        ("FOO;*ESE 256", vec![-113]),
        ("*ESE 256;FOO", vec![-222, -113]),
    ] {
        assert_eq!(errors(&rack.scope, message).await, numbers, "{message}");
    }
}

#[tokio::test]
async fn a_query_behind_an_indefinite_reply() {
    // SCPI-99: -440; IEEE 488.2 6.3.2.3 and 10.14: *IDN? must be the last query of its message.
    let rack = rack();
    dialogue(
        &rack.supply,
        &[
            ("*ESR?;*IDN?;*TST?", "128;EVENPAIR-SIM,SUPPLY,0,1.0"),
            ("SYST:ERR?", "-440,\"Query UNTERMINATED after indefinite response\""),
            ("*ESR?", "4"),
            ("*IDN?;*ESE 1", "EVENPAIR-SIM,SUPPLY,0,1.0"),
            ("*ESE?", "1"),
        ],
    )
    .await;
}

#[tokio::test]
async fn out_of_range_settings_are_clamped_and_reported() {
    let rack = rack();
    for (message, query, set) in [
        ("VOLT:RANG:PTP 1000", "VOLT:RANG:PTP?", "1.0E+2"),
        ("VOLT:RANG:OFFS -1E400", "VOLT:RANG:OFFS?", "-5.0E+1"),
        ("INP4:DEL 1 US", "INP4:DEL?", "1.0E-7"),
        ("SWE:POIN 3", "SWE:POIN?", "10"),
        ("AVER:COUN 5000", "AVER:COUN?", "1024"),
    ] {
        assert_eq!(errors(&rack.scope, message).await, [-222], "{message}");
        assert_eq!(ask(&rack.scope, query).await, set, "{query}");
    }
    assert_eq!(errors(&rack.scope, "INP4:DEL 100 NS;DEL -100 NS").await, [0; 0], "the limit itself is in range");
    let lines = [
        ("SWE:POIN? MIN;POIN? MAX;POIN? DEF", "10;1000000;10000"),
        ("SWE:POIN MAX;POIN?", "1000000"),
        ("*RST;SWE:POIN?", "10000"),
    ];
    dialogue(&rack.scope, &lines).await;
}

#[tokio::test]
async fn every_scope_setting_has_a_query_and_a_reset_value() {
    let rack = rack();
    let lines = [
        ("TRIG:SOUR?;LEV?;SLOP?", "INT1;0.0E+0;POS"),
        ("TRIG:SOUR INT3;LEV 250 MV;SLOP NEG;:TRIG:SEQ:SOUR?;LEV?;SLOP?", "INT3;2.5E-1;NEG"),
        ("TRIGGER:SOURCE EXTERNAL;SOURCE?;SOUR IMM;SOUR?", "EXT;IMM"),
        ("AVER?;AVER:COUN?", "0;16"),
        ("AVERAGE:STATE ON;COUNT 64;STATE?;COUNT?", "1;64"),
        ("FORM?;FORM:BORD?", "ASC,0;NORM"),
        ("FORM INT,8;FORM?;FORM REAL,32;FORM?;FORM INTEGER,16;:FORM:DATA?", "INT,8;REAL,32;INT,16"),
        ("FORM:BORD SWAP;BORD?", "SWAP"),
        ("INP3:COUP GROUND;COUP?", "GRO"),
        ("*RST;TRIG:SOUR?;:AVER?;:FORM?;:FORM:BORD?;:INP3:COUP?", "INT1;0;ASC,0;NORM;DC"),
    ];
    dialogue(&rack.scope, &lines).await;
    assert_eq!(errors(&rack.scope, "TRIG:SOUR INT5").await, [-222]);
    assert_eq!(errors(&rack.scope, "TRIG:SOUR EXT1").await, [-141]);
}

#[tokio::test]
async fn the_generator() {
    let rack = rack();
    let lines = [
        ("OUTP?;OUTP2?;OUTP:IMP?", "0;0;50"),
        ("SOUR:FUNC SQU;FREQ 1 MHZ;VOLT 10;VOLT:OFFS 5", ""),
        ("SOUR1:PULS:DCYC 29;TRAN 3 NS;DCYC?;TRAN?", "2.9E+1;3.0E-9"),
        ("SOURCE1:FUNCTION:SHAPE?;:SOUR:FREQ:CW?;:SOUR:VOLT:LEV:IMM:AMPL?", "SQU;1.0E+6;1.0E+1"),
        ("SOUR:VOLT:OFFS?;:SOUR2:FUNC?;FREQ?", "5.0E+0;SIN;1.0E+3"),
        ("SOUR2:FUNC PULS;FUNC?;FUNC DC;FUNC?;FUNC MTON;FUNC?", "PULS;DC;MTON"),
        ("OUTP2 ON;OUTP1:STAT 1;:OUTP?;OUTP2:STAT?", "1;1"),
        ("*RST;OUTP?;OUTP2?;:SOUR:FUNC?", "0;0;SIN"),
        ("SYST:ERR?", "0,\"No error\""),
    ];
    // The path behind `SOUR:FUNC` is `SOUR`, and behind `VOLT:OFFS` it is `SOUR:VOLT`.
    dialogue(&rack.generator, &lines).await;
    assert_eq!(errors(&rack.generator, "OUTP3 ON").await, [-114]);
    assert_eq!(errors(&rack.generator, "SOUR3:FREQ 1").await, [-114]);
    assert_eq!(errors(&rack.generator, "SOUR:FREQ 1 GHZ").await, [-222]);
}

#[tokio::test]
async fn the_supply_measures_what_the_world_says() {
    let rack = rack();
    let lines = [
        ("VOLT?;CURR?;:SOUR2:VOLT? MAX;:SOUR2:CURR? MAX", "0.0E+0;5.0E+0;3.0E+1;2.0E+0"),
        ("VOLT 48;:SOUR2:VOLT 12;CURR 1.5;:SOUR1:VOLT?;:SOUR2:CURR?", "4.8E+1;1.5E+0"),
        ("OUTP ON;OUTP:STAT?;:OUTP2?", "1;0"),
    ];
    dialogue(&rack.supply, &lines).await;
    // What the meter shows is the world's business (Ohm's law is tested there): 48 V within a percent, nothing when off.
    let on: f64 = ask(&rack.supply, "MEAS:VOLT?").await.parse().unwrap();
    assert!((on - 48.0).abs() < 0.48, "{on}");
    let off: f64 = ask(&rack.supply, "OUTP OFF;:MEASURE1:SCALAR:VOLTAGE:DC?").await.parse().unwrap();
    assert!(off.abs() < 0.48, "{off}");
    assert!(ask(&rack.supply, "MEAS2:CURR?").await.parse::<f64>().is_ok());
    assert_eq!(errors(&rack.supply, "MEAS3:VOLT?").await, [-114]);
    assert_eq!(errors(&rack.supply, "VOLT 61").await, [-222]);
}

#[tokio::test]
async fn the_switch() {
    let rack = rack();
    let lines = [
        ("ROUT:CLOS (@101,105:107)", ""),
        ("ROUT:CLOS? (@101,102,105:107)", "1,0,1,1,1"),
        ("ROUT:OPEN? (@101,102);CLOS:STAT?", "0,1;(@101,105,106,107)"),
        ("ROUT:CLOS (@103)", ""),
        ("SYST:ERR?", "-221,\"Settings conflict\""),
        ("ROUT:CLOS? (@103)", "0"),
        ("ROUT:OPEN (@101);CLOS (@103);CLOS? (@101,103)", "0,1"),
        ("ROUTE:OPEN:ALL;:ROUTE:CLOSE:STATE?", "(@)"),
        ("ROUT:CLOS (@102,103)", ""),
        ("ROUT:CLOS:STAT?", "(@)"),
        ("SYST:ERR?", "-221,\"Settings conflict\""),
        ("SYST:ERR?", "0,\"No error\""),
    ];
    dialogue(&rack.switch, &lines).await;
    assert_eq!(errors(&rack.switch, "ROUT:CLOS (@109)").await, [-222]);
    assert_eq!(errors(&rack.switch, "ROUT:CLOS 101").await, [-104]);
    assert_eq!(errors(&rack.switch, "ROUT:CLOS (101)").await, [-171]);
}

#[tokio::test]
async fn an_acquisition_is_an_overlapped_operation() {
    // SCPI-99 vol. 2, 24: INITiate is overlapped; IEEE 488.2 12.
    let rack = rack();
    let scope = &rack.scope;
    ask(scope, "*CLS;:TRIG:SOUR IMM;:SWE:POIN 20;TINT 1E-9;:FORM INT,8;:INIT").await;
    assert_eq!(ask(scope, "*OPC?;:STAT:OPER:COND?;*ESR?").await, "1;0;0");
    assert_eq!(ask(scope, "STAT:OPER?").await, "24", "sweeping and measuring were seen beginning");
    let preamble = ask(scope, "TRAC:PRE? CHAN2").await;
    let fields: Vec<&str> = preamble.split(',').collect();
    assert_eq!((fields.len(), fields[0], fields[1], fields[8]), (10, "20", "1.0E-9", "1"), "{preamble}");
    let data = scope.run(b"TRAC:DATA? CHAN2;DATA? CHAN1").await;
    // Two blocks of 20 bytes: `#220` + 20, `;`, `#220` + 20, NL.
    assert_eq!(data.len(), 24 + 1 + 24 + 1);
    assert_eq!((&data[..4], &data[24..29], data[49]), (&b"#220"[..], &b";#220"[..], b'\n'));
    let next = ask(scope, "INIT;*WAI;:TRAC:PRE? CHAN1").await;
    let number = |preamble: &str| preamble.split(',').next_back().unwrap().parse::<u64>().unwrap();
    assert!(number(&next) > number(&preamble), "acquisitions are counted");
    assert_eq!(ask(scope, "TRAC:PRE? CHAN1;PRE? CHAN2").await.matches(&format!(",{}", number(&next))).count(), 2);
    assert_eq!(ask(scope, "INIT;*OPC;*WAI;*ESR?").await, "1", "*OPC sets bit 0 at the end");
    assert_eq!(errors(scope, "*RST;TRAC? CHAN1").await, [-230], "*RST forgets the record");
}

#[tokio::test]
async fn without_a_trigger_it_waits_until_one_comes() {
    let rack = rack();
    let scope = &rack.scope;
    ask(scope, "*CLS;STAT:OPER:PTR 32;:TRIG:SOUR EXT;:SWE:POIN 10;:INIT;*OPC").await;
    while ask(scope, "STAT:OPER:COND?").await != "32" {
        tokio::task::yield_now().await;
    }
    assert_eq!(ask(scope, "STAT:OPER:EVEN?;*ESR?").await, "32;0");
    assert_eq!(errors(scope, "INIT").await, [-213]);
    assert_eq!(errors(scope, "TRAC:PRE? CHAN1").await, [-230]);
    ask(&rack.generator, "SOUR:FUNC SQU;FREQ 1E6;VOLT 1;:OUTP ON").await;
    assert_eq!(ask(scope, "*OPC?").await, "1");
    assert!(ask(scope, "TRAC:PRE? CHAN1").await.starts_with("10,"));
    assert_eq!(ask(scope, "STAT:OPER:COND?").await, "0");
    // The execution errors above and the operation complete bit.
    assert_eq!(ask(scope, "*ESR?").await, "17");
}

#[tokio::test]
async fn a_change_of_settings_or_an_abort_ends_the_wait() {
    let rack = rack();
    let scope = &rack.scope;
    ask(scope, "TRIG:SOUR EXT;:SWE:POIN 10;:INIT").await;
    while ask(scope, "STAT:OPER:COND?").await != "32" {
        tokio::task::yield_now().await;
    }
    assert_eq!(ask(scope, "TRIG:SOUR IMM;*OPC?").await, "1");
    assert!(ask(scope, "TRAC:PRE? CHAN1").await.starts_with("10,"));
    ask(scope, "TRIG:SOUR EXT;:INIT").await;
    assert_eq!(ask(scope, "ABOR;*OPC?;:STAT:OPER:COND?").await, "1;0");
    assert_eq!(errors(scope, "TRAC? CHAN1").await, [-230], "an aborted acquisition leaves no record");
    assert_eq!(ask(scope, "TRIG:SOUR IMM;:INIT;*OPC?;*RST;*OPC?").await, "1;1");
    assert_eq!(ask(scope, "TRIG:SOUR EXT;:INIT;*OPC;*RST;*OPC?;*ESR?").await, "1;144", "*RST forgets *OPC");
}

#[tokio::test]
async fn the_same_commands_give_the_same_samples() {
    let mut records = Vec::new();
    for _ in 0..2 {
        let rack = rack();
        ask(&rack.generator, "SOUR:FUNC SQU;FREQ 1E6;VOLT 10;:OUTP ON").await;
        ask(&rack.switch, "ROUT:CLOS (@101)").await;
        ask(&rack.scope, "TRIG:SOUR EXT;:SWE:POIN 500;:FORM INT,16;:INIT;ABOR;:INIT").await;
        records.push(rack.scope.run(b"*WAI;:TRAC:DATA? CHAN1;DATA? CHAN2").await);
    }
    assert!(records[0].len() > 2000);
    assert_eq!(records[0], records[1]);
}

#[tokio::test]
async fn status_registers_have_their_masks_and_filters() {
    // SCPI-99 vol. 1, 9
    let rack = rack();
    let lines = [
        ("STAT:OPER:ENAB?;PTR?;NTR?;COND?;EVEN?", "0;32767;0;0;0"),
        ("STAT:OPER:ENAB #H18;NTR 16;PTR 8;ENAB?;NTR?;PTR?", "24;16;8"),
        ("STAT:QUES:ENAB 7;NTR 3;PTR 5;ENAB?;NTR?;PTR?;COND?;:STAT:QUES?", "7;3;5;0;0"),
        ("STAT:PRES;OPER:ENAB?;:STAT:OPER:PTR?;NTR?;:STAT:QUES:ENAB?", "0;32767;0;0"),
    ];
    dialogue(&rack.scope, &lines).await;
    assert_eq!(errors(&rack.scope, "STAT:OPER:ENAB 65535").await, [-222]);
}

#[tokio::test]
async fn system_preset_is_a_reset() {
    let rack = rack();
    assert_eq!(ask(&rack.scope, "SWE:POIN 77;:SYST:PRES;:SWE:POIN?").await, "10000");
    assert_eq!(ask(&rack.generator, "OUTP ON;:SYSTEM:PRESET;:OUTP?").await, "0");
}
