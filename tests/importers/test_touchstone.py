"""Touchstone: all forms give the same numbers, and those of the specification's and scikit-rf's own files."""

from __future__ import annotations

import io
import pickle
from pathlib import Path

import numpy as np
import pytest
import skrf
from bench_tables import FREQ_HZ, FREQ_UNITS, GAIN, RTOL, file_of, number
from numpy.testing import assert_allclose
from skrf.io.touchstone import Touchstone

from fitamp.errors import SweepError, UsageError
from fitamp.importers import read_sweep
from fitamp.sweep import Sign, Sweep

SAMPLES = sorted(path.name for path in (Path(skrf.__file__).parent / "data").glob("*.s[0-9]p"))


def pair(form: str, t: complex) -> str:
    size, angle_deg = abs(t), float(np.degrees(np.angle(t)))
    if form == "RI":
        return f"{number(t.real)} {number(t.imag)}"
    return f"{number(size if form == 'MA' else 20 * np.log10(size))} {number(angle_deg)}"


def rows(form: str, unit: str, layout: str, gap: str = " ") -> list[str]:
    """Rows with the gain as S11 of one port, or as S21 of two; the other entries hold other values."""
    lines = []
    for f, t in zip((FREQ_HZ / FREQ_UNITS[unit]).tolist(), GAIN.tolist(), strict=True):
        other = [pair(form, 0.1 + 0.2j), pair(form, 0.3 - 0.1j), pair(form, 0.5 + 0.5j)]
        entries = {
            "one": [pair(form, t)],
            "21_12": [other[0], pair(form, t), other[1], other[2]],
            "12_21": [other[0], other[1], pair(form, t), other[2]],
            "lower": [other[0], pair(form, t), other[2]],
        }[layout]
        lines.append(f"{number(f)} {entries[0]}{gap if len(entries) > 2 else ' '}{' '.join(entries[1:])}")
    return lines


def version_2(form: str, unit: str, order: str, body: list[str], matrix: str = "Full") -> str:
    head = ["[Version] 2.0", f"# {unit} S {form} R 50", "[Number of Ports] 2", f"[Two-Port Data Order] {order}"]
    head += [f"[Number of Frequencies] {len(body)}", "[Reference] 50", "75", f"[Matrix Format] {matrix}"]
    head += ["[Begin Information]", "# not an option line", "[End Information]", "[Network Data]"]
    return "\n".join([*head, *body, "[End]", ""])


def assert_same(sweep: Sweep, trace: str) -> None:
    assert_allclose(sweep.freq_hz, FREQ_HZ, rtol=RTOL)
    assert np.max(np.abs(sweep.gain / GAIN - 1)) < RTOL
    assert (sweep.origin.form, sweep.origin.trace, sweep.sign) == ("touchstone", trace, Sign.AS_READ)


@pytest.mark.parametrize("unit", ["Hz", "kHz", "MHz", "GHz"])
@pytest.mark.parametrize("form", ["RI", "MA", "DB"])
def test_every_form_and_unit_gives_the_numbers_in_the_file(tmp_path: Path, form: str, unit: str) -> None:
    option = f"! invented\n# {unit} S {form} R 50\n"
    one = file_of(tmp_path, option + "\n".join(rows(form, unit, "one")), "a.s1p")
    assert_same(read_sweep(one), "S11")
    two = file_of(tmp_path, option + "\n".join(rows(form, unit, "21_12")), "a.S2P")
    assert_same(read_sweep(two), "S21")
    for order in ("12_21", "21_12"):
        path = file_of(tmp_path, version_2(form, unit, order, rows(form, unit, order)), f"v2_{order}.s2p")
        assert_same(read_sweep(path), "S21")


def test_case_order_and_gaps_of_the_option_line_do_not_matter(tmp_path: Path) -> None:
    body = "\n".join(rows("RI", "kHz", "one"))
    for option in ("# KHZ s ri r 50", "#khz RI R 50 S", "  #   R 75.5   ri kHz  ! remark"):
        assert_same(read_sweep(file_of(tmp_path, f"{option}\n{body}", "a.s1p")), "S11")


def test_rows_over_several_lines_comments_crlf_and_byte_order_mark(tmp_path: Path) -> None:
    body = "\r\n".join(["# Hz S DB R 50", *rows("DB", "Hz", "21_12", gap=" ! first\r\n\r\n   ")])
    path = file_of(tmp_path, b"\xef\xbb\xbf! drive \xc2\xb5V\r\n" + body.encode(), "a.s2p")
    assert_same(read_sweep(path), "S21")
    latin = file_of(tmp_path, "! 50 °\n".encode("latin-1") + body.encode(), "b.s2p")
    assert_same(read_sweep(latin), "S21")


def test_frequency_may_stand_on_a_line_of_its_own(tmp_path: Path) -> None:
    body = "\n".join(rows("RI", "Hz", "one")).replace(" ", "\n  ", 1)
    assert_same(read_sweep(file_of(tmp_path, f"# Hz S RI R 50\n{body}\n", "a.s1p")), "S11")


