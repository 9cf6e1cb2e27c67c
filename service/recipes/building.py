"""From a recipe's body to the kernel's design: units, materials, and whether the parts fit."""

from typing import Final

from service.errors import InvalidValue
from service.physics.bar_magnet import BarMagnet
from service.physics.design import NOTHING, Design, Learned, Shell
from service.physics.former import Former
from service.physics.guide import Scatter
from service.physics.magnet import grade
from service.physics.output import VibratingString
from service.physics.pole_materials import PoleMaterial, pole_material
from service.physics.poles import Pole
from service.physics.uncertainty import Estimate
from service.physics.voice_coil import former_material
from service.physics.wire import (
    ALUMINIUM,
    COPPER,
    COPPER_CLAD_ALUMINIUM_10,
    COPPER_CLAD_ALUMINIUM_15,
    StandardWire,
    standard_wire,
)
from service.recipes.body import CorePart, PolesPart, RecipeBody, StringPart, WirePart

MILLI: Final = 1e-3
CONDUCTORS: Final = {
    one.name: one for one in (COPPER, ALUMINIUM, COPPER_CLAD_ALUMINIUM_10, COPPER_CLAD_ALUMINIUM_15)
}
# Standard uncertainties where the recipe states none; common practice, no source.
_GAP_FLUX_UNCERTAINTY: Final = 0.03
_LEAD_UNCERTAINTY: Final = 0.10
# A former longer than its winding by this, where no length is stated.
_FORMER_OVERHANG: Final = 10e-3


def to_design(body: RecipeBody, learned: Learned | None = None) -> Design:
    """Return the kernel's design of a recipe.

    Args:
        body: the recipe.
        learned: what measured coils of it have taught, if anything.

    Raises:
        InvalidValue: parts that do not fit together; it names the field and says what to do.
    """
    former = _former(body)
    wire = _wire(body.wire)
    if former.winding_height < wire.overall_diameter_max:
        raise InvalidValue(
            f"The winding height of {body.former.winding_height_mm:g} mm does not hold one turn "
            f"of {body.wire.size} ({wire.overall_diameter_max * 1e3:.3f} mm with enamel).",
            pointer="/former/winding_height_mm",
            value=body.former.winding_height_mm,
            mend="Correct the height or the wire.",
        )
    if body.layers is not None and body.scatter is not None:
        raise InvalidValue(
            "A winding has even layers or a scatter, not both.",
            pointer="/layers",
            value=body.layers,
            mend="Leave out layers, or set scatter to null.",
        )
    if body.layers is not None and body.layers > body.turns:
        raise InvalidValue(
            f"{body.layers} layers need at least as many turns, not {body.turns}.",
            pointer="/layers",
            value=body.layers,
            mend="Correct the layers or the turns.",
        )
    conditions = body.conditions
    leads = body.lead_resistance_ohm or 0.0
    gap = _gap_flux_density(body)
    height = conditions.gap_height_mm
    material = _pole_material(body)
    return Design(
        former=former,
        wire=wire,
        turns=body.turns,
        scatter=_scatter(body),
        layers=body.layers,
        spool=_spool(body.wire),
        poles=() if material is None else _poles(body, material),
        susceptibility_uncertainty=material.susceptibility_uncertainty if material else 0.0,
        conductivity_uncertainty=material.conductivity_uncertainty if material else 0.0,
        magnet=material.grade if material else None,
        bar=_bar(body, material),
        shell=_shell(body),
        temperature=conditions.temperature_c,
        test_frequency=conditions.test_frequency_hz,
        lead_resistance=Estimate(leads, _LEAD_UNCERTAINTY * leads) if leads else NOTHING,
        string=_string(body),
        gap_flux_density=gap,
        gap_height=None if height is None else height * MILLI,
        learned=learned or Learned(),
    )


def _former(body: RecipeBody) -> Former:
    part = body.former
    if part.straight_x_mm == part.straight_y_mm == 0.0 and part.corner_radius_mm == 0.0:
        raise InvalidValue(
            "A former without straight sides needs a corner radius.",
            pointer="/former/corner_radius_mm",
            value=0.0,
            mend="Give half the diameter of the round former.",
        )
    return Former(
        part.straight_x_mm * MILLI,
        part.straight_y_mm * MILLI,
        part.corner_radius_mm * MILLI,
        part.winding_height_mm * MILLI,
        None if part.flange_build_mm is None else part.flange_build_mm * MILLI,
    )


