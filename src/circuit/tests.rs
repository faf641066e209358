//! Reading as a whole: from text to the flat circuit and its findings. The circuits are invented; what they must
//! come to follows from the rules of the language alone.

use super::*;
use crate::config::Options;
use crate::text::{LONGEST_FILE, LoadProblem, Loader, Memory};
use std::path::{Path, PathBuf};

fn read_all(files: &[(&str, &str)]) -> Reading {
    let mut memory = Memory::default();
    for (name, text) in files {
        memory.insert(*name, *text);
    }
    read(&mut memory, Path::new(files[0].0), &Options::default()).unwrap()
}

fn read_one(text: &str) -> Reading {
    read_all(&[("root.cir", text)])
}

/// Rule and line of every finding of warning or error, in order of the text.
fn told(reading: &Reading) -> Vec<(&'static str, usize)> {
    let mut findings = reading.findings.clone();
    crate::finding::sort(&mut findings);
    let loud = findings.iter().filter(|f| f.severity > crate::finding::Severity::Note);
    loud.map(|f| (f.rule, reading.sources.positions(f.span).0.line)).collect()
}

fn find(circuit: &Circuit, name: &str) -> ElementId {
    circuit
        .elements()
        .map(|(id, _)| id)
        .find(|&id| circuit.element_name(id) == name)
        .unwrap_or_else(|| panic!("no {name}"))
}

fn nodes(circuit: &Circuit, name: &str) -> Vec<String> {
    circuit.pins(find(circuit, name)).iter().map(|p| circuit.node_name(p.node)).collect()
}

fn ohms(circuit: &Circuit, name: &str) -> f64 {
    match circuit.element(find(circuit, name)).behaviour {
        Behaviour::Resistor(value) => value.number,
        ref other => panic!("{name} is {other:?}"),
    }
}

#[test]
fn instances_are_expanded_with_their_parameters() {
    let reading = read_one(
        "t\nX1 in out FILTER r=2k\nX2 in out FILTER\n.subckt FILTER a b params: r=1k\nR1 a m {r*k}\nX1 m b STAGE\n\
         .subckt STAGE p q\nR1 p q {r}\nR2 q vcc 5\n.ends\n.ends FILTER\n.param k=2\n.global vcc\nV1 vcc 0 5\n",
    );
    let circuit = &reading.circuit;
    assert_eq!(told(&reading), []);
    assert_eq!((ohms(circuit, "X1:R1"), ohms(circuit, "X2:R1")), (4000.0, 2000.0));
    assert_eq!((ohms(circuit, "X1:X1:R1"), ohms(circuit, "X2:X1:R1")), (2000.0, 1000.0));
    assert_eq!(nodes(circuit, "X1:R1"), ["in", "X1:m"]);
    assert_eq!(nodes(circuit, "X1:X1:R1"), ["X1:m", "out"]);
    assert_eq!(nodes(circuit, "X2:X1:R2"), ["out", "vcc"]);
}

#[test]
fn a_value_points_at_where_it_was_written() {
    let reading = read_one("t\n.param load=1M\nR1 a 0 {load}\n");
    assert_eq!(told(&reading), [("misread-value", 2)]);
}

#[test]
fn local_models_hide_outer_ones() {
    let reading = read_one(
        "t\nD1 a 0 DX\nX1 a 0 S is=3n\n.model DX D(IS=1n)\n.subckt S p n is=2n\n.model DX D(IS={is})\nD1 p n DX\n.ends\n",
    );
    let is = |name: &str| match reading.circuit.element(find(&reading.circuit, name)).behaviour {
        Behaviour::Diode { model: Some(model), .. } => {
            reading.circuit.model(model).parameter("is").unwrap().number
        }
        ref other => panic!("{other:?}"),
    };
    assert_eq!((is("D1"), is("X1:D1")), (1e-9, 3e-9));
}

#[test]
fn expressions_follow_the_usual_rules() {
    // values by hand
    for (text, expected) in [
        ("2+3*4", 14.0),
        ("2**3**2", 512.0),
        ("-2**2", -4.0),
        ("10-4-3", 3.0),
        ("1k/2", 500.0),
        ("max(1,7,3)", 7.0),
        ("if(1>2, 1/0, 5)", 5.0),
        ("2>1 ? 10 : 20", 10.0),
        ("sqrt(16)+abs(-1)", 5.0),
        ("limit(9, 1, 4)", 4.0),
        ("1e-3*1meg", 1000.0),
        ("7 % 4", 3.0),
        ("!0 + (1&&0)", 1.0),
        ("double(4)", 8.0),
    ] {
        let reading = read_one(&format!("t\n.func double(x) {{2*x}}\nR1 a 0 {{{text}}}\n"));
        assert_eq!(ohms(&reading.circuit, "R1"), expected, "{text}: {:?}", told(&reading));
        let reading = read_one(&format!("t\n.func double(x) {{2*x}}\nR1 a 0 '{text}'\n"));
        assert_eq!(ohms(&reading.circuit, "R1"), expected, "{text}");
    }
}

