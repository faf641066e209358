//! The table of materials that a `made-of` note may name: drop and reference current of each.

/// A material in the constant-drop model.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Material {
    /// Its word in `made-of` notes.
    pub word: &'static str,
    /// Drop in volts at 27 °C.
    pub drop: f64,
    /// Current at which the diode has that drop, amperes.
    pub reference: f64,
    /// Emission coefficient with which the second opinion passes through that point.
    pub emission: f64,
}

/// Change of a drop with temperature where nothing better is known, volts per kelvin. Silicon near 25 °C:
/// about −2 mV/K (Sedra & Smith, Microelectronic Circuits, figure on the diode's temperature dependence).
pub const DRIFT: f64 = -2e-3;

/// Temperature at which the table holds, degrees Celsius.
pub const REFERENCE_TEMPERATURE: f64 = 27.0;

/// Common practice, no source.
pub const MATERIALS: [Material; 10] = [
    plain("silicon", 0.7),
    plain("schottky", 0.3),
    plain("germanium", 0.3),
    led("ir-led", 1.3),
    led("red-led", 1.8),
    led("amber-led", 2.0),
    led("green-led", 2.3),
    led("ingan-green-led", 3.0),
    led("blue-led", 3.1),
    led("white-led", 3.0),
];

const fn plain(word: &'static str, drop: f64) -> Material {
    Material { word, drop, reference: 1e-3, emission: 1.0 }
}

const fn led(word: &'static str, drop: f64) -> Material {
    Material { word, drop, reference: 10e-3, emission: 2.0 }
}

impl Material {
    /// Silicon, which a diode is where nothing is said.
    pub const SILICON: Material = MATERIALS[0];

    /// The material of that word, case ignored.
    pub fn named(word: &str) -> Option<&'static Material> {
        MATERIALS.iter().find(|m| m.word.eq_ignore_ascii_case(word))
    }
}
