//! What the calculators refuse: exit 2, one line that names the option and the remedy, nothing on standard output.
//! And what they must not refuse: the far ends of what they take, without a number that is none.

use super::running::{Scratch, run};

fn refused(args: &[&str], words: &[&str]) {
    let mut all = vec!["reckon"];
    all.extend(args);
    let output = run(&all);
    let text = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(2), "{args:?}: {text}");
    assert_eq!(text.lines().count(), 1, "{args:?}: {text}");
    assert!(text.starts_with("proofhouse: "), "{args:?}: {text}");
    assert!(output.stdout.is_empty(), "{args:?}: {}", String::from_utf8_lossy(&output.stdout));
    for word in words {
        assert!(text.contains(word), "{args:?}: {word:?} is not in {text}");
    }
}

/// Command, and words that have to be in the line: the option, what is wrong, the remedy.
const REFUSED: &[(&str, &[&str])] = &[
    ("interval --events -3 --runs 10", &["--events", "-3", "whole number", "write"]),
    ("interval --events 1.5 --runs 10", &["--events", "1.5", "whole number"]),
    ("interval --events 11 --runs 10", &["--events", "11", "at most one"]),
    ("interval --events 1 --runs 0", &["--runs", "at least 1"]),
    ("interval --events 1 --runs 1e300", &["--runs", "1e300", "2^53"]),
    ("interval --events 1 --runs 9007199254740993", &["--runs", "2^53"]),
    ("interval --events 1 --hours 0", &["--hours", "write"]),
    ("interval --events 1 --hours -2h", &["--hours", "-2h", "write"]),
    ("interval --events 1 --hours inf", &["--hours", "inf", "write"]),
    ("interval --events 1 --hours 1e300", &["--hours", "1e12 hours"]),
    ("interval --events 1 --hours 5fortnights", &["--hours", "fortnights", "d, h, m, s"]),
    ("interval --events 1", &["--runs", "--hours"]),
    ("interval --events 1 --runs 10 --hours 1", &["--runs", "--hours"]),
    ("interval --runs 10", &["--events"]),
    ("interval --events 1 --runs 10 --confidence 0", &["--confidence", "95%"]),
    ("interval --events 1 --runs 10 --confidence 1", &["--confidence", "95%"]),
    ("interval --events 1 --runs 10 --confidence 100%", &["--confidence", "100%", "95%"]),
    ("interval --events 1 --runs 10 --confidence NaN", &["--confidence", "NaN", "95%"]),
    ("interval --events 1 --runs 10 --confidence -5%", &["--confidence", "-5%", "95%"]),
    ("interval --events 1 --runs 10 --confidence 95", &["--confidence", "95", "0.95"]),
    ("interval --events 1 --runs 10 --method best", &["--method", "best", "mid-p"]),
    ("interval --events 1 --hours 10 --method score", &["--method", "--hours", "exact"]),
    ("interval --events 1 --runs 10 --method mid-p --one-sided upper --confidence 40%", &["--confidence", "exact"]),
    ("interval --events 1 --runs 10 --one-sided left", &["--one-sided", "left", "upper"]),
    ("zero", &["--runs", "--hours", "--below"]),
    ("zero --runs 10 --below 1/500h", &["--runs", "--below"]),
    ("zero --below 500h", &["--below", "500h", "1/500h"]),
    ("zero --below 0/h", &["--below", "0/h"]),
    ("zero --below 1/0h", &["--below", "1/0h", "above 0"]),
    ("zero --below 2", &["--below", "below 1 per run"]),
    ("zero --below 1e-17", &["--below", "2^53"]),
    ("zero --runs 10 --devices 4", &["--devices", "hours"]),
    ("zero --below 1e-9 --acceleration 4", &["--acceleration", "hours"]),
    ("zero --runs 10 --failures 11", &["--failures", "11", "at most one"]),
    ("zero --hours 10 --devices 0", &["--devices", "at least 1"]),
    ("zero --hours 10 --acceleration 0", &["--acceleration", "positive"]),
    ("zero --fit -1", &["--fit", "-1", "positive"]),
    ("compare --first 5/100h", &["--second"]),
    ("compare --first 5/100h --second 1", &["--second", "exposure", "5/100h"]),
    ("compare --first 5/100h --second 1/1000", &["--first", "--second", "5/100h"]),
    ("compare --first 5/4 --second 1/1000", &["--first", "5 events in 4 runs"]),
    ("compare --first -5/100h --second 1/100h", &["--first", "-5/100h", "whole number"]),
    ("compare --first 5/0h --second 1/100h", &["--first", "5/0h", "above 0"]),
    ("compare --first 5/100h --second 1/100h --ratio 0", &["--ratio", "positive"]),
    ("compare --first 5/100h --second 1/100h --ratio NaN", &["--ratio", "NaN"]),
    ("sequential --good 1/200h --bad 1/1000h", &["--bad", "--good", "above"]),
    ("sequential --good 1/200h --bad 1/200h", &["--bad", "--good", "above"]),
    ("sequential --good 1/200h --bad 1/199h", &["--bad", "further apart"]),
    ("sequential --good 1/200h --bad 0.1", &["--bad", "per hour"]),
    ("sequential --good 1/1000h --bad 1/200h --alpha 60% --beta 40%", &["--alpha", "--beta"]),
    ("sequential --good 1/1000h --bad 1/200h --alpha 1e-9", &["--alpha", "least"]),
    ("sequential --good 0.01 --bad 0.1 --fixed", &["--fixed", "per hour"]),
    ("sequential --good 1/2h --bad 1/1h --hours 18.8", &["--reject-at"]),
    ("sequential --good 1/2h --bad 1/1h --fixed --hours 18.8 --reject-at 1e7", &["--reject-at", "fewer"]),
    ("power", &["--rate", "--first", "--below"]),
    ("power --rate 1/500h", &["--rate", "--probability", "--hours"]),
    ("power --rate 1/500h --probability 95% --hours 3", &["--rate", "--probability"]),
    ("power --rate 1/500h --runs 1000", &["--runs", "--hours"]),
    ("power --rate 1e-9 --hours 1000", &["--hours", "--runs"]),
    ("power --rate 1/500h --first 1/100h", &["--rate", "--first"]),
    ("power --first 1/100h", &["--second"]),
    ("power --first 1/500h --second 1/100h", &["--first", "--second", "higher"]),
    ("power --first 1e-6 --second 1e-9", &["--first", "per hour"]),
    ("power --first 1/100h --second 1/500h --probability 0.9", &["--probability", "--first"]),
    ("power --first 1/100h --second 1/500h --hours 1e10", &["--hours", "fewer"]),
    ("power --first 1/100h --second 0.00999999/h", &["--first", "--second", "too close"]),
    ("power --first 1/100h --second 1/500h --level 1e-9", &["--level", "higher"]),
    ("power --first 1/100h --second 1/500h --power 0.999999", &["--power", "less"]),
    ("power --first 1/100h --second 1/500h --split 1e6", &["--split", "0.1 to 100"]),
    ("power --below 1/500h", &["--below", "--true"]),
    ("power --below 1/500h --true 1/100h", &["--true", "lower"]),
    ("power --below 1/500h --true 1/5000h --probability 1", &["--probability", "95%"]),
    ("spread --counts 3", &["--counts", "at least 2"]),
    ("spread --counts 0,0,0", &["--counts", "0 events"]),
    ("spread --counts 3,x,1", &["--counts", "entry 2", "'x'", "whole number"]),
    ("spread --counts 3,-1", &["--counts", "entry 2", "-1"]),
    ("spread --counts 3,,1", &["--counts", "entry 2"]),
    ("spread --counts 3,1,2 --exposures 1,2", &["--exposures", "2 values", "3 counts"]),
    ("spread --counts 3,1 --exposures 1,0", &["--exposures", "entry 2", "positive"]),
    ("spread --counts 3,1 --exposures 1h,2", &["--exposures", "alike"]),
    ("spread --counts 9e15,9e15", &["--counts", "2^53"]),
    ("spread --counts - --exposures -", &["--counts", "--exposures", "@FILE"]),
    ("spread --counts -", &["--counts", "standard input", "no values"]),
    ("spread --counts @/nonexistent/list", &["--counts", "/nonexistent/list", "read"]),
    ("episodes --times 1,NaN", &["--times", "entry 2", "NaN"]),
    ("episodes --times 1,1e300", &["--times", "entry 2", "seconds"]),
    ("episodes --times 1,2 --gap 60", &["--gap", "no unit"]),
    ("episodes --times 1,2 --gap 0s", &["--gap", "0s"]),
    ("family --p 0.1,1.5", &["--p", "entry 2", "from 0 to 1"]),
    ("family --p 0.1 --level 0", &["--level", "95%"]),
    ("shrink --counts 1,2,3 --exposures 1,2", &["--exposures", "3 counts"]),
    ("shrink --counts 0,0", &["--counts", "0 events"]),
    ("slope --readings 3/10h@61,1/12h@55", &["--readings", "at least 3"]),
    ("slope --readings 3/10h@61,1/12h@61,1/1h@61", &["--readings", "different"]),
    ("slope --readings 0/10h@50,0/12h@61,3/1h@70", &["--readings", "70"]),
    ("slope --readings 3/10h,1/12h@61", &["--readings", "entry 1", "3/10h@61"]),
    ("slope --readings 3/10@61,1/12h@61", &["--readings", "entry 1", "unit"]),
    ("slope --readings 3/10h@999,1/12h@61", &["--readings", "entry 1", "300"]),
    ("slope --readings 3/10h@61,1/12h@55,9/8h@70 --at hot", &["--at", "hot"]),
    ("ratio --pairs 3/10", &["--pairs", "at least 2"]),
    ("ratio --pairs 3/10,4/0", &["--pairs", "entry 2", "above 0"]),
    ("ratio --pairs 3/10,4", &["--pairs", "entry 2", "3/10"]),
    ("guess --events 3", &["guess"]),
];

