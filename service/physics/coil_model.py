"""One coil as a function of its uncertain inputs, around the point that the kernel has solved.

Field problems are solved once, at the estimates; their course around these is carried by
powers whose exponents come from a few more solutions. What is a plain formula stays one. So
values are exact, sensitivities good to about 1 %, and a budget of a dozen and a half inputs costs
a few more field solutions instead of hundreds.
"""

import cmath
import math
from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from service.physics.capacitance import RELATIVE_UNCERTAINTY as CAPACITANCE_UNCERTAINTY
from service.physics.capacitance import self_capacitance
from service.physics.caution import Caution
from service.physics.coil_inputs import Known, uncertain_inputs
from service.physics.design import NOTHING, Design
from service.physics.inductance import coil_inductance
from service.physics.lay import HEXAGONAL_PACKING, Lay, layer_lay, scatter_lay
from service.physics.output import Output, mean_axial_field, middle_pole, string_output
from service.physics.poles import Pole, pole_response
from service.physics.resistance import (
    conductor_mass,
    resistance_per_metre_estimate,
    stretch_by_tension,
    tension_limit,
    winding_resistance,
)
from service.physics.resonance import self_capacitance_of_solenoid
from service.physics.section import WindingSection
from service.physics.uncertainty import Estimate
from service.physics.voice_coil import force_factor, reflected_impedance
from service.physics.working_point import magnet_pole_flux, pole_flux_over_bar

FloatArray = NDArray[np.float64]

OUTPUTS: Final = (
    "resistance",
    "resistance_20",
    "inductance",
    "air_inductance",
    "apparent_inductance",
    "quality_factor",
    "self_capacitance",
    "self_resonance",
    "output",
    "wire_length",
    "wire_mass",
    "outer_build",
    "fill_factor",
    "pole_flux_density",
    "force_factor",
)

_STEP: Final = 0.01
# Tension of a layer winding for which none is stated, as a share of the wire's limit.
_USUAL_TENSION: Final = 0.6
_MEDHURST_SHAPES: Final = (0.101, 49.9)


