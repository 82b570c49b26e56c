//! Random networks: seeded, hence the same on every machine, and drawn over everything a network
//! file can state. All of them are invented.

use std::f64::consts::PI;
use std::ops::{Range, RangeInclusive};

use fastrand::Rng;
use stillflame::modes::{self, Solved};
use stillflame::network::Network;

use super::rig::{End, Exit, Feed, Gas, Inflow, Piece, Response, Rig, Size, What};

/// What may be drawn.
#[derive(Clone, Debug)]
pub struct Wish {
    pub ducts: RangeInclusive<usize>,
    pub flames: RangeInclusive<usize>,
    pub stream: Stream,
    /// Ducts may carry entropy.
    pub carried: bool,
    /// Every interaction index is zero.
    pub silent: bool,
    pub ends: Ends,
    /// Longest time a carried entropy wave may take along one duct (s).
    pub longest_carried: f64,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[allow(dead_code, reason = "no test draws every kind of stream")]
pub enum Stream {
    Still,
    /// Up to Mach 0.3 anywhere.
    Flowing,
    Either,
    /// Flow stated as a Mach number at the feed, and only ends that bear still gas.
    Variable,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[allow(dead_code, reason = "no test draws every kind of ends")]
pub enum Ends {
    Any,
    /// No complex reflection coefficient.
    Real,
    /// Closed, open, anechoic, or a real reflection coefficient of at most one.
    Passive,
}

impl Default for Wish {
    /// The networks of the campaign.
    fn default() -> Self {
        Wish {
            ducts: 3..=8,
            flames: 1..=2,
            stream: Stream::Either,
            carried: true,
            silent: false,
            ends: Ends::Any,
            longest_carried: 0.04,
        }
    }
}

/// A network with its mean flow and acoustics.
#[derive(Clone, Debug)]
pub struct Drawn {
    pub seed: u64,
    pub rig: Rig,
    pub network: Network,
    pub solved: Solved,
    /// Networks drawn before it that have no mean flow below Mach 0.3 or no elimination.
    #[allow(dead_code, reason = "only a campaign tells it")]
    pub redrawn: usize,
}

/// Greatest Mach number drawn.
pub const FASTEST: f64 = 0.3;

/// The network of that seed.
pub fn draw(seed: u64, wish: &Wish) -> Drawn {
    for redrawn in 0..100 {
        let mut d = Draw {
            rng: Rng::with_seed(seed.wrapping_mul(1000).wrapping_add(redrawn as u64)),
            wish,
        };
        let mut rig = d.rig(seed);
        if !d.let_flow(&mut rig) {
            continue;
        }
        let network = rig.network();
        if let Ok(solved) = modes::solve(&network) {
            return Drawn {
                seed,
                rig,
                network,
                solved,
                redrawn,
            };
        }
    }
    panic!("seed {seed}: nothing drawn can be solved");
}

struct Draw<'w> {
    rng: Rng,
    wish: &'w Wish,
}

impl Draw<'_> {
    fn within(&mut self, r: Range<f64>) -> f64 {
        r.start + (r.end - r.start) * self.rng.f64()
    }

    /// Evenly distributed in the logarithm.
    fn scale(&mut self, r: Range<f64>) -> f64 {
        self.within(r.start.ln()..r.end.ln()).exp()
    }

    fn chance(&mut self, p: f64) -> bool {
        self.rng.f64() < p
    }

    fn size(&mut self, diameter: Range<f64>) -> Size {
        let d = self.scale(diameter);
        self.size_of(d * d * PI / 4.0)
    }

    fn size_of(&mut self, area: f64) -> Size {
        if self.rng.bool() {
            Size::Area(area)
        } else {
            Size::Diameter((area * 4.0 / PI).sqrt())
        }
    }

    fn gas(&mut self, gamma: Range<f64>) -> Gas {
        let gamma = self.within(gamma);
        match self.rng.u8(0..3) {
            0 => Gas::Air,
            1 => Gas::ByConstant {
                gamma,
                gas_constant: self.within(270.0..310.0),
            },
            _ => Gas::ByMolarMass {
                gamma,
                molar_mass: self.within(0.027..0.030),
            },
        }
    }

    fn reflection(&mut self) -> End {
        let passive = self.wish.ends == Ends::Passive;
        let most = if passive || self.chance(0.9) {
            1.0
        } else {
            1.1
        };
        let coefficient = match self.rng.u8(0..6) {
            0 => 1.0,
            1 => -1.0,
            2 => 0.0,
            _ => self.within(-most..most),
        };
        let phase = match self.rng.u8(0..4) {
            0 => PI,
            1 | 2 if self.wish.ends == Ends::Any => self.within(-PI..PI),
            _ => 0.0,
        };
        End::Reflection { coefficient, phase }
    }

