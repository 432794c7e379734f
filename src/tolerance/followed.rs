//! The levels whose distances are followed from wafer to wafer, in all bands that are solved.

use super::charged::{Slopes, slopes};
use crate::models::Band;
use crate::structure::{BandName, Cause, Charge, Design, Level, Structure, Window};
use crate::subbands::{Bands, Nearby, Place};

/// Named levels in the bands of a solved design.
#[derive(Clone, Debug)]
pub struct Followed<'b> {
    /// Conduction levels, then those of each hole band, then what windows and aims call `valence`.
    pub names: Vec<Level>,
    /// Where each is in the design.
    places: Vec<Place>,
    /// Each band as the place to start from.
    nearby: Vec<Nearby<'b>>,
    energies_ev: Vec<f64>,
}

impl<'b> Followed<'b> {
    pub fn new(bands: &'b Bands, names: Vec<Level>) -> Followed<'b> {
        let places: Vec<Place> = names.iter().map(|name| bands.place(*name)).collect();
        Followed {
            energies_ev: energies_ev(bands, &names),
            names,
            places,
            nearby: bands.alone().map(Nearby::new).collect(),
        }
    }

    /// The energies of the named levels of the design, in eV.
    pub fn energies_ev(&self) -> &[f64] {
        &self.energies_ev
    }

    pub fn nearby(&self) -> &[Nearby<'b>] {
        &self.nearby
    }

    /// The slope of each solved level, band by band; `None` when the design has no room for the cause.
    pub fn band_slopes(&self, charge: &Charge, design: &Design, cause: &Cause) -> Option<Slopes> {
        slopes(charge, design, &self.nearby, cause)
    }

    /// Of numbers for each solved level those of the named ones.
    pub fn named(&self, of_bands: &[Vec<f64>]) -> Option<Vec<f64>> {
        let value = |place: &Place| of_bands[place.band].get(place.state).copied();
        self.places.iter().map(value).collect()
    }

    /// The slope of each named level.
    pub fn slopes(&self, charge: &Charge, design: &Design, cause: &Cause) -> Option<Vec<f64>> {
        self.named(&self.band_slopes(charge, design, cause)?.whole)
    }

    /// Where the named levels are on a wafer whose bands have these energies, those nearest the edge first. `None` when
    /// one is not among them.
    pub fn places_on(&self, energies_ev: &[Vec<f64>]) -> Option<Vec<Place>> {
        let mut holes: Vec<Place> = Vec::new();
        if self.names.iter().any(|name| name.band == BandName::Valence) {
            let all = (1..energies_ev.len()).flat_map(|band| {
                (0..energies_ev[band].len()).map(move |state| Place { band, state })
            });
            holes.extend(all);
            holes.sort_by(|a, b| {
                energies_ev[b.band][b.state].total_cmp(&energies_ev[a.band][a.state])
            });
        }
        let place = |(name, place): (&Level, &Place)| match name.band {
            BandName::Valence => holes.get(name.index - 1).copied(),
            _ => (place.state < energies_ev[place.band].len()).then_some(*place),
        };
        self.names.iter().zip(&self.places).map(place).collect()
    }
}

/// The energies of named levels in eV; the nearest there is where a band has too few.
pub fn energies_ev(bands: &Bands, names: &[Level]) -> Vec<f64> {
    let energy = |name: &Level| bands.energy_ev(bands.place(*name));
    names.iter().map(energy).collect()
}

/// The levels that windows name.
pub fn named_by(windows: &[Window]) -> Vec<Level> {
    let levels = windows.iter().flat_map(|window| [window.from, window.to]);
    levels.collect()
}

/// The levels to follow: those that the structure asks for, and what its windows and aims name.
pub fn names(structure: &Structure, windows: &[Window], bands: &Bands) -> Vec<Level> {
    let aims = structure.tune.iter().flat_map(|tune| &tune.aims);
    let of_windows = named_by(windows);
    let of_aims = aims.flat_map(|aim| [aim.from, aim.to]);
    let asked = bands.asked_for(structure);
    let mut names: Vec<Level> = Vec::new();
    for (solved, asked) in bands.alone().zip(asked) {
        let band = solved.band.name();
        let own = of_windows.iter().filter(|level| level.band == band);
        let highest = own.map(|level| level.index).max().unwrap_or(0);
        let count = asked.max(highest).min(solved.pairs.len());
        names.extend((1..=count).map(|index| Level { band, index }));
    }
    let holes = bands.holes().len();
    for level in of_windows.iter().copied().chain(of_aims) {
        let known = level.band == BandName::Valence && level.index <= holes;
        if known && !names.contains(&level) {
            names.push(level);
        }
    }
    names
}

/// As few levels of each band as the named ones need.
pub fn fewest(asked: &[(Band, usize)], names: &[Level]) -> Vec<(Band, usize)> {
    let count = |&(band, count): &(Band, usize)| (band, band.highest(names).clamp(1, count));
    asked.iter().map(count).collect()
}

/// The transitions between the named levels as places in their list, the level of lower energy first: inside each band, from each
/// hole to each electron, and what windows and aims name besides.
pub fn pairs(structure: &Structure, windows: &[Window], names: &[Level]) -> Vec<(usize, usize)> {
    let mut pairs: Vec<(usize, usize)> = Vec::new();
    for (i, one) in names.iter().enumerate() {
        for (j, other) in names.iter().enumerate().skip(i + 1) {
            match (one.band, other.band) {
                (BandName::Valence, _) | (_, BandName::Valence) => {}
                (BandName::Conduction, BandName::Conduction) => pairs.push((i, j)),
                (BandName::Conduction, _) => pairs.push((j, i)),
                // Holes are counted downwards.
                (one, other) if one == other => pairs.push((j, i)),
                _ => {}
            }
        }
    }
    let aims = structure.tune.iter().flat_map(|tune| &tune.aims);
    let of_windows = windows.iter().map(|window| (window.from, window.to));
    for (from, to) in of_windows.chain(aims.map(|aim| (aim.from, aim.to))) {
        let place = |level| names.iter().position(|name| *name == level);
        if let (Some(from), Some(to)) = (place(from), place(to))
            && !pairs.contains(&(from, to))
            && !pairs.contains(&(to, from))
        {
            pairs.push((from, to));
        }
    }
    pairs
}
