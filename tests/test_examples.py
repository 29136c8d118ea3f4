"""The shipped examples: right verdicts, true zero times inside their errors, and written again byte for byte."""

from __future__ import annotations

import importlib.util
import math
import sys
from pathlib import Path

import pytest

from fitamp.comparison import Comparison, Nulling

# The parts as scripts/make_examples.py makes them: factors on the design's gm2 = 1.6 mS and Cc = 1.8 pF, and the
# resistor in ohms (None: 1/gm2 of the part). The zero time is Cc·(Rz - 1/gm2), by hand.
PARTS: dict[str, tuple[float, float, float | None]] = {
    "a": (0.96, 1.02, 1.05 * 1300),
    "b": (1.04, 0.98, 0.0),
    "c": (0.96, 1.02, None),
    "d": (1.04, 0.98, 2.4 * 1300),
    "e": (0.96, 1.02, 1.05 * 1300),
}
VERDICTS = {
    "a": Nulling.AS_DESIGNED,
    "b": Nulling.WRONG_SIDE,
    "c": Nulling.AT_INFINITY,
    "d": Nulling.TOO_MUCH,
    "e": Nulling.AS_DESIGNED,
}
# 8 fF and more are in every load: 1.03 to 1.10 times 4 pF of CL, and 2.03 pF of probe where 2 pF are stated.
EXTRA_LOAD_F = {"a": 1.04, "b": 1.10, "c": 1.04, "d": 1.10, "e": 1.04}


def true_zero_time_s(letter: str) -> float:
    """Zero time of an example part, from its factors."""
    gm2_factor, Cc_factor, resistor_ohm = PARTS[letter]
    gm2 = 1.6e-3 * gm2_factor
    return 1.8e-12 * Cc_factor * ((1 / gm2 if resistor_ohm is None else resistor_ohm) - 1 / gm2)


@pytest.mark.parametrize("letter", PARTS)
def test_every_part_gets_its_verdict(letter: str, compared_examples: dict[str, Comparison]) -> None:
    assert compared_examples[letter].verdict.nulling is VERDICTS[letter]


@pytest.mark.parametrize("letter", PARTS)
def test_zero_time_is_true_within_four_standard_errors(letter: str, compared_examples: dict[str, Comparison]) -> None:
    zero_time = compared_examples[letter].verdict.zero_time_s
    assert zero_time.value is not None
    assert zero_time.stderr is not None
    assert abs(zero_time.value - true_zero_time_s(letter)) < 4 * zero_time.stderr
    # 2 % of Cc/gm2: an error so large that anything agrees would be no answer.
    assert zero_time.stderr < 0.02 * 1.8e-12 / 1.6e-3


@pytest.mark.parametrize("letter", PARTS)
def test_gm2_rz_and_load_are_covered(letter: str, compared_examples: dict[str, Comparison]) -> None:
    comparison = compared_examples[letter]
    gm2_factor, _, resistor_ohm = PARTS[letter]
    product = 1.0 if resistor_ohm is None else 1.6e-3 * gm2_factor * resistor_ohm
    low, high = comparison.verdict.gm2_rz.ci95
    assert low is not None
    assert high is not None
    assert low <= product <= high
    assert comparison.parasitic is not None
    low, high = comparison.parasitic.load_f.ci95
    assert low is not None
    assert high is not None
    assert low <= (EXTRA_LOAD_F[letter] - 1) * 4e-12 <= high


@pytest.mark.parametrize("quantity", ["zero_time_s", "pole2_hz", "gain_bandwidth_hz", "crossover_hz"])
def test_one_part_on_two_benches_gives_one_answer(quantity: str, compared_examples: dict[str, Comparison]) -> None:
    first, second = (compared_examples[letter].row(quantity).measured for letter in "ae")
    assert first.value is not None
    assert second.value is not None
    assert first.stderr is not None
    assert second.stderr is not None
    assert abs(first.value - second.value) < 3 * math.hypot(first.stderr, second.stderr)


def test_the_script_writes_the_shipped_files_byte_for_byte(
    examples: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    script = examples.parent / "scripts" / "make_examples.py"
    spec = importlib.util.spec_from_file_location("make_examples", script)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    monkeypatch.setattr(sys, "argv", [str(script), "--out", str(tmp_path)])
    module.main()
    assert capsys.readouterr().out.count("241 points") == 5
    shipped = sorted(path.relative_to(examples) for path in examples.glob("part_*/*"))
    assert len(shipped) == 6
    shipped += sorted(path.relative_to(examples) for path in examples.glob("part_*.*"))
    written = {path.relative_to(tmp_path) for path in tmp_path.rglob("*") if path.is_file()}
    assert set(shipped) == written
    for path in shipped:
        assert (tmp_path / path).read_bytes() == (examples / path).read_bytes(), path