#[test]
fn one_bad_line_hides_no_other() {
    let reading = read_one(
        "t\nR1 a\nR2 a 0 {1\nR3 a 0 {x}\nR4 a 0 {1/0}\n.param p={q} q={p}\nR5 a 0 {p}\nX1 a NOWHERE\nC1 a 0 0,1u\n\
         R6 a 0 7\nR6 a 0 8\nF1 a 0 V9 1\n? a b\n",
    );
    assert_eq!(
        told(&reading),
        [
            ("unreadable-line", 2),
            ("unreadable-line", 3),
            ("unknown-parameter", 4),
            ("division-by-zero", 5),
            ("parameter-cycle", 6),
            ("missing-subcircuit", 8),
            ("decimal-comma", 9),
            ("duplicate-name", 11),
            ("missing-element", 12),
            ("unknown-element", 13),
        ]
    );
    assert_eq!(reading.circuit.elements.len(), 10);
    assert!(reading.circuit.incomplete);
}

#[test]
fn nodes_are_taken_by_letter_and_model() {
    let reading = read_one(
        "t\nQ1 c b e QN\nQ2 c b e s QN\nQ3 c b e QN 2\nQ4 c b e QX\nQ5 c b e s QX\nQ6 c b e QX 2\nM1 d g s b MX L=1u\nM2 d g s MX\n\
         J1 d g s JX\nE1 (a,b) (c,d) 10\nE2 a b POLY(1) c d 0 10\nE3 a b value={v(c)}\nS1 a b c d SX\nT1 a b c d Z0=50\nB1 a b v={1}\n\
         .model QN NPN\nV1 +24V GND 5\nR1 a[3] <0> 1\nR2 /VOUT y#2 1\n",
    );
    let count = |name: &str| nodes(&reading.circuit, name).len();
    let counts =
        ["Q1", "Q2", "Q3", "Q4", "Q5", "Q6", "M1", "M2", "J1", "E1", "E2", "E3", "S1", "T1", "B1"].map(count);
    assert_eq!(counts, [3, 4, 3, 3, 4, 3, 4, 3, 3, 4, 4, 2, 4, 4, 2]);
    assert_eq!(nodes(&reading.circuit, "V1"), ["+24V", "0"]);
    assert_eq!(nodes(&reading.circuit, "R1"), ["a[3]", "<0>"]);
    assert_eq!(told(&reading), [("undefined-model", 5)]);
}

#[test]
fn sources_with_and_without_parentheses() {
    let shape = |text: &str| {
        let reading = read_one(&format!("t\nV1 a 0 {text}\n"));
        match &reading.circuit.elements[0].behaviour {
            Behaviour::VoltageSource(source) => (**source).clone(),
            other => panic!("{text}: {other:?}"),
        }
    };
    for text in ["DC 2 SIN(0 5 50)", "2 SIN 0 5 50", "2 AC 1 0 SIN( 0, 5, 50 )", "SIN(0 5 50) DC=2"] {
        let source = shape(text);
        assert_eq!(source.dc.map(|v| v.number), Some(2.0), "{text}");
        assert!(matches!(source.shape, Some(Shape::Sine { amplitude: 5.0, frequency: 50.0, .. })), "{text}");
    }
    assert_eq!(shape("").dc, None);
    assert_eq!(shape("PWL(0 0 1m\n+ 5)").shape, Some(Shape::Points(vec![(0.0, 0.0), (1e-3, 5.0)])));
    assert!(matches!(shape("PULSE(0 5 1u 1n 1n 5u 10u)").shape, Some(Shape::Pulse { period: 1e-5, .. })));
}

