//! What the checks share: the parts, the weakest short circuits, the draw.

use super::{CLOSED_CASE, Case, Circumstances, Finding, Hazards, Kind, Level, NotJudged};
use crate::arrangements::{self, Arranged, Given, ShortCircuit};
use crate::margins;
use crate::press::PressStart;
use crate::ratings::Ratings;
use crate::report::{ChargeReport, Mode, Protector};
use crate::setup::Setup;
use crate::units::{Amps, Celsius, Seconds};

impl Hazards {
    /// A check that was made, and what it found.
    pub(super) fn check(&mut self, found: Option<(Level, Kind)>) {
        self.checks_made += 1;
        if let Some((level, kind)) = found {
            self.findings.push(Finding { level, kind });
        }
    }

    pub(super) fn cannot(&mut self, what: NotJudged) {
        self.not_judged.push(what);
    }
}

/// Every charge there is: nominal, weak, cold.
pub(super) fn charges<'a>(c: &Circumstances<'a>) -> impl Iterator<Item = &'a ChargeReport> {
    [Some(c.charge), c.weak_charge, c.cold_charge].into_iter().flatten()
}

/// The largest draw at the end of a press that ends lit, all charges; where none does, what a press would draw with
/// the arc lit and a full cell.
///
/// A press that opens in its inrush ends at a current that is no draw.
pub(super) fn steady_draw(c: &Circumstances<'_>) -> Amps {
    let lit = charges(c)
        .flat_map(|r| &r.presses)
        .filter(|p| p.summary.end_mode == Mode::Lit)
        .map(|p| p.summary.current_end.0)
        .reduce(f64::max);
    let would = || {
        margins::end_of_press(c.corners.typical, 1.0, c.corners.typical.usage.ambient).1.map(|s| s.current.0)
    };
    Amps(lit.or_else(would).unwrap_or(0.0))
}

/// The checks, with what several of them need.
pub(super) struct Look<'c, 'a> {
    pub(super) c: &'c Circumstances<'a>,
    /// The nominal parts.
    pub(super) nominal: &'a Setup,
    /// As they are wired.
    pub(super) arranged: Arranged,
    /// Largest steady draw of a press, all cells.
    pub(super) draw: Amps,
    /// Largest current of a press, all cells.
    pub(super) peak: Amps,
}

/// The leads' shortest time to their limit.
pub(super) fn lead_limit(short: &ShortCircuit) -> Option<Seconds> {
    short.leads.iter().map(|l| l.limit).min_by(|a, b| a.0.total_cmp(&b.0))
}

impl<'c, 'a> Look<'c, 'a> {
    pub(super) fn new(c: &'c Circumstances<'a>, given: &Given<'a>) -> Self {
        Self {
            c,
            nominal: c.corners.typical,
            arranged: arrangements::arranged(given, c.corners.typical.arrangement),
            draw: steady_draw(c),
            peak: Amps(
                charges(c).flat_map(|r| &r.presses).fold(0.0, |m: f64, p| m.max(p.summary.peak_current.0)),
            ),
        }
    }

    pub(super) fn ratings(&self) -> &'a Ratings {
        self.c.ratings
    }

    pub(super) fn parallel(&self) -> f64 {
        f64::from(self.nominal.cell.parallel)
    }

    pub(super) fn closed(&self) -> f64 {
        if self.ratings().keeping.closed_case { CLOSED_CASE } else { 1.0 }
    }

    pub(super) fn held(&self) -> bool {
        self.ratings().keeping.held_hours > 0.0
    }

    pub(super) fn cases(&self) -> [(Case, Celsius); 2] {
        [(Case::Ambient, self.nominal.usage.ambient), (Case::Cold, self.ratings().keeping.cold)]
    }

    /// Weak parts with the protectors at their late corner, at an ambient temperature.
    pub(super) fn weak_and_late(&self, ambient: Celsius) -> Setup {
        self.with_boards_of(self.c.corners.high, self.c.weak, ambient)
    }

    /// Parts with the protectors of another corner, wired as the nominal ones, at an ambient temperature.
    pub(super) fn with_boards_of(&self, corner: &Setup, parts: &Setup, ambient: Celsius) -> Setup {
        let mut setup = arrangements::wired(parts, self.nominal.arrangement);
        setup.usage.ambient = ambient;
        setup.board = corner.board.clone();
        setup.second_protector = corner.second_protector.clone();
        setup
    }

    /// Where a weak short circuit is looked at: full and empty, at ambient and cold.
    pub(super) fn weak_shorts(&self) -> Vec<(Case, Setup, PressStart, ShortCircuit)> {
        let mut list = Vec::new();
        for (case, t) in self.cases() {
            let setup = self.weak_and_late(t);
            for soc in [1.0, 0.0] {
                let start = PressStart::relaxed(&setup, soc, t);
                let short = arrangements::short_circuit(&setup, &start, &self.ratings().leads);
                list.push((case, setup.clone(), start, short));
            }
        }
        list
    }

    /// When the fuse clears for certain, in the slower of the surroundings; never, if it cannot interrupt the full
    /// current.
    pub(super) fn fuse_clears(&self, current: Amps) -> Option<Seconds> {
        let fuse = self.ratings().fuse.as_ref()?;
        if fuse.breaking.is_some_and(|most| self.arranged.short_full.current > most) {
            return None;
        }
        let [a, b] = self.cases().map(|(_, t)| arrangements::fuse_time(fuse, current, t).latest);
        Some(Seconds(a?.0.max(b?.0)))
    }

    /// Whether a current stage opens, though over-discharge detection may be quicker.
    pub(super) fn a_stage_opens(&self, setup: &Setup, start: &PressStart) -> bool {
        let mut stages_only = setup.clone();
        for board in [&mut stages_only.board, &mut stages_only.second_protector].into_iter().flatten() {
            board.over_discharge = None;
        }
        arrangements::opens_on_short(&stages_only, start).is_some()
    }

    /// Lowest steady current that trips a stage.
    pub(super) fn lowest_trip(&self, setup: &Setup, start: &PressStart) -> Option<Amps> {
        let boards =
            [(Protector::Board, setup.board_in_path()), (Protector::Second, setup.second_protector.as_ref())];
        boards
            .into_iter()
            .filter_map(|(protector, board)| board.map(|b| (protector, b)))
            .flat_map(|(protector, b)| b.stages.iter().map(move |stage| (protector, stage)))
            .map(|(protector, stage)| arrangements::trip_needed(setup, protector, stage, start, 1.0))
            .min_by(|a, b| a.0.total_cmp(&b.0))
    }
}
