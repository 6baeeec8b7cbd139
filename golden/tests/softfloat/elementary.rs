//! Source of truth: MPFR 4.2.2 through gmpy2 2.3.2: exp, log, sin and cos correctly rounded, at the edges of the kernel's
//! ranges and at random, by `golden/witness/check_elementary.py`. The pinned steps may be off by two last places.

use golden::reference::float::elementary::{circle, exp, log};

#[test]
fn values_are_within_two_last_places() {
    let mut apart = [[0u32; 3]; 4];
    for line in include_str!("../data/elementary.txt").lines() {
        let [name, x, right] = line.split(' ').collect::<Vec<_>>()[..] else { panic!("{line}") };
        let [x, right] = [x, right].map(|digits| u64::from_str_radix(digits, 16).expect("hexadecimal"));
        let (function, ours) = match name {
            "exp" => (0, exp(x)),
            "log" => (1, log(x)),
            "sin" => (2, circle(x)[0]),
            _ => (3, circle(x)[1]),
        };
        // of one sign, so that encodings are ordered as values
        let places = ours.abs_diff(right) as usize;
        assert!(places <= 2, "{line}: {ours:016x}");
        apart[function][places] += 1;
    }
    println!("exp, log, sin, cos: {apart:?} values are 0, 1, 2 last places off");
    assert!(apart.iter().all(|f| f.iter().sum::<u32>() == 500 && f[0] > 250), "{apart:?}");
}
