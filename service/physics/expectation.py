"""The whole prediction of one coil, with its uncertainty and where that comes from."""

from collections.abc import Collection
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from service.physics.caution import Caution
from service.physics.coil_inputs import Input, Source
from service.physics.coil_model import OUTPUTS, CoilModel
from service.physics.design import Design
from service.physics.lay import Lay
from service.physics.resistance import BREAKING_STRAIN
from service.physics.uncertainty import Estimate, sensitivities

FloatArray = NDArray[np.float64]

# Rises whenever a prediction changes for the same design; kept with every verdict.
KERNEL_VERSION: Final = "1.0.0"

_STEP: Final = 1e-3
# Above this share of the resonance a meter shows the inductance 12 % high and more.
_NEAR_RESONANCE: Final = 1.0 / 3.0


@dataclass(frozen=True, slots=True)
class BudgetRow:
    """What one input contributes to the standard uncertainty of each output.

    Attributes:
        input: with its value, unit, standard uncertainty and source.
        contributions: by output, in the output's SI unit.
        shares: by output, of its variance.
    """

    input: Input
    contributions: dict[str, float]
    shares: dict[str, float]


@dataclass(frozen=True, slots=True, eq=False)
class Expectation:
    """What a coil of this design should measure; SI units, resistance at its temperature too.

    Attributes:
        design: what was predicted.
        lay: how the wire lies.
        names: of the outputs, in the order of the arrays.
        values: of the outputs.
        covariance: of the outputs.
        inputs: the uncertain inputs.
        input_covariance: of the inputs.
        jacobian: derivatives of the outputs (down) by the inputs (across).
        cautions: what to look at before winding.
        kernel_version: of the rules that made it.
    """

    design: Design
    lay: Lay
    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    inputs: tuple[Input, ...]
    input_covariance: FloatArray
    jacobian: FloatArray
    cautions: tuple[Caution, ...]
    kernel_version: str

    def quantity(self, name: str) -> Estimate:
        """Return one output with its standard uncertainty."""
        k = self.names.index(name)
        return Estimate(float(self.values[k]), float(np.sqrt(self.covariance[k, k])))

    def elasticity(self, output: str, name: str) -> float:
        """Return by how many per cent an output changes for one per cent of an input."""
        row = self.names.index(output)
        column = [one.name for one in self.inputs].index(name)
        slope = float(self.jacobian[row, column])
        return slope * self.inputs[column].value / float(self.values[row])

    def budget(self) -> tuple[BudgetRow, ...]:
        """Return each input's contribution; inputs without uncertainty contribute nothing."""
        u = np.sqrt(np.diag(self.input_covariance))
        parts = np.abs(self.jacobian * u)
        variances = np.diag(self.covariance)
        shares = parts**2 / np.where(variances > 0.0, variances, 1.0)[:, np.newaxis]
        return tuple(
            BudgetRow(
                one,
                {name: float(parts[row, column]) for row, name in enumerate(self.names)},
                {name: float(shares[row, column]) for row, name in enumerate(self.names)},
            )
            for column, one in enumerate(self.inputs)
        )


def expect(design: Design) -> Expectation:
    """Return what a coil of this design should measure.

    Args:
        design: the coil, SI units.

    Returns:
        Values, covariance, budget and cautions. Uncertainties follow the linear law (JCGM 100);
        it serves all outputs but `output`, whose factor of two says so itself.

    Raises:
        ValueError: an impossible design; the message names what and the value.
    """
    model = CoilModel(design)
    estimates = np.array([one.value for one in model.inputs])
    u = np.array([one.standard_uncertainty for one in model.inputs])
    # What is exactly known still has a slope: the diagnosis asks what a miscount would do.
    # Steps of a thousandth leave an error of a millionth, in one difference.
    sizes = np.where(estimates != 0.0, np.abs(estimates), np.where(u > 0.0, u, 1.0))
    jacobian = sensitivities(model.outputs_at, estimates, _STEP * sizes, levels=1)
    input_covariance = np.diag(u * u)
    covariance = jacobian @ input_covariance @ jacobian.T
    values = model.outputs_at(estimates)
    return Expectation(
        design=design,
        lay=model.lay,
        names=OUTPUTS,
        values=values,
        covariance=(covariance + covariance.T) / 2.0,
        inputs=model.inputs,
        input_covariance=input_covariance,
        jacobian=jacobian,
        cautions=_cautions(model, dict(zip(OUTPUTS, values.tolist(), strict=True))),
        kernel_version=KERNEL_VERSION,
    )


def covariance_between(
    one: Expectation, other: Expectation, shared: Collection[Source]
) -> FloatArray:
    """Return the covariance between the outputs of two coils that have some errors in common.

    Args:
        one, other: two expectations.
        shared: sources that the coils share, such as {"spool", "model"} for two coils of one
            recipe from one spool.

    Returns:
        Matrix of `one`'s outputs (down) and `other`'s (across). An input of the same name is
        taken as the same error, relative to its value, as large as `one` and `other` say.
    """
    places = {item.name: index for index, item in enumerate(other.inputs)}
    common = np.zeros((len(one.inputs), len(other.inputs)))
    for row, item in enumerate(one.inputs):
        column = places.get(item.name)
        if column is not None and item.source in shared:
            u = other.inputs[column].standard_uncertainty
            common[row, column] = item.standard_uncertainty * u
    return np.asarray(one.jacobian @ common @ other.jacobian.T, dtype=np.float64)


def _cautions(model: CoilModel, values: dict[str, float]) -> tuple[Caution, ...]:
    found = list(model.cautions)
    if model.tension > model.tension_limit:
        found.append(
            Caution(
                "tension-above-limit",
                f"The tension of {model.tension:.3g} N is above {model.tension_limit:.3g} N, what "
                f"this wire may bear: it stretches for good or breaks. Usual is "
                f"{0.5 * model.tension_limit:.2g} to {0.8 * model.tension_limit:.2g} N.",
            )
        )
    if model.stretch.value >= BREAKING_STRAIN:
        found.append(Caution("wire-breaks", "At this tension the wire breaks."))
    ratio = model.design.test_frequency / values["self_resonance"]
    if ratio >= 1.0:
        found.append(
            Caution(
                "test-frequency-above-resonance",
                f"The test frequency lies above the self-resonance of about "
                f"{values['self_resonance']:.0f} Hz: a meter shows no inductance there.",
            )
        )
    elif ratio > _NEAR_RESONANCE:
        found.append(
            Caution(
                "test-frequency-near-resonance",
                f"The test frequency is {100 * ratio:.0f} % of the self-resonance: a meter shows "
                "an inductance that is far from the true one. Test lower.",
            )
        )
    if model.output is not None and model.output.reason is not None:
        found.append(Caution("no-output", model.output.reason))
    return tuple(found)
