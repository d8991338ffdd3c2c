//! One-dimensional crystals from text to bands, against published tables and closed forms.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

#[path = "bands/mod.rs"]
mod bench;

use bench::{Bench, EV};
use crenate::bands::{Class, Feature, GapKind, Solution, TargetState};
use crenate::model::{ParameterKind, Setting};

/// 4J/Er and W/Er of a lattice s·Er·sin²(kx): Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008), Table I
/// (from memory; every entry was reproduced by computation).
const TABLE_I: [(f64, f64, f64); 5] = [
    (3.0, 0.444_109, 0.451_894),
    (5.0, 0.263_069, 0.264_211),
    (10.0, 0.076_730, 0.076_747),
    (15.0, 0.026_075, 0.026_076),
    (20.0, 0.009_965, 0.009_965),
];

fn optical(depth: f64) -> String {
    format!(
        "crystal lattice_of_light\n  mass 86.909180 u\n  lattice chain 532 nm\n  recoil 1064 nm\n  depth 1 = {depth} Er\n  \
         carriers bosons\n  measure j = hopping 1 by 1\n"
    )
}

#[test]
fn optical_lattices_have_the_published_widths() {
    for (depth, _, width) in TABLE_I {
        let bench = Bench::new(&optical(depth));
        let crystal = bench.build(0, &Default::default()).crystal;
        let recoil = crystal.recoil.expect("a recoil").energy.value;
        let found = bench.solve(0).bands[0].width.value / recoil;
        assert!(
            (found - width).abs() < 1e-6,
            "s = {depth}: W = {found} Er, in print {width} Er"
        );
    }
}

/// cos ka = cos z + P sin z / z has its band tops at z = nπ for P > 0, and the mass there is −P/π² of the particle's
/// for n = 1 (Kronig & Penney, Proc. R. Soc. A 130, 499 (1931), in the limit of spikes; closed form).
#[test]
fn a_comb_of_spikes_follows_its_closed_form() {
    // P = m S a / ħ²; with 1 me, 1 nm and S = 0.5 eV nm.
    let hbar2_per_me = 2.0 * 0.038_099_821_109_685_837;
    let p = 0.5 / hbar2_per_me;
    let bench =
        Bench::new("crystal comb\n  mass 1 me\n  lattice chain 1 nm\n  delta 0.5 eV*nm at 0.25\n");
    let solution = bench.solve(0);
    let top = solution.bands[0].top.energy.value / EV;
    let exact = 0.038_099_821_109_685_837 * std::f64::consts::PI.powi(2);
    assert!(
        (top - exact).abs() < 1e-9 * exact,
        "top {top} eV, exact {exact} eV"
    );
    let mass = solution.bands[0].top.mass.expect("a mass").value / 9.109_383_713_9e-31;
    let expected = -p / std::f64::consts::PI.powi(2);
    assert!(
        (mass - expected).abs() < 1e-8,
        "mass {mass} me, closed form {expected} me"
    );
    assert_eq!(solution.bands[0].top.point.as_deref(), Some("edge"));
}

/// A weak cosine opens a first gap of 2|V_G| (first-order perturbation theory, common practice).
#[test]
fn a_weak_cosine_opens_a_gap_of_twice_its_component() {
    let bench = Bench::new("crystal weak\n  mass 1 me\n  lattice chain 1 nm\n  cosine 1 = 1 meV\n");
    let gap = bench.solve(0).gaps[0].size.value / EV;
    assert!((gap / 1e-3 - 1.0).abs() < 1e-5, "gap {gap} eV");
}