#[test]
fn includes_are_looked_up_and_confined() {
    let reading = read_all(&[
        (
            "a/root.cir",
            "t\n.include sub/one.inc\n.include ../b/no.inc\n.include gone.inc\n.lib parts.lib fast\nD1 r 0 DF\n",
        ),
        ("a/sub/one.inc", "R1 r 0 1k\n.include two.inc\n.include ../root.cir\n"),
        ("a/sub/two.inc", "R2 r 0 1M\n"),
        ("b/no.inc", "R9 r 0 1k\n"),
        ("a/parts.lib", ".lib slow\n.model DF D(IS=1n)\n.endl\n.lib fast\n.model DF D(IS=2n)\n.endl\n"),
    ]);
    let rules: Vec<_> = told(&reading).into_iter().map(|t| t.0).collect();
    assert_eq!(rules, ["include-outside", "include-not-found", "include-cycle", "misread-value"]);
    assert_eq!(reading.circuit.elements.len(), 3);
    assert_eq!(reading.circuit.models[0].parameter("is").unwrap().number, 2e-9);
    let misread = reading.findings.iter().find(|f| f.rule == "misread-value").unwrap();
    assert_eq!(misread.trail.len(), 2);
}

/// Files in memory that count what is asked of them.
#[derive(Default)]
struct Counting {
    files: Memory,
    loads: usize,
    asked: std::cell::Cell<usize>,
}

impl Loader for Counting {
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem> {
        self.loads += 1;
        self.files.load(path)
    }
    fn exists(&self, path: &Path) -> bool {
        self.asked.set(self.asked.get() + 1);
        self.files.exists(path)
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        self.asked.set(self.asked.get() + 1);
        self.files.resolve(path)
    }
}

#[test]
fn a_file_that_asks_itself_for_ever_new_sections_is_read_once() {
    let lines =
        |range: std::ops::Range<u32>| range.map(|n| format!(".lib root.cir s{n}\n")).collect::<String>();
    let mut loader = Counting::default();
    loader.files.insert("root.cir", format!("t\nR1 a 0 1k\n{}", lines(0..100)));
    let reading = read(&mut loader, Path::new("root.cir"), &Options::default()).unwrap();
    assert_eq!((loader.loads, reading.circuit.elements.len()), (1, 1));
    assert!(told(&reading).iter().all(|t| t.0 == "include-cycle"));
    // sections of its own that ask for each other are read until the limit says no, and its place is looked up once
    let sections: String = (0..12).map(|n| format!(".lib s{n}\n{}.endl\n", lines(0..12))).collect();
    let mut loader = Counting::default();
    loader.files.insert("root.cir", format!("t\n.lib root.cir s0\n{sections}"));
    let reading = read(&mut loader, Path::new("root.cir"), &Options::default()).unwrap();
    assert!(reading.findings.iter().any(|f| f.rule == "limit-reached"));
    assert!(loader.asked.get() < 10, "{}", loader.asked.get());
}

#[test]
fn include_directories_may_lie_anywhere() {
    let mut memory = Memory::with("a/root.cir", "t\n.include parts.inc\n");
    memory.insert("b/parts.inc", "R1 a 0 1k\n");
    let options = Options { include_dirs: vec![PathBuf::from("b")], ..Options::default() };
    let reading = read(&mut memory, Path::new("a/root.cir"), &options).unwrap();
    assert_eq!(reading.circuit.elements.len(), 1);
}

#[test]
fn foreign_blocks_are_passed_over() {
    let reading = read_one(
        "t\n.bench\nrun\nplot v(a) > b\n.endb\n.ac dec 10 1 1meg\n.op\nR1 a 0 1k\n.foo\n.end\nR2 a 0 1\n",
    );
    assert_eq!(told(&reading), []);
    let rules: Vec<_> = reading.findings.iter().map(|f| f.rule).collect();
    assert_eq!(rules, ["unknown-dot-line", "text-after-end"]);
    assert_eq!(reading.circuit.elements.len(), 1);
}

#[test]
fn the_same_in_many_instances_is_told_once() {
    let instances: String = (0..50).map(|n| format!("X{n} n{n} 0 S\n")).collect();
    let reading = read_one(&format!("t\n.subckt S a b\nR1 a b 1M\n.ends\n{instances}"));
    assert_eq!(told(&reading), [("misread-value", 3)]);
    assert!(reading.findings[0].message.contains("50 instances"), "{}", reading.findings[0].message);
    assert_eq!(reading.findings[0].trail[0].what, "instance X0 of S");
}

#[test]
fn expansion_is_bounded() {
    // sixty levels of two
    let mut text = String::from("t\nX1 a 0 S0\n");
    for n in 0..60 {
        text.push_str(&format!(".subckt S{n} a b\nX1 a b S{}\nX2 a b S{}\n.ends\n", n + 1, n + 1));
    }
    let reading = read_one(&format!("{text}.subckt S60 a b\nX1 a b S0\n.ends\n"));
    let rules: Vec<_> = told(&reading).into_iter().map(|t| t.0).collect();
    assert!(rules.contains(&"recursive-subcircuit") && rules.contains(&"limit-reached"), "{rules:?}");
    assert!(reading.circuit.elements.len() < 40_000);
}

