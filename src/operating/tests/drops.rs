//! Where drops come from and which of several wins.

use super::Laid;
use crate::config::Options;
use crate::operating::DropOrigin;

const MODEL: &str = ".model DX D(IS=10f N=1)";

/// Drop of D1 in volts and its origin in words.
fn drop(lines: &str, options: &Options) -> (f64, String) {
    let laid = Laid::out(lines, options);
    let drop = laid.diodes[0].drop(&laid.circuit, 27.0);
    ((drop.volts * 1e4).round() / 1e4, drop.origin.to_string())
}

#[test]
fn each_origin_gives_way_to_the_one_before_it() {
    let usual = Options::default();
    let plain = "D1 a 0 DX\n.model DX D";
    assert_eq!(drop(plain, &usual), (0.7, "default".into()));
    assert_eq!(drop(&format!("{plain}\n*@ made-of DX red-led"), &usual), (1.8, "material red-led".into()));
    // 25.865 mV · ln(1 + 1 mA/10 fA) at 300.15 K, computed from the exact constants
    let modelled = format!("D1 a 0 DX\n{MODEL}\n*@ made-of DX red-led");
    assert_eq!(drop(&modelled, &usual), (0.6551, "model DX at 1mA".into()));
    let noted = format!("{modelled}\n*@ drop DX 0.61");
    assert_eq!(drop(&noted, &usual), (0.61, "note".into()));
    let own = format!("{noted}\n*@ drop D1 0.62");
    assert_eq!(drop(&own, &usual), (0.62, "note".into()));
    let option = Options { drop: Some(0.5), ..Options::default() };
    assert_eq!(drop(&own, &option), (0.5, "option".into()));
    assert_eq!(drop(&format!("{plain}\n*@ drop D1 0"), &usual), (0.0, "note".into()));
}

#[test]
fn a_model_without_a_saturation_current_has_the_drop_of_its_material() {
    assert_eq!(drop("D1 a 0 DX\n.model DX D(BV=5.1 RS=1)", &Options::default()), (0.7, "default".into()));
    assert_eq!(drop("D1 a 0 DX\n.model DX D(N=2)", &Options::default()), (0.7, "default".into()));
    assert_eq!(drop("D1 a 0 DX\n.model DX D(IS=10f)", &Options::default()).1, "model DX at 1mA");
    assert_eq!(drop("D1 a 0 DX", &Options::default()), (0.7, "default".into()));
}

#[test]
fn area_makes_a_diode_larger() {
    let laid = Laid::out("D1 a 0 DX 10\nD2 a 0 DX\n.model DX D(IS=10f RS=5 BV=50)", &Options::default());
    let (large, small) = (&laid.diodes[0], &laid.diodes[1]);
    assert_eq!((large.series, small.series), (0.5, 5.0));
    // ten times the area is one decade less current each: kT/q·ln 10 = 59.556 mV at 300.15 K (computed)
    let difference = small.level(27.0).value - large.level(27.0).value;
    assert!((difference - 59.556e-3).abs() < 1e-6, "{difference}");
    assert_eq!(large.reverse.map(|l| (l.value, l.exact)), Some((50.0, true)));
}

#[test]
fn only_what_no_person_fixed_moves_with_temperature() {
    let at = |lines: &str, celsius: f64| Laid::out(lines, &Options::default()).diodes[0].level(celsius);
    let plain = "D1 a 0 DX\n.model DX D";
    assert!((at(plain, 77.0).value - 0.6).abs() < 1e-12);
    assert!(at(plain, 27.0).exact && !at(plain, 77.0).exact);
    assert_eq!(at(&format!("{plain}\n*@ drop D1 0.65"), 77.0).value, 0.65);
    assert!(at(&format!("{plain}\n*@ made-of D1 germanium"), 300.0).value == 0.0);
    // about −2 mV/K at constant current for silicon (Sedra & Smith), here from IS(T) with EG 1.11 and XTI 3
    let modelled = format!("D1 a 0 DX\n{MODEL}");
    let slope = (at(&modelled, 37.0).value - at(&modelled, 27.0).value) / 10.0;
    assert!((-2.1e-3..-1.5e-3).contains(&slope), "{slope}");
}

#[test]
fn notes_that_cannot_be_used_are_told() {
    let laid = Laid::out(
        "R1 a 0 1k\nD1 a 0 DX\n.model DX D\n*@ drop R1 0.6\n*@ drop D1 -0.2\n*@ drop D7 0.6\n*@ drop D1 0.6\n*@ drop D1 0.7",
        &Options::default(),
    );
    let mut rules = laid.rules();
    rules.sort_unstable();
    assert_eq!(rules, ["conflicting-notes", "unknown-name", "unusable-note", "unusable-note"]);
    assert_eq!(laid.diodes[0].drop(&laid.circuit, 27.0).origin, DropOrigin::Note);
    assert_eq!(laid.diodes[0].level(27.0).value, 0.6);
}
#[test]
fn inner_notes_stand_before_outer_ones() {
    let lines = "X1 a LED\nX2 a LED\nD9 a 0 DX\n.subckt LED p\nD1 p 0 DX\n*@ drop D1 0.61\n.ends\n.model DX D\n*@ drop X1:D1 0.5\n*@ drop DX 0.66";
    let laid = Laid::out(lines, &Options::default());
    let volts = |name: &str| {
        let id = laid.element(name);
        laid.diodes.iter().find(|d| d.element == id).unwrap().level(27.0).value
    };
    assert_eq!((volts("X1:D1"), volts("X2:D1"), volts("D9")), (0.61, 0.61, 0.66));
    assert!(laid.findings.is_empty(), "{:?}", laid.findings);
    let outer_only = lines.replace("*@ drop D1 0.61\n", "");
    let laid = Laid::out(&outer_only, &Options::default());
    let volts = |name: &str| {
        let id = laid.element(name);
        laid.diodes.iter().find(|d| d.element == id).unwrap().level(27.0).value
    };
    assert_eq!((volts("X1:D1"), volts("X2:D1")), (0.5, 0.66));
}