/// The same cosine written as a wave, a profile and a pair of components has the same bands.
#[test]
fn one_potential_has_one_answer_however_it_is_written() {
    let head = "crystal c\n  mass 0.3 me\n  lattice chain 2 nm\n";
    let texts = [
        format!("{head}  cosine 1 = 80 meV phase 0.4\n"),
        format!("{head}  profile = 80 meV * cos(2*pi*x/period + 0.4)\n"),
        format!("{head}  fourier 1 = 40 meV phase 0.4\n  fourier -1 = 40 meV phase -0.4\n"),
        format!(
            "{head}  profile -0.7 nm to 0.5 nm = 80 meV * cos(2*pi*x/period + 0.4)\n  \
             profile 0.5 nm to 1.3 nm = 80 meV * cos(2*pi*x/period + 0.4)\n"
        ),
    ];
    let solutions: Vec<_> = texts.iter().map(|text| Bench::new(text).solve(0)).collect();
    for (solution, text) in solutions.iter().zip(&texts) {
        for (gap, first) in solution.gaps.iter().zip(&solutions[0].gaps) {
            let allowed = gap.size.uncertainty + first.size.uncertainty;
            assert!(
                (gap.size.value - first.size.value).abs() <= allowed,
                "{text}: {gap:?} against {first:?}"
            );
        }
    }
}

/// Two particles fill one band of two states a level: with a gap above it the crystal is a semiconductor; one particle
/// makes a metal (common practice).
#[test]
fn filling_decides_the_class() {
    for (filling, class) in [
        (2, Class::Semiconductor),
        (1, Class::Metal),
        (3, Class::Metal),
    ] {
        let text = format!(
            "crystal c\n  mass 0.067 me\n  layer 6 nm at 0 meV\n  layer 3 nm at 250 meV\n  filling {filling}\n"
        );
        let solution = Bench::new(&text).solve(0);
        assert_eq!(solution.class, Some(class), "filling {filling}");
        assert!(solution.fermi.is_some());
    }
    let empty = "crystal free\n  mass 1 me\n  lattice chain 1 nm\n  profile = 0 eV\n  filling 2\n";
    let solution = Bench::new(empty).solve(0);
    assert_eq!(solution.gaps[0].kind, GapKind::Closed);
    assert_eq!(solution.class, Some(Class::Semimetal));
}

#[test]
fn targets_are_met_missed_and_untestable() {
    let text = "crystal c\n  mass 0.067 me\n  layer 6 nm at 0 meV\n  layer 3 nm at 250 meV\n  require gap 1 >= 10 meV\n  \
                require gap 1 >= 10 eV\n  require fermi <= 1 eV\n  measure line = bottom 2 - top 1\n  require line = gap 1 within 1 %\n";
    let (targets, measures) = Bench::new(text).assess(0);
    let states: Vec<_> = targets.iter().map(|target| target.state).collect();
    assert_eq!(
        states,
        [
            TargetState::Met,
            TargetState::Missed,
            TargetState::Untestable,
            TargetState::Met
        ]
    );
    let solution = Bench::new(text).solve(0);
    let line = measures[0].value.clone().expect("a value");
    assert!(
        (line.value - solution.gaps[0].size.value).abs()
            <= line.uncertainty + solution.gaps[0].size.uncertainty
    );
}

/// J of the same lattices, Table I (from memory; every entry was reproduced by computation).
#[test]
fn optical_lattices_have_the_published_hoppings() {
    for (depth, four_j, _) in TABLE_I {
        let bench = Bench::new(&optical(depth));
        let recoil = bench
            .build(0, &Default::default())
            .crystal
            .recoil
            .expect("a recoil")
            .energy
            .value;
        let (_, measures) = bench.assess(0);
        let found = 4.0 * measures[0].value.clone().expect("a hopping").value / recoil;
        assert!(
            (found - four_j).abs() < 1e-6,
            "s = {depth}: 4J = {found} Er, in print {four_j} Er"
        );
    }
}