    fn end(&mut self, feed: bool, flows: bool) -> End {
        let passive = self.wish.ends == Ends::Passive;
        loop {
            match self.rng.u8(0..7) {
                0 => return End::Closed,
                1 => return End::Open,
                2 if feed && !passive => return End::Reservoir,
                3 => return End::Anechoic,
                4 if flows && !passive => return End::Choked,
                5 | 6 => return self.reflection(),
                _ => {}
            }
        }
    }

    /// A network whose flow, if it flows, is a trial yet.
    fn rig(&mut self, seed: u64) -> Rig {
        let flows = match self.wish.stream {
            Stream::Still | Stream::Variable => false,
            Stream::Flowing => true,
            Stream::Either => self.chance(0.65),
        };
        let trial = if flows || self.wish.stream == Stream::Variable {
            Inflow::Mach(self.scale(0.005..FASTEST))
        } else {
            match self.rng.u8(0..3) {
                0 => Inflow::MassFlow(0.0),
                1 => Inflow::Velocity(0.0),
                _ => Inflow::Mach(0.0),
            }
        };
        let temperature = self.within(280.0..900.0);
        let feed = Feed {
            gas: self.gas(1.3..1.42),
            flow: Some(trial),
            temperature,
            pressure: Some(self.scale(8e4..3e6)),
            end: self.end(true, flows),
        };
        let pieces = self.pieces(temperature);
        let mut exit = Exit {
            end: self.end(false, flows),
            throat: None,
        };
        if exit.end == End::Choked && self.rng.bool() {
            // To be filled in when the flow is known.
            exit.throat = Some(self.size(0.01..0.02));
        }
        let mut rig = Rig {
            title: format!("Random network {seed}"),
            feed,
            pieces,
            exit,
        };
        self.responses(&mut rig);
        rig
    }

    /// Passages of one area each, in them ducts, restrictions and flames, between them area changes
    /// and plenums.
    fn pieces(&mut self, mut temperature: f64) -> Vec<Piece> {
        let ducts = self.rng.usize(self.wish.ducts.clone());
        let flames = self.rng.usize(self.wish.flames.clone());
        let count = self.rng.usize(1..=ducts.min(5));
        let mut passages = vec![vec!['d']; count];
        for _ in count..ducts {
            let at = self.rng.usize(0..count);
            passages[at].push('d');
        }
        for _ in 0..flames {
            let at = self.rng.usize(0..count);
            passages[at].push('f');
        }
        for passage in &mut passages {
            while self.chance(0.25) {
                passage.push('r');
            }
            self.rng.shuffle(passage);
        }
        let mut pieces = Vec::new();
        let mut area: Option<f64> = None;
        for passage in passages {
            let next = self.size(0.03..0.25);
            if let Some(before) = area {
                let name = format!("change_{}", pieces.len());
                let effective_length = self.slug();
                let what = match (self.chance(0.25), next.area() < before) {
                    (true, _) => What::Plenum(self.scale(3e-4..0.03)),
                    (false, true) => What::Contraction(effective_length),
                    (false, false) => What::Expansion(effective_length),
                };
                pieces.push(Piece { name, what });
            }
            area = Some(next.area());
            for kind in passage {
                let n = pieces.len();
                let (name, what) = match kind {
                    'd' => ("duct", self.duct(next)),
                    'r' => ("plate", self.restriction(next.area())),
                    _ => ("flame", self.flame(&mut temperature)),
                };
                let name = format!("{name}_{n}");
                pieces.push(Piece { name, what });
            }
        }
        pieces
    }

    fn slug(&mut self) -> f64 {
        if self.chance(0.4) {
            0.0
        } else {
            self.within(0.003..0.06)
        }
    }

    fn duct(&mut self, size: Size) -> What {
        let carried = self.wish.carried && self.chance(0.35);
        let dispersed = self.chance(0.6);
        What::Duct {
            length: self.scale(0.04..1.2),
            size,
            carried: carried.then(|| {
                if dispersed {
                    self.within(1e-4..3e-3)
                } else {
                    0.0
                }
            }),
        }
    }

    fn restriction(&mut self, area: f64) -> What {
        let stated = self.rng.bool();
        let open = area * self.within(0.2..1.0);
        What::Restriction {
            loss: if self.chance(0.15) {
                0.0
            } else {
                self.within(0.1..6.0)
            },
            effective_length: self.slug(),
            opening: stated.then(|| self.size_of(open)),
        }
    }

