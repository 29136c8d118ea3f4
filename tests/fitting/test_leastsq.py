"""The optimiser against NIST's certified fits of rational functions, and its promises at the edges."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.leastsq import MAX_STEPS, Optimum, interleaved, minimise, triangle_of

NIST = Path(__file__).parents[1] / "data" / "nist"


@dataclass(frozen=True, slots=True, kw_only=True)
class CertifiedSet:
    """A NIST Statistical Reference Dataset: data, both start points, certified values and standard deviations."""

    x: FloatArray
    y: FloatArray
    starts: FloatArray
    values: FloatArray
    stderrs: FloatArray
    residual_sum: float


def read_set(name: str) -> CertifiedSet:
    """Parameter lines are ``b1 = start1 start2 value sd``; the data begin in line 61, as each file's head says."""
    lines = (NIST / f"{name}.dat").read_text(encoding="ascii").splitlines()
    table = np.array([line.split("=")[1].split() for line in lines if re.match(r"\s*b\d+ =", line)], dtype=float)
    y, x = np.loadtxt(lines[60:]).T
    (residual_sum,) = (float(line.split(":")[1]) for line in lines if line.startswith("Residual Sum of Squares"))
    return CertifiedSet(
        x=x, y=y, starts=table[:, :2].T, values=table[:, 2], stderrs=table[:, 3], residual_sum=residual_sum
    )


def rational(numerator: int) -> Callable[[FloatArray, FloatArray], FloatArray]:
    """(b1 + b2 x + …) / (1 + … x + …) with so many numerator coefficients, the rest in the denominator."""

    def model(b: FloatArray, x: FloatArray) -> FloatArray:
        top, bottom = b[:numerator], np.concatenate([[1.0], b[numerator:]])
        return np.asarray(np.polyval(top[::-1], x) / np.polyval(bottom[::-1], x))

    return model


def kowalik_osborne(b: FloatArray, x: FloatArray) -> FloatArray:
    """The model of MGH09, as its file states it."""
    return np.asarray(b[0] * (x**2 + x * b[1]) / (x**2 + x * b[2] + b[3]))


def complex_step(model: Callable[[FloatArray, FloatArray], FloatArray], x: FloatArray) -> Callable[..., FloatArray]:
    """Derivatives exact to rounding (W. Squire and G. Trapp, SIAM Review 40, 1998)."""

    def jacobian(b: FloatArray) -> FloatArray:
        columns = [model(b + 1e-200j * unit, x).imag / 1e-200 for unit in np.eye(len(b))]
        return np.stack(columns, axis=1)

    return jacobian


MODELS = {"Hahn1": rational(4), "Kirby2": rational(3), "Thurber": rational(4), "MGH09": kowalik_osborne}


def fit(name: str, start: int, *, analytic: bool, max_steps: int = MAX_STEPS) -> tuple[CertifiedSet, Optimum]:
    certified = read_set(name)
    model = MODELS[name]
    optimum = minimise(
        lambda b: model(b, certified.x) - certified.y,
        certified.starts[start],
        names=[f"b{i + 1}" for i in range(len(certified.values))],
        jacobian=complex_step(model, certified.x) if analytic else None,
        max_steps=max_steps,
    )
    return certified, optimum


def digits(found: FloatArray, certified: FloatArray) -> float:
    """NIST's measure, the smallest −log10 of the relative error (LRE)."""
    return float(-np.log10(np.max(np.abs(found / certified - 1)) + 1e-16))


def rescaled_stderrs(optimum: Optimum) -> FloatArray:
    """NIST does not know the data's noise and takes it from the residuals: variances times chi-square per freedom."""
    freedom = len(optimum.residuals) - len(optimum.values)
    return np.asarray(np.sqrt(np.diag(optimum.covariance) * optimum.chi_square / freedom))


# Certified values and standard deviations: NIST/ITL Statistical Reference Datasets, eleven digits.
# Six digits is what NIST's own discussion calls for; MGH09 from start 1 is the one at which solvers stop early.
@pytest.mark.parametrize("analytic", [True, False])
@pytest.mark.parametrize("start", [0, 1])
@pytest.mark.parametrize("name", ["Hahn1", "Kirby2", "Thurber", "MGH09"])
def test_certified_values_and_deviations_are_reached_from_both_starts(name: str, start: int, analytic: bool) -> None:
    certified, optimum = fit(name, start, analytic=analytic)
    assert optimum.converged
    assert digits(optimum.values, certified.values) > 6
    assert digits(rescaled_stderrs(optimum), certified.stderrs) > 6
    assert optimum.chi_square == pytest.approx(certified.residual_sum, rel=1e-9)


def test_covariance_is_for_unit_deviation_and_never_rescaled() -> None:
    # The mean of n numbers with deviation 1 has the deviation 1/sqrt(n), however far they scatter.
    data = np.array([0.0, 1000.0, 2000.0, 5000.0])
    optimum = minimise(lambda b: b[0] - data, [1.0], names=["mean"], jacobian=lambda _: np.ones((4, 1)))
    assert optimum.values[0] == pytest.approx(2000.0)
    assert optimum.stderr("mean") == pytest.approx(0.5, rel=1e-12)


