"""The invented workshop: people, machines, instruments, spools, magnets, recipes. All invented."""

from dataclasses import dataclass
from datetime import date, timedelta

SHOP = {"name": "Alder Lane Winding (invented)", "time_zone": "Europe/Berlin"}
CUSTOMER = "Seven Bridges Guitars (invented)"
LOUDSPEAKER_CUSTOMER = "Low Meadow Loudspeakers (invented)"
PASSWORD = "copper wax and felt"  # noqa: S105 - a demo, on this machine's own address only

OWNER = "Olga Fenn"
LEAD = "Mira Voss"
OPERATOR = "Tom Aldar"
BENCH = "Ines Brook"
AUDITOR = "Sam Reed"

PEOPLE: dict[str, list[str]] = {
    OWNER: ["owner"],
    LEAD: ["lead", "operator", "bench"],
    OPERATOR: ["operator"],
    BENCH: ["bench"],
    AUDITOR: ["auditor"],
}

WINDER_A = "Winder A"
WINDER_B = "Winder B"
MACHINES = (
    {"name": WINDER_A, "top_speed_rpm": 1500.0},
    {"name": WINDER_B, "top_speed_rpm": 600.0, "counts_direction": True},
)


def instruments(today: date) -> list[dict[str, object]]:
    """A bench meter with four wires, a bridge, and a hand-held meter whose calibration ran out."""
    calibrated = today - timedelta(days=120)
    return [
        {
            "name": "Bench meter",
            "serial_number": "INV-0117",
            "measures_resistance": True,
            "resistance_accuracy_percent": 0.05,
            "four_wire": True,
            "calibrated_on": str(calibrated),
            "calibration_due": str(calibrated + timedelta(days=365)),
        },
        {
            "name": "Bridge",
            "serial_number": "INV-0231",
            "measures_resistance": True,
            "measures_inductance": True,
            "resistance_accuracy_percent": 0.2,
            "inductance_accuracy_percent": 0.3,
            "four_wire": True,
            "calibrated_on": str(calibrated),
            "calibration_due": str(calibrated + timedelta(days=365)),
        },
        {
            "name": "Hand-held meter",
            "serial_number": "INV-0009",
            "measures_resistance": True,
            "resistance_accuracy_percent": 0.8,
            "resistance_accuracy_ohm": 50.0,
            "lead_resistance_ohm": 0.2,
            "calibrated_on": str(today - timedelta(days=500)),
            "calibration_due": str(today - timedelta(days=135)),
        },
    ]


@dataclass(frozen=True)
class SpoolPlan:
    """A spool; ``true_factor`` is what its wire really has over what a measured metre told."""

    key: str
    wire_size: str
    wire_build: str
    lot: str
    net_mass_kg: float
    ohm_per_metre: float
    true_factor: float = 1.0


SPOOLS = (
    SpoolPlan("even", "AWG 42", "single", "INV-42-A", 1.5, 5.41),
    # The outer metre was measured; deeper in, the wire is thinner.
    SpoolPlan("thin", "AWG 42", "single", "INV-42-B", 1.2, 5.39, 1.035),
    SpoolPlan("voice", "0.200 mm", "grade 1", "INV-V20", 2.0, 0.5451),
    SpoolPlan("finer", "AWG 43", "single", "INV-43-A", 0.9, 6.95),
)

MAGNETS = (
    {
        "material": "alnico 5",
        "piece": "rod 4.8 x 17 mm",
        "supplier_lot": "INV-M-05",
        "pieces": 600,
    },
    {
        "material": "alnico 2",
        "piece": "rod 4.8 x 17 mm",
        "supplier_lot": "INV-M-02",
        "pieces": 300,
    },
)


@dataclass(frozen=True)
class RecipePlan:
    key: str
    name: str
    kind: str
    note: str


RECIPES = (
    RecipePlan("long-single", "Long single (invented)", "pickup", "Six rods in a racetrack."),
    RecipePlan("soft-single", "Soft single (invented)", "pickup", "Finer wire, a softer magnet."),
    RecipePlan("screw-and-bar", "Screw and bar (invented)", "pickup", "Steel screws over a bar."),
    RecipePlan("wide-flat", "Wide flat (invented)", "pickup", "Wide and low, heavy enamel."),
    RecipePlan("narrow-tall", "Narrow tall (invented)", "pickup", "Narrow and high, 0.050 mm."),
    RecipePlan("voice-25", "Voice coil 25 (invented)", "voice coil", "Two layers, film former."),
    RecipePlan("voice-38", "Voice coil 38 (invented)", "voice coil", "Two layers, paper former."),
)


@dataclass(frozen=True)
class CoilPlan:
    """What really happens to one coil, and what people will see of it."""

    story: str
    recipe: str
    spool: str
    machine: str = WINDER_A
    missing_turns: int = 0
    shorted_share: float = 0.0
    coil_temperature_c: float = 21.6
    entered_temperature_c: float | None = None
    lose_answer: bool = False
    breaks_at: int | None = None
    quality_read: bool = False
    decisions: tuple[tuple[str, str | None, str | None], ...] = (("release", None, None),)


LONG_SINGLES = (
    CoilPlan("a quiet coil", "long-single", "even"),
    CoilPlan("the network drops an answer; the counter sends again", "long-single", "even",
             lose_answer=True),
    CoilPlan("the wire breaks at 3,100 turns; wound again", "long-single", "even",
             breaks_at=3100),
    CoilPlan("the sensor bounces: 260 turns fewer than counted", "long-single", "even",
             missing_turns=260, decisions=(("hold", None, "Counter under suspicion."),)),
    CoilPlan("the spool is thinner than its measured metre", "long-single", "thin",
             decisions=(("hold", None, "Spool to be measured again."),)),
    CoilPlan("turns are shorted at the flange", "long-single", "even", shorted_share=0.02,
             quality_read=True,
             decisions=(("scrap", "shorted turns", "Short at the flange, enamel cut."),)),
    CoilPlan("still warm from winding when first measured", "long-single", "even",
             coil_temperature_c=52.0, entered_temperature_c=22.0),
)  # fmt: skip

OTHERS = (CoilPlan("another recipe on the same machine", "soft-single", "finer"),)

VOICE_COILS = (
    CoilPlan("a voice coil on the slow machine", "voice-25", "voice", WINDER_B),
    CoilPlan("four turns short", "voice-25", "voice", WINDER_B, missing_turns=4,
             decisions=(("scrap", "miscount", "Four turns short; the bond cannot be undone."),)),
)  # fmt: skip
