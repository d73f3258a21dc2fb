//! Corrections of several ranges come back, each range's newest, with where a transferred one came from.
#![allow(clippy::unwrap_used)]

use evenpair_api::{Correction, Quantity, TransferWay, TransferredFrom};
use tempfile::TempDir;
use uuid::Uuid;

use crate::store::tests::{a_correction, open};

fn on_span(mut correction: Correction, span_v: f64) -> Correction {
    for leg in [&mut correction.conditions.positive, &mut correction.conditions.negative] {
        leg.span = Quantity::exact(span_v, "V");
    }
    correction
}

fn from(old: &Correction) -> TransferredFrom {
    TransferredFrom {
        correction: old.id,
        made_at: old.made_at,
        span: old.conditions.positive.span.clone(),
        offset: Quantity::exact(22.0, "V"),
        reference: "fast".to_owned(),
        skew_by: TransferWay::Carried,
        levels_by: TransferWay::Legs,
    }
}

#[tokio::test]
async fn each_ranges_newest_comes_back_the_newest_first() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let (first, second) = (a_correction("gate", 0), a_correction("gate", 60));
    let mut narrow = on_span(a_correction("gate", 30), 20.0);
    narrow.transferred_from = Some(from(&first));
    let mut probe = a_correction("gate", 10);
    probe.conditions.negative.probe = "p10c".to_owned();
    let other = a_correction("shunt", 90);
    for correction in [&first, &second, &narrow, &probe, &other] {
        store.put_correction(correction).await.unwrap();
    }
    assert_eq!(store.newest_corrections("gate").await.unwrap(), [second, narrow.clone(), probe]);
    assert_eq!(store.newest_corrections("bus").await.unwrap(), []);
    assert_eq!(store.correction(narrow.id).await.unwrap(), Some(narrow));
}

#[tokio::test]
async fn nothing_is_transferred_from_a_correction_that_is_not_stored() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut narrow = on_span(a_correction("gate", 30), 20.0);
    narrow.transferred_from = Some(TransferredFrom { correction: Uuid::now_v7(), ..from(&a_correction("gate", 0)) });
    assert!(store.put_correction(&narrow).await.is_err());
    assert_eq!(store.correction(narrow.id).await.unwrap(), None, "a part of a refused one was stored");
}