/// Two corners with gaps of about 5.5 meV, and between them the gap closes: the phase of the wall's two layers passes a
/// multiple of π.
#[test]
fn a_gap_that_closes_inside_the_tolerance_is_found() {
    let text = "crystal c\n  mass 0.067 me\n  layer 4.5 nm ± 0.2 nm at 0 meV\n  layer 11.56 nm at 235 meV\n  \
                require gap 2 >= 1 meV\n";
    let bench = Bench::new(text);
    let draw = bench
        .build(0, &Setting::default())
        .crystal
        .parameters
        .into_iter();
    let draw = draw
        .filter(|parameter| parameter.kind == ParameterKind::Draw)
        .map(|parameter| parameter.id)
        .next_back()
        .unwrap();
    for end in [-1.0, 1.0] {
        let mut setting = Setting::default();
        setting.draws.insert(draw, end);
        let gap = bench.solve_at(0, &setting).gaps[1].size.value / EV;
        assert!(
            (gap - 5.5e-3).abs() < 0.5e-3,
            "gap 2 at the corner {end}: {gap} eV"
        );
    }
    let (targets, _) = bench.assess(0);
    assert!(
        targets[0].worst.expect("a worst value") / EV < 1e-6,
        "{targets:?}"
    );
    assert!(
        matches!(targets[0].state, TargetState::AtRisk | TargetState::Missed),
        "{targets:?}"
    );
}

/// Worst cases over several tolerances against every point of a grid.
#[test]
fn worst_cases_are_no_better_than_a_grid() {
    let cases = [
        "crystal c\n  mass 0.067 me\n  let a = 5 nm ± 4 %\n  layer a at 0 meV\n  layer 3 nm ± 0.2 nm at 240 meV ± 10 meV mass 0.09 me\n  \
         require gap 1 >= 0 meV\n  require width 1 >= 0 meV\n",
        "crystal c\n  mass 0.067 me\n  layer 4.5 nm ± 0.2 nm at 0 meV\n  layer 11.56 nm ± 0.1 nm at 235 meV\n  \
         require gap 2 >= 0 meV\n",
        "crystal c\n  mass 1 me\n  lattice chain 1 nm\n  cosine 1 = 0.4 eV ± 0.2 eV\n  cosine 2 = 0.3 eV ± 0.25 eV\n  \
         cosine 3 = 0.2 eV ± 5 % phase 0.3\n  require gap 2 >= 0 eV\n",
    ];
    for text in cases {
        let bench = Bench::new(text);
        let parameters = bench.build(0, &Setting::default()).crystal.parameters;
        let draws: Vec<_> = parameters
            .iter()
            .filter(|one| one.kind == ParameterKind::Draw)
            .map(|one| one.id)
            .collect();
        let (targets, _) = bench.assess(0);
        for (index, target) in targets.iter().enumerate() {
            let n: i32 = if draws.len() == 3 { 5 } else { 11 };
            let mut least = f64::INFINITY;
            for point in 0..n.pow(draws.len() as u32) {
                let mut setting = Setting::default();
                for (axis, draw) in draws.iter().enumerate() {
                    let step = point / n.pow(axis as u32) % n;
                    setting
                        .draws
                        .insert(*draw, -1.0 + 2.0 * f64::from(step) / f64::from(n - 1));
                }
                let solution = bench.solve_at(0, &setting);
                let values = [
                    solution.gaps[0].size,
                    solution.bands[0].width,
                    solution.gaps[1].size,
                ];
                let value = match target.text.as_str() {
                    text if text.starts_with("gap 1") => values[0],
                    text if text.starts_with("width 1") => values[1],
                    _ => values[2],
                };
                least = least.min(value.value);
            }
            let worst = target.worst.expect("a worst value");
            assert!(
                worst <= least * (1.0 + 1e-9),
                "target {index} of {text}: {worst} is above the grid's {least}"
            );
        }
    }
}