def test_lower_matrix_of_version_2_is_completed_by_symmetry(tmp_path: Path) -> None:
    text = version_2("RI", "Hz", "12_21", rows("RI", "Hz", "lower"), matrix="Lower")
    path = file_of(tmp_path, text, "a.s2p")
    assert_same(read_sweep(path), "S21")
    assert_same(read_sweep(path, trace="S12"), "S12")


def test_half_a_matrix_of_three_ports_stands_row_by_row(tmp_path: Path) -> None:
    # Touchstone 2.0, [Matrix Format]: lower is N11, N21 N22, N31 N32 N33; upper is N11 N12 N13, N22 N23, N33.
    for matrix, order in (("Lower", "11 21 22 31 32 33"), ("Upper", "11 21 31 22 32 33")):
        body = [f"{f} " + " ".join(f"{cell} -{cell}" for cell in order.split()) for f in (1, 2)]
        text = (
            version_2("RI", "Hz", "12_21", body, matrix=matrix).replace("Ports] 2", "Ports] 3").replace("75", "75 75")
        )
        text = text.replace("[Two-Port Data Order] 12_21\n", "")
        path = file_of(tmp_path, text, "a.s3p")
        for trace, expected in (("S11", 11), ("S21", 21), ("S12", 21), ("S23", 32), ("S31", 31), ("S33", 33)):
            assert read_sweep(path, trace=trace, sign=Sign.UNKNOWN).gain[0] == expected * (1 - 1j)


def test_comments_that_look_like_port_impedances_change_nothing(tmp_path: Path) -> None:
    body = "\n! Port Impedance 50 0\n".join(rows("RI", "Hz", "one"))
    assert_same(read_sweep(file_of(tmp_path, f"! Gamma\n# Hz S RI R 50\n{body}", "a.s1p")), "S11")


def test_trace_picks_the_s_parameter(tmp_path: Path) -> None:
    path = file_of(tmp_path, "# Hz S RI R 50\n1 11 -11 21 -21 12 -12 22 -22\n2 11 0 21 0 12 0 22 0\n", "a.s2p")
    for trace, expected in (("S11", 11 - 11j), ("s21", 21 - 21j), ("S1,2", 12 - 12j), ("S(2,2)", 22 - 22j)):
        assert read_sweep(path, trace=trace, sign=Sign.UNKNOWN).gain[0] == expected


@pytest.mark.parametrize(
    ("trace", "message"),
    [
        ("S31", "trace S31 is not there; the file has S11 to S22"),
        ("T21", "trace 'T21' is not an S-parameter; expected one such as S21"),
        ("S0,1", "trace 'S0,1' is not an S-parameter"),
    ],
)
def test_trace_that_is_not_there_is_refused(tmp_path: Path, trace: str, message: str) -> None:
    path = file_of(tmp_path, "# Hz S RI R 50\n1 11 0 21 0 12 0 22 0\n", "a.s2p")
    with pytest.raises(UsageError, match=message):
        read_sweep(path, trace=trace)


def test_more_than_two_ports_need_a_trace(tmp_path: Path) -> None:
    # Laid out as the four-port example of the Touchstone 1.1 specification (from memory): one matrix row a line.
    matrix = [[f"{i}.{j} 0" for j in range(1, 5)] for i in range(1, 5)]
    text = "# GHz S RI R 50\n5.0 " + "\n    ".join(" ".join(row) for row in matrix) + "\n"
    path = file_of(tmp_path, text, "a.s4p")
    with pytest.raises(UsageError, match=r"which of 4x4 S-parameters is the loop gain\? give --trace"):
        read_sweep(path)
    assert read_sweep(path, trace="S32", sign=Sign.UNKNOWN).gain[0] == 3.2


def test_point_at_zero_hertz_is_left_out_with_its_reason(tmp_path: Path) -> None:
    text = "\n".join(["# Hz S RI R 50", "0 10000 0", *rows("RI", "Hz", "one")])
    sweep = read_sweep(file_of(tmp_path, text, "a.s1p"))
    assert_same(sweep, "S11")
    assert [(point.f_hz, point.gain) for point in sweep.left_out] == [(0.0, 10000)]


# The examples of the Touchstone File Format Specification, versions 1.1 and 2.0, from memory.
ONE_PORT = (
    "!1-port S-parameter file, single frequency point\n# MHz S MA R 50\n!freq magS11 angS11\n2.000 0.894 -12.136\n"
)
TWO_PORT = """!2-port S-parameter file, three frequency points
# GHz S RI R 50.0
!freq RelS11 ImS11 ReS21 ImS21 ReS12 ImS12 ReS22 ImS22
1.0000 0.3926 -0.1211 -0.0003 -0.0021 -0.0003 -0.0021 0.3926 -0.1211
2.0000 0.3517 -0.3054 -0.0096 -0.0298 -0.0096 -0.0298 0.3517 -0.3054
10.000 0.3419 0.3336 -0.0134 0.0379 -0.0134 0.0379 0.3419 0.3336
"""
NOISE_1 = """!2-port network, S-parameter and noise data
# GHZ S MA R 50
2 .95 -26 3.57 157 .04 76 .66 -14
22 .60 -144 1.30 40 .14 40 .56 -85
! NOISE PARAMETERS
4 .7 .64 69 .38
18 2.7 .46 -33 .40
"""
NOISE_2 = """! 2-port network, S-parameter and noise data
[Version] 2.0
# GHz S MA R 50
[Number of Ports] 2
[Two-Port Data Order] 21_12
[Number of Frequencies] 2
[Number of Noise Frequencies] 2
[Reference] 50 25.0
[Network Data]
2 .95 -26 3.57 157 .04 76 .66 -14
22 .60 -144 1.30 40 .14 40 .56 -85
[Noise Data]
4 .7 .64 69 .38
18 2.7 .46 -33 .40
[End]
"""


