//! A slice of a sweep, so that several machines can share it.

use std::ops::Range;
use std::str::FromStr;

/// The `index`-th of `of` slices, counted from 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Part {
    index: usize,
    of: usize,
}

/// No sweep has more points than this to share.
const MOST: usize = crate::structure::MOST_POINTS as usize;

impl Part {
    pub const WHOLE: Part = Part { index: 1, of: 1 };

    /// The points of this slice among all; slices differ by one point at most.
    pub fn range(self, points: usize) -> Range<usize> {
        let end = |index: usize| index * points / self.of;
        end(self.index - 1)..end(self.index)
    }

    pub fn is_first(self) -> bool {
        self.index == 1
    }
}

impl FromStr for Part {
    type Err = String;

    fn from_str(text: &str) -> Result<Part, String> {
        let numbers = text
            .split_once('/')
            .and_then(|(index, of)| Some((index.parse().ok()?, of.parse().ok()?)));
        match numbers {
            Some((index, of)) if (1..=of).contains(&index) && of <= MOST => Ok(Part { index, of }),
            Some((_, of)) if of == 0 || of > MOST => {
                Err(format!("expected from 1 to {MOST} slices, as in `1/4`"))
            }
            Some((_, of)) => Err(format!("expected a slice from `1/{of}` to `{of}/{of}`")),
            None => Err("expected the slice and their number, as in `1/4`".to_owned()),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slices_join_to_the_whole() {
        for points in [2, 7, 61, 100] {
            for of in [1, 2, 3, 7, 200] {
                let joined: Vec<usize> = (1..=of)
                    .flat_map(|index| Part { index, of }.range(points))
                    .collect();
                assert!(joined.into_iter().eq(0..points), "{points} in {of}");
            }
        }
    }

    #[test]
    fn what_is_no_slice_is_refused() {
        for text in [
            "0/3", "4/3", "a/b", "1", "1/0", "-1/3", "1/3/2", "", "1/100001",
        ] {
            assert!(text.parse::<Part>().is_err(), "{text}");
        }
        assert_eq!("2/3".parse(), Ok(Part { index: 2, of: 3 }));
    }
}
