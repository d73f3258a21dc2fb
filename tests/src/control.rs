//! The simulator's control port: faults ordered, and what has struck.

use std::collections::BTreeMap;

use tokio::io::{AsyncBufReadExt, AsyncWriteExt, BufReader};
use tokio::net::TcpStream;

use crate::process::PATIENCE;
use crate::wire::place;

/// A fault that has struck.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Strike {
    /// The fault's number.
    pub fault: u32,
    /// The instrument that it befell.
    pub instrument: String,
    /// What went wrong, as the scenario calls it.
    pub what: String,
    /// The number of the instrument's reply, or of the acquisition.
    pub at: u64,
}

/// A connection to the control port.
#[derive(Debug)]
pub struct Control {
    stream: BufReader<TcpStream>,
}

impl Control {
    /// Connects to the control port at a VISA resource string.
    ///
    /// # Panics
    /// When nothing listens there.
    pub async fn connect(resource: &str) -> Self {
        let stream = TcpStream::connect(place(resource).0).await.expect("the control port listens");
        Self { stream: BufReader::new(stream) }
    }

    /// Arms a fault, such as `instrument = "scope", what = "cut"`, and returns its number.
    ///
    /// # Panics
    /// When the simulator does not take it.
    pub async fn arm(&mut self, fault: &str) -> u32 {
        let (_, number) = self.say(&format!("arm {{ {fault} }}")).await;
        u32::try_from(number).expect("a fault's number")
    }

    /// Disarms all faults and returns how many there were.
    pub async fn disarm_all(&mut self) -> u64 {
        self.say("disarm all").await.1
    }

    /// Every strike so far, in order.
    ///
    /// # Panics
    /// When the simulator leaves some out.
    pub async fn report(&mut self) -> Vec<Strike> {
        let (lines, count) = self.say("report").await;
        assert_eq!(lines.len() as u64, count, "a report without gaps");
        lines.iter().map(|line| strike(line)).collect()
    }

    /// How often each fault has struck: instrument and what went wrong, with the count.
    ///
    /// # Panics
    /// When the answer is not as documented.
    pub async fn counts(&mut self) -> BTreeMap<(String, String), u64> {
        let (lines, _) = self.say("count").await;
        let entry = |line: &String| {
            let words = words(line);
            let count = words["count"].parse().expect("a count");
            ((words["instrument"].to_owned(), words["what"].to_owned()), count)
        };
        lines.iter().map(entry).collect()
    }

    /// Sends a line; the lines of the answer before its last, and the number in the last.
    async fn say(&mut self, line: &str) -> (Vec<String>, u64) {
        let talk = async {
            self.stream.write_all(format!("{line}\n").as_bytes()).await.expect("sending to the control port");
            let mut lines = Vec::new();
            loop {
                let mut answer = String::new();
                self.stream.read_line(&mut answer).await.expect("reading from the control port");
                match answer.trim_end().split_once(' ') {
                    Some(("ok", number)) => return (lines, number.parse().expect("a number behind `ok`")),
                    _ if answer.starts_with("error") || answer.is_empty() => panic!("`{line}`: {answer}"),
                    _ => lines.push(answer.trim_end().to_owned()),
                }
            }
        };
        tokio::time::timeout(PATIENCE, talk)
            .await
            .unwrap_or_else(|_| panic!("the control port does not answer `{line}`"))
    }
}

/// The parts `key=value` of a line.
fn words(line: &str) -> BTreeMap<&str, &str> {
    line.split(' ').map(|word| word.split_once('=').unwrap_or_else(|| panic!("`{line}`"))).collect()
}

fn strike(line: &str) -> Strike {
    let words = words(line);
    let at = words.get("reply").or_else(|| words.get("acquisition")).expect("where it struck");
    Strike {
        fault: words["fault"].parse().expect("a fault's number"),
        instrument: words["instrument"].to_owned(),
        what: words["what"].to_owned(),
        at: at.parse().expect("a number"),
    }
}