#[test]
fn other_values_keep_the_structure() {
    let reading = read_one("t\n.param load=1k\nR1 a 0 {load*2}\nR2 a 0 {temper}\n");
    let overrides = Overrides { parameters: vec![("LOAD".into(), 5e3)], temperature: Some(85.0) };
    let (circuit, _) = expand(&reading.sources, &reading.parsed, &overrides);
    assert_eq!((ohms(&circuit, "R1"), ohms(&circuit, "R2")), (1e4, 85.0));
    assert_eq!(ohms(&reading.circuit, "R1"), 2e3);
    assert_eq!(circuit.nodes, reading.circuit.nodes);
}

#[test]
fn settings_are_read() {
    let reading = read_one(
        "t\nV1 a 0 5\n.options tnom=25 temp = 60\n.dc V1 0 10 1\n.tran 1u 10m 2m uic\n.ic v(a)=2.5\n",
    );
    let circuit = &reading.circuit;
    assert_eq!((circuit.temperature, circuit.nominal_temperature), (Some(60.0), Some(25.0)));
    assert_eq!((circuit.sweeps[0].name.as_str(), circuit.sweeps[0].to), ("V1", 10.0));
    assert_eq!(circuit.transient, Some(Transient { step: 1e-6, stop: 10e-3, start: 2e-3, uic: true }));
    assert_eq!(circuit.initial, [(NodeId(1), 2.5)]);
}

#[test]
fn a_library_gives_one_note() {
    let reading = read_one("t\n.subckt S a b\nR1 a b 1k\nD1 a b NOWHERE\n.ends\n.model DX D\n");
    let rules: Vec<_> = reading.findings.iter().map(|f| f.rule).collect();
    assert_eq!(rules, ["nothing-to-check"]);
}

#[test]
fn functions_that_call_each_other_twice_do_not_hang() {
    let mut text = String::from("t\n.func f0(x) {x}\n");
    for n in 1..60 {
        text.push_str(&format!(".func f{n}(x) {{f{}(x)+f{}(x)}}\n", n - 1, n - 1));
    }
    let reading = read_one(&format!("{text}R1 a 0 {{f59(1)}}\nR2 a 0 {{f3(1)}}\n"));
    assert!(told(&reading).iter().all(|t| t.0 == "limit-reached"), "{:?}", told(&reading));
    assert!(!told(&reading).is_empty());
}

#[test]
fn what_includes_bring_in_is_bounded() {
    let large = format!("* {}\n", "x".repeat(100_000));
    let reading = read_all(&[
        ("root.cir", &format!("t\n{}", ".include large.inc\n".repeat(50))),
        ("large.inc", &large),
    ]);
    let told = told(&reading);
    assert!(told.len() == 40 && told.iter().all(|t| t.0 == "limit-reached"), "{told:?}");
}

#[test]
fn a_flood_of_unknown_names_among_many_is_told_quickly() {
    let mut text = String::from("t\n");
    for n in 0..20_000 {
        text.push_str(&format!(".param known{n}=1\nR{n} a 0 {{unknwon{n}}}\nX{n} a 0 SUB{n}\n.word{n}\n"));
    }
    assert_eq!(told(&read_one(&text)).iter().filter(|t| t.0 == "unknown-parameter").count(), 1000);
}

/// A file of any size that is never to be read.
struct Claims(u64);

impl Loader for Claims {
    fn load(&mut self, path: &Path) -> Result<Vec<u8>, LoadProblem> {
        assert!(path != Path::new("large.inc"), "a file that is too long must not be loaded");
        Ok(b"t\n.include large.inc\nR1 a 0 1k\nR2 a 0 1k\n".to_vec())
    }
    fn size(&self, path: &Path) -> Option<u64> {
        (path == Path::new("large.inc")).then_some(self.0)
    }
    fn exists(&self, _: &Path) -> bool {
        true
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        path.to_path_buf()
    }
}

#[test]
fn a_file_that_is_too_long_is_told_and_not_loaded() {
    for size in [LONGEST_FILE as u64 + 1, u64::MAX] {
        let reading = read(&mut Claims(size), Path::new("root.cir"), &Options::default()).unwrap();
        let finding = &reading.findings[0];
        assert_eq!(finding.rule, "limit-reached");
        assert!(finding.message.contains("at most 512 MiB are read"), "{}", finding.message);
        assert_eq!(finding.trail.len(), 1, "the include that leads there");
        assert_eq!(reading.circuit.elements.len(), 2);
    }
}

