//! The `aims` of tuning.

use super::document::{Node, line_of};
use super::fields::{Checker, Fields, Limits, above};
use super::file::{Aim, BandName, Follow, Level, Target, Within};
use super::read_tune::{MAX_COUPLED_LEVELS, MAX_LEVELS};
use crate::diagnostics::{Diagnostic, probably_meant};
use crate::units::{self, Dimension};

pub(super) const ENERGY_LIMITS: Limits = above(0.0, 10.0, "more than 0 eV, at most 10 eV");
pub(super) const WAVELENGTH_LIMITS: Limits = above(0.0, 1e7, "more than 0 µm, at most 10 mm");
const DIPOLE_LIMITS: Limits = above(0.0, 1e5, "more than 0 nm, at most 100 µm");
const WEIGHT_LIMITS: Limits = above(0.0, 1e6, "more than 0, at most 1e6");
/// What an aim can be about.
const TARGETS: [&str; 4] = ["energy", "wavelength", "dipole", "maximize"];

/// The aims of `tune`, those without mistakes; `solved` are the bands that levels may belong to.
pub(super) fn aims(checker: &mut Checker, items: &[Node], solved: &[BandName]) -> Vec<Aim> {
    let mut found: Vec<Aim> = Vec::new();
    for item in items {
        let Some(aim) = aim(checker, item, solved) else {
            continue;
        };
        if let Some(first) = found.iter().find(|other| contradict(other, &aim)) {
            let line = line_of(checker.text, first.span.start);
            checker.report(
                Diagnostic::error(format!(
                    "the aim on line {line} is about the same property of the same transition"
                ))
                .at(aim.span.clone())
                .expected("one value for each"),
            );
            continue;
        }
        found.push(aim);
    }
    found
}

/// Whether two aims want values of the same thing.
fn contradict(one: &Aim, other: &Aim) -> bool {
    let same_pair = (one.from, one.to) == (other.from, other.to)
        || (one.from, one.to) == (other.to, other.from);
    let about_energy =
        |aim: &Aim| matches!(aim.target, Target::EnergyEv(_) | Target::WavelengthUm(_));
    same_pair && one.follow == other.follow && about_energy(one) == about_energy(other)
}

fn aim(checker: &mut Checker, item: &Node, solved: &[BandName]) -> Option<Aim> {
    let fields = checker.fields(
        item,
        "an aim",
        &[
            "from",
            "to",
            "energy",
            "wavelength",
            "dipole",
            "maximize",
            "weight",
            "within",
            "follow",
        ],
    )?;
    checker.missing(&fields, "this aim", "from", "conduction 1");
    checker.missing(&fields, "this aim", "to", "conduction 2");
    let from = fields
        .get("from")
        .and_then(|node| level(checker, node, solved));
    let to = fields
        .get("to")
        .and_then(|node| level(checker, node, solved));
    let ends_differ = from.is_none() || from != to;
    if !ends_differ && let Some(node) = fields.get("to") {
        checker.report(
            Diagnostic::error("this aim goes from a level to itself")
                .at(node.span.clone())
                .expected("another level than `from`"),
        );
    }
    let target = target(checker, &fields);
    let weight = match fields.get("weight") {
        Some(node) => checker.number(node, WEIGHT_LIMITS),
        None => Some(1.0),
    };
    let within = match fields.get("within") {
        Some(node) => within(checker, node, target).map(Some),
        None => Some(None),
    };
    let follow = match fields.get("follow") {
        Some(node) => checker.word(node, &["order", "character"]),
        None => Some("order"),
    };
    let follow = match follow? {
        "character" => Follow::Character,
        _ => Follow::Order,
    };
    let (mut from, mut to) = (from?, to.filter(|_| ends_differ)?);
    // Emission is written from the upper level to the lower; counted by energy, it is the same transition. By character,
    // the two may have changed places, and then the order says which of them is to be the upper one.
    if !is_lower_first(from, to) && (follow == Follow::Order || from.band != to.band) {
        std::mem::swap(&mut from, &mut to);
    }
    suits_bands(checker, &fields, [from, to], target, follow, solved)?;
    Some(Aim {
        from,
        to,
        target: target?,
        weight: weight?,
        within: within?,
        follow,
        span: checker.head(&item.span),
    })
}

/// Whether the first of two levels has the lower energy.
pub(super) fn is_lower_first(from: Level, to: Level) -> bool {
    match (from.band, to.band) {
        (BandName::Conduction, BandName::Conduction) => from.index < to.index,
        (one, other) if one == other => from.index > to.index,
        // Of two different hole bands neither is the lower: the file says which is meant.
        (from, _) => from != BandName::Conduction,
    }
}

/// Holds that an aim between bands asks for what there is between bands.
fn suits_bands(
    checker: &mut Checker,
    fields: &Fields,
    levels: [Level; 2],
    target: Option<Target>,
    follow: Follow,
    solved: &[BandName],
) -> Option<()> {
    let mut fits = true;
    if levels[0].band != levels[1].band
        && let Some(key @ ("dipole" | "maximize")) = ["dipole", "maximize"]
            .into_iter()
            .find(|key| fields.has(key))
        && target.is_some()
    {
        let node = fields.get(key)?;
        checker.report(
            Diagnostic::error("a dipole along growth is between levels of one band")
                .at(node.span.clone())
                .expected("`energy` or `wavelength` between bands"),
        );
        fits = false;
    }
    // Where the holes are coupled, `valence` is the name of their band; else it only counts.
    let counts_apart = solved.contains(&BandName::HeavyHole);
    if follow == Follow::Character
        && counts_apart
        && levels.iter().any(|l| l.band == BandName::Valence)
    {
        checker.report(
            Diagnostic::error("`valence` counts levels by energy, whatever their character")
                .at(fields.get("follow")?.span.clone())
                .expected("`heavy-hole` or `light-hole` levels to follow"),
        );
        fits = false;
    }
    fits.then_some(())
}

