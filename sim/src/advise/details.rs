//! What may be added on the command line: the cut, the finish, the life, the bar, the thread, the jaws.

use std::num::NonZeroU8;

use clap::Args;
use rimrate_core::machine::HolderKind;
use rimrate_core::setup::{
    self, Bar, Details, Diameter, HalfNut, InsertBox, Jaws, Life, Ra, Support, Thread,
};
use rimrate_core::trade::edge;
use rimrate_core::trade::{Operation, Tool};
use rimrate_core::units::{Length, SurfaceSpeed};

use crate::fail::Fail;

/// Options that make the advice more exact; what is missing is not weighed.
#[derive(Args, Debug)]
#[command(next_help_heading = "The cut, where more is known")]
pub(super) struct DetailOptions {
    /// Depth of cut: "2 mm", "0.08 in".
    #[arg(long)]
    depth: Option<String>,
    /// Feed in a revolution, in a tooth when milling: "0.2 mm", "0.008 in".
    #[arg(long)]
    feed: Option<String>,
    /// Nose radius of the tool: "0.8 mm".
    #[arg(long)]
    nose_radius: Option<String>,
    /// Wanted roughness Ra: "1.6 um", "63 uin".
    #[arg(long)]
    ra: Option<String>,
    /// Wanted edge life: "60 min", "2 h".
    #[arg(long)]
    life: Option<String>,
    /// Cutting speed printed on the insert's box: "250 m/min".
    #[arg(long)]
    box_speed: Option<String>,
    /// Edge life that the box speaks of; 15 min where missing.
    #[arg(long, requires = "box_speed")]
    box_life: Option<String>,
    /// How far the bar sticks out: "250 mm".
    #[arg(long)]
    stick_out: Option<String>,
    /// What holds its far end: free, tailstock or behind (out of the back of the headstock); free where missing.
    #[arg(long, requires = "stick_out")]
    support: Option<String>,
    /// Diameter of the bar, where --diameter is that of a drill, bore or cutter.
    #[arg(long, requires = "stick_out")]
    stock: Option<String>,
    /// Bore of a tube that sticks out.
    #[arg(long, requires = "stick_out")]
    tube_bore: Option<String>,
    /// Lead of the thread: "1.75 mm", "20 tpi".
    #[arg(long)]
    lead: Option<String>,
    /// Room for the tool behind the end of the thread, up to a shoulder.
    #[arg(long, requires = "lead")]
    runout: Option<String>,
    /// What is done at the thread's end: opened, closed or away (cut away from the shoulder); both cases where missing.
    #[arg(long, requires = "lead")]
    half_nut: Option<String>,
    /// Length of the cut, or depth of the hole.
    #[arg(long)]
    length: Option<String>,
    /// Teeth of the cutter.
    #[arg(long)]
    teeth: Option<String>,
    /// Width of cut when milling; width of the blade when parting.
    #[arg(long)]
    width: Option<String>,
    /// Jaws of the chuck, for the grip that they lose by turning.
    #[arg(long, requires_all = ["jaw_mass", "jaw_radius", "grip"])]
    jaws: Option<String>,
    /// Mass of one jaw: "0.8 kg".
    #[arg(long, requires = "jaws")]
    jaw_mass: Option<String>,
    /// Radius of a jaw's mass centre: "60 mm".
    #[arg(long, requires = "jaws")]
    jaw_radius: Option<String>,
    /// Grip of the whole chuck at rest: "15 kN".
    #[arg(long, requires = "jaws")]
    grip: Option<String>,
    /// The work is off balance.
    #[arg(long)]
    off_balance: bool,
    /// The cut is interrupted: keyway, slot, square bar.
    #[arg(long)]
    interrupted: bool,
}

