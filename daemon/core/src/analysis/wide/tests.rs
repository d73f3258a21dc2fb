//! The macro's function does what its body says, with and without a result.

#![allow(clippy::float_cmp)]

widest! {
    /// Adds in place.
    fn add(out: &mut [f32], other: &[f32]) {
        out.iter_mut().zip(other).for_each(|(a, b)| *a += b);
    }
}

widest! {
    fn product(a: f32, b: f32) -> f32 {
        a * b
    }
}

#[test]
fn bodies_run() {
    let mut values = [1.0, 2.0, 3.0];
    add(&mut values, &[0.5, 0.25, 0.125]);
    assert_eq!(values, [1.5, 2.25, 3.125]);
    assert_eq!(product(3.0, 0.1).to_bits(), (3.0f32 * 0.1).to_bits());
}
