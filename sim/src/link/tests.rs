//! Connections over in-memory pipes: pace on a paused clock, and what faults make of an exchange.

use std::time::Duration;

use tokio::io::AsyncBufReadExt;
use tokio::io::{AsyncReadExt, BufReader, DuplexStream};
use tokio::time::{Instant, advance, timeout};

use super::*;
use crate::instrument::Bench;
use crate::instrument::fixture::spec;
use crate::scenario::{FaultSpec, Kind, PersonalitySpec, Scenario};
use std::sync::Arc;

fn device(kind: Kind, personality: PersonalitySpec) -> Arc<Device> {
    let scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    Arc::new(Device::new(&spec(kind, personality), &Arc::new(Bench::new(&scenario))))
}

fn fault(text: &str) -> FaultSpec {
    toml::from_str(&format!("instrument = \"scope\"\nwhat = {text}")).unwrap()
}

/// A connection to a device.
struct Guest(BufReader<DuplexStream>);

impl Guest {
    fn of(device: &Arc<Device>) -> Self {
        let (near, far) = tokio::io::duplex(1 << 16);
        let device = Arc::clone(device);
        tokio::spawn(async move { converse(far, &device).await });
        Self(BufReader::new(near))
    }

    async fn send(&mut self, text: &str) {
        self.0.write_all(text.as_bytes()).await.unwrap();
    }

    /// The next line; empty once the connection is closed.
    async fn line(&mut self) -> String {
        let mut line = Vec::new();
        let read = timeout(Duration::from_secs(60), self.0.read_until(b'\n', &mut line)).await;
        read.expect("a reply that was not lost").unwrap();
        String::from_utf8_lossy(&line).into_owned()
    }

    async fn ask(&mut self, text: &str) -> String {
        self.send(text).await;
        self.line().await
    }
}

#[tokio::test]
async fn a_greeting_comes_first() {
    let mut guest = Guest::of(&device(Kind::Scope, PersonalitySpec::Wordy));
    assert_eq!(guest.line().await, "Good day. One guest at a time, please.\r\n");
    assert_eq!(guest.ask("IDENTITY?\r\n").await, "A,B,C,D\r\n");
}

#[tokio::test(start_paused = true)]
async fn what_comes_too_soon_is_lost_and_what_comes_later_is_not() {
    let device = device(Kind::Scope, PersonalitySpec::Slow);
    let mut guest = Guest::of(&device);
    // Together: the second is lost, so is the question behind it.
    settle().await;
    guest.send("PUT DEPTH 100\nPUT MEAN 7\nTELL NAME\n").await;
    settle().await;
    pass(20).await;
    assert_eq!(guest.ask("TELL DEPTH\n").await, "100\n");
    pass(20).await;
    assert_eq!(guest.ask("TELL MEAN\n").await, "1\n");
    for (pause_ms, kept) in [(3, false), (7, true)] {
        pass(20).await;
        guest.send("PUT DEPTH 200\n").await;
        // The clock stands still until the device has looked.
        settle().await;
        pass(pause_ms).await;
        guest.send(&format!("PUT MEAN {pause_ms}\n")).await;
        settle().await;
        pass(20).await;
        let expected = if kept { "7\n" } else { "1\n" };
        assert_eq!(guest.ask("TELL MEAN\n").await, expected, "{pause_ms} ms");
    }
}

/// Time passes, and the device looks as often as it does when nothing holds it up.
async fn pass(time_ms: u64) {
    for _ in 0..time_ms {
        advance(Duration::from_millis(1)).await;
        settle().await;
    }
}

/// Lets the other tasks go on without letting time pass.
async fn settle() {
    for _ in 0..20 {
        tokio::task::yield_now().await;
    }
}

#[tokio::test(start_paused = true)]
async fn a_message_that_was_looked_at_late_is_not_held_against_the_next() {
    // The pipe holds the first message while nobody looks for a second; when somebody does, the next comes at once.
    let (mut near, mut far) = tokio::io::duplex(64);
    let mut pace = Pace::new(Some(Duration::from_millis(5)));
    near.write_all(b"A").await.unwrap();
    advance(Duration::from_secs(1)).await;
    let mut buffer = [0; 8];
    assert_eq!(pace.read(&mut far, &mut buffer).await.unwrap(), 1);
    assert!(pace.hears());
    near.write_all(b"B").await.unwrap();
    assert_eq!(pace.read(&mut far, &mut buffer).await.unwrap(), 1);
    assert!(pace.hears(), "the first may have come a second ago");
}

#[tokio::test]
async fn cut_in_the_middle() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"cut\"\nbytes = 3"));
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("*IDN?\n").await, "A,B");
    assert_eq!(guest.line().await, "");
    assert_eq!(Guest::of(&device).ask("*IDN?\n").await, "A,B,C,D\n");
}

#[tokio::test(start_paused = true)]
async fn stalls_and_drips_take_their_time() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"stall\"\nseconds = 30.0\nbytes = 4"));
    device.faults().arm(fault("\"drip\"\nseconds = 1.0\nbytes = 2"));
    let mut guest = Guest::of(&device);
    let before = Instant::now();
    assert_eq!(guest.ask("*IDN?\n").await, "A,B,C,D\n");
    assert_eq!(before.elapsed().as_secs(), 30);
    // Eight bytes in four parts; the last pause comes behind the reply.
    let before = Instant::now();
    assert_eq!(guest.ask("*IDN?\n").await, "A,B,C,D\n");
    assert_eq!(before.elapsed().as_secs(), 3);
}