impl DetailOptions {
    /// Checks what was typed.
    pub(super) fn read(
        &self,
        diameter: Diameter,
        tool: Tool,
        operation: Operation,
        holder: Option<HolderKind>,
    ) -> Result<Details, Fail> {
        let word = |field: &str, text: &str, known: &[&str]| {
            Fail::input(format!(
                "{field}: `{text}` is unknown; allowed: {}",
                known.join(", ")
            ))
        };
        let teeth = self.teeth.as_deref().map(|text| {
            text.trim()
                .parse::<NonZeroU8>()
                .ok()
                .filter(|z| z.get() <= 100)
                .ok_or_else(|| {
                    Fail::input(format!(
                        "teeth: `{text}` is out of range; allowed: a whole number, 1 to 100"
                    ))
                })
        });
        let jaws = match (&self.jaws, &self.jaw_mass, &self.jaw_radius, &self.grip) {
            (Some(n), Some(mass), Some(radius), Some(grip)) => {
                Some(Jaws::parse(n, mass, radius, grip).map_err(Fail::input)?)
            }
            _ => None,
        };
        let bar = match length("stick-out", &self.stick_out, (0.1, 10_000.0))? {
            None => None,
            Some(out) => Some(self.bar(out, diameter, operation)?),
        };
        let thread = match &self.lead {
            None => None,
            Some(text) => Some(Thread {
                lead: setup::lead(text).map_err(Fail::input)?,
                runout: length("runout", &self.runout, (0.1, 1000.0))?,
                half_nut: self
                    .half_nut
                    .as_deref()
                    .map(|text| {
                        HalfNut::from_id(text)
                            .ok_or_else(|| word("half-nut", text, &HalfNut::ALL.map(HalfNut::id)))
                    })
                    .transpose()?,
            }),
        };
        let depth = length("depth", &self.depth, (0.001, 100.0))?;
        let radius = diameter.mm() / 2.0;
        let turning = matches!(
            operation,
            Operation::RoughTurning | Operation::FinishTurning
        );
        if let Some(depth) = depth.filter(|a| turning && a.mm() > radius) {
            return Err(Fail::input(format!(
                "depth: `{depth}` goes beyond the middle of the work; allowed: 0.001 mm to {radius} mm, half of the diameter"
            )));
        }
        let details = Details {
            depth,
            feed: length("feed", &self.feed, (0.001, 10.0))?,
            nose_radius: length("nose-radius", &self.nose_radius, (0.01, 20.0))?,
            ra: self
                .ra
                .as_deref()
                .map(Ra::parse)
                .transpose()
                .map_err(Fail::input)?,
            life: life("life", &self.life)?,
            insert_box: match &self.box_speed {
                None => None,
                Some(text) => {
                    let speed = box_speed(text)?;
                    let life = life("box-life", &self.box_life)?.unwrap_or(Life::OF_BOX);
                    if !tool.is_carbide() {
                        return Err(Fail::input(format!(
                            "box-speed: `{text}` does not go with {}, which has no inserts; allowed: with carbide or coated-carbide",
                            tool.id()
                        )));
                    }
                    Some(InsertBox { speed, life })
                }
            },
            bar,
            thread,
            length: length("length", &self.length, (0.1, 100_000.0))?,
            teeth: teeth.transpose()?,
            width: length("width", &self.width, (0.01, 1000.0))?,
            jaws,
            off_balance: self.off_balance,
            interrupted: self.interrupted,
        };
        self.only_what_applies(operation, holder)?;
        Ok(details)
    }