#[test]
fn wrong_input_is_one_line_with_the_remedy() {
    for (command, words) in REFUSED {
        refused(&command.split(' ').collect::<Vec<_>>(), words);
    }
    refused(&["spread", "--counts", ""], &["--counts", "no values"]);
    refused(&["interval", "--events", "", "--runs", "10"], &["--events"]);
}

#[test]
fn a_wrong_line_of_a_file_is_named() {
    let scratch = Scratch::new("reckon-wrong-list");
    let path = scratch.path().join("counts.csv");
    let list = format!("@{}", path.display());
    std::fs::write(&path, "# by core\n3,0\n1,twelve\n").unwrap();
    refused(&["spread", "--counts", &list], &["--counts", "counts.csv line 3", "'twelve'"]);
    std::fs::write(&path, b"3\n\xff\n").unwrap();
    refused(&["spread", "--counts", &list], &["--counts", "counts.csv", "UTF-8"]);
    std::fs::write(&path, "1\n".repeat(1_500_000)).unwrap();
    for (command, option) in
        [("spread", "--counts"), ("shrink", "--counts"), ("family", "--p"), ("episodes", "--times")]
    {
        refused(&[command, option, &list], &[option, "more than", "at once"]);
    }
    std::fs::write(&path, "1\n".repeat(10_000_000)).unwrap();
    refused(&["family", "--p", &list], &["--p", "4 MiB"]);
    let folder = format!("@{}", scratch.path().display());
    refused(&["spread", "--counts", &folder], &["--counts", "read"]);
}