    fn flame(&mut self, temperature: &mut f64) -> What {
        let velocity = self.chance(0.3);
        let hotter = !velocity || self.rng.bool();
        let burnt_temperature = hotter.then(|| {
            let ratio = if *temperature < 1200.0 {
                1.3..3.5
            } else {
                1.1..1.4
            };
            *temperature = (*temperature * self.within(ratio)).min(2900.0);
            *temperature
        });
        let other = hotter && self.rng.bool();
        What::Flame {
            burnt_temperature,
            burnt_gas: other.then(|| self.gas(1.22..1.35)),
            velocity,
            responses: Vec::new(),
        }
    }

    /// The responses, once every station they may follow is there.
    fn responses(&mut self, rig: &mut Rig) {
        let names: Vec<String> = rig.pieces.iter().map(|p| p.name.clone()).collect();
        for at in 0..rig.pieces.len() {
            if let What::Flame { responses, .. } = &mut rig.pieces[at].what {
                let count = [0, 1, 1, 1, 1, 1, 2, 2, 3][self.rng.usize(0..9)];
                *responses = (0..count).map(|_| self.response(&names, at)).collect();
            }
        }
    }

    fn response(&mut self, names: &[String], own: usize) -> Response {
        let delay = self.within(0.0..0.009);
        let gaussian = self.chance(0.4);
        let index = match self.rng.u8(0..8) {
            _ if self.wish.silent => 0.0,
            0 => 0.0,
            1 | 2 => self.within(-2.5..0.0),
            _ => self.within(0.0..3.0),
        };
        let before = self.rng.usize(0..=own);
        let behind = self.rng.usize(own..names.len());
        let reference = match self.rng.u8(0..10) {
            0 => Some("feed.out".to_owned()),
            1 | 2 if before < own => Some(format!("{}.in", names[before])),
            3 if before < own => Some(names[before].clone()),
            4 => Some(format!("{}.out", names[behind])),
            5 => Some("exit.in".to_owned()),
            _ => None,
        };
        Response {
            index,
            delay,
            spread: gaussian.then(|| delay * self.within(0.02..0.33)),
            reference,
        }
    }

    /// Slows the trial flow until it stays below Mach 0.3, then states it in one of the ways there
    /// are. False where no flow is found.
    fn let_flow(&mut self, rig: &mut Rig) -> bool {
        let Some(Inflow::Mach(mut mach)) = rig.feed.flow else {
            return true;
        };
        if mach == 0.0 {
            return true;
        }
        let throat = rig.exit.throat.take();
        for _ in 0..30 {
            rig.feed.flow = Some(Inflow::Mach(mach));
            let fastest = modes::solve(&rig.network()).ok().map(|solved| {
                let states = &solved.mean.states;
                let fastest = states.iter().map(|s| s.mach()).fold(0.0, f64::max);
                (fastest, solved)
            });
            match fastest {
                Some((fastest, solved)) if fastest <= FASTEST => {
                    self.state_flow(rig, &solved, throat);
                    return true;
                }
                _ => mach *= 0.6,
            }
        }
        false
    }

    fn state_flow(&mut self, rig: &mut Rig, solved: &Solved, throat: Option<Size>) {
        let first = &solved.mean.states[0];
        if self.wish.stream != Stream::Variable {
            match self.rng.u8(0..3) {
                0 => rig.feed.flow = Some(Inflow::MassFlow(first.mass_flow())),
                1 => rig.feed.flow = Some(Inflow::Velocity(first.velocity)),
                _ => {}
            }
        }
        if let (Some(size), Some(area)) = (throat, solved.mean.throat_area) {
            rig.exit.throat = Some(match size {
                Size::Diameter(_) => Size::Diameter((area * 4.0 / PI).sqrt()),
                Size::Area(_) => Size::Area(area),
            });
            if self.rng.bool() {
                rig.feed.flow = None;
            } else {
                rig.feed.flow = Some(Inflow::MassFlow(first.mass_flow()));
                rig.feed.pressure = None;
            }
        }
        // Entropy that takes long along a duct has mixed out.
        for (piece, state) in rig.pieces.iter_mut().zip(&solved.mean.states) {
            if let What::Duct {
                length, carried, ..
            } = &mut piece.what
                && *length > self.wish.longest_carried * state.velocity
            {
                *carried = None;
            }
        }
    }
}
