//! The bound against its derivation, and what the alarm sees.

use super::*;

/// Plain scalars on architectures whose baseline has no fused multiply-add; `mul_add` rounds once everywhere.
#[cfg(target_arch = "x86_64")]
macro_rules! scalar {
    ($real:ident) => {
        impl FmaLanes for $real {
            type Scalar = $real;
            const WIDTH: usize = 1;
            unsafe fn load(from: *const $real) -> $real {
                // SAFETY: the caller vouches for the pointer
                unsafe { from.read() }
            }
            unsafe fn broadcast(from: *const $real) -> $real {
                // SAFETY: the caller vouches for the pointer
                unsafe { from.read() }
            }
            unsafe fn store(self, to: *mut $real) {
                // SAFETY: the caller vouches for the pointer
                unsafe { to.write(self) }
            }
            unsafe fn mul_add(self, factor: $real, addend: $real) -> $real {
                $real::mul_add(self, factor, addend)
            }
            unsafe fn no_bits() -> $real {
                0.0
            }
            unsafe fn add_bits(self, other: $real) -> $real {
                $real::from_bits(self.to_bits().wrapping_add(other.to_bits()))
            }
        }
    };
}
#[cfg(target_arch = "x86_64")]
scalar!(f32);
#[cfg(target_arch = "x86_64")]
scalar!(f64);

/// The derivation in the file's head, evaluated.
#[test]
fn the_bound_is_what_its_derivation_gives() {
    for u in [f64::from(f32::EPSILON) / 2.0, f64::EPSILON / 2.0] {
        let gamma = |n: f64| n * u / (1.0 - n * u);
        let sum = 96.0 * 95.0 * (gamma(94.0) + gamma(191.0) * (2.0 + gamma(94.0)));
        let bound = f64::from(BOUND) * u;
        assert!(sum <= bound && bound < 1.02 * sum, "{sum:e} {bound:e}");
        assert!(95.0 * (1.0 + gamma(94.0)) <= f64::from(CLOSING));
    }
    assert_eq!(f64::from(f32::LIMITS[1]), f64::from(BOUND * CLOSING) / 2f64.powi(24));
    assert_eq!(f64::LIMITS[0], f64::from(BOUND) / 2f64.powi(53));
}

/// In (−1, 1), by splitmix64.
fn noise() -> impl FnMut() -> f64 {
    let mut state = 1984u64;
    move || {
        state = state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = state;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) as i64 >> 10) as f64 / 2f64.powi(53)
    }
}

macro_rules! alarm {
    ($name:ident $real:ident $registers:literal) => {
        /// Every bit of every thirteenth element, one at a time: those that weigh more than twice the bound of their row and
        /// column must raise the alarm for exactly that row and column; every flip must change a digest.
        #[test]
        fn $name() {
            let mut draw = noise();
            let mut right = noise();
            let factors = Factors::<$real>::close(|| draw() as $real, || -right() as $real);
            let mut product = Product::empty();
            // SAFETY: a scalar needs no feature
            unsafe { run::<$real, $registers, 2>(&factors, &mut product) };
            assert_eq!(product.alarms(), [0, 0]);
            let honest = product.digests;
            let (mut raised, mut quiet) = (0, 0);
            for at in (0..ORDER * ORDER).step_by(13) {
                let (i, j) = (at / ORDER, at % ORDER);
                let kept = product.c.0[i][j];
                for bit in 0..8 * size_of::<$real>() {
                    let wrong = $real::from_bits(kept.to_bits() ^ 1 << bit);
                    product.c.0[i][j] = wrong;
                    // SAFETY: a scalar needs no feature
                    unsafe { check::<$real, $registers>(&mut product) };
                    let limit = |at| $real::LIMITS[usize::from(at == ORDER - 1)];
                    let larger = limit(i).max(limit(j));
                    assert!(product.digests[0] != honest[0], "[{i}][{j}] bit {bit}");
                    if (wrong - kept).abs() > 2.0 * larger || !wrong.is_finite() {
                        assert_eq!(product.alarms(), [1, 1], "[{i}][{j}] bit {bit}");
                        assert_eq!(beyond(&product.rows).collect::<Vec<_>>(), [i]);
                        assert_eq!(beyond(&product.columns).collect::<Vec<_>>(), [j]);
                        raised += 1;
                    } else {
                        quiet += 1;
                    }
                }
                product.c.0[i][j] = kept;
            }
            println!("{raised} flips raised the alarm, {quiet} are below its reach");
            assert!(raised > $registers * ORDER * ORDER / 13 / 2 && quiet > 0);
        }
    };
}
alarm!(one_flip_is_located_in_binary64 f64 8);
alarm!(one_flip_is_located_in_binary32 f32 16);
