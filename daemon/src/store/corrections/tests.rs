//! Corrections come back digit for digit; what can change does, the rest does not.
#![allow(clippy::unwrap_used)]

use evenpair_api::{
    Compensation, Correction, CorrectionState, PoleZero, Quantity, RejectionLimit, Response, ResponseBand,
};
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

fn a_response() -> Response {
    Response {
        interval: Quantity::exact(1e-9, "s"),
        skew: Quantity::exact(-3e-12, "s"),
        pole_zero: Some(PoleZero {
            time_constant: Quantity::new(95e-6, 11e-6, "s"),
            relative: Quantity::new(0.03, 1.0 / 3.0e4, "1"),
        }),
        taps: vec![0.01, -0.02, 1.0 / 3.0, -0.02, 0.01],
        gain_u: 2e-6,
        level: Quantity::exact(-0.1 - 0.2, "V"),
        improved: vec![ResponseBand { from_hz: 1e5, to_hz: 3e5, before_db: 44.0, after_db: 70.5, floor_db: 70.5 }],
        words: vec!["trim its probe".to_owned()],
    }
}

/// Catches: what is beyond gain, skew and offset lost on the disk, or a limit that a verification does not renew.
#[tokio::test]
async fn response_compensation_and_limit_are_kept() {
    let folder = TempDir::new().unwrap();
    let store = open(&folder);
    let mut correction = Correction {
        compensation: Some(Compensation {
            relative: Quantity::new(1.5e-4, 4.7e-4, "1"),
            time_constant: Quantity::exact(95e-6, "s"),
            level: Quantity::exact(24.0, "V"),
        }),
        response: Some(a_response()),
        limit: Some(RejectionLimit {
            limit_db: 52.5,
            at_least: false,
            amplitude: Quantity::exact(24.0, "V"),
            error: Quantity::new(0.05, 0.01, "V"),
        }),
        ..a_correction("gate", 0)
    };
    store.put_correction(&correction).await.unwrap();
    assert_eq!(store.correction(correction.id).await.unwrap().as_ref(), Some(&correction));
    let limit = RejectionLimit { limit_db: 55.0, ..correction.limit.clone().unwrap() };
    store.set_rejection(correction.id, &correction.rejection, None).await.unwrap();
    assert_eq!(store.latest_correction("gate").await.unwrap().unwrap().limit, correction.limit);
    store.set_rejection(correction.id, &correction.rejection, Some(&limit)).await.unwrap();
    correction.limit = Some(limit);
    assert_eq!(store.latest_correction("gate").await.unwrap().as_ref(), Some(&correction));
}