#[tokio::test]
async fn a_late_reply_comes_before_the_next() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"late\"\nto = \"*IDN\""));
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("*IDN?\n*TST?\n").await, "A,B,C,D\n");
    assert_eq!(guest.line().await, "0\n");
    // With its connection it is gone, unless it is said to outlive it.
    for (across, first) in [("", "0\n"), ("\nacross = true", "A,B,C,D\n")] {
        device.faults().arm(fault(&format!("\"late\"\nto = \"*IDN\"{across}")));
        let mut guest = Guest::of(&device);
        guest.send("*IDN?\n*ESE 7\n").await;
        let mut other = Guest::of(&device);
        while other.ask("*ESE?\n").await != "7\n" {}
        drop(guest);
        other.send("*ESE 0\n").await;
        let found = if across.is_empty() { other.ask("*TST?\n").await } else { "A,B,C,D\n".to_owned() };
        assert_eq!(found, first);
    }
}

#[tokio::test]
async fn a_reboot_loses_the_settings_and_tells_so() {
    // IEEE 488.2 11.5.1.1.1: bit 7 (PON) is set when the instrument was switched on.
    let device = device(Kind::Generator, PersonalitySpec::Standard);
    let (mut guest, mut other) = (Guest::of(&device), Guest::of(&device));
    assert_eq!(guest.ask("*ESR?;:OUTP ON;*ESE 4;:OUTP?\n").await, "128;1\n");
    assert_eq!(other.ask("*ESR?\n").await, "0\n");
    device.faults().arm(fault("\"reboot\""));
    assert_eq!(guest.ask("*IDN?\n").await, "");
    assert_eq!(other.line().await, "", "all connections are gone");
    assert_eq!(Guest::of(&device).ask("*ESR?;*ESE?;:OUTP?;:SYST:ERR:COUN?\n").await, "128;0;0;0\n");
}

#[tokio::test]
async fn somebody_else_meddles() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"meddle\"\nsend = \"SWE:POIN 77;POIN?\"\nto = \"POIN?\""));
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("SWE:POIN 100\nSWE:POIN?\n").await, "100\n");
    assert_eq!(guest.ask("SWE:POIN?\n").await, "77\n");
}

#[tokio::test]
async fn the_error_queue_runs_over() {
    // SCPI-99: -350 "Queue overflow" as the newest entry of a full queue.
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"overflow\""));
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("*TST?\n").await, "0\n");
    let mut last = String::new();
    loop {
        let error = guest.ask("SYST:ERR?\n").await;
        if error.starts_with('0') {
            break;
        }
        last = error;
    }
    assert_eq!(last, "-350,\"Queue overflow\"\n");
}

#[tokio::test]
async fn a_completion_that_is_never_told_and_a_trigger_that_never_comes() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"mute\"\nto = \"*OPC?\""));
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("*OPC?\n*TST?\n").await, "0\n");
    device.faults().arm(fault("\"no-trigger\""));
    guest.send("TRIG:SOUR IMM;:SWE:POIN 10;:INIT\n").await;
    while guest.ask("STAT:OPER:COND?\n").await != "32\n" {}
    assert_eq!(guest.ask("ABOR;:INIT;*OPC?\n").await, "1\n");
    assert!(guest.ask("TRAC:PRE? CHAN1\n").await.starts_with("10,"), "the next one is as usual");
}

#[tokio::test]
async fn a_probe_that_fell_off_the_trigger_channel_is_written_down_though_nothing_triggers() {
    let scenario = Scenario::read(include_str!("../../../configs/scenarios/greenhouse-fan.toml")).unwrap();
    let bench = Arc::new(Bench::new(&scenario));
    let device = Arc::new(Device::new(&spec(Kind::Scope, PersonalitySpec::Standard), &bench));
    device.faults().arm(fault("\"flat\"\nchannel = 1"));
    let mut guest = Guest::of(&device);
    guest.send("TRIG:SOUR INT1;LEV 1;:SWE:POIN 10;:INIT\n").await;
    while guest.ask("STAT:OPER:COND?\n").await != "32\n" {}
    let (entries, count) = bench.ledger.read();
    assert_eq!((entries.iter().map(|entry| entry.at).collect::<Vec<_>>(), count), (vec![0], 1));
}

#[tokio::test]
async fn settings_are_clamped_without_a_word() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"clamp\"\nsetting = \"span\"\nmost = 5.0"));
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("VOLT:RANG:PTP 10;PTP?;:SYST:ERR:COUN?\n").await, "5.0E+0;0\n");
}

#[tokio::test]
async fn refused_connections() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    device.faults().arm(fault("\"refuse\"\nconnections = 1"));
    assert!(device.admit().is_some());
    let mut guest = Guest::of(&device);
    assert_eq!(guest.ask("*IDN?\n").await, "");
    assert!(device.admit().is_none());
    assert!(device.admit().is_some());
}

#[tokio::test]
async fn garbage_junk_and_doubles_reach_the_peer() {
    let device = device(Kind::Scope, PersonalitySpec::Standard);
    for text in ["\"garbage\"\nbytes = 9", "\"junk\"", "\"twice\""] {
        device.faults().arm(fault(text));
    }
    let mut guest = Guest::of(&device);
    guest.send("*TST?\n").await;
    let mut found = [0; 11];
    guest.0.read_exact(&mut found).await.unwrap();
    assert_eq!(&found[9..], b"0\n");
    assert_eq!(guest.ask("*TST?\n").await, "0 ~+?9,x\n");
    assert_eq!((guest.ask("*TST?\n").await, guest.line().await), ("0\n".to_owned(), "0\n".to_owned()));
}
