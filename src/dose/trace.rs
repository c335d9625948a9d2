//! A dose per MU as an ordered list of factors, each with value, unit and
//! source. Report, explanation and tests read the same trace, so what is shown
//! is what was computed.

use serde::Serialize;

/// A factor of the formalism.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum FactorName {
    /// D'0, cGy/MU.
    ReferenceOutput,
    /// Sc.
    CollimatorScatter,
    /// Sc(A): head scatter of an aperture.
    ApertureHeadScatter,
    /// F(A): primary and phantom scatter of an aperture per unit in-air fluence.
    ApertureInPhantom,
    /// Sp.
    PhantomScatter,
    /// TPR or TMR.
    TissuePhantomRatio,
    /// PDD as a share of 1.
    PercentDepthDose,
    /// TPR(d_eff)/TPR(d) in the SSD form.
    EffectiveDepth,
    /// OAR.
    OffAxisRatio,
    /// WF.
    Wedge,
    /// Profile of a wedge, off the axis along it.
    WedgeProfile,
    /// TF.
    Tray,
    /// Transmission of couch or immobilisation.
    Couch,
    /// BF: bolus or any further transmission typed by hand.
    OtherTransmission,
    /// Inverse square.
    InverseSquare,
}

impl FactorName {
    /// The factor's usual name.
    #[must_use]
    pub const fn title(self) -> &'static str {
        match self {
            Self::ReferenceOutput => "dose per MU at the reference point",
            Self::CollimatorScatter => "collimator scatter factor",
            Self::ApertureHeadScatter => "head scatter factor of the aperture",
            Self::ApertureInPhantom => "dose in phantom per unit in-air fluence",
            Self::PhantomScatter => "phantom scatter factor",
            Self::TissuePhantomRatio => "tissue-phantom ratio",
            Self::PercentDepthDose => "percent depth dose / 100",
            Self::EffectiveDepth => "effective-depth correction",
            Self::OffAxisRatio => "off-axis ratio",
            Self::Wedge => "wedge factor",
            Self::WedgeProfile => "wedge profile ratio",
            Self::Tray => "tray factor",
            Self::Couch => "couch transmission",
            Self::OtherTransmission => "further transmission",
            Self::InverseSquare => "inverse-square factor",
        }
    }

    /// The symbol used in AAPM TG-71 or, where it has none, the usual one.
    #[must_use]
    pub const fn symbol(self) -> &'static str {
        match self {
            Self::ReferenceOutput => "D'0",
            Self::CollimatorScatter => "Sc",
            Self::ApertureHeadScatter => "Sc(A)",
            Self::ApertureInPhantom => "F(A)",
            Self::PhantomScatter => "Sp",
            Self::TissuePhantomRatio => "TPR",
            Self::PercentDepthDose => "PDD/100",
            Self::EffectiveDepth => "TPR(d_eff)/TPR(d)",
            Self::OffAxisRatio => "OAR",
            Self::Wedge => "WF",
            Self::WedgeProfile => "WF(x)/WF(0)",
            Self::Tray => "TF",
            Self::Couch => "CF",
            Self::OtherTransmission => "BF",
            Self::InverseSquare => "ISF",
        }
    }

    /// The unit; empty for a ratio.
    #[must_use]
    pub const fn unit(self) -> &'static str {
        match self {
            Self::ReferenceOutput => "cGy/MU",
            _ => "",
        }
    }
}

/// One factor of a trace.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Factor {
    /// Which.
    pub name: FactorName,
    /// Its value, unrounded.
    pub value: f64,
    /// Where it comes from: table and cells, a formula with its numbers, or "typed".
    pub source: String,
}

/// A number that leads to factors: a depth, a distance, an equivalent square.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Input {
    /// What it is, such as `equivalent square of the collimator`.
    pub name: &'static str,
    /// Symbol, such as `c`.
    pub symbol: &'static str,
    /// Value, unrounded.
    pub value: f64,
    /// Unit, such as `cm`.
    pub unit: &'static str,
    /// How it was obtained.
    pub source: String,
}

/// How a dose per MU was obtained.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Trace {
    /// The formula in symbols, such as `D'0 * Sc * Sp * TPR * OAR * ISF`.
    pub formula: String,
    /// Its source, such as `AAPM TG-71, isocentric form`.
    pub formula_source: &'static str,
    /// Numbers that lead to the factors, in order of use.
    pub inputs: Vec<Input>,
    /// The factors, in order.
    pub factors: Vec<Factor>,
    /// Their product, cGy/MU.
    pub dose_per_mu_cgy: f64,
}

impl Trace {
    /// A trace whose dose per MU is the product of its factors.
    #[must_use]
    pub fn new(
        formula: String,
        formula_source: &'static str,
        inputs: Vec<Input>,
        factors: Vec<Factor>,
    ) -> Self {
        let dose_per_mu_cgy = factors.iter().map(|factor| factor.value).product();
        Self {
            formula,
            formula_source,
            inputs,
            factors,
            dose_per_mu_cgy,
        }
    }

    /// The factor of this name, if the trace has it.
    #[must_use]
    pub fn factor(&self, name: FactorName) -> Option<&Factor> {
        self.factors.iter().find(|factor| factor.name == name)
    }

    /// The input of this symbol, if the trace has it.
    #[must_use]
    pub fn input(&self, symbol: &str) -> Option<&Input> {
        self.inputs.iter().find(|input| input.symbol == symbol)
    }
}