    /// Refuses what was typed for nothing: an option that the operation or the holder does not have.
    fn only_what_applies(
        &self,
        operation: Operation,
        holder: Option<HolderKind>,
    ) -> Result<(), Fail> {
        let refused = |field: &str, value: &str, with: &str, allowed: &str| {
            Err(Fail::input(format!(
                "{field}: `{value}` does not go with {with}; allowed: with {allowed}"
            )))
        };
        // A drill, reamer or tap of so many flutes turns at its own diameter's speed: its feed is that of a turn.
        let counts_teeth = operation == Operation::Milling;
        let mills_or_parts = operation.is_milling() || operation == Operation::Parting;
        let threads = operation.is_threading();
        let to_an_end = operation == Operation::Threading;
        let turned = operation.is_turning();
        let has_depth = turned || operation.is_milling();
        let own_feed = !threads;
        let boxed = edge::box_share(operation).is_some();
        let ids = |go: &dyn Fn(Operation) -> bool| {
            let ids: Vec<&str> = Operation::ALL
                .into_iter()
                .filter(|&o| go(o))
                .map(Operation::id)
                .collect();
            ids.join(", ")
        };
        let single_point = ids(&Operation::is_turning);
        let all = [
            ("lead", &self.lead, threads, ids(&Operation::is_threading)),
            ("runout", &self.runout, to_an_end, "threading".to_owned()),
            (
                "half-nut",
                &self.half_nut,
                to_an_end,
                "threading".to_owned(),
            ),
            ("teeth", &self.teeth, counts_teeth, "milling".to_owned()),
            (
                "width",
                &self.width,
                mills_or_parts,
                "milling, fly-cutting, parting".to_owned(),
            ),
            ("ra", &self.ra, turned, single_point.clone()),
            ("nose-radius", &self.nose_radius, turned, single_point),
            (
                "depth",
                &self.depth,
                has_depth,
                ids(&|o| o.is_turning() || o.is_milling()),
            ),
            ("feed", &self.feed, own_feed, ids(&|o| !o.is_threading())),
            (
                "box-speed",
                &self.box_speed,
                boxed,
                format!(
                    "{}: the box does not speak of other cuts, whose speed the table gives",
                    ids(&|o| edge::box_share(o).is_some())
                ),
            ),
        ];
        for (field, value, goes, allowed) in &all {
            if let Some(value) = value.as_ref().filter(|_| !goes) {
                return refused(field, value, operation.id(), allowed);
            }
        }
        let jawed = matches!(holder, Some(HolderKind::ThreeJaw | HolderKind::FourJaw));
        if let Some(value) = self.jaws.as_ref().filter(|_| !jawed) {
            return refused(
                "jaws",
                value,
                holder.map_or("a holder that is not known", HolderKind::name),
                "a three-jaw or four-jaw chuck",
            );
        }
        Ok(())
    }

    fn bar(&self, out: Length, diameter: Diameter, operation: Operation) -> Result<Bar, Fail> {
        let stock = length("stock", &self.stock, (0.1, 2000.0))?;
        let outside = match stock {
            Some(stock) => stock.mm(),
            None if operation.is_outside_turning() => diameter.mm(),
            None => {
                return Err(Fail::input(format!(
                    "stock: missing beside stick-out, for the diameter is that of the {}; allowed: the bar's diameter, a number with mm or in, 0.1 mm to 2000 mm",
                    operation.diameter_word()
                )));
            }
        };
        let bore = length("tube-bore", &self.tube_bore, (0.01, 2000.0))?;
        if let Some(bore) = bore.filter(|b| b.mm() >= outside) {
            return Err(Fail::input(format!(
                "tube-bore: `{bore}` leaves no wall; allowed: less than the bar's {outside} mm"
            )));
        }
        let support = match self.support.as_deref() {
            None => Support::Free,
            Some(text) => Support::from_id(text).ok_or_else(|| {
                Fail::input(format!(
                    "support: `{text}` is unknown; allowed: {}",
                    Support::ALL.map(Support::id).join(", ")
                ))
            })?,
        };
        Ok(Bar {
            length: out,
            support,
            stock,
            bore,
        })
    }
}

/// Reads a length where one was typed.
fn length(field: &str, text: &Option<String>, range: (f32, f32)) -> Result<Option<Length>, Fail> {
    match text {
        None => Ok(None),
        Some(text) => setup::length(field, text, range)
            .map(Some)
            .map_err(Fail::input),
    }
}

/// Reads an edge life where one was typed.
fn life(field: &str, text: &Option<String>) -> Result<Option<Life>, Fail> {
    match text {
        None => Ok(None),
        Some(text) => Life::parse(field, text).map(Some).map_err(Fail::input),
    }
}

fn box_speed(text: &str) -> Result<SurfaceSpeed, Fail> {
    let allowed = "a number with m/min or ft/min, 1 m/min to 2000 m/min";
    text.parse::<SurfaceSpeed>()
        .map_err(|e| Fail::input(format!("box-speed: `{text}` {e}; allowed: {allowed}")))
        .and_then(|v| {
            if (1.0..=2000.0).contains(&v.m_min()) {
                Ok(v)
            } else {
                Err(Fail::input(format!(
                    "box-speed: `{text}` is out of range; allowed: {allowed}"
                )))
            }
        })
}
