//! Corrections come back digit for digit; what can change does, the rest does not.
#![allow(clippy::unwrap_used)]

use evenpair_api::{CorrectionState, Quantity};
use tempfile::TempDir;
use uuid::Uuid;

use crate::store::StoreError;
use crate::store::tests::{a_correction, open};

#[tokio::test]
async fn the_latest_of_a_pair_is_found() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let (old, new, other) = (a_correction("gate", 0), a_correction("gate", 60), a_correction("shunt", 90));
    for correction in [&new, &old, &other] {
        store.put_correction(correction).await.unwrap();
    }
    assert_eq!(store.latest_correction("gate").await.unwrap(), Some(new));
    assert_eq!(store.latest_correction("shunt").await.unwrap(), Some(other));
    assert_eq!(store.latest_correction("bus").await.unwrap(), None);
    assert_eq!(store.correction(old.id).await.unwrap(), Some(old));
}

#[tokio::test]
async fn state_and_rejection_change_and_estimates_do_not() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut correction = a_correction("gate", 0);
    correction.conditions.carried = None;
    store.put_correction(&correction).await.unwrap();
    let mut points = correction.rejection.clone();
    points.push(points[0].clone());
    points[1].frequency_hz = 1e7;
    points[0].at_least = false;
    store.set_rejection(correction.id, &points, None).await.unwrap();
    correction.rejection = points;
    assert_eq!(store.correction(correction.id).await.unwrap(), Some(correction.clone()));

    correction.state = CorrectionState::Void;
    correction.reasons = vec!["the span of the negative leg is 40 V, and it was made on 80 V".to_owned()];
    correction.rejection.truncate(1);
    let mut forged = correction.clone();
    forged.gain = Quantity::new(1.0, 0.0, "1");
    store.update_correction(&forged).await.unwrap();
    assert_eq!(store.correction(correction.id).await.unwrap(), Some(correction));
}

#[tokio::test]
async fn what_does_not_fit_is_refused() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let correction = a_correction("gate", 0);
    let refused = store.update_correction(&correction).await.unwrap_err();
    assert!(matches!(refused, StoreError::Unknown { what: "correction", .. }), "{refused}");
    let refused = store.set_rejection(Uuid::now_v7(), &correction.rejection, None).await.unwrap_err();
    assert!(matches!(refused, StoreError::Unknown { what: "correction", .. }), "{refused}");
    let mut wrong = correction.clone();
    wrong.conditions.negative.span.unit = "mV".to_owned();
    let refused = store.put_correction(&wrong).await.unwrap_err();
    assert!(matches!(refused, StoreError::Inconsistent { .. }), "{refused}");
    assert_eq!(store.correction(correction.id).await.unwrap(), None, "a part of a refused one was stored");
    store.put_correction(&correction).await.unwrap();
    let refused = store.put_correction(&correction).await.unwrap_err();
    assert!(matches!(refused, StoreError::AlreadyThere { what: "correction", .. }), "{refused}");
}
