//! Time of one operation on one term, by the number of active slots: medians
//! over random states that fill all slots. `cargo bench --bench terms`.

use std::hint::black_box;
use std::time::Instant;

use num_complex::Complex64;
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;
use shottower::clifford::equatorial::EquatorialForm;
use shottower::clifford::terms::Terms;

const TERMS: usize = 1000;
const ROUNDS: usize = 41;

/// Median nanoseconds a term of `work`, which returns how long it took.
fn median(mut work: impl FnMut() -> f64) -> f64 {
    let mut times: Vec<f64> = (0..ROUNDS).map(|_| work()).collect();
    times.sort_by(f64::total_cmp);
    times[ROUNDS / 2] * 1e9 / TERMS as f64
}

fn time(work: impl FnOnce()) -> f64 {
    let start = Instant::now();
    work();
    start.elapsed().as_secs_f64()
}

fn run<const W: usize>(slots: usize) {
    let mut rng = Pcg64Mcg::seed_from_u64(1);
    let mask = |rng: &mut Pcg64Mcg| -> [u64; W] {
        std::array::from_fn(|word| match slots.saturating_sub(64 * word) {
            left @ 0..64 => rng.random::<u64>() & ((1 << left) - 1),
            _ => rng.random(),
        })
    };
    let unitary = |terms: &mut Terms<W>, rng: &mut Pcg64Mcg| {
        let (x, z) = (mask(rng), mask(rng));
        let pairs: u32 = (0..W).map(|w| (x[w] & z[w]).count_ones()).sum();
        terms.primitive(((pairs + 1) & 1) as u8, &x, &z);
    };
    let mut terms = Terms::<W>::new(slots);
    terms.reset(&[Complex64::ONE; TERMS]);
    for slot in 0..slots {
        terms.plus(slot);
    }
    for _ in 0..2 * slots {
        let powers: Vec<u8> = (0..TERMS).map(|_| rng.random()).collect();
        terms.diagonal(rng.random_range(0..slots), |label| powers[label as usize]);
        unitary(&mut terms, &mut rng);
    }

    let primitive = median(|| time(|| unitary(&mut terms, &mut rng)));
    let measured = median(|| {
        let mut copy = terms.clone();
        let (slot, value) = (rng.random_range(0..slots), rng.random());
        time(|| copy.measured(slot, value))
    });
    let mut form = EquatorialForm::new(slots);
    let all = std::array::from_fn(|word| match slots.saturating_sub(64 * word) {
        left @ 0..64 => (1 << left) - 1,
        _ => !0,
    });
    let overlaps = median(|| {
        form.randomise(&all, &mut rng);
        let slot = rng.random_range(0..slots);
        time(|| {
            black_box(terms.overlaps(&form, slot));
        })
    });
    let amplitude = median(|| {
        let x = mask(&mut rng);
        time(|| {
            black_box(terms.total_amplitude(&x));
        })
    });
    println!(
        "{W:>5} {slots:>5} {:>6} {primitive:>10.1} {measured:>9.1} {overlaps:>9.1} {amplitude:>10.1}",
        terms.bytes_per_term()
    );
}

fn main() {
    println!("words slots  bytes  primitive  measured  overlaps  amplitude  (ns a term)");
    for slots in [10, 20, 40, 64] {
        run::<1>(slots);
    }
    for slots in [40, 80, 128] {
        run::<2>(slots);
    }
    for slots in [80, 256] {
        run::<4>(slots);
    }
}
