//! The department's rules: the site file over built-in defaults, checked, with
//! where each came from. This stage reads no plan and no model.

mod site;

pub use site::{
    ActionLevel, ActionLevels, CheckSettings, DepthUncertainty, PointRules, ReportSettings,
    SettingsError, Severity, Site, SiteSource, Technical,
};