/// The ends of the range that is taken: an answer, and no number in it that is none.
#[test]
fn the_far_ends_have_answers() {
    for command in [
        "interval --events 9007199254740992 --runs 9007199254740992",
        "interval --events 0 --runs 1 --confidence 0.9999999999999999",
        "interval --events 1 --runs 9007199254740992 --confidence 1e-300",
        "interval --events 9007199254740992 --hours 1e-9",
        "interval --events 1 --hours 1e12 --method mid-p",
        "zero --hours 1e12 --devices 9007199254740992 --acceleration 1e15",
        "zero --below 1e-12/h --confidence 0.9999999999999999",
        "zero --fit 1e-15",
        "zero --below 0.999999",
        "compare --first 0/1 --second 1/1",
        "compare --first 9007199254740992/1e-9h --second 0/1e12h",
        "compare --first 4503599627370496/9007199254740992 --second 1/9007199254740992",
        "compare --first 5e8/1e9 --second 5e8/1e9",
        "sequential --good 1e-12/h --bad 1e12/h",
        "sequential --good 1/1000h --bad 1/700h --alpha 0.01% --beta 0.01%",
        "sequential --good 1e-15 --bad 0.9",
        "sequential --good 1/2h --bad 1/1h --fixed --hours 1e12 --reject-at 10000",
        "power --rate 1e-12/h --probability 0.9999999999999999",
        "power --rate 1e15/h --hours 1e12",
        "power --first 1e15/h --second 1e-12/h",
        "power --below 1e-12/h --true 0",
        "spread --counts 1,0,0,0,0,9000000000000000",
        "spread --counts 1,9000000000000000 --exposures 1e-15,1e15",
        "episodes --times -1e15,1e15,0 --gap 1e-3s",
        "family --p 0,1,1e-300",
        "shrink --counts 1,9000000000000000 --exposures 1e-15,1e15",
        "slope --readings 9e14/1e-9h@-100,1/1e12h@300,0/1h@20",
        "ratio --pairs 0/1e-15,1e15/1e15,0/1",
    ] {
        for format in ["text", "json"] {
            let mut args = vec!["reckon"];
            args.extend(command.split(' '));
            args.extend(["--format", format]);
            let output = run(&args);
            let (out, err) = (String::from_utf8_lossy(&output.stdout), String::from_utf8_lossy(&output.stderr));
            assert_eq!(output.status.code(), Some(0), "{command}: {err}");
            let numbers = |c: char| !c.is_alphanumeric();
            assert!(!out.split(numbers).any(|word| ["NaN", "inf", "Infinity"].contains(&word)), "{command}: {out}");
            assert!(out.lines().all(|line| format == "json" || line.chars().count() <= 100), "{command}: {out}");
        }
    }
}
