"""Rules of stock: own resistance and what is left, against hand calculations."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.errors import ConfirmationNeeded, InvalidValue, NotAllowed, WrongState
from service.stock.models import SPOOL_STATES
from service.stock.rules import (
    check_state_change,
    mass_per_metre,
    own_resistance,
    remaining,
    wire_of,
)

AWG_42 = wire_of("AWG 42", "single", "copper")


@pytest.mark.parametrize(
    ("size", "build", "conductor", "pointer"),
    [
        ("AWG 99", "single", "copper", "/wire_size"),
        ("42", "single", "copper", "/wire_size"),
        ("", "single", "copper", "/wire_size"),
        ("AWG 42", "tenfold", "copper", "/wire_build"),
        ("AWG 42", "grade 1", "copper", "/wire_build"),
        ("0.063 mm", "heavy", "copper", "/wire_build"),
        ("0.064 mm", "grade 1", "copper", "/wire_size"),
        ("AWG 42", "single", "unobtainium", "/conductor"),
    ],
)
def test_a_wire_that_no_standard_has_is_refused_with_what_is_known(
    size: str, build: str, conductor: str, pointer: str
) -> None:
    with pytest.raises(InvalidValue) as refusal:
        wire_of(size, build, conductor)
    assert refusal.value.pointer == pointer
    assert ("copper" if pointer == "/conductor" else "AWG 42") in str(refusal.value.mend)


def test_a_metre_of_wire_weighs_its_copper_and_its_enamel() -> None:
    # AWG 42 is 0.0025 in = 0.0635 mm: pi/4 x (63.5e-6 m)^2 x 8890 kg/m3 = 28.15 mg/m of copper;
    # over the enamel 0.0028 in = 0.07112 mm: pi/4 x (71.12^2 - 63.5^2) um^2 x 1300 kg/m3 = 1.05.
    assert mass_per_metre(AWG_42, "copper") == pytest.approx(28.15e-6 + 1.05e-6, rel=1e-3)


@pytest.mark.parametrize("share", [-0.14, 0.0, 0.17])
def test_the_spools_own_resistance_tells_how_heavy_its_copper_is(share: float) -> None:
    # A conductor thicker by some share of its area has that much less resistance, and more mass.
    own = AWG_42.resistance_nominal / (1 + share)
    added = mass_per_metre(AWG_42, "copper", own) - mass_per_metre(AWG_42, "copper")
    assert added == pytest.approx(28.15e-6 * share, rel=1e-3, abs=1e-15)


def test_a_resistance_that_is_not_this_wires_says_nothing_about_its_mass() -> None:
    meant = mass_per_metre(AWG_42, "copper", 1000 * AWG_42.resistance_nominal)
    assert meant == mass_per_metre(AWG_42, "copper")


def test_a_resistance_at_25_c_is_brought_to_20_c() -> None:
    # By hand: 5.5 ohm / (1 + 0.00393 x 5) = 5.394 ohm (copper's coefficient of IEC 60028).
    per_metre = own_resistance(
        AWG_42, "copper", resistance_ohm=5.5, length_m=1.0, temperature_c=25.0, confirmed=False
    )
    assert per_metre == pytest.approx(5.5 / 1.01965, rel=1e-9)


@pytest.mark.parametrize("factor", [1e-3, 0.79, 1.21, 1e3])
def test_a_value_far_from_the_standard_is_asked_back_unless_confirmed(factor: float) -> None:
    edge = AWG_42.resistance_min if factor < 1 else AWG_42.resistance_max

    def measured(confirmed: bool) -> float:
        return own_resistance(
            AWG_42,
            "copper",
            resistance_ohm=edge * factor * 2,
            length_m=2.0,
            temperature_c=20.0,
            confirmed=confirmed,
        )

    with pytest.raises(ConfirmationNeeded) as question:
        measured(confirmed=False)
    assert question.value.pointer == "/resistance_ohm"
    assert measured(confirmed=True) == pytest.approx(edge * factor)


@given(net=st.floats(1e-3, 500), drawn=st.floats(0, 1e4), per_metre=st.floats(1e-7, 1e-1))
def test_what_is_left_is_never_less_than_nothing_nor_more_than_there_was(
    net: float, drawn: float, per_metre: float
) -> None:
    left = remaining(net, drawn, per_metre)
    assert 0 <= left.mass_kg <= net
    assert left.length_m == pytest.approx(left.mass_kg / per_metre)
    if drawn >= net:
        assert (left.length_m, left.mass_kg) == (0, 0)


@pytest.mark.parametrize("state", SPOOL_STATES)
@pytest.mark.parametrize("wanted", SPOOL_STATES)
@pytest.mark.parametrize("role", ["operator", "bench", "lead"])
def test_a_state_changes_to_another_and_only_a_lead_ends_a_quarantine(
    state: str, wanted: str, role: str
) -> None:
    def change() -> None:
        check_state_change(state, wanted, frozenset({role}))

    if wanted == state:
        with pytest.raises(WrongState):
            change()
    elif state == "quarantined" and role != "lead":
        with pytest.raises(NotAllowed):
            change()
    else:
        change()