#[test]
fn of_very_many_findings_of_one_rule_the_rest_is_counted() {
    // found while lines are read, and while they are expanded
    let stray: String = (0..1500).map(|n| format!(".modle{n} x\n")).collect();
    let reading = read_one(&format!("t\nR1 a 0 1k\nR2 a 0 1k\n{stray}"));
    let more = |text: &str, reading: &Reading| {
        reading.findings.iter().filter(|f| f.rule == "limit-reached" && f.message.contains(text)).count()
    };
    assert_eq!(more("500 more findings of unknown-dot-line", &reading), 1);
    let broken: String = (0..1200).map(|n| format!("R{n} a 0 x\n")).collect();
    assert_eq!(more("200 more findings of unreadable-line", &read_one(&format!("t\n{broken}"))), 1);
}

#[test]
fn an_instance_may_stand_for_several_in_parallel() {
    let reading = read_one(
        "t\nV1 a 0 5\nX1 a 0 PART m=2\nX2 a 0 PART m={1+1}\n.subckt PART p q\nX3 p q INNER m=3\n.ends\n\
         .subckt INNER p q\nR1 p q 6k\nC1 p q 1u\nL1 p q 6m\nI1 p q 1m\nD1 p q DX\nE1 e q p q 2\nG1 p q p q 1m\n\
         V1 p s 0\nF1 p q V1 2\nH1 h q V1 6\nR2 s e 1k\nR3 h q 1k\n.model DX D\n.ends\n",
    );
    assert!(told(&reading).is_empty(), "{:?}", told(&reading));
    let circuit = &reading.circuit;
    for instance in ["X1", "X2"] {
        let part = |name: &str| &circuit.element(find(circuit, &format!("{instance}:X3:{name}"))).behaviour;
        let number = |name: &str| match part(name) {
            Behaviour::Resistor(v) => v.number,
            Behaviour::Capacitor { farads, .. } => farads.number,
            Behaviour::Inductor { henries, .. } => henries.number,
            Behaviour::CurrentSource(source) => source.dc.unwrap().number,
            Behaviour::Diode { area, .. } => *area,
            Behaviour::VoltageByVoltage { gain }
            | Behaviour::CurrentByVoltage { gain }
            | Behaviour::VoltageByCurrent { gain, .. }
            | Behaviour::CurrentByCurrent { gain, .. } => gain.number,
            other => panic!("{other:?}"),
        };
        // six alike in parallel: conductances add, voltages stay, a current that is followed is the sum of six
        let expected = [
            ("R1", 1e3),
            ("C1", 6e-6),
            ("L1", 1e-3),
            ("I1", 6e-3),
            ("D1", 6.0),
            ("E1", 2.0),
            ("G1", 6e-3),
            ("F1", 2.0),
            ("H1", 1.0),
        ];
        for (name, value) in expected {
            assert!((number(name) / value - 1.0).abs() < 1e-12, "{name}: {}", number(name));
        }
    }
}

#[test]
fn connectors_are_no_transistors() {
    let reading = read_one("t\nJ1 a b CONN\nJ2 a b c d e CONN5\nJ3 a b c JX\nJ4 a b c JX 2\n.model JX NJF\n");
    let circuit = &reading.circuit;
    let pins = |name: &str| nodes(circuit, name).len();
    assert_eq!((pins("J1"), pins("J2"), pins("J3"), pins("J4")), (2, 5, 3, 3));
    assert!(told(&reading).is_empty(), "{:?}", told(&reading));
    let is_transistor =
        |n: &str| matches!(circuit.element(find(circuit, n)).behaviour, Behaviour::Transistor { .. });
    assert_eq!(["J1", "J2", "J3", "J4"].map(is_transistor), [false, false, true, true]);
}

/// What another model type means by its numbers is not ours to guess: a switch on it would stand wrong in silence.
#[test]
fn a_switch_on_a_model_of_another_type_is_not_evaluated() {
    let reading = read_one(
        "t\nV1 a 0 5\nS1 a b c 0 MX\nW1 b 0 V1 MX\nS2 a b c 0 MS\nV2 c 0 1\n.model MX OTHER(VON=3)\n.model MS SW(VT=2)\n",
    );
    let is_unknown = |n: &str| {
        matches!(reading.circuit.element(find(&reading.circuit, n)).behaviour, Behaviour::Unknown { .. })
    };
    assert_eq!(["S1", "W1", "S2"].map(is_unknown), [true, true, false]);
}
