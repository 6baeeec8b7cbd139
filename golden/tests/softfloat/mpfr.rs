//! Source of truth: MPFR 4.2.2 through gmpy2 2.3.2, results and exceptions, by `golden/witness/check_softfloat.py`.

use golden::softfloat::{self as soft, Flags, Format, Round};

#[test]
fn operations_and_exceptions() {
    let lines = include_str!("../data/softfloat.txt").lines();
    let mut count = 0;
    for line in lines {
        let fields: Vec<&str> = line.split(' ').collect();
        let [op, format, rounding, numbers @ .., flags] = fields.as_slice() else { panic!("{line}") };
        let f = match *format {
            "binary16" => Format::F16,
            "bfloat16" => Format::BF16,
            "binary32" => Format::F32,
            _ => Format::F64,
        };
        let r = Round::ALL.into_iter().find(|r| format!("{r:?}") == *rounding).expect("a rounding");
        let numbers: Vec<u64> = numbers.iter().map(|n| u64::from_str_radix(n, 16).expect("hexadecimal")).collect();
        let ours = match (*op, numbers.as_slice()) {
            ("add", [a, b, _]) => soft::add(f, *a, *b, r),
            ("sub", [a, b, _]) => soft::sub(f, *a, *b, r),
            ("mul", [a, b, _]) => soft::mul(f, *a, *b, r),
            ("div", [a, b, _]) => soft::div(f, *a, *b, r),
            ("sqrt", [a, _]) => soft::sqrt(f, *a, r),
            ("fma", [a, b, c, _]) => soft::fma(f, *a, *b, *c, r),
            _ => panic!("{line}"),
        };
        let expected = (numbers[numbers.len() - 1], Flags(flags.parse().expect("flags")));
        assert_eq!(ours, expected, "{line}: ours {:x}", ours.0);
        count += 1;
    }
    assert_eq!(count, 6 * 4 * 4 * 30, "the file is whole");
}
