"""Design files: what good ones mean, and that doubtful ones are refused in one line that says why."""

from __future__ import annotations

import hashlib
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design import Bench, Design, HalfPlane, Limit, Roots, read_design, write_design
from fitamp.errors import DesignError, UsageError

MINIMAL = """\
[elements]
gm1 = "150 uS"
R1 = "900 kOhm"
C1 = "200 fF"
gm2 = "1.6 mS"
R2 = "60 kOhm"
CL = "4 pF"
Cc = "1.8 pF"
Rz = "1.3 kOhm"
"""
FULL = """\
[about]
name = "two-stage, first silicon"
note = \"\"\"
Bias "low",
measured at 25 °C.\"\"\"

[elements]
gm1 = { value = "150 uS", spread = 0.08 }
R1 = "900 kOhm"
C1 = "200 fF"
gm2 = { value = "1.6 mS", spread = "10 %", under_test = true }
R2 = "60 kOhm"
CL = "4 pF"
Cc = { value = "1.8 pF", spread = "0 %" }
Rz = { value = "1.3 kOhm", spread = "20 %", under_test = true }
Cgd = { value = "10 fF", spread = "50 %" }
mirror_pole = "400 MHz"

[loop]
beta = 0.5
delay = "0.2 ns"

[limits]
dc_gain = ["76 dB", inf]
gain_bandwidth_hz = [5e6, 9e6]
zero_hz = ["80 MHz", "160 MHz"]
phase_margin_deg = [60, "80 deg"]
gain_margin_db = ["10 dB", "none"]
pole2_hz = [-inf, "90 MHz"]
half_plane = "left"
small_zero = "5 %"

[bench]
load = { value = "2 pF", spread = "20 %" }
delay = { value = "1.2 ns", spread = "0.1 ns" }
"""
ROOTS = """\
[designed]
dc_gain = "82 dB"
pole1 = { value = "1.2 kHz", spread = "30 %" }
pole2 = "58 MHz"
zero = "110 MHz"
half_plane = "left"
"""
ELEMENTS = Elements(gm1=150e-6, R1=900e3, C1=200e-15, gm2=1.6e-3, R2=60e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
FREQ_HZ = np.geomspace(10.0, 1e10, 31)


def design_of(tmp_path: Path, text: str) -> Design:
    path = tmp_path / "miller.toml"
    path.write_text(text, encoding="utf-8")
    return read_design(path)


# Good files


def test_minimal_file_states_the_elements_and_nothing_else(tmp_path: Path) -> None:
    design = design_of(tmp_path, MINIMAL)
    assert design.elements == ELEMENTS
    assert design.roots is None
    assert design.file == str(tmp_path / "miller.toml")
    assert design.name == "miller"
    assert design.sha256 == hashlib.sha256(MINIMAL.encode()).hexdigest()
    assert design.spreads == dict.fromkeys(ELEMENT_NAMES, 0.20)
    assert design.assumed_spreads == ELEMENT_NAMES
    assert design.under_test == {"Rz"}
    assert design.limits == {}
    assert design.bench == Bench()
    assert design.half_plane is HalfPlane.LEFT
    assert design.small_zero_ratio == 0.10


def test_full_file_is_taken_up_entry_by_entry(tmp_path: Path) -> None:
    design = design_of(tmp_path, FULL)
    assert design.elements == replace(ELEMENTS, Cgd=10e-15, mirror_pole_hz=400e6, beta=0.5, delay_s=0.2e-9)
    assert design.name == "two-stage, first silicon"
    assert design.note == 'Bias "low",\nmeasured at 25 °C.'
    stated = {"gm1": 0.08, "gm2": 0.10, "Cc": 0.0, "Rz": 0.20, "Cgd": 0.5}
    assert design.spreads == dict.fromkeys((*ELEMENT_NAMES, "Cgd", "mirror_pole_hz"), 0.20) | stated
    assert design.assumed_spreads == ("R1", "C1", "R2", "CL", "mirror_pole_hz")
    assert design.under_test == {"gm2", "Rz"}
    assert design.limits == {
        "dc_gain": Limit(low=10**3.8),
        "gain_bandwidth_hz": Limit(low=5e6, high=9e6),
        "zero_hz": Limit(low=80e6, high=160e6),
        "phase_margin_deg": Limit(low=60.0, high=80.0),
        "gain_margin_db": Limit(low=10.0),
        "pole2_hz": Limit(high=90e6),
    }
    assert design.small_zero_ratio == 0.05
    assert design.bench == Bench(load_f=2e-12, load_spread=0.2, delay_s=1.2e-9, delay_spread_s=0.1e-9)


def test_design_by_roots_is_their_transfer_function(tmp_path: Path) -> None:
    design = design_of(tmp_path, ROOTS + 'pole3 = "900 MHz"\n[loop]\ndelay = "0.1 ns"\n')
    assert design.elements is None
    assert design.half_plane is HalfPlane.LEFT
    assert design.under_test == frozenset()
    assert design.roots is not None
    assert design.roots.spreads == {
        "dc_gain": 0.20,
        "pole1_hz": 0.30,
        "pole2_hz": 0.20,
        "zero_hz": 0.20,
        "pole3_hz": 0.20,
    }
    assert design.assumed_spreads == ("dc_gain", "pole2_hz", "zero_hz", "pole3_hz")
    jf = 1j * FREQ_HZ
    expected = 10**4.1 * (1 + jf / 110e6) / ((1 + jf / 1.2e3) * (1 + jf / 58e6) * (1 + jf / 900e6))
    expected = expected * np.exp(-2j * np.pi * FREQ_HZ * 0.1e-9)
    assert design.transfer().evaluate(FREQ_HZ) == pytest.approx(expected, rel=1e-12)
    assert design.zero_time_s == pytest.approx(1 / (2 * math.pi * 110e6), rel=1e-12)
    assert design.small_zero_time_s == pytest.approx(0.1 / (2 * math.pi * 110e6), rel=1e-12)


def test_zero_in_the_right_half_plane_has_a_negative_zero_time(tmp_path: Path) -> None:
    design = design_of(tmp_path, ROOTS.replace('"left"', '"right"'))
    assert design.zero_time_s == pytest.approx(-1 / (2 * math.pi * 110e6), rel=1e-12)
    assert design.transfer().zeros_hz == (110e6,)


@pytest.mark.parametrize("zero", ['zero = "none"\n', ""])
def test_zero_designed_at_infinity_is_small_against_pole_2(tmp_path: Path, zero: str) -> None:
    text = ROOTS.replace('zero = "110 MHz"\n', zero).replace('"left"', '"infinity"')
    design = design_of(tmp_path, text)
    assert design.half_plane is HalfPlane.INFINITY
    assert design.zero_time_s == 0
    assert design.transfer().zeros_hz == ()
    assert design.small_zero_time_s == pytest.approx(0.1 / (2 * math.pi * 58e6), rel=1e-12)


@pytest.mark.parametrize("text", [MINIMAL, FULL, ROOTS])
def test_written_design_reads_back_the_same(tmp_path: Path, text: str) -> None:
    design = design_of(tmp_path, text)
    write_design(design, tmp_path / "copy.toml")
    copy = read_design(tmp_path / "copy.toml")
    assert copy.sha256 != design.sha256
    assert replace(copy, file=design.file, sha256=design.sha256) == design


def test_design_is_not_written_into_a_missing_folder(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match=r"copy\.toml: cannot be written .*; choose another place"):
        write_design(Design.from_elements(ELEMENTS), tmp_path / "missing" / "copy.toml")


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig"])
@pytest.mark.parametrize("newline", ["\n", "\r\n"])
def test_editors_marks_and_line_ends_make_no_difference(tmp_path: Path, encoding: str, newline: str) -> None:
    path = tmp_path / "miller.toml"
    path.write_text(MINIMAL, encoding=encoding, newline=newline)
    assert read_design(path).elements == ELEMENTS


def test_resistor_is_under_test_unless_the_file_says_otherwise(tmp_path: Path) -> None:
    text = MINIMAL.replace('"1.3 kOhm"', '{ value = "1.3 kOhm", under_test = false }')
    assert design_of(tmp_path, text).under_test == frozenset()


def test_amplifier_without_resistor_keeps_its_right_half_plane_zero(tmp_path: Path) -> None:
    # An inverting stage with a capacitor across it has a right-half-plane zero at gm/C (common practice).
    design = design_of(tmp_path, MINIMAL.replace('"1.3 kOhm"', '"0 Ohm"'))
    assert design.half_plane is HalfPlane.RIGHT
    assert design.transfer().zeros_hz[0].real == pytest.approx(1.6e-3 / (2 * math.pi * 1.8e-12), rel=1e-9)


def test_delay_spread_may_be_relative(tmp_path: Path) -> None:
    text = MINIMAL + '[bench]\ndelay = { value = "1.2 ns", spread = "10 %" }\n'
    assert design_of(tmp_path, text).bench.delay_spread_s == pytest.approx(0.12e-9, rel=1e-12)


# What a design means


@given(
    st.tuples(*(st.floats(min_value=0.2, max_value=5.0) for _ in ELEMENT_NAMES)),
    st.floats(min_value=0.0, max_value=5e-12),
    st.floats(min_value=0.0, max_value=2e-9),
)
def test_transfer_is_that_of_the_elements_and_the_bench_adds_to_it(
    factors: tuple[float, ...], load_f: float, delay_s: float
) -> None:
    values = {name: getattr(ELEMENTS, name) * factor for name, factor in zip(ELEMENT_NAMES, factors, strict=True)}
    elements = Elements(**values, delay_s=0.1e-9)
    design = Design.from_elements(elements, bench=Bench(load_f=load_f, delay_s=delay_s))
    assert design.transfer() == elements.transfer()
    loaded = replace(elements, CL=elements.CL + load_f, delay_s=0.1e-9 + delay_s).transfer()
    assert design.on_bench().evaluate(FREQ_HZ) == pytest.approx(loaded.evaluate(FREQ_HZ), rel=1e-9)


def test_bench_delay_adds_to_a_design_by_roots() -> None:
    roots = Roots(dc_gain=1e4, pole1_hz=1e3, pole2_hz=5e7, half_plane=HalfPlane.INFINITY, delay_s=1e-9)
    design = Design.from_roots(roots, bench=Bench(delay_s=2e-9))
    assert design.transfer().delay_s == 1e-9
    assert design.on_bench().delay_s == pytest.approx(3e-9, rel=1e-15)


def test_overlap_capacitor_pulls_the_zero_time_down() -> None:
    # Kirchhoff's current law at the output with Cgd across stage 2: the current that bypasses gm2 is s·Cgd·V.
    design = Design.from_elements(replace(ELEMENTS, Cgd=20e-15))
    assert design.zero_time_s == pytest.approx(1.8e-12 * (1300 - 625) - 20e-15 * 625, rel=1e-12)
    assert design.zero_time_s == pytest.approx(design.transfer().zero_time_s, rel=1e-9)


@pytest.mark.parametrize(
    ("nulling_product", "half_plane"),
    [
        (0.0, HalfPlane.RIGHT),
        (0.89, HalfPlane.RIGHT),
        (0.91, HalfPlane.INFINITY),
        (1.0, HalfPlane.INFINITY),
        (1.09, HalfPlane.INFINITY),
        (1.11, HalfPlane.LEFT),
        (2.5, HalfPlane.LEFT),
    ],
)
def test_half_plane_follows_from_the_nulling_product(nulling_product: float, half_plane: HalfPlane) -> None:
    # gm2·Rz = 1 sends the zero to infinity (common practice); within a tenth of it the zero counts as gone.
    design = Design.from_elements(replace(ELEMENTS, Rz=nulling_product / ELEMENTS.gm2))
    assert design.half_plane is half_plane
    assert design.small_zero_time_s == pytest.approx(0.1 * 1.8e-12 / 1.6e-3, rel=1e-12)


def test_stated_half_plane_holds_where_the_zero_is_small() -> None:
    nearly_gone = replace(ELEMENTS, Rz=1.05 / ELEMENTS.gm2)
    for half_plane in HalfPlane:
        assert Design.from_elements(nearly_gone, half_plane=half_plane).half_plane is half_plane


@pytest.mark.parametrize("half_plane", [HalfPlane.RIGHT, HalfPlane.INFINITY])
def test_half_plane_against_the_elements_is_refused(half_plane: HalfPlane) -> None:
    with pytest.raises(DesignError, match=r"but the elements put it in the left half plane \(gm2·Rz = 2\.08\)"):
        Design.from_elements(ELEMENTS, half_plane=half_plane)


def test_limit_tells_inside_outside_and_between() -> None:
    limit = Limit(low=80.0, high=160.0)
    assert [limit.contains(value) for value in (79.0, 80.0, 160.0, 161.0)] == [False, True, True, False]
    assert limit.straddled_by(70.0, 90.0)
    assert limit.straddled_by(150.0, 170.0)
    assert limit.straddled_by(70.0, 170.0)
    assert not limit.straddled_by(90.0, 150.0)
    assert not limit.straddled_by(10.0, 70.0)
    assert not limit.straddled_by(170.0, math.inf)
    assert Limit(low=80.0).straddled_by(70.0, math.inf)
    assert not Limit(low=80.0).straddled_by(90.0, math.inf)
    assert Limit(high=80.0).contains(-math.inf)


# Refusals of values put together in Python


@pytest.mark.parametrize(
    ("low", "high", "complaint"),
    [
        (None, None, "both ends are open"),
        (math.nan, 1.0, "not finite"),
        (1.0, math.inf, "an open end is None"),
        (2.0, 1.0, "the first end, 2, must be below the second, 1"),
        (1.0, 1.0, "must be below"),
    ],
)
def test_limit_that_limits_nothing_is_refused(low: float | None, high: float | None, complaint: str) -> None:
    with pytest.raises(DesignError, match=complaint):
        Limit(low=low, high=high)


@pytest.mark.parametrize(
    ("changes", "complaint"),
    [
        ({"dc_gain": -1e4}, "dc_gain must be finite and above 0, but is -10000"),
        ({"pole2_hz": 500.0}, r"pole 1 \(1000 Hz\) must lie below pole 2 \(500 Hz\)"),
        ({"pole3_hz": 1e6}, r"pole 3 \(1e\+06 Hz\) must not lie below pole 2"),
        ({"zero_hz": None}, "no zero is given, but it shall lie in the left half plane"),
        ({"half_plane": HalfPlane.INFINITY}, "at infinity at once"),
        ({"delay_s": -1e-9}, "delay must be 0 s or more"),
        ({"spreads": {"pole4_hz": 0.1}}, "spread of pole4_hz, which is not one of dc_gain, "),
        ({"spreads": {"pole1_hz": 1.5}}, "spread of pole1_hz must be from 0 to below 1, but is 1.5"),
    ],
)
def test_roots_that_contradict_each_other_are_refused(changes: dict[str, Any], complaint: str) -> None:
    sound = Roots(dc_gain=1e4, pole1_hz=1e3, pole2_hz=5e7, zero_hz=1e8, half_plane=HalfPlane.LEFT)
    with pytest.raises(DesignError, match=complaint):
        replace(sound, **changes)


def test_design_put_together_wrongly_is_refused() -> None:
    roots = Roots(dc_gain=1e4, pole1_hz=1e3, pole2_hz=5e7, half_plane=HalfPlane.INFINITY)
    with pytest.raises(DesignError, match="needs element values or roots, and not both"):
        Design(file="x", half_plane=HalfPlane.LEFT)
    with pytest.raises(DesignError, match="needs element values or roots, and not both"):
        Design(file="x", half_plane=HalfPlane.LEFT, elements=ELEMENTS, roots=roots)
    with pytest.raises(DesignError, match="no limit can be put on slew_rate; known are dc_gain, "):
        Design.from_elements(ELEMENTS, limits={"slew_rate": Limit(low=1.0)})
    with pytest.raises(DesignError, match="no element is named Rx; known are gm1, "):
        Design.from_elements(ELEMENTS, under_test=["Rx"])
    with pytest.raises(DesignError, match="small_zero_ratio must be from 0 to below 1, but is 10"):
        Design.from_elements(ELEMENTS, small_zero_ratio=10)
    with pytest.raises(DesignError, match="a bench load cannot be added to a design given by roots"):
        Design.from_roots(roots, bench=Bench(load_f=1e-12))
    with pytest.raises(DesignError, match="the bench's load_f must be 0 or more, but is -1"):
        Bench(load_f=-1.0)


# Refusals of files


def refusal(tmp_path: Path, text: str) -> str:
    with pytest.raises(DesignError, match=r"miller\.toml") as caught:
        design_of(tmp_path, text)
    message = str(caught.value)
    assert "\n" not in message
    assert caught.value.exit_code == 3
    return message.removeprefix(str(tmp_path / "miller.toml"))


@pytest.mark.parametrize(
    ("entry", "message"),
    [
        ('Rz = "1.3 kF"', ", [elements] Rz: '1.3 kF' has unit 'F'; expected Ω, as in '1.3 kOhm'"),
        ('Rz = "1,3 kOhm"', ", [elements] Rz: '1,3 kOhm' has a comma; write the decimal mark as a point"),
        ('Rz = "1.3k"', ", [elements] Rz: '1.3k' has no unit; expected Ω, as in '1.3 kOhm'"),
        ('Rz = "-1 Ohm"', ", [elements] Rz: '-1 Ohm' is negative; expected something like '1.3 kOhm'"),
        ('Rz = "1e999 Ohm"', ", [elements] Rz: '1e999 Ohm' is not finite"),
        ("Rz = 1300", ", [elements] Rz: 1300 is not text with a unit; expected something like '1.3 kOhm'"),
        ("Rz = true", ", [elements] Rz: true is not text with a unit; expected something like '1.3 kOhm'"),
        ('Rz = ["1 kOhm"]', ", [elements] Rz: ['1 kOhm'] is not text with a unit; expected something like '1.3 kOhm'"),
        ("Rz = 2024-05-01", ", [elements] Rz: 2024-05-01 is not text with a unit; expected something like '1.3 kOhm'"),
        ('Rz = { valeu = "1 kOhm" }', ", [elements] Rz: unknown key 'valeu'; did you mean value? known are value, "),
        ("Rz = { spread = 0.1 }", ", [elements] Rz: the table has no value; expected { value = "),
        ('Rz = { value = "1 kOhm", spread = 20 }', ", [elements] Rz: spread is 20; expected 0 or more and below 100 %"),
        ('Rz = { value = "1 kOhm", spread = "-1 %" }', ", [elements] Rz: spread is '-1 %'; expected 0 or more"),
        ('Rz = { value = "1 kOhm", spread = "10 dB" }', ", [elements] Rz: '10 dB' is not a ratio; expected"),
        ('Rz = { value = "1 kOhm", spread = true }', ", [elements] Rz: true is neither number nor text; expected"),
        ('Rz = { value = "1 kOhm", spread = nan }', ", [elements] Rz: nan is not finite"),
        ('Rz = { value = "1 kOhm", under_test = "yes" }', ", [elements] Rz: under_test is 'yes'; expected true or"),
        ('Rz = "1 Ohm"\nC1x = "1 pF"', ", [elements]: unknown key 'C1x'; did you mean C1? known are gm1, "),
        ('Rz = "1 Ohm"\nmirror_pole = "0 Hz"', ", [elements] mirror_pole: '0 Hz' is not above 0; expected"),
        (
            "",
            ', [elements]: lacks Rz; add a line such as Rz = { value = "1.3 kOhm", spread = "12 %" }, or Rz = "0 Ohm"',
        ),
    ],
)
def test_unusable_element_is_refused(tmp_path: Path, entry: str, message: str) -> None:
    assert refusal(tmp_path, MINIMAL.replace('Rz = "1.3 kOhm"', entry)).startswith(message)


def test_elements_beyond_computing_are_refused(tmp_path: Path) -> None:
    text = MINIMAL.replace("200 fF", "1e300 F")
    message = ", [elements]: no loop gain can be computed from these values; check the prefixes of the units"
    assert refusal(tmp_path, text) == message


@pytest.mark.parametrize("zero", ["0 S", "-0 S"])
def test_element_that_cannot_be_zero_is_refused_at_zero(tmp_path: Path, zero: str) -> None:
    text = MINIMAL.replace("1.6 mS", zero)
    assert f"[elements] gm2: '{zero}' is not above 0; expected something like '1.6 mS'" in refusal(tmp_path, text)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("[limit]\n", ", unknown table 'limit'; did you mean [limits]? known are [about], "),
        ("[xyz]\n", ", unknown table 'xyz'; known are [about], "),
        ("[loop]\nbeta = 0\n", ", [loop] beta: 0 is not above 0; expected a number such as 1.0 or 0.5"),
        ('[loop]\nbeta = "half"\n', ", [loop] beta: 'half' is text; expected a number above 0"),
        ("[loop]\nbeta = true\n", ", [loop] beta: true is neither number nor text"),
        ("[loop]\nbeta = inf\n", ", [loop] beta: inf is not finite"),
        (f"[loop]\nbeta = 1{'0' * 400}\n", ", [loop] beta: a number of 401 digits; expected"),
        ('[loop]\ndelay = "-1 ns"\n', ", [loop] delay: '-1 ns' is negative"),
        ('[loop]\ndelay = "1 nS"\n', ", [loop] delay: '1 nS' has unit 'S'; expected s"),
        ('[bench]\nload = "2 ns"\n', ", [bench] load: '2 ns' has unit 's'; expected F"),
        ('[bench]\nload = { value = "2 pF", under_test = true }\n', ", [bench] load: unknown key 'under_test'"),
        ('[bench]\ndelay = { value = "0 ns", spread = "10 %" }\n', ", [bench] delay: spread is '10 %' of 0; expected"),
        ('[bench]\ndelay = { value = "1 ns", spread = "-1 ns" }\n', ", [bench] delay: '-1 ns' is negative"),
        ("[about]\nname = 7\n", ", [about] name: 7 is not text"),
        ('[about]\nname = "a\\nb"\n', ", [about] name: 'a\\nb' has characters that cannot be printed"),
        ('[limits]\nzero_hz = "80 MHz"\n', ", [limits] zero_hz: '80 MHz' is not a list of two ends; expected"),
        ('[limits]\nzero_hz = ["80 MHz"]\n', ", [limits] zero_hz: ['80 MHz'] is not a list of two ends"),
        (
            '[limits]\nzero_hz = ["80 MHz", "60 MHz"]\n',
            ", [limits] zero_hz: the first end, '80 MHz', must be below the second, '60 MHz'",
        ),
        ('[limits]\nzero_hz = [80e6, "80 MHz"]\n', ", [limits] zero_hz: the first end, 80000000.0, must be below the"),
        (
            "[limits]\ndc_gain = [76, 88]\n",
            ", [limits] dc_gain: a plain number is V/V, and the design has 12960 V/V; write",
        ),
        ('[limits]\nzero_hz = ["80 mV", "90 MHz"]\n', ", [limits] zero_hz: '80 mV' has unit 'mV'; expected Hz"),
        ("[limits]\nzero_hz = [-1, 5]\n", ", [limits] zero_hz: -1 is negative; expected 0 or more"),
        ("[limits]\nzero_hz = [inf, 5]\n", ", [limits] zero_hz: inf is no end on this side; an open end is"),
        ("[limits]\nzero_hz = [nan, 5]\n", ", [limits] zero_hz: nan is no end on this side"),
        ('[limits]\nzero_hz = ["none", inf]\n', ", [limits] zero_hz: both ends are open"),
        ("[limits]\nzero_hz = [true, 5]\n", ", [limits] zero_hz: true is neither number nor text"),
        ('[limits]\ndc_gain = ["5 Hz", inf]\n', ", [limits] dc_gain: '5 Hz' has unit 'Hz'; expected V/V"),
        ('[limits]\nphase_margin = ["60 deg", inf]\n', ", [limits]: unknown key 'phase_margin'; did you mean phase_"),
        ('[limits]\nhalf_plane = "top"\n', ", [limits] half_plane: 'top' is no half plane; expected 'left', 'right'"),
        ('[limits]\nhalf_plane = "right"\n', ", [limits] half_plane: the zero shall lie in the right half plane, but"),
        ('[limits]\nsmall_zero = "100 %"\n', ", [limits] small_zero: spread is '100 %'; expected"),
        (ROOTS, ", both [elements] and [designed]; expected one of the two"),
    ],
)
def test_unusable_entry_beside_the_elements_is_refused(tmp_path: Path, text: str, message: str) -> None:
    assert refusal(tmp_path, MINIMAL + text).startswith(message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('"82 dB"', '"0 V/V"', ", [designed] dc_gain: '0 V/V' is not above 0"),
        ('"82 dB"', '"82 dBm"', ", [designed] dc_gain: '82 dBm' has unit 'dBm'; expected V/V"),
        ('"58 MHz"', '"1 kHz"', ", [designed]: pole 1 (1200 Hz) must lie below pole 2 (1000 Hz)"),
        ('"110 MHz"', '"none"', ", [designed]: no zero is given, but it shall lie in the left half plane"),
        ('"left"', '"infinity"', ", [designed]: the zero is at 1.1e+08 Hz and at infinity at once"),
        ('"left"', '"leftish"', ", [designed] half_plane: 'leftish' is no half plane"),
        ('half_plane = "left"', "", ', [designed]: lacks half_plane; add a line such as half_plane = "left"'),
        ('zero = "110 MHz"', "", ", [designed]: lacks zero"),
        ('pole2 = "58 MHz"', "", ', [designed]: lacks pole2; add a line such as pole2 = { value = "45 MHz", spread = '),
        ('pole2 = "58 MHz"', 'pole_2 = "58 MHz"', ", [designed]: unknown key 'pole_2'; did you mean pole2?"),
        ('"left"\n', '"left"\n[loop]\nbeta = 0.5\n', ", [loop] beta: is part of dc_gain in [designed]; leave it out"),
        ('"left"\n', '"left"\n[bench]\nload = "1 pF"\n', ", [bench] load: cannot be added to [designed]; give the"),
        ('"left"\n', '"left"\n[limits]\nhalf_plane = "right"\n', ", [limits] half_plane: is 'right', but [designed]"),
    ],
)
def test_unusable_root_is_refused(tmp_path: Path, old: str, new: str, message: str) -> None:
    assert old in ROOTS
    assert refusal(tmp_path, ROOTS.replace(old, new)).startswith(message)


