//! What the output words of each kernel hold, where they are plain numbers. Everything else is sums, digests or counters,
//! whose bits have no meaning of their own.

use kernels::{Size, catalogue};

use crate::ledger::words::{Element, Layout};

/// Kernels whose words are numbers as they come out of the unit; each says so at the head of its file.
const NUMBERS: [(&str, Element); 4] = [
    ("float.chain64", Element::Binary64),
    ("float.chain32", Element::TwoBinary32),
    ("fma.chain64", Element::Binary64),
    ("fma.chain32", Element::TwoBinary32),
];

/// The layout of a kernel's output at a footprint in KiB; nothing is known of kernels of other programs.
pub fn of(kernel: &str, size: u32) -> Layout {
    let known = catalogue::find(kernel).filter(|k| k.sizes().contains(&Size(size)));
    Layout {
        words: known.map(|k| k.output_words(Size(size)) as u64),
        element: NUMBERS.iter().find(|(id, _)| *id == kernel).map_or(Element::Unknown, |(_, element)| *element),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn kernels_that_are_named_exist() {
        for (id, element) in NUMBERS {
            let size = catalogue::find(id).expect("in the catalogue").sizes()[0].0;
            let layout = of(id, size);
            assert!(layout.words > Some(0) && layout.element == element, "{id}");
        }
        assert_eq!(of("no.such", 1), Layout::default());
        assert_eq!(of("fma.chain64", 1_000_000).words, None);
    }
}