/// The chain rule through layers, ramps, waves, profiles, sites and masses, against differences of whole solves.
#[test]
fn derivatives_agree_with_differences() {
    let cases = [
        "material w\n  mass 0.067 me\n  edge 0 meV\n  rate 1.02\nmaterial b\n  mass 0.09 me\n  edge 230 meV\n  nonparabolic 2.1 eV\n\
         crystal c\n  layer 5 nm of w\n  layer 1 nm of w to b\n  layer 2 nm of b\n  delta 0.05 eV*nm at 3.2 nm\n",
        "crystal c\n  mass 0.3 me\n  let depth = 90 meV\n  lattice chain 3 nm\n  cosine 1 = depth phase 0.3\n  \
         cosine 2 = depth / 3\n  site gaussian -60 meV sigma 0.4 nm at 0.7 nm\n  site box 25 meV size 0.5 nm at 2 nm\n",
        "crystal c\n  mass 0.3 me\n  let a = 40 meV\n  let p = 2 nm\n  lattice chain 4 nm\n  \
         profile -1 nm to p = a * (x/nm)^2\n  profile p to 3 nm = 160 meV - 120 meV*(x/nm - 2)\n",
    ];
    for text in cases {
        let bench = Bench::new(text);
        let crystal = bench.build(0, &Setting::default()).crystal;
        let sensitivities = bench
            .solver
            .sensitivities(&crystal, 3, &|| false)
            .expect("sensitivities");
        let mut checked = 0;
        for parameter in crystal
            .parameters
            .iter()
            .filter(|one| one.kind != ParameterKind::Draw && one.value != 0.0)
        {
            let step = 1e-4 * parameter.value;
            let at = |times: f64| {
                let mut setting = Setting::default();
                setting
                    .overrides
                    .insert(parameter.id, parameter.value + times * step);
                bench.solve_at(0, &setting)
            };
            let mut moved = Setting::default();
            moved.overrides.insert(parameter.id, parameter.value + step);
            if bench.build(0, &moved).crystal.broken {
                continue; // one end of a piece alone opens the cell
            }
            let ends = [at(-2.0), at(-1.0), at(1.0), at(2.0)];
            for sensitivity in &sensitivities {
                let value = |solution: &Solution| match sensitivity.feature {
                    Feature::Gap(n) => solution.gaps[n - 1].size.value,
                    Feature::Width(n) => solution.bands[n - 1].width.value,
                    Feature::Bottom(n) => solution.bands[n - 1].bottom.energy.value,
                    Feature::Top(n) => solution.bands[n - 1].top.energy.value,
                };
                let [a, b, c, d] = [0, 1, 2, 3].map(|end| value(&ends[end]));
                let difference = (8.0 * (c - b) - (d - a)) / 12.0;
                let found = sensitivity
                    .slopes
                    .iter()
                    .find(|(id, _)| *id == parameter.id)
                    .map_or(0.0, |(_, slope)| slope * step);
                let scale = 1e-7 * b.abs().max(1e-4 * EV) * 1e-3;
                assert!(
                    (found - difference).abs() <= scale.max(2e-6 * difference.abs()),
                    "{:?} by {:?} `{}` of {text}: {found} against {difference}",
                    sensitivity.feature,
                    parameter.kind,
                    parameter.text
                );
                checked += 1;
            }
        }
        assert!(checked >= 24, "only {checked} derivatives were checked");
    }
}

/// Slopes of gap 1 and of the top of band 2 by what has this name, and the same from whole solves to the right of its value
/// (a spike on a face moves into the layer to its right): (−3 f₀ + 4 f₁ − f₂)/2h, extrapolated.
fn slopes_to_the_right(text: &str, name: &str, step: f64) -> Vec<(f64, f64)> {
    let bench = Bench::new(text);
    let crystal = bench.build(0, &Setting::default()).crystal;
    let parameter = crystal
        .parameters
        .iter()
        .find(|one| one.kind == ParameterKind::Name(name.into()))
        .unwrap_or_else(|| panic!("no {name} among {:?}", crystal.parameters))
        .clone();
    let sensitivities = bench
        .solver
        .sensitivities(&crystal, 2, &|| false)
        .expect("sensitivities");
    let at = |times: f64| {
        let mut setting = Setting::default();
        setting
            .overrides
            .insert(parameter.id, parameter.value + times * step);
        let solution = bench.solve_at(0, &setting);
        [
            solution.gaps[0].size.value,
            solution.bands[1].top.energy.value,
        ]
    };
    let f: Vec<[f64; 2]> = [0.0, 0.5, 1.0, 2.0].map(at).to_vec();
    [Feature::Gap(1), Feature::Top(2)]
        .iter()
        .enumerate()
        .map(|(i, feature)| {
            let coarse = (-3.0 * f[0][i] + 4.0 * f[2][i] - f[3][i]) / (2.0 * step);
            let fine = (-3.0 * f[0][i] + 4.0 * f[1][i] - f[2][i]) / step;
            let found = sensitivities
                .iter()
                .find(|one| one.feature == *feature)
                .and_then(|one| one.slopes.iter().find(|(id, _)| *id == parameter.id))
                .map_or(0.0, |(_, slope)| *slope);
            (found, fine + (fine - coarse) / 3.0)
        })
        .collect()
}