def test_zero_at_infinity_cannot_keep_an_upper_limit(tmp_path: Path) -> None:
    text = MINIMAL.replace("1.3 kOhm", "625 Ohm")
    assert refusal(tmp_path, text + '[limits]\nzero_hz = ["1 GHz", "2 GHz"]\n').startswith(
        ", [limits] zero_hz: ends at 2.000 GHz, but the zero is designed at infinity; open that end with inf"
    )
    assert design_of(tmp_path, text + '[limits]\nzero_hz = ["1 GHz", inf]\n').limits["zero_hz"].low == 1e9


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", ", neither [elements] nor [designed]; expected one of the two"),
        ('gm2 = "1.6 mS"\n', ", [elements] is missing above gm2; write that heading on a line of its own"),
        (MINIMAL.removeprefix("[elements]\n"), ", [elements] is missing above gm1; write that heading on a line of"),
        (ROOTS.removeprefix("[designed]\n"), ", [designed] is missing above dc_gain; write that heading on a line of"),
        ('Rz = "1 Ohm"\n' + MINIMAL, ", Rz stands above the heading [elements]; move it below"),
        ("beta = 1.0\n", ", unknown entry before the first table, 'beta'; known are [about], "),
        ("elements = 3\n", ", elements is not a table; expected one heading [elements] with entries below it"),
        ("[[elements]]\n", ", elements is not a table; expected one heading [elements]"),
        ("[elements]\nRz = 1.3 kOhm\n", ", line 2, column 10: not TOML: Expected newline or end of document"),
        ("[elements]\n[elements]\n", ", line 2, column 10: not TOML: Cannot declare ('elements',) twice"),
        ("[elements", ", end of document: not TOML: Expected ']' at the end of a table declaration"),
        (f"a = {'[' * 5000}", ": is nested too deeply; a design file has tables of plain entries"),
        (f"a = {'9' * 5000}", ": not TOML: Exceeds the limit"),
        ("#" * 1_000_001, ": is larger than 1 MB; a design file is a page of TOML text"),
    ],
)
def test_file_that_is_no_design_is_refused(tmp_path: Path, text: str, message: str) -> None:
    assert refusal(tmp_path, text).startswith(message)