class CoilModel:
    """A design with its field problems solved.

    Attributes:
        design: as given.
        lay: of the wire.
        section: the winding that carries the current.
        inputs: the uncertain inputs, in the order of the argument of `outputs_at`.
        flux: density at the middle rod's top, T.
        output: of the string; None if the design has none.
        tension_limit: of the wire, N.
        cautions: of the lay, and what could not be solved.
    """

    def __init__(self, design: Design) -> None:
        self.design = design
        wire = design.wire
        self.per_metre = design.spool or resistance_per_metre_estimate(wire)
        self.tension_limit = tension_limit(wire.conductor_diameter_nominal, wire.conductor)
        self.tension = _USUAL_TENSION * self.tension_limit
        if design.scatter is not None:
            self.tension = design.scatter.tension
        self.stretch = design.learned.stretch or stretch_by_tension(
            self.tension, wire.conductor_diameter_nominal, wire.conductor
        )
        self.lay = self._lay()
        self.cautions: list[Caution] = list(self.lay.cautions)
        self.section = design.former.section(self.lay.outer_build, self.lay.height)
        self._solve_air()
        self._solve_poles()
        self._solve_shell()
        self.flux = self._pole_flux()
        self.capacitance = self._capacitance()
        self.output = self._output()
        known = Known(
            lay=self.lay,
            per_metre=self.per_metre,
            stretch=self.stretch,
            capacitance=self.capacitance,
            poles=self.poles,
            flux=self.flux,
            has_output=self.output is not None and self.output.fundamental > 0.0,
        )
        self.inputs = uncertain_inputs(design, known)
        self._place = {one.name: index for index, one in enumerate(self.inputs)}

    def _lay(self) -> Lay:
        design, overall = self.design, self.design.wire.overall_diameter_nominal
        if design.scatter is None:
            return layer_lay(design.former, overall, design.turns, design.layers)
        known = design.learned.packing
        return scatter_lay(
            design.former,
            overall,
            design.turns,
            design.scatter,
            self.tension_limit,
            packing=None if known is None else min(known.value, HEXAGONAL_PACKING),
        )

    def _solve_air(self) -> None:
        """Inductance of one turn, and its exponents in each dimension (they add to 1)."""
        section = self.section
        self._air = coil_inductance(section, 1.0)
        dimensions = {
            "former straight y": section.straight_y,
            "former corner radius": section.inner_radius,
            "build": section.build,
            "height": section.height,
            "former straight x": section.straight_x,
        }
        present = [name for name, size in dimensions.items() if size > 0.0]
        self._air_powers: dict[str, float] = {}
        for name in present[:-1]:
            moved = coil_inductance(_resized(section, dimensions, name), 1.0)
            self._air_powers[name] = math.log(moved / self._air) / math.log1p(_STEP)
        # Inductance goes with size, so the last exponent is what is wanting to 1.
        self._air_powers[present[-1]] = 1.0 - sum(self._air_powers.values())
        self._dimensions = {name: dimensions[name] for name in present}

    def _solve_poles(self) -> None:
        """What the rods add to one turn, complex, and its exponents in build and material."""
        factor = self.design.learned.susceptibility_factor
        share = 1.0 if factor is None else factor.value
        self.poles: tuple[Pole, ...] = tuple(
            replace(pole, susceptibility=share * pole.susceptibility) for pole in self.design.poles
        )
        self._added = self._added_by() if self.poles else 0j
        self._added_powers: dict[str, complex] = {}
        if self._added == 0.0:
            return
        # The rods' answer goes with the square of the coil's field at their places.
        thicker = _resized(self.section, {"build": self.section.build}, "build")
        fields = [mean_axial_field(one, self.poles) for one in (self.section, thicker)]
        squares = [float(field @ field) for field in fields]
        moved = {
            "build": self._added * squares[1] / squares[0],
            "pole susceptibility": self._added_by(susceptibility=1.0 + _STEP),
            "pole conductivity": self._added_by(conductivity=1.0 + _STEP),
        }
        self._added_powers = {
            name: cmath.log(added / self._added) / math.log1p(_STEP)
            for name, added in moved.items()
        }

    def _added_by(self, susceptibility: float = 1.0, conductivity: float = 1.0) -> complex:
        """Added inductance of one turn with the rods' material scaled by the factors."""
        return pole_response(self.section, self.poles).added_inductance(
            [susceptibility * pole.susceptibility for pole in self.poles],
            [conductivity * pole.conductivity for pole in self.poles],
            self.design.test_frequency,
        )

    def _solve_shell(self) -> None:
        shell = self.design.shell
        self._shell = 0j
        if shell is not None:
            self._shell = reflected_impedance(
                self.section,
                1.0,
                former_thickness=shell.thickness,
                former_length=shell.length,
                resistivity=shell.resistivity,
                frequency=self.design.test_frequency,
                enhancement=1.0 + self._added / self._air,
            )

    def _pole_flux(self) -> Estimate:
        """On the axis at the top of the rod nearest the middle, T."""
        design = self.design
        if design.pole_flux_density is not None:
            return design.pole_flux_density
        if not self.poles:
            return NOTHING
        try:
            if design.bar is not None:
                found = pole_flux_over_bar(self.poles, design.bar)
            elif design.magnet is not None:
                found = magnet_pole_flux(self.poles, [design.magnet] * len(self.poles))
            else:
                return NOTHING
        except ArithmeticError:
            self.cautions.append(
                Caution(
                    "no-working-point",
                    "No working point of the magnets was found: their flux and the output are "
                    "left out.",
                )
            )
            return NOTHING
        middle = self.poles.index(middle_pole(self.poles))
        value = found.values[middle]
        return Estimate(value, found.relative_uncertainty * abs(value))

    def _capacitance(self) -> Estimate:
        if self.design.learned.capacitance is not None:
            return self.design.learned.capacitance
        wire = self.design.wire
        if self.lay.neighbour_pairs == 0:
            # A single layer; one that is not round counts as a round one of equal length.
            diameter = self.lay.mean_turn_length / math.pi
            least, most = _MEDHURST_SHAPES
            length = min(max(self.section.height, least * diameter), most * diameter)
            value = self_capacitance_of_solenoid(diameter, length)
            return Estimate(value, CAPACITANCE_UNCERTAINTY * value)
        return self_capacitance(
            self.lay, wire.conductor_diameter_nominal, wire.overall_diameter_nominal
        )

    def _output(self) -> Output | None:
        design = self.design
        if design.string is None:
            return None
        return string_output(
            self.section, design.turns, self.poles, abs(self.flux.value), design.string
        )

    def outputs_at(self, x: FloatArray) -> FloatArray:
        """Return the outputs, in the order of OUTPUTS and in SI units, for values of the inputs."""

        def ratio(name: str) -> float:
            """Value of an input over its estimate."""
            place = self._place.get(name)
            if place is None or self.inputs[place].value == 0.0:
                return 1.0
            return float(x[place]) / self.inputs[place].value

        def value(name: str) -> float:
            place = self._place.get(name)
            return 0.0 if place is None else float(x[place])

        design, lay, wire = self.design, self.lay, self.design.wire
        turns = value("turns")
        more, wider = ratio("turns"), ratio("wire overall diameter")
        if design.scatter is None:
            height = lay.height * wider
            growth = wider / ratio("packing")
        else:
            height = lay.height * ratio("winding height")
            growth = more * wider * wider / ratio("packing") / ratio("winding height")
        build = lay.outer_build * growth
        straight = 2.0 * (value("former straight x") + value("former straight y"))
        inner = straight + 2.0 * math.pi * value("former corner radius")
        # Turns added lie outside the others: the sum of builds goes with the square of turns.
        outward = 2.0 * math.pi * float(lay.turn_builds.sum()) * more * growth
        if design.scatter is None:
            outward *= more
        length = (turns * inner + outward) * value("mean turn")

        per_metre, stretch = value("wire resistance per metre"), max(value("stretch"), 0.0)
        alpha = wire.conductor.temperature_coefficient_20
        leads = max(value("lead resistance"), 0.0)
        cold = winding_resistance(length, per_metre, stretch=stretch, lead_resistance=leads)
        warm = winding_resistance(
            length,
            per_metre,
            stretch=stretch,
            temperature=value("coil temperature"),
            temperature_coefficient_20=alpha,
            lead_resistance=leads,
        )
        area = (
            math.pi / 4.0 * wire.conductor_diameter_nominal**2
            * (wire.resistance_nominal / per_metre)
        )  # fmt: skip

        changes = {
            "build": growth,
            "height": height / lay.height,
            "former straight x": ratio("former straight x"),
            "former straight y": ratio("former straight y"),
            "former corner radius": ratio("former corner radius"),
        }
        shape = math.prod(changes[name] ** power for name, power in self._air_powers.items())
        air = turns * turns * self._air * shape * value("air inductance model")
        series = complex(air)
        if self.poles:
            changes |= {n: ratio(n) for n in ("pole susceptibility", "pole conductivity")}
            material = math.prod(
                (changes[name] ** power for name, power in self._added_powers.items()),
                start=1.0 + 0.0j,
            )
            series += turns * turns * self._added * material * value("pole inductance model")
        omega = 2.0 * math.pi * design.test_frequency
        impedance = warm + 1j * omega * series + turns * turns * self._shell
        inductance = impedance.imag / omega
        capacitance = abs(value("self-capacitance")) / more  # far draws of a sample may be below 0
        shown = impedance / (1.0 + 1j * omega * capacitance * impedance)
        flux = value("pole flux density")
        volts = 0.0
        if self.output is not None:
            volts = self.output.fundamental * more * ratio("pole flux density")
            volts *= ratio("string model")
        force = 0.0
        if design.gap_flux_density is not None:
            force = force_factor(
                max(value("gap flux density"), 0.0), length, height, design.gap_height
            )
        return np.array(
            [
                warm,
                cold,
                inductance,
                air,
                shown.imag / omega,
                impedance.imag / impedance.real,
                capacitance,
                1.0 / (2.0 * math.pi * math.sqrt(abs(inductance) * capacitance)),
                volts,
                length,
                conductor_mass(length, area, wire.conductor, stretch),
                build,
                area * turns / (height * build),
                flux,
                force,
            ]
        )


def _resized(section: WindingSection, dimensions: dict[str, float], name: str) -> WindingSection:
    """The section with one of its dimensions larger by the step."""
    size = dimensions[name] * (1.0 + _STEP)
    straight_x = size if name == "former straight x" else section.straight_x
    straight_y = size if name == "former straight y" else section.straight_y
    inner = size if name == "former corner radius" else section.inner_radius
    build = size if name == "build" else section.build
    height = size if name == "height" else section.height
    return WindingSection(straight_x, straight_y, inner, inner + build, height)