/// A spike at the start of the cell, on a face, or at an end of a piece moves as one anywhere else does.
#[test]
fn spikes_on_a_cut_have_slopes_by_their_place() {
    let cases = [
        "crystal c\n  mass 0.3 me\n  lattice chain 2 nm\n  cosine 1 = 80 meV phase 0.5\n  let d = 0 nm\n  delta 0.05 eV*nm at d\n",
        "crystal c\n  mass 0.3 me\n  lattice chain 2 nm\n  cosine 1 = 80 meV phase 0.5\n  let d = 2 nm\n  delta 0.05 eV*nm at d\n",
        "crystal c\n  let d = 0 nm\n  layer 2 nm at 0 meV mass 0.3 me\n  layer 1 nm at 200 meV mass 0.5 me\n  \
         delta 0.05 eV*nm at d\n",
        "crystal c\n  let d = 2 nm\n  layer 2 nm at 0 meV mass 0.3 me\n  layer 1 nm at 200 meV to 90 meV mass 0.5 me\n  \
         delta 0.05 eV*nm at d\n",
        "crystal c\n  mass 0.3 me\n  let d = 2 nm\n  layer 2 nm at 0 meV\n  layer 1 nm at 200 meV\n  cosine 1 = 30 meV\n  \
         delta 0.05 eV*nm at d\n  delta -0.02 eV*nm at 1 nm\n",
        "crystal c\n  mass 0.3 me\n  let d = 1 nm\n  lattice chain 3 nm\n  profile 0 nm to 1 nm = 90 meV * (x/nm)^2\n  \
         profile 1 nm to 3 nm = 20 meV * x/nm\n  delta 0.05 eV*nm at d\n",
    ];
    for text in cases {
        for (found, difference) in slopes_to_the_right(text, "d", 2e-13) {
            assert!(
                (found - difference).abs() <= 2e-5 * difference.abs() && found != 0.0,
                "{text}: {found:e} against {difference:e}"
            );
        }
    }
}