def test_examples_of_the_specification(tmp_path: Path) -> None:
    one = read_sweep(file_of(tmp_path, ONE_PORT, "a.s1p"), sign=Sign.UNKNOWN)
    assert one.freq_hz.tolist() == [2e6]
    assert one.gain[0] == pytest.approx(0.894 * np.exp(-1j * np.radians(12.136)), rel=1e-14)
    two = read_sweep(file_of(tmp_path, TWO_PORT, "a.s2p"), sign=Sign.UNKNOWN)
    assert two.freq_hz.tolist() == [1e9, 2e9, 1e10]
    assert two.gain.tolist() == [-0.0003 - 0.0021j, -0.0096 - 0.0298j, -0.0134 + 0.0379j]


@pytest.mark.parametrize("text", [NOISE_1, NOISE_2], ids=["version 1", "version 2"])
def test_noise_data_are_no_part_of_the_sweep(tmp_path: Path, text: str) -> None:
    sweep = read_sweep(file_of(tmp_path, text, "a.s2p"), sign=Sign.UNKNOWN)
    assert sweep.freq_hz.tolist() == [2e9, 22e9]
    assert_allclose(np.abs(sweep.gain), [3.57, 1.30], rtol=1e-14)
    assert_allclose(np.degrees(np.angle(sweep.gain)), [157, 40], rtol=1e-14)
    assert ("noise data", "2 rows left aside") in [(d.topic, d.choice) for d in sweep.decisions]


def test_noise_may_start_at_the_last_frequency_of_the_network_data(tmp_path: Path) -> None:
    # "Less than or equal to" in the specification (from memory); scikit-rf alone wants it to be less.
    path = file_of(tmp_path, NOISE_1.replace("\n4 .7", "\n22 .7").replace("\n18 2.7", "\n23 2.7"), "a.s2p")
    assert read_sweep(path, sign=Sign.UNKNOWN).freq_hz.tolist() == [2e9, 22e9]


@pytest.mark.parametrize("name", SAMPLES)
def test_scikit_rf_sample_files_read_as_scikit_rf_reads_them(name: str) -> None:
    path = Path(skrf.__file__).parent / "data" / name
    expected = Touchstone(path)
    ports = expected.rank
    for out in range(ports):
        for into in range(ports):
            sweep = read_sweep(path, trace=f"S{out + 1}{into + 1}", sign=Sign.UNKNOWN)
            assert np.array_equal(sweep.freq_hz, expected.f)
            assert np.array_equal(sweep.gain, expected.s[:, out, into])


def test_values_read_by_eye_from_scikit_rf_sample_files() -> None:
    folder = Path(skrf.__file__).parent / "data"
    slot = read_sweep(folder / "ring slot measured.s1p", sign=Sign.UNKNOWN)
    # Line 4 of the file, in GHz: 75.0 -0.067684517179 0.659208635995
    assert (slot.freq_hz[0], slot.gain[0]) == (75e9, -0.067684517179 + 0.659208635995j)
    coil = read_sweep(folder / "ind.s2p", sign=Sign.UNKNOWN)
    # First row, in Hz, magnitude and degrees, S21 second: 1e+09 ... 0.960165474 -3.92693531
    assert coil.freq_hz[0] == 1e9
    assert abs(coil.gain[0]) == pytest.approx(0.960165474, rel=1e-14)
    assert np.degrees(np.angle(coil.gain[0])) == pytest.approx(-3.92693531, rel=1e-14)


class Trap:
    """Leaves a mark when unpickled."""

    def __init__(self, mark: Path) -> None:
        self.mark = mark

    def __reduce__(self) -> tuple[object, ...]:
        return Path.touch, (self.mark,)


@pytest.mark.parametrize("protocol", range(pickle.HIGHEST_PROTOCOL + 1))
def test_pickled_payload_is_refused_and_not_executed(tmp_path: Path, protocol: int) -> None:
    mark = tmp_path / "executed"
    payload = pickle.dumps(Trap(mark), protocol=protocol)
    for name in ("a.s1p", "a.s2p", "a.csv"):
        with pytest.raises(SweepError, match=r"a\.(s1p|s2p|csv)(, line \d+)?: "):
            read_sweep(file_of(tmp_path, payload, name))
    assert not mark.exists()
    pickle.load(io.BytesIO(payload))  # the trap does work, where something springs it
    assert mark.exists()