def test_complex_rows_are_interleaved_as_lmfit_flattens_them() -> None:
    values = np.array([[1 + 2j, 3 + 4j], [5 + 6j, 7 + 8j]])
    assert interleaved(values).tolist() == [[1, 3], [2, 4], [5, 7], [6, 8]]
    # numpy's own view of a complex array as floats, by which lmfit flattens.
    assert interleaved(values[:, 0]).tolist() == values[:, 0].copy().view(np.float64).tolist()


def test_a_complex_fit_needs_and_gets_rows_in_that_order() -> None:
    # exp(-(b1 + j b2) x) has b = (0.3, 2) by construction; a Jacobian in another order stops elsewhere or not at all.
    x = np.linspace(0, 3, 20)
    data = np.exp(-(0.3 + 2j) * x)

    def model(b: FloatArray) -> ComplexArray:
        return np.asarray(np.exp(-(b[0] + 1j * b[1]) * x))

    optimum = minimise(
        lambda b: interleaved(model(b) - data),
        [1.0, 1.0],
        names=["b1", "b2"],
        jacobian=lambda b: interleaved(np.stack([-x * model(b), -1j * x * model(b)], axis=1)),
    )
    assert optimum.values == pytest.approx([0.3, 2.0], rel=1e-12)


def test_error_state_of_numpy_survives_a_residual_that_raises() -> None:
    def residual(_: FloatArray) -> FloatArray:
        raise ArithmeticError("no such point")

    with np.errstate(divide="raise", over="raise", invalid="raise", under="raise"):
        before = np.geterr()
        with pytest.raises(ArithmeticError, match="no such point"):
            minimise(residual, [1.0], names=["b1"])
        assert np.geterr() == before


def test_a_direction_without_information_gets_a_huge_variance_and_leaves_the_others_alone() -> None:
    x = np.arange(1.0, 6.0)
    optimum = minimise(
        lambda b: (b[0] - 3) * x + 0 * b[1],
        [1.0, 7.0],
        names=["seen", "unseen"],
        jacobian=lambda _: np.stack([x, 0 * x], axis=1),
    )
    assert optimum.covariance[1, 1] == 1e30
    assert optimum.covariance[0, 0] == pytest.approx(1 / (x @ x))
    assert optimum.values.tolist() == pytest.approx([3.0, 7.0])


def test_two_parameters_that_only_act_together_are_both_unknown() -> None:
    x = np.arange(1.0, 6.0)
    optimum = minimise(
        lambda b: (b[0] + b[1] - 3) * x,
        [1.0, 1.0],
        names=["b1", "b2"],
        jacobian=lambda _: np.stack([x, x], axis=1),
    )
    assert np.all(np.diag(optimum.covariance) > 1e27)
    assert optimum.values.sum() == pytest.approx(3.0)


def test_without_derivatives_a_singular_fit_claims_to_know_nothing() -> None:
    optimum = minimise(lambda b: np.full(5, b[0] + 0 * b[1] - 3), [1.0, 1.0], names=["seen", "unseen"])
    assert np.diag(optimum.covariance).tolist() == [1e30, 1e30]


def test_a_residual_that_is_not_finite_is_no_convergence() -> None:
    optimum = minimise(
        lambda b: np.full(4, np.nan) * b[0], [1.0], names=["b1"], jacobian=lambda _: np.full((4, 1), np.nan)
    )
    assert not optimum.converged
    assert optimum.covariance[0, 0] == 1e30


@pytest.mark.parametrize("analytic", [True, False])
def test_a_fit_that_takes_too_long_is_given_up_and_says_so(analytic: bool) -> None:
    # MGH09 needs hundreds of steps from start 1.
    _, optimum = fit("MGH09", 0, analytic=analytic, max_steps=50)
    assert not optimum.converged
    assert np.isfinite(optimum.values).all()


def test_as_many_names_as_values() -> None:
    with pytest.raises(ValueError, match="zip"):
        minimise(lambda b: b, [1.0, 2.0], names=["b1"])


def test_the_answer_cannot_be_changed() -> None:
    optimum = minimise(lambda b: b - np.array([1.0, 2.0]), [0.0, 0.0], names=["b1", "b2"])
    for array in (optimum.values, optimum.covariance, optimum.residuals):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0.0


def test_a_tall_matrix_comes_to_the_triangle_of_its_qr_decomposition() -> None:
    matrix = np.random.default_rng(4).standard_normal((1500, 3)) * [1e6, 1.0, 1e-6]
    triangle = triangle_of(matrix)
    assert triangle.shape == (3, 3)
    np.testing.assert_allclose(np.abs(triangle), np.abs(np.linalg.qr(matrix, mode="r")), rtol=1e-10, atol=1e-16)
    assert triangle_of(matrix[:2]).shape == (2, 3)