/// All kinds of parameter (numbers, names, fields of materials, tolerances), at a gap open by a millionth of its bands'
/// spacing: its slopes change as fast as it does, and each must be met relative to itself.
#[test]
fn derivatives_near_a_closed_gap_agree_with_differences() {
    let text = "material w\n  mass 0.067 me\n  edge 0 meV\n  rate 1 ± 1 %\nmaterial b\n  mass 0.067 me\n  edge 0.02 meV ± 10 %\n\
                crystal c\n  let thin = 1.7 nm\n  layer 5 nm of w\n  layer thin of b\n  layer 2.1 nm ± 3 % at 0.007 meV\n  mass 0.067 me\n";
    let bench = Bench::new(text);
    let crystal = bench.build(0, &Setting::default()).crystal;
    assert!(!crystal.broken);
    let solution = bench.solve(0);
    let gap = solution.gaps[0].size;
    let spacing = solution.bands[0].width.value;
    assert!(
        gap.value < 1e-3 * spacing && gap.value > 1e3 * gap.uncertainty,
        "{gap:?} of {spacing:e}"
    );
    let sensitivities = bench
        .solver
        .sensitivities(&crystal, 2, &|| false)
        .expect("sensitivities");
    let (mut names, mut fields, mut draws, mut literals) = (0, 0, 0, 0);
    for parameter in &crystal.parameters {
        if parameter.kind != ParameterKind::Draw && parameter.value == 0.0 {
            continue;
        }
        let draw = parameter.kind == ParameterKind::Draw;
        let slope = |feature: Feature| {
            let of = sensitivities.iter().find(|one| one.feature == feature);
            of.and_then(|one| one.slopes.iter().find(|(id, _)| *id == parameter.id))
                .map_or(0.0, |(_, slope)| *slope)
        };
        let base = if draw { 0.0 } else { parameter.value };
        // the gap may change by no more than a hundredth of itself
        let step = (1e-3 * if draw { 1.0 } else { base.abs() })
            .min(0.01 * gap.value / slope(Feature::Gap(1)).abs());
        let at = |times: f64| {
            let mut setting = Setting::default();
            let place = if draw {
                &mut setting.draws
            } else {
                &mut setting.overrides
            };
            place.insert(parameter.id, base + times * step);
            bench.solve_at(0, &setting)
        };
        let ends = [-2.0, -1.0, 1.0, 2.0].map(at);
        for (feature, value) in [
            (
                Feature::Gap(1),
                ends.each_ref().map(|one| one.gaps[0].size.value),
            ),
            (
                Feature::Top(1),
                ends.each_ref().map(|one| one.bands[0].top.energy.value),
            ),
            (
                Feature::Bottom(2),
                ends.each_ref().map(|one| one.bands[1].bottom.energy.value),
            ),
            (
                Feature::Width(1),
                ends.each_ref().map(|one| one.bands[0].width.value),
            ),
        ] {
            let [a, b, c, d] = value;
            let difference = (8.0 * (c - b) - (d - a)) / 12.0;
            let found = slope(feature) * step;
            let noise = 40.0 * gap.uncertainty + 1e-15 * b.abs();
            assert!(
                (found - difference).abs() <= noise + 1e-6 * difference.abs(),
                "{feature:?} by {:?} `{}`: {found:e} against {difference:e}",
                parameter.kind,
                parameter.text
            );
            match parameter.kind {
                ParameterKind::Literal => literals += 1,
                ParameterKind::Name(_) => names += 1,
                ParameterKind::Field(..) => fields += 1,
                ParameterKind::Draw => draws += 1,
            }
        }
    }
    assert!(
        names >= 4 && fields >= 12 && draws >= 12 && literals >= 16,
        "{names} names, {fields} fields, {draws} tolerances, {literals} literals"
    );
}

/// Half of the first band's states of free particles lie below ħ²(π/2a)²/2m, one and a half bands' below that of 3π/2a; in a
/// comb of spikes they lie below cos z + P sin z/z = 0 (Kronig & Penney, Proc. R. Soc. A 130, 499 (1931), in the limit of
/// spikes; closed forms); above whole bands the level stands in the middle of the gap (common practice).
#[test]
fn fermi_levels_follow_their_closed_forms() {
    const HBAR2_2ME: f64 = 0.038_099_821_109_685_837; // eV nm², CODATA 2022
    let pi = std::f64::consts::PI;
    for (filling, z) in [(1, pi / 2.0), (3, 1.5 * pi)] {
        let text = format!(
            "crystal free\n  mass 1 me\n  lattice chain 1 nm\n  profile = 0 eV\n  filling {filling}\n  measure level = fermi\n"
        );
        let bench = Bench::new(&text);
        let fermi = bench.assess(0).1[0].value.clone().expect("a Fermi level");
        let exact = HBAR2_2ME * z * z;
        assert!(
            (fermi.value / EV - exact).abs() < 1e-9 * exact,
            "filling {filling}: {} eV against {exact} eV",
            fermi.value / EV
        );
    }
    let comb = "crystal comb\n  mass 1 me\n  lattice chain 1 nm\n  delta 0.5 eV*nm at 0.25\n  filling 1\n  \
                require fermi <= 0.4 eV\n";
    let p = 0.5 / (2.0 * HBAR2_2ME);
    let (mut low, mut high) = (pi / 2.0, pi);
    for _ in 0..60 {
        let z: f64 = 0.5 * (low + high);
        if z.cos() + p * z.sin() / z > 0.0 {
            low = z;
        } else {
            high = z;
        }
    }
    let (targets, _) = Bench::new(comb).assess(0);
    let (found, exact) = (targets[0].value.unwrap().value / EV, HBAR2_2ME * low * low);
    assert!(
        (found - exact).abs() < 1e-9 * exact,
        "{found} eV against {exact} eV"
    );
    assert_eq!(targets[0].state, TargetState::Met);
    let whole = Bench::new(&comb.replace("filling 1", "filling 2"));
    let solution = whole.solve(0);
    let middle = 0.5 * (solution.bands[0].top.energy.value + solution.bands[1].bottom.energy.value);
    let fermi = solution.fermi.unwrap();
    assert!((fermi.value - middle).abs() <= 2.0 * fermi.uncertainty + 1e-15 * middle);
}

