//! The one shape of "this value is refused".

use core::fmt;

use heapless::String;

/// A value that was refused: which one, what it was, what is wrong, what is allowed.
///
/// Text longer than its place is cut and ends in `~`; nothing is ever dropped silently.
#[derive(Clone, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Rejected {
    /// Path of the field, as the user wrote or would write it: `diameter`, `step[3].rpm`.
    pub field: String<48>,
    /// The value as given.
    pub value: String<40>,
    /// What is wrong with it, in a few words.
    pub problem: &'static str,
    /// What is allowed instead, with units.
    pub allowed: String<96>,
}

impl Rejected {
    /// Builds the error from anything that prints.
    #[cold]
    #[inline(never)]
    pub fn new(
        field: impl fmt::Display,
        value: impl fmt::Display,
        problem: &'static str,
        allowed: impl fmt::Display,
    ) -> Self {
        Rejected {
            field: text(field),
            value: text(value),
            problem,
            allowed: text(allowed),
        }
    }

    /// The same error about a field inside `parent`.
    #[must_use]
    #[cold]
    #[inline(never)]
    pub fn within(self, parent: impl fmt::Display) -> Self {
        Rejected {
            field: text(format_args!("{parent}.{}", self.field)),
            ..self
        }
    }
}

impl fmt::Display for Rejected {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Rejected {
            field,
            value,
            problem,
            allowed,
        } = self;
        write!(f, "{field}: `{value}` {problem}; allowed: {allowed}")
    }
}

impl core::error::Error for Rejected {}

/// Prints into a bounded string; what does not fit is cut and marked with `~`.
pub fn text<const N: usize>(value: impl fmt::Display) -> String<N> {
    struct Cut<'a, const N: usize>(&'a mut String<N>, bool);
    impl<const N: usize> fmt::Write for Cut<'_, N> {
        fn write_str(&mut self, s: &str) -> fmt::Result {
            for c in s.chars() {
                self.1 = self.1 || self.0.push(c).is_err();
            }
            Ok(())
        }
    }
    let mut out = String::new();
    let mut cut = Cut(&mut out, false);
    // Neither this writer nor the numbers and texts printed here can fail.
    let _ = fmt::write(&mut cut, format_args!("{value}"));
    if cut.1 {
        while out.push('~').is_err() && out.pop().is_some() {}
    }
    out
}