def _wire(part: WirePart) -> StandardWire:
    return standard_wire(part.size, part.build, CONDUCTORS[part.conductor])


def _spool(part: WirePart) -> Estimate | None:
    measured = part.spool_resistance_ohm_per_m
    doubt = part.spool_standard_uncertainty_ohm_per_m
    if measured is None:
        if doubt is not None:
            raise InvalidValue(
                "An uncertainty of the spool is stated, but no resistance.",
                pointer="/wire/spool_standard_uncertainty_ohm_per_m",
                value=doubt,
                mend="State spool_resistance_ohm_per_m as well, or neither.",
            )
        return None
    return Estimate(measured, 0.005 * measured if doubt is None else doubt)


def _scatter(body: RecipeBody) -> Scatter | None:
    part = body.scatter
    if part is None:
        return None
    return Scatter(
        part.traverse,
        part.turns_per_pass,
        part.wander_mm * MILLI,
        part.edge_dwell_turns,
        part.tension_n,
        part.seed,
    )


def _pole_material(body: RecipeBody) -> PoleMaterial | None:
    """Of the rods or the core; None for a coil in air."""
    if body.poles is not None and body.core is not None:
        raise InvalidValue(
            "A coil has poles or a core, not both.",
            pointer="/core",
            mend="Set poles or core to null.",
        )
    for name, part in (("poles", body.poles), ("core", body.core)):
        if part is not None:
            try:
                return pole_material(part.material)
            except ValueError as error:
                raise InvalidValue(
                    f"There is no pole material of this name: {error}.",
                    pointer=f"/{name}/material",
                    value=part.material,
                    mend="Choose one of the materials named.",
                ) from error
    return None


def _poles(body: RecipeBody, material: PoleMaterial) -> tuple[Pole, ...]:
    if body.core is not None:
        return (_core(body, body.core, material),)
    return () if body.poles is None else _row(body, body.poles, material)


def _row(body: RecipeBody, part: PolesPart, material: PoleMaterial) -> tuple[Pole, ...]:
    if part.count > 1 and part.pitch_mm < part.diameter_mm:
        raise InvalidValue(
            f"Rods of {part.diameter_mm:g} mm do not stand {part.pitch_mm:g} mm apart.",
            pointer="/poles/pitch_mm",
            value=part.pitch_mm,
            mend=f"Give a pitch of at least {part.diameter_mm:g} mm.",
        )
    former = body.former
    along = max(former.straight_x_mm, former.straight_y_mm)
    across = min(former.straight_x_mm, former.straight_y_mm)
    width = across + 2.0 * former.corner_radius_mm
    if part.diameter_mm > width:
        raise InvalidValue(
            f"Rods of {part.diameter_mm:g} mm do not fit an opening {width:g} mm wide.",
            pointer="/poles/diameter_mm",
            value=part.diameter_mm,
            mend=f"Give a diameter of at most {width:g} mm, or a wider former.",
        )
    outermost = (part.count - 1) * part.pitch_mm / 2.0
    # How far a rod's axis may lie from the middle: the round end narrows with its distance.
    spare = former.corner_radius_mm - part.diameter_mm / 2.0
    room = along / 2.0 + spare
    if outermost > room + 1e-9:
        raise InvalidValue(
            f"{part.count} rods at {part.pitch_mm:g} mm reach {outermost:g} mm from the middle, "
            f"but the opening leaves room for {room:g} mm.",
            pointer="/poles/pitch_mm",
            value=part.pitch_mm,
            mend=f"Give a pitch of at most {2.0 * room / (part.count - 1):.4g} mm, or fewer rods.",
        )
    places = [
        (index - (part.count - 1) / 2.0) * part.pitch_mm * MILLI for index in range(part.count)
    ]
    lengthwise = former.straight_x_mm >= former.straight_y_mm
    return tuple(
        _rod(part, material, (place, 0.0) if lengthwise else (0.0, place)) for place in places
    )


def _core(body: RecipeBody, part: CorePart, material: PoleMaterial) -> Pole:
    former = body.former
    if former.straight_x_mm or former.straight_y_mm:
        raise InvalidValue(
            "Only a round coil has a core; a former with straight sides has poles.",
            pointer="/core",
            mend="Set both straight sides to 0, or describe poles.",
        )
    thickness = _thickness(body)
    room = 2.0 * (former.corner_radius_mm - thickness / MILLI)
    if part.diameter_mm > room:
        raise InvalidValue(
            f"A core of {part.diameter_mm:g} mm does not fit a former of {room:.4g} mm inside.",
            pointer="/core/diameter_mm",
            value=part.diameter_mm,
            mend=f"Give a diameter of at most {room:.4g} mm.",
        )
    return _rod(part, material, (0.0, 0.0))


