import pytest

from service.physics.magnet import GRADES
from service.physics.pole_materials import (
    DEFAULT_MATERIAL,
    POLE_MATERIALS,
    PoleMaterial,
    pole_material,
)


def test_every_magnet_grade_is_a_pole_material_with_its_recoil_permeability() -> None:
    for name, grade in GRADES.items():
        material = POLE_MATERIALS[name]
        assert material.grade is grade
        assert material.susceptibility == grade.recoil_permeability - 1.0
        assert material.conductivity == grade.conductivity


def test_steel_is_much_more_permeable_than_any_magnet_and_trusted_less_than_alnico() -> None:
    steel = pole_material("steel")
    assert steel.grade is None
    assert 100.0 <= steel.susceptibility <= 300.0
    assert 5e6 <= steel.conductivity <= 7e6
    assert steel.susceptibility > 20 * max(g.recoil_permeability for g in GRADES.values())
    assert steel.susceptibility_uncertainty > pole_material("alnico 5").susceptibility_uncertainty


@pytest.mark.parametrize(
    ("spelt", "name"),
    [("Alnico-5", "alnico 5"), ("ALNICO5", "alnico 5"), ("n42", "NdFeB N42"), ("Steel", "steel")],
)
def test_a_name_is_found_however_it_is_spelt(spelt: str, name: str) -> None:
    assert pole_material(spelt).name == name


def test_the_default_is_a_material_there_is() -> None:
    assert pole_material(DEFAULT_MATERIAL).name == DEFAULT_MATERIAL


@pytest.mark.parametrize("name", ["unobtainium", "", 5])
def test_an_unknown_material_is_refused_with_the_names_there_are(name: object) -> None:
    with pytest.raises(ValueError, match=rf"alnico 5.*got {name!r}"):
        pole_material(name)  # type: ignore[arg-type] # deliberately wrong


def test_an_impossible_material_is_refused() -> None:
    with pytest.raises(ValueError, match=r"susceptibility must not be negative, got -1\.0"):
        PoleMaterial("anti-iron", -1.0, 0.1, 0.0, 0.1)
    with pytest.raises(ValueError, match="name must be a text that is not empty, got ' '"):
        PoleMaterial(" ", 1.0, 0.1, 0.0, 0.1)
