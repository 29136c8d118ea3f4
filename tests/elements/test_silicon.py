"""Silicon as the next design: elements and errors of the estimate in a design file."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from stepped_parts import BASE, DESIGN, NOMINAL, STEPS, drawn, swept

from fitamp.design import Bench, Design, HalfPlane, Limit, read_design
from fitamp.elements import ElementEstimate, estimate_elements, estimated_design, write_estimated_design
from fitamp.elements.silicon import estimated_design_text
from fitamp.errors import UsageError

LIMITED = Design.from_elements(
    NOMINAL,
    spreads={"gm1": 0.2, "R1": 0.2, "C1": 0.2, "gm2": 0.2, "R2": 0.2, "CL": 0.2, "Cc": 0.2, "Rz": 0.2},
    limits={"zero_hz": Limit(low=90e6, high=200e6), "phase_margin_deg": Limit(low=65.0)},
    bench=Bench(load_f=2e-12, load_spread=0.05, delay_s=0.0),
    name="line buffer",
    file="line_buffer.toml",
)


@pytest.fixture(scope="module")
def stepped() -> ElementEstimate:
    return estimate_elements(swept(drawn(1), STEPS, seed=2), LIMITED, conditions=STEPS)


def test_the_file_reads_back_as_the_estimated_part(stepped: ElementEstimate, tmp_path: Path) -> None:
    path = tmp_path / "silicon.toml"
    write_estimated_design(stepped, path)
    design = read_design(path)
    assert design.elements is not None
    for one in stepped.elements:
        found = one.estimate
        assert found.value is not None
        assert found.stderr is not None
        # Digits to a hundredth of the error.
        assert getattr(design.elements, one.name) == pytest.approx(found.value, abs=0.01 * found.stderr)
        assert design.spreads[one.name] == pytest.approx(found.stderr / found.value, rel=0.01)
    assert design.limits == LIMITED.limits
    assert design.bench == LIMITED.bench
    assert design.under_test == LIMITED.under_test
    assert design.half_plane is HalfPlane.LEFT
    assert design.name == "line buffer, as estimated"
    assert not design.assumed_spreads


def test_remarks_say_where_the_numbers_come_from(stepped: ElementEstimate) -> None:
    lines = estimated_design_text(stepped).splitlines()
    assert lines[0] == "# Elements as estimated by fitamp, in place of those of line_buffer.toml, from"
    assert lines[1:6] == [
        "#   step0.csv",
        "#   step1.csv with 5.00 pF added",
        "#   step2.csv with 15.0 pF added",
        "#   step3.csv with 400 Ω taken from Rz",
        "#   step4.csv with 500 Ω added to Rz",
    ]
    (gm2,) = (line for line in lines if line.startswith("#   gm2"))
    assert "100%" in gm2
    assert gm2.endswith("designed 1.600 mS")


def test_what_no_sweep_tells_stays_as_designed() -> None:
    design = replace(LIMITED, bench=Bench(delay_s=0.0), spreads={**LIMITED.spreads, "C1": 0.0})
    sweeps = swept(drawn(1), [BASE], seed=2, bench_load_f=0.0)
    estimate = estimate_elements(sweeps, design, under_test=["R1", "R2", "gm1"])
    found = estimated_design(estimate)
    assert found.elements is not None
    assert (found.elements.R1, found.spreads["R1"]) == (NOMINAL.R1, 0.2)
    assert (found.elements.C1, found.spreads["C1"]) == (NOMINAL.C1, 0.0)
    text = estimated_design_text(estimate)
    assert "R1             not told by the sweeps, kept as designed" in text
    assert "C1             held as designed, which gives it no spread" in text


def test_a_part_without_its_resistor_is_a_design_with_its_zero_on_the_other_side(tmp_path: Path) -> None:
    die = drawn(3).with_changes(Rz=0.0)
    estimate = estimate_elements(swept(die, STEPS[:3], seed=3), LIMITED, conditions=STEPS[:3])
    path = tmp_path / "silicon.toml"
    write_estimated_design(estimate, path)
    design = read_design(path)
    assert design.half_plane is HalfPlane.RIGHT
    assert design.elements is not None
    assert design.elements.Rz == pytest.approx(0.0, abs=5.0)


def test_a_nulled_part_keeps_the_side_that_it_was_designed_for(tmp_path: Path) -> None:
    die = NOMINAL.with_changes(Rz=630.0)
    estimate = estimate_elements(swept(die, STEPS, seed=3), LIMITED, conditions=STEPS)
    path = tmp_path / "silicon.toml"
    write_estimated_design(estimate, path)
    assert read_design(path).half_plane is HalfPlane.LEFT


def test_an_estimate_not_to_be_trusted_says_so_in_the_file() -> None:
    sweeps = swept(drawn(1), [BASE, BASE], seed=2)
    sweeps[1] = swept(drawn(1).with_changes(gm1=2e-4), [BASE, BASE], seed=2)[1]
    text = estimated_design_text(estimate_elements(sweeps, DESIGN))
    assert "# The estimate is not to be trusted without a look at its notes:" in text
    assert "do not show the same part" in text


def test_a_name_cannot_break_out_of_its_remark(stepped: ElementEstimate, tmp_path: Path) -> None:
    check = replace(stepped.checks[0], file='evil\n[bench]\nload = "1 F"')
    path = tmp_path / "silicon.toml"
    write_estimated_design(replace(stepped, checks=(check, *stepped.checks[1:])), path)
    assert read_design(path).bench.load_f == 2e-12


def test_a_place_that_cannot_be_written_is_refused(stepped: ElementEstimate, tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="cannot be written"):
        write_estimated_design(stepped, tmp_path / "none" / "silicon.toml")