def _rod(part: PolesPart | CorePart, material: PoleMaterial, place: tuple[float, float]) -> Pole:
    return Pole(
        place[0],
        place[1],
        part.diameter_mm * MILLI,
        part.length_mm * MILLI,
        part.offset_mm * MILLI,
        material.susceptibility,
        material.conductivity,
    )


def _bar(body: RecipeBody, material: PoleMaterial | None) -> BarMagnet | None:
    part, poles = body.magnet_bar, body.poles
    if part is None:
        return None
    if poles is None or material is None or material.grade is not None:
        raise InvalidValue(
            "A bar magnet stands under soft rods only.",
            pointer="/magnet_bar",
            mend="Give poles of steel, or leave out the bar.",
        )
    try:
        magnet = grade(part.material)
    except ValueError as error:
        raise InvalidValue(
            f"There is no magnet of this name: {error}.",
            pointer="/magnet_bar/material",
            value=part.material,
            mend="Choose one of the magnets named.",
        ) from error
    lengthwise = body.former.straight_x_mm >= body.former.straight_y_mm
    along, across = part.length_mm * MILLI, part.width_mm * MILLI
    return BarMagnet(
        along if lengthwise else across,
        across if lengthwise else along,
        part.thickness_mm * MILLI,
        (poles.offset_mm - poles.length_mm / 2.0 - part.gap_mm) * MILLI,
        magnet,
    )


def _thickness(body: RecipeBody) -> float:
    """Of the former under a round coil, m; 0 if its material is not stated."""
    if body.former_material is None:
        return 0.0
    if body.former_thickness_mm is not None:
        return body.former_thickness_mm * MILLI
    return former_material(body.former_material).thickness


def _shell(body: RecipeBody) -> Shell | None:
    if body.former_material is None or body.former_slit:
        return None
    material = former_material(body.former_material)
    if material.resistivity is None:
        return None
    former = body.former
    if former.straight_x_mm or former.straight_y_mm:
        raise InvalidValue(
            "A conducting former is reckoned for round coils only.",
            pointer="/former_material",
            value=body.former_material,
            mend="Choose an insulating material, or a round former.",
        )
    thickness = _thickness(body)
    if thickness >= former.corner_radius_mm * MILLI:
        raise InvalidValue(
            "The former is thicker than its radius.",
            pointer="/former_thickness_mm",
            value=body.former_thickness_mm,
            mend=f"Give less than {former.corner_radius_mm:g} mm.",
        )
    length = (
        former.winding_height_mm * MILLI + _FORMER_OVERHANG
        if body.former_length_mm is None
        else body.former_length_mm * MILLI
    )
    return Shell(thickness, length, material.resistivity)


def _gap_flux_density(body: RecipeBody) -> Estimate | None:
    here, there = body.gap_flux_density_t, body.conditions.gap_flux_density_t
    if here is not None and there is not None and here != there:
        raise InvalidValue(
            f"Two flux densities are stated for the gap, {here:g} T and {there:g} T.",
            pointer="/gap_flux_density_t",
            value=here,
            mend="State it once.",
        )
    value = there if here is None else here
    return None if value is None else Estimate(value, _GAP_FLUX_UNCERTAINTY * value)


def _string(body: RecipeBody) -> VibratingString | None:
    """The usual string over rods; none for a coil that has neither."""
    part = body.string
    if part is None:
        if body.poles is None:
            return None
        part = StringPart()
    if part.amplitude_mm + part.diameter_mm / 2.0 >= part.distance_mm:
        raise InvalidValue(
            f"A string of {part.diameter_mm:g} mm that swings {part.amplitude_mm:g} mm strikes a "
            f"rod {part.distance_mm:g} mm away.",
            pointer="/string/amplitude_mm",
            value=part.amplitude_mm,
            mend="Give a smaller amplitude or a larger distance.",
        )
    return VibratingString(
        part.diameter_mm * MILLI,
        part.distance_mm * MILLI,
        part.amplitude_mm * MILLI,
        part.frequency_hz,
        part.ferrous,
    )
