"""What a coil is made of: the input of a prediction, in SI units."""

from dataclasses import dataclass, field

from service.physics.arguments import celsius, non_negative, positive, whole
from service.physics.bar_magnet import BarMagnet
from service.physics.former import Former
from service.physics.guide import Scatter
from service.physics.magnet import MagnetGrade
from service.physics.output import VibratingString
from service.physics.poles import Pole
from service.physics.uncertainty import Estimate
from service.physics.wire import StandardWire

NOTHING = Estimate(0.0, 0.0)


@dataclass(frozen=True, slots=True)
class Shell:
    """A closed conducting former: thickness and length in m, resistivity in ohm m."""

    thickness: float
    length: float
    resistivity: float


@dataclass(frozen=True, slots=True)
class Learned:
    """What measured coils of a recipe have taught; None where the prior still holds.

    Attributes:
        packing: share of the section that wire with enamel fills.
        stretch: relative elongation of the wire.
        susceptibility_factor: of the poles' susceptibility against that of their material.
        capacitance: self-capacitance, F.
    """

    packing: Estimate | None = None
    stretch: Estimate | None = None
    susceptibility_factor: Estimate | None = None
    capacitance: Estimate | None = None


@dataclass(frozen=True, slots=True)
class Design:
    """One coil, SI units, temperatures in °C.

    Attributes:
        former: to wind on.
        wire: as its standard allows it.
        turns: whole turns.
        scatter: how the wire is spread; None for even layers.
        layers: number of even layers, only without scatter; None to fill the height.
        spool: the spool's own resistance at 20 °C, ohm/m; None if not measured.
        turns_uncertainty: standard uncertainty of the count; 0 for a counter that is trusted.
        poles: magnetic rods inside, or one core.
        susceptibility_uncertainty, conductivity_uncertainty: relative, of the rods' material.
        magnet: grade of the rods, if they are magnets.
        bar: magnet under soft rods; what it adds to the inductance is left out.
        pole_flux_density: on the axis at the middle rod's top, T, if measured; else it follows
            from the magnets.
        shell: a closed conducting former, which is a shorted turn.
        temperature: of the coil, °C; the spread of the magnets' temperature is not in it.
        temperature_uncertainty: K.
        test_frequency: Hz.
        lead_resistance: ohm.
        string: to predict the output of; None for none.
        gap_flux_density: mean over the gap of a loudspeaker motor, T; None for none.
        gap_height: m; None if the whole winding stands in the gap.
        learned: what measured coils have taught.
    """

    former: Former
    wire: StandardWire
    turns: int
    scatter: Scatter | None = None
    layers: int | None = None
    spool: Estimate | None = None
    turns_uncertainty: float = 0.0
    poles: tuple[Pole, ...] = ()
    susceptibility_uncertainty: float = 0.0
    conductivity_uncertainty: float = 0.0
    magnet: MagnetGrade | None = None
    bar: BarMagnet | None = None
    pole_flux_density: Estimate | None = None
    shell: Shell | None = None
    temperature: float = 20.0
    temperature_uncertainty: float = 0.5
    test_frequency: float = 1000.0
    lead_resistance: Estimate = NOTHING
    string: VibratingString | None = None
    gap_flux_density: Estimate | None = None
    gap_height: float | None = None
    learned: Learned = field(default_factory=Learned)

    def __post_init__(self) -> None:
        whole("turns", self.turns, least=1)
        if self.scatter is not None and self.layers is not None:
            raise ValueError(f"layers must be None for a scattered winding, got {self.layers!r}")
        if self.magnet is not None and self.bar is not None:
            raise ValueError(f"bar must be None where rods are magnets, got {self.bar!r}")
        non_negative("turns_uncertainty", self.turns_uncertainty)
        non_negative("susceptibility_uncertainty", self.susceptibility_uncertainty)
        non_negative("conductivity_uncertainty", self.conductivity_uncertainty)
        celsius("temperature", self.temperature)
        non_negative("temperature_uncertainty", self.temperature_uncertainty)
        positive("test_frequency", self.test_frequency)
        non_negative("lead_resistance", self.lead_resistance.value)
