//! Effects of the registry by a word or a number.

use spindrift::medium::effects::{EffectSettings, model};
use spindrift::parameters::Setting;

/// An effect of the registry, with some of its parameters and the defaults for the others.
pub fn effect(kind: &str, given: &[(&'static str, Setting)]) -> EffectSettings {
    let model = model(kind).unwrap_or_else(|| panic!("the registry has no {kind}"));
    EffectSettings::new(model, given)
}

/// An effect as it is by default.
pub fn plain(kind: &str) -> EffectSettings {
    effect(kind, &[])
}

/// `collinear-expansion` with a phase factor.
pub fn phase(word: &'static str) -> EffectSettings {
    effect("collinear-expansion", &[("phase", Setting::Word(word))])
}

/// `singular-enhancement` by a constant f.
pub fn enhancement(factor: f64) -> EffectSettings {
    effect(
        "singular-enhancement",
        &[("factor", Setting::Number(factor))],
    )
}

/// `singular-enhancement` that knows the medium's size.
pub fn enhancement_along_the_path(slope_per_gev2: f64) -> EffectSettings {
    effect(
        "singular-enhancement",
        &[
            ("law", Setting::Word("path")),
            ("slope_per_GeV2", Setting::Number(slope_per_gev2)),
        ],
    )
}

/// `single-hard` with scattering centres as numbers.
pub fn centres(opacity_per_fm: f64, debye_mass_gev: f64) -> EffectSettings {
    effect(
        "single-hard",
        &[
            ("centres", Setting::Word("given")),
            ("opacity_per_fm", Setting::Number(opacity_per_fm)),
            ("debye_mass_GeV", Setting::Number(debye_mass_gev)),
        ],
    )
}

/// `drag` whose loss fluctuates.
pub fn fluctuating_drag() -> EffectSettings {
    effect("drag", &[("fluctuations", Setting::Flag(true))])
}