def test_missing_heading_is_one_fault(tmp_path: Path) -> None:
    for text in (MINIMAL.removeprefix("[elements]\n"), ROOTS.removeprefix("[designed]\n")):
        assert "more fault" not in refusal(tmp_path, text)
    assert refusal(tmp_path, 'half_plane = "left"\n').endswith("(and 1 more fault in this file)")


def test_missing_elements_come_with_an_example_line(tmp_path: Path) -> None:
    one = MINIMAL.replace('Cc = "1.8 pF"\n', "")
    example = '{ value = "1.8 pF", spread = "6 %" }'
    assert refusal(tmp_path, one) == f", [elements]: lacks Cc; add a line such as Cc = {example}"
    two = one.replace('Rz = "1.3 kOhm"\n', "")
    assert refusal(tmp_path, two) == f", [elements]: lacks Cc, Rz; add a line for each, such as Cc = {example}"


def test_several_faults_are_counted_behind_the_first(tmp_path: Path) -> None:
    text = MINIMAL.replace("1.3 kOhm", "1.3 kF").replace("1.6 mS", "1,6 mS").replace("Cc =", "CC =")
    message = refusal(tmp_path, text)
    assert message.startswith(", [elements]: unknown key 'CC'; did you mean Cc?")
    assert message.endswith("(and 3 more faults in this file)")  # gm2, Rz, and Cc is lacking


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (MINIMAL.encode() + b"# 25 \xb0C", "line 10: byte 0xB0 is not UTF-8 text; save the file as UTF-8"),
        (MINIMAL.encode("utf-16"), "line 1: byte 0xFF is not UTF-8 text"),
    ],
)
def test_file_in_another_encoding_is_refused(tmp_path: Path, data: bytes, message: str) -> None:
    path = tmp_path / "miller.toml"
    path.write_bytes(data)
    with pytest.raises(DesignError, match=message):
        read_design(path)


def test_path_without_a_file_is_refused(tmp_path: Path) -> None:
    with pytest.raises(DesignError, match=r"none\.toml: no such file; check the path of the design file"):
        read_design(tmp_path / "none.toml")
    with pytest.raises(DesignError, match="is a directory; give the design file itself"):
        read_design(tmp_path)
    with pytest.raises(DesignError, match="check the path of the design file"):
        read_design("a\0b.toml")
    with pytest.raises(DesignError, match=r"cannot be read|no such file"):
        read_design(str(tmp_path / ("x" * 5000)))