/// Bosons fill no bands: no Fermi level and no class, while widths and hoppings are as ever.
#[test]
fn bosons_have_neither_fermi_level_nor_class() {
    let text = optical(5.0) + "  require fermi <= 1 Er\n  require hopping 1 by 1 >= 0.06 Er\n";
    let bench = Bench::new(&text);
    let built = bench.build(0, &Setting::default());
    let solution = bench
        .solver
        .solve(&built.crystal, &|| false)
        .expect("bands");
    assert!(solution.fermi.is_none() && solution.class.is_none());
    assert!(built.crystal.bosons);
    if !built.crystal.broken {
        let (targets, _) = bench.assess(0);
        assert_eq!(targets[0].state, TargetState::Untestable, "{targets:?}");
        assert_eq!(targets[1].state, TargetState::Met, "{targets:?}");
    }
}

/// A limit inside the uncertainty decides nothing: at the nominal values, and at the worst ones.
#[test]
fn limits_inside_the_uncertainty_leave_a_target_undecided() {
    let free = "crystal free\n  mass 1 me\n  lattice chain 1 nm\n  profile = 0 eV\n  require gap 1 >= 0 meV\n  \
                require gap 1 <= 0 meV\n  require gap 1 >= 1 ueV\n  require gap 1 <= 1 ueV\n";
    let (targets, _) = Bench::new(free).assess(0);
    let states: Vec<_> = targets.iter().map(|target| target.state).collect();
    assert_eq!(
        states,
        [
            TargetState::Undecided,
            TargetState::Undecided,
            TargetState::Missed,
            TargetState::Met
        ]
    );
    assert!(targets[0].reason.is_some());
    let closing = "crystal c\n  mass 0.067 me\n  layer 4.45 nm ± 0.2 nm at 0 meV\n  layer 11.56 nm at 235 meV\n  \
                   require gap 2 >= 0 meV\n";
    let (targets, _) = Bench::new(closing).assess(0);
    assert_eq!(targets[0].state, TargetState::Undecided, "{targets:?}");
    assert!(targets[0].reason.as_deref().unwrap().contains("worst"));
}

/// J over one to three cells: the rows of `reference/optical_lattice.csv`, computed with mpmath at 40 digits and more; J₁ is
/// that of Bloch, Dalibard & Zwerger, Rev. Mod. Phys. 80, 885 (2008), Table I.
#[test]
fn hoppings_over_several_cells_meet_their_rows() {
    let mut checked = 0;
    for line in include_str!("reference/optical_lattice.csv").lines() {
        let fields: Vec<&str> = line.split(',').collect();
        if fields[0] != "hop" || !["0.5", "5", "10", "20"].contains(&fields[1]) {
            continue;
        }
        let depth: f64 = fields[1].parse().unwrap();
        let text =
            optical(depth) + "  measure j2 = hopping 1 by 2\n  measure j3 = hopping 1 by 3\n";
        let bench = Bench::new(&text);
        let built = bench.build(0, &Setting::default());
        let recoil = built.crystal.recoil.expect("a recoil").energy.value;
        let (_, measures) = bench.assess(0);
        for (measure, field) in measures.iter().zip(&fields[2..5]) {
            let found = measure.value.clone().expect("a hopping");
            let exact: f64 = field.parse().unwrap();
            let error = (found.value / recoil - exact).abs();
            // the recoil energy itself is known to some units in the last place
            assert!(
                error <= found.uncertainty / recoil + 1e-13 * exact.abs(),
                "s = {depth} {}: {} Er against {exact} Er",
                measure.name,
                found.value / recoil
            );
            assert!(error <= 1e-9 * exact.abs());
            checked += 1;
        }
    }
    assert_eq!(checked, 12);
}
