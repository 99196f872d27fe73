//! The codes of all diagnostics: words, for good. One table row a code.

/// How much a diagnostic weighs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, serde::Serialize, schemars::JsonSchema)]
#[serde(rename_all = "lowercase")]
pub enum Severity {
    /// The input can't be used as it stands.
    Error,
    /// The results stand; somebody should look.
    Warning,
    /// Worth knowing.
    Note,
}

macro_rules! codes {
    ($($(#[$doc:meta])* $variant:ident = $word:literal, $severity:ident;)*) => {
        /// What a diagnostic is about; each has a page in `docs/diagnostics/`, which `loopwright explain` prints.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, serde::Serialize, schemars::JsonSchema)]
        #[serde(rename_all = "kebab-case")]
        pub enum Code { $($(#[$doc])* $variant,)* }

        impl Code {
            /// Every code, in the order of the table.
            pub const ALL: &'static [Self] = &[$(Self::$variant,)*];

            /// The word that stands for it in text and JSON.
            pub const fn word(self) -> &'static str {
                match self { $(Self::$variant => $word,)* }
            }

            /// The severity that it has unless its place says otherwise.
            pub const fn severity(self) -> Severity {
                match self { $(Self::$variant => Severity::$severity,)* }
            }

            /// Its page: what it means, why it matters, a bad example and the mended one. Markdown.
            pub const fn page(self) -> &'static str {
                match self { $(Self::$variant => include_str!(concat!("../../docs/diagnostics/", $word, ".md")),)* }
            }

            /// The code that this word stands for.
            pub fn from_word(word: &str) -> Option<Self> {
                Self::ALL.iter().copied().find(|c| c.word() == word)
            }
        }
    };
}

codes! {
    /// The text does not follow the grammar, or a count of arguments, ports or rows is off.
    Syntax = "syntax", Error;
    /// A name that is not there.
    UnknownName = "unknown-name", Error;
    /// One name given twice.
    DuplicateName = "duplicate-name", Error;
    /// A signal with two drivers.
    DrivenTwice = "driven-twice", Error;
    /// A signal that is read and that nothing drives.
    UndrivenSignal = "undriven-signal", Error;
    /// A signal declared and neither driven nor read.
    UnusedSignal = "unused-signal", Warning;
    /// A block on which no output and no request depends.
    UnusedBlock = "unused-block", Warning;
    /// Two units that don't agree.
    UnitMismatch = "unit-mismatch", Error;
    /// A bare number that carries a unit beside a scaled one.
    BareNumber = "bare-number", Note;
    /// A loop without lag or delay that has a solution.
    AlgebraicLoop = "algebraic-loop", Warning;
    /// A loop without lag or delay that has none.
    IllPosedLoop = "ill-posed-loop", Error;
    /// A law whose numerator's degree passes its denominator's.
    ImproperLaw = "improper-law", Warning;
    /// A number is needed where a param has no value.
    ParameterWithoutValue = "parameter-without-value", Error;
    /// A param or a define that depends on itself.
    CircularDefinition = "circular-definition", Error;
    /// Files that use each other in a circle.
    UseCycle = "use-cycle", Error;
    /// A used file that can't be read.
    UseNotFound = "use-not-found", Error;
    /// A division by zero.
    DivisionByZero = "division-by-zero", Error;
    /// A named limit was reached.
    LimitReached = "limit-reached", Error;
    /// Sampled blocks of two periods.
    MixedRates = "mixed-rates", Error;
    /// A state equation that is not linear.
    NotLinear = "not-linear", Error;
    /// An unstable mode that no request shows.
    HiddenUnstableMode = "hidden-unstable-mode", Warning;
}
