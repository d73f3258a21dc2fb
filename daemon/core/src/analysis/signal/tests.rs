use super::*;

#[test]
fn every_kind_reads_alike() {
    let double: Vec<f64> = (0..1000).map(|i| (0.1 * f64::from(i)).sin()).collect();
    let single: Vec<f32> = double.iter().map(|x| *x as f32).collect();
    let moved = Moved { signal: &single, along: &double, step: -1.0 };
    for from in [0, 1, 300] {
        let mut out = [0.0f32; 611];
        single.load(from, &mut out);
        assert_eq!(&single[from..from + 611], &out);
        double.load(from, &mut out);
        assert_eq!(&single[from..from + 611], &out);
        // A signal less itself is nothing, but for the rounding to single precision.
        moved.load(from, &mut out);
        assert!(out.iter().all(|x| x.abs() < 1e-7) && moved.at(from).abs() < 1e-7);
    }
    assert_eq!(moved.points(), 1000);
}

#[test]
fn the_outline_holds_every_sample() {
    let signal: Vec<f32> = (0..1003).map(|i| ((i * 7919) % 1009) as f32).collect();
    let outline = Outline::of(&signal);
    assert_eq!(outline.blocks.len(), 4);
    for (block, part) in outline.blocks.iter().zip(signal.chunks(BLOCK)) {
        assert!(part.iter().all(|x| (block.0..=block.1).contains(x)));
        assert!(part.contains(&block.0) && part.contains(&block.1));
    }
    assert!(outline.range().0 <= 3.0 && outline.range().1 >= 1005.0);
    assert_eq!(range_of(&[f32::NAN, 2.0]), (2.0, 2.0));
}
