//! An instrument that answers late, twice, or not at all over HiSLIP: no query ever gets another's reply.

use evenpair_core::scpi::hislip::{Header, Kind};
use proptest::prelude::*;

use super::hislip::{counts, say, up};
use super::*;

/// How the instrument behaves when it is asked.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Mood {
    /// It answers.
    Good,
    /// It answers the query before first.
    Late,
    /// It begins an answer whose query it does not name, which then turns out to be the query before's.
    Undecided,
    /// It answers twice.
    Twice,
    /// It says nothing until it is cleared, and then the answer comes before the clear is through.
    Slow,
    /// It says nothing until it is cleared, and the answer comes after everything else.
    Slowest,
}

fn moods() -> impl Strategy<Value = Vec<Mood>> {
    use Mood::{Good, Late, Slow, Slowest, Twice, Undecided};
    let mood = proptest::sample::select(vec![Good, Late, Undecided, Twice, Slow, Slowest]);
    proptest::collection::vec(mood, 1..12)
}

/// What an unnumbered part of a reply carries (IVI-6.1, from memory).
const NO_ID: u32 = 0xFFFF_FFFF;

async fn live_through(moods: Vec<Mood>) {
    let (bench, mut server) = up().await;
    // Every query is answered by how many there were, so that each right answer is right once only.
    let mut asked = 0_i64;
    let mut clears = 0_u64;
    for mood in moods {
        let call = bench.call(measure());
        let mut id = server.told(MEASURE).await;
        asked += 1;
        let old = format!("{}\n", asked - 1);
        match mood {
            Mood::Good | Mood::Twice => {}
            Mood::Late => server.reply(id - 2, old.as_bytes()).await,
            Mood::Undecided => {
                say(&mut server.sync, Header::new(Kind::Data).parameter(NO_ID), b"1").await;
                server.reply(id - 2, old.as_bytes()).await;
            }
            Mood::Slow | Mood::Slowest => {
                server.cleared_with(id, format!("{asked}\n").as_bytes()).await;
                server.greet().await;
                let before = std::mem::replace(&mut id, server.told(MEASURE).await);
                if mood == Mood::Slowest && before != id {
                    server.reply(before, format!("{asked}\n").as_bytes()).await;
                }
                asked += 1;
                clears += 1;
            }
        }
        server.reply(id, format!("{asked}\n").as_bytes()).await;
        if mood == Mood::Twice {
            server.reply(id, format!("{asked}\n").as_bytes()).await;
        }
        assert_eq!(value(&call.await.unwrap().unwrap()), asked, "{mood:?}");
        if mood == Mood::Twice {
            server.cleared_with(id, b"").await;
            server.greet().await;
            clears += 1;
            bench.handle.watch().wait_for(|report| report.up && report.clears == clears).await.unwrap();
        }
    }
    assert_eq!(counts(&bench), (clears, 0));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(100))]

    #[test]
    fn no_query_gets_the_reply_of_another(moods in moods()) {
        let runtime = tokio::runtime::Builder::new_current_thread().enable_time().start_paused(true).build().unwrap();
        runtime.block_on(live_through(moods));
    }
}