/// `conduction 2`, of one of the solved bands.
pub(super) fn level(checker: &mut Checker, node: &Node, solved: &[BandName]) -> Option<Level> {
    let expected = "a level such as `conduction 2`";
    let text = checker.scalar(node, expected)?;
    let mut words = text.split_whitespace();
    let (word, index, rest) = (words.next().unwrap_or_default(), words.next(), words.next());
    let known = BandName::ALL.into_iter().find(|band| band.word() == word);
    let coupled = known == Some(BandName::Valence) && !solved.contains(&BandName::HeavyHole);
    let most = if coupled {
        MAX_COUPLED_LEVELS
    } else {
        MAX_LEVELS
    };
    let problem = match known {
        None => {
            let problem = Diagnostic::error(format!("`{word}` is no band"));
            match probably_meant(word, solved.iter().map(|band| band.word())) {
                Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
                None => problem,
            }
        }
        Some(band) if !solved.contains(&band) => {
            let problem = Diagnostic::error(format!("the band `{word}` is not solved"));
            if solved.contains(&BandName::Valence) {
                problem.hint("the holes of this file are coupled: their levels are `valence 1`, `valence 2`, …, heavy and light ones together")
            } else {
                problem.hint("holes are solved with `valence: {model: decoupled}` under `bands:`, or with `six-band` or `eight-band`")
            }
        }
        Some(band) => match (index.map(str::parse::<u32>), rest) {
            (Some(Ok(index)), None) if (1..=most).contains(&index) => {
                return Some(Level {
                    band,
                    index: index as usize,
                });
            }
            (Some(Ok(0)), None) => Diagnostic::error("levels are counted from 1"),
            (Some(Ok(index)), None) => Diagnostic::error(format!(
                "level {index} is beyond the {most} that can be solved"
            )),
            (None, _) => Diagnostic::error("the number of the level is missing"),
            _ => Diagnostic::error(format!("`{text}` is no level")),
        },
    };
    checker.report(
        problem
            .at(node.span.clone())
            .expected(format!("expected {expected}")),
    );
    None
}

fn target(checker: &mut Checker, fields: &Fields) -> Option<Target> {
    let named: Vec<&str> = TARGETS.into_iter().filter(|key| fields.has(key)).collect();
    let key = match named.as_slice() {
        [key] => *key,
        [] => {
            checker.report(
                Diagnostic::error("this aim does not say what the transition shall have")
                    .at(fields.head.clone())
                    .expected("one of `energy: 36 meV`, `wavelength: 8.6 µm`, `dipole: 2 nm`, `maximize: dipole`"),
            );
            return None;
        }
        [first, second, ..] => {
            checker.report(
                Diagnostic::error(format!(
                    "this aim asks for `{first}` and `{second}` at once"
                ))
                .at(fields.head.clone())
                .expected("one of them per aim"),
            );
            return None;
        }
    };
    let node = fields.get(key)?;
    let mut length = |limits| {
        Some(
            checker
                .quantity(node, &[Dimension::Length], limits)?
                .value
                .value(),
        )
    };
    match key {
        "wavelength" => length(WAVELENGTH_LIMITS).map(|nm| Target::WavelengthUm(nm * 1e-3)),
        "dipole" => length(DIPOLE_LIMITS).map(Target::DipoleNm),
        "energy" => {
            let energy = checker.quantity(node, &[Dimension::Energy], ENERGY_LIMITS)?;
            Some(Target::EnergyEv(energy.value.value()))
        }
        _ => checker
            .word(node, &["dipole"])
            .map(|_| Target::MaximizeDipole),
    }
}

fn within(checker: &mut Checker, node: &Node, target: Option<Target>) -> Option<Within> {
    let expected = match target? {
        Target::EnergyEv(_) => "an energy such as `1 meV`, or a part such as `1 %`",
        Target::WavelengthUm(_) => {
            "a length such as `20 nm`, an energy such as `1 meV`, or a part such as `1 %`"
        }
        Target::DipoleNm(_) => "a length such as `0.1 nm`, or a part such as `1 %`",
        Target::MaximizeDipole => {
            checker.report(
                Diagnostic::error("an aim that maximizes has no value to come near to")
                    .at(node.span.clone())
                    .expected("no `within` here"),
            );
            return None;
        }
    };
    let text = checker.scalar(node, expected)?;
    let positive = |value: f64| value > 0.0 && value.is_finite();
    let problem = match units::split_number(text) {
        Some((number, "%")) if positive(number) && number < 100.0 => {
            return Some(Within::Fraction(number * 1e-2));
        }
        Some((_, "%")) => format!("`{text}` is out of range"),
        _ => match units::parse(text, &[Dimension::Energy, Dimension::Length]) {
            Ok(quantity) if !positive(quantity.value()) => format!("`{text}` is out of range"),
            Ok(quantity) => match (quantity.unit.dimension, target?) {
                (Dimension::Energy, Target::EnergyEv(_) | Target::WavelengthUm(_)) => {
                    return Some(Within::EnergyEv(quantity.value()));
                }
                (Dimension::Length, Target::WavelengthUm(_) | Target::DipoleNm(_)) => {
                    return Some(Within::LengthNm(quantity.value()));
                }
                (dimension, _) => format!("{} does not suit this aim", dimension.noun()),
            },
            Err(error) => error.to_string(),
        },
    };
    checker.report(
        Diagnostic::error(problem)
            .at(node.span.clone())
            .expected(format!("expected {expected}")),
    );
    None
}
