//! Exit status.

use crate::verdict::Decision;

/// What the exit status means. The numbers from 64 on are those of BSD's `sysexits.h`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
#[repr(u8)]
pub enum Exit {
    /// Every sample was decided.
    Decisive = 0,
    /// The command line cannot be followed.
    Usage = 2,
    /// Some sample was not decided.
    Inconclusive = 10,
    /// For some sample nothing in the library explains the readings.
    Unexplained = 11,
    /// A sample, a file, a set-up or a library was refused.
    BadData = 65,
    /// An input is missing or cannot be read.
    NoInput = 66,
    /// A fault of the program.
    Internal = 70,
    /// The output cannot be written.
    NoOutput = 73,
}

/// The same for the help.
pub(super) const HELP: &str = "\
Exit status:
   0  every sample was decided
   2  the command line cannot be followed
  10  some sample was not decided
  11  for some sample nothing in the library explains the readings
  65  a sample, a file, a set-up or a library was refused (the rest is reported)
  66  an input is missing or cannot be read
  70  a fault of the program
  73  the output cannot be written
The highest that applies; --exit-zero makes 10 and 11 into 0.";

impl Exit {
    /// The number.
    pub fn code(self) -> u8 {
        self as u8
    }

    /// The status that a decision on one sample calls for.
    pub(super) fn of(decision: Decision) -> Self {
        match decision {
            Decision::Decisive => Self::Decisive,
            Decision::Inconclusive => Self::Inconclusive,
            Decision::Unexplained => Self::Unexplained,
        }
    }

    /// The status for scripts that only want to know whether the program ran.
    pub(super) fn or_zero(self, exit_zero: bool) -> Self {
        match self {
            Self::Inconclusive | Self::Unexplained if exit_zero => Self::Decisive,
            other => other,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const ALL: [Exit; 8] = [
        Exit::Decisive,
        Exit::Usage,
        Exit::Inconclusive,
        Exit::Unexplained,
        Exit::BadData,
        Exit::NoInput,
        Exit::Internal,
        Exit::NoOutput,
    ];

    #[test]
    fn the_help_names_every_status_and_the_order_is_that_of_the_numbers() {
        // interface.md, exit status.
        assert_eq!(ALL.map(Exit::code), [0, 2, 10, 11, 65, 66, 70, 73]);
        assert!(ALL.is_sorted());
        for exit in ALL {
            let start = format!("\n{:>4}  ", exit.code());
            assert!(HELP.contains(&start), "{exit:?} is not in the help");
        }
    }

    #[test]
    fn exit_zero_hides_only_what_is_no_fault() {
        let hidden = ALL.map(|exit| exit.or_zero(true).code());
        assert_eq!(hidden, [0, 2, 0, 0, 65, 66, 70, 73]);
        assert_eq!(ALL.map(|exit| exit.or_zero(false)), ALL);
    }
}
