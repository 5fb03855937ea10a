//! Where a figure comes from, and how far it may be trusted.

use core::fmt;

/// How a figure came to us.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Confidence {
    /// Read in the text of the source.
    Read,
    /// Recalled from the source named, not seen again.
    FromMemory,
    /// A habit of the trade that nobody's table stands behind.
    CommonPractice,
}

impl Confidence {
    /// In a few words.
    pub const fn words(self) -> &'static str {
        match self {
            Confidence::Read => "read",
            Confidence::FromMemory => "from memory",
            Confidence::CommonPractice => "common practice, no source",
        }
    }
}

impl fmt::Display for Confidence {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.words())
    }
}

/// A source, printed as `US Navy NAVEDTRA 14345, drill-press section (read)`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Source {
    /// Publication and place in it; empty for common practice.
    pub text: &'static str,
    /// How far to trust it.
    pub confidence: Confidence,
}

impl Source {
    pub(crate) const fn read(text: &'static str) -> Self {
        Source {
            text,
            confidence: Confidence::Read,
        }
    }
    pub(crate) const fn from_memory(text: &'static str) -> Self {
        Source {
            text,
            confidence: Confidence::FromMemory,
        }
    }
    pub(crate) const fn common_practice() -> Self {
        Source {
            text: "",
            confidence: Confidence::CommonPractice,
        }
    }
}

impl fmt::Display for Source {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.text.is_empty() {
            self.confidence.fmt(f)
        } else {
            write!(f, "{} ({})", self.text, self.confidence)
        }
    }
}

/// Data Book, free-machining carbon steels.
pub(crate) const DATA_BOOK_9_1: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-1");
/// Data Book, low carbon steels.
pub(crate) const DATA_BOOK_9_2: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-2");
/// Data Book, medium carbon steels.
pub(crate) const DATA_BOOK_9_3: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-3");
/// Data Book, high carbon steels.
pub(crate) const DATA_BOOK_9_4: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-4");
/// Data Book, low carbon alloy steels.
pub(crate) const DATA_BOOK_9_5: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-5");
/// Data Book, the hard rows of three tables.
pub(crate) const DATA_BOOK_HARD: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, tables 9-3, 9-4 and 9-5, by hardness");
/// Data Book, face milling of medium carbon steels.
pub(crate) const DATA_BOOK_9_9: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-9");
/// Both ends of free-machining steel in high-speed steel.
pub(crate) const DATA_BOOK_AND_SFPM: Source = Source::read(
    "The Ferrous Metals Data Book, ch. 9, table 9-1; lower end: handbook table of HSS speeds for carbon and alloy steels, vm68.com/stuff/sfpm.html",
);
/// A handbook table in a reproduction that does not name its book; its columns are those of Machinery's Handbook (from memory).
pub(crate) const SFPM: Source = Source::read(
    "handbook table of HSS speeds for turning, milling, drilling and reaming carbon and alloy steels, vm68.com/stuff/sfpm.html",
);
/// The Air Force's stainless table.
pub(crate) const AIR_FORCE_2_8: Source =
    Source::read("USAF T.O. 1-1A-9 / TM 43-0106, Aerospace Metals, table 2-8, p. 2-72");
/// Carbide turning.
pub(crate) const CARVILL_191: Source =
    Source::read("Carvill, Mechanical Engineer's Data Handbook, p. 191, sec. 5.6.7");
/// Milling.
pub(crate) const CARVILL_187: Source =
    Source::read("Carvill, Mechanical Engineer's Data Handbook, p. 187");
/// The Navy's drilling speeds.
pub(crate) const NAVY: Source = Source::read("US Navy NAVEDTRA 14345, drill-press section");
/// Drilling by material; speeds follow from the rpm columns at 12.5 mm.
pub(crate) const KALPAKJIAN: Source = Source::read(
    "Kalpakjian & Schmid, Manufacturing Engineering and Technology, table 23.11, p. 649 (from its rpm at 12.5 mm)",
);
/// Drilling by material and hardness.
pub(crate) const EL_HOFY: Source =
    Source::read("El-Hofy, Fundamentals of Machining Processes, table 5.4, p. 143");
/// The Army's turning and threading table.
pub(crate) const ARMY: Source = Source::from_memory(
    "US Army TC 9-524, Fundamentals of Machine Tools, lathe chapter, speeds for turning and threading",
);
/// High-speed steel at 0.125 in depth and 0.012 in/rev.
pub(crate) const MACHINERYS: Source = Source::from_memory(
    "Machinery's Handbook, tables of HSS turning speeds by material and hardness",
);
/// Drill feeds at two diameters.
pub(crate) const KALPAKJIAN_DRILLS: Source = Source::read(
    "Kalpakjian & Schmid, Manufacturing Engineering and Technology, table 23.11, p. 649, feeds at 1.5 and 12.5 mm",
);
/// Taylor exponents.
pub(crate) const KALPAKJIAN_21: Source = Source::from_memory(
    "Kalpakjian & Schmid, Manufacturing Engineering and Technology, ch. 21, ranges of the exponent n",
);
/// Face milling of low carbon steels.
pub(crate) const DATA_BOOK_9_8: Source =
    Source::read("The Ferrous Metals Data Book, ch. 9, table 9-8");
/// Moduli and densities.
pub(crate) const GERE: Source = Source::read("Gere, Mechanics of Materials, tables H-1 and H-2");
/// The same tables, rows not seen again.
pub(crate) const GERE_MEMORY: Source =
    Source::from_memory("Gere, Mechanics of Materials, tables H-1 and H-2");
/// Modulus of steel; its density from memory.
pub(crate) const CALLISTER: Source =
    Source::read("Callister, Materials Science and Engineering, table B.2, p. 804");
/// Specific cutting forces by material group.
pub(crate) const VDI_GROUPS: Source = Source::read(
    "specific cutting force and its exponent by the material groups of VDI 3323, as tabulated in a cutting-tool maker's turning catalogue of 2017",
);
