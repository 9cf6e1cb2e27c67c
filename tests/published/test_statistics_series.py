"""Further published series: digits of pi, a filter's transmittance, coal-mining disasters."""

import math

import pytest

from service import statistics
from tests.published.statistics_data import COAL, MAVRO


def digits_of_pi(count: int) -> list[int]:
    """By Machin's formula in whole numbers: pi = 16 arctan(1/5) - 4 arctan(1/239)."""

    def inverse_tangent(of: int, unit: int) -> int:
        term = unit // of
        total, odd = term, 1
        while term:
            term //= -of * of
            odd += 2
            total += term // odd
        return total

    guard = 20
    unit = 10 ** (count - 1 + guard)
    pi = (16 * inverse_tangent(5, unit) - 4 * inverse_tangent(239, unit)) // 10**guard
    half = count // 2
    front, back = divmod(pi, 10**half)  # in two, as Python limits the length of a text of digits
    return [int(digit) for digit in f"{front}{back:0{half}d}"]


# NIST StRD PiDigits: certified values. The data file has 3 as its 957th value where pi has 8 (seen
# in a stored copy of the file, the other 4,999 agree); the certified values are those of the file.
def test_summary_of_the_digits_of_pi() -> None:
    digits = digits_of_pi(5000)
    assert (len(digits), digits[:6], digits[956]) == (5000, [3, 1, 4, 1, 5, 9], 8)
    digits[956] = 3
    found = statistics.summary(digits)
    assert found.mean == pytest.approx(4.5348, rel=1e-15)
    assert found.standard_deviation == pytest.approx(2.86733906028871, rel=3e-15)
    assert found.lag_1_autocorrelation == pytest.approx(-0.00355099287237972, rel=3e-13)


# NIST StRD Mavro: certified values.
def test_summary_of_the_transmittance_of_a_filter() -> None:
    found = statistics.summary(MAVRO)
    assert found.mean == pytest.approx(2.001856, rel=1e-15)
    assert found.standard_deviation == pytest.approx(0.000429123454003053, rel=1e-12)
    assert found.lag_1_autocorrelation == pytest.approx(0.937989183438248, rel=1e-12)


# Raftery & Akman, Biometrika 73 (1986), from memory: the rate fell from about 3.1 to 0.9 a year,
# most probably in 1890 or 1891, surely between 1887 and 1895. Statistic computed independently.
def test_the_rate_of_coal_mining_disasters_falls_about_1891() -> None:
    change = statistics.change_point(COAL, kind="poisson")
    last_year_before = 1850 + change.index
    assert 1889 <= last_year_before <= 1892
    assert (change.before, change.after) == pytest.approx((3.1, 0.9), abs=0.05)
    sides = COAL[: change.index], COAL[change.index :]
    likelihoods = [sum(side) * math.log(sum(side) / len(side)) for side in sides]
    none = sum(COAL) * math.log(sum(COAL) / len(COAL))
    assert change.statistic == pytest.approx(2 * (sum(likelihoods) - none), rel=1e-12)


# Product rule of ISO 13053-1 (from memory): steps of .97 .98 .95 .99 give 0.89404. A step's yield
# is exp(-DPU), so its DPU is -ln(yield).
def test_rolled_yield_is_the_product_of_the_steps() -> None:
    yields = [0.97, 0.98, 0.95, 0.99]
    found = statistics.rolled_throughput_yield([-math.log(share) for share in yields])
    assert found == pytest.approx(0.89404, abs=1e-5)


# Binomial, computed: a yield of 95 % in lots of 40 scatters by .03446; the chart stands off thrice.
def test_a_p_chart_stands_three_binomial_deviations_off() -> None:
    chart = statistics.p_chart([1, 2, 3], 40)
    assert chart.centre == pytest.approx(0.05)
    assert chart.upper == pytest.approx(0.05 + 3 * 0.03446, abs=3e-5)
    assert chart.lower == 0
