"""Two receivers make the loop gain, with their sign said."""

from __future__ import annotations

import io
from pathlib import Path

import numpy as np
import pytest
from loop_records import FREQ_HZ, GAIN, NOISE, record, scatter

from fitamp.errors import SweepError, UsageError
from fitamp.fitting import fit_sweep
from fitamp.importers import Quantity, Unit
from fitamp.loopgain import ReceiverColumns, loop_from_receivers, read_receivers
from fitamp.sweep import Concern, Sign

ERROR, RETURN = 0.2 / (1 + GAIN), 0.2 * GAIN / (1 + GAIN)
RI = "f=1:Hz error_re=2 error_im=3 return_re=4 return_im=5"


def table(folder: Path, rows: list[tuple[object, ...]], head: str = "f (Hz),a,b,c,d") -> Path:
    path = folder / "bench.csv"
    path.write_text("\n".join([head, *(",".join(map(str, row)) for row in rows), ""]), encoding="utf-8")
    return path


def ri_rows(error: np.ndarray, returned: np.ndarray) -> list[tuple[object, ...]]:
    return [
        (f, e.real, e.imag, r.real, r.imag)
        for f, e, r in zip(FREQ_HZ.tolist(), error.tolist(), returned.tolist(), strict=True)
    ]


@pytest.mark.parametrize(
    ("turn", "sign", "said"), [(1, Sign.AS_READ, "T = return/error"), (-1, Sign.INVERTED, "T = −")]
)
def test_sign_is_recognised_and_said(turn: int, sign: Sign, said: str) -> None:
    sweep = loop_from_receivers(FREQ_HZ, ERROR, turn * RETURN)
    np.testing.assert_allclose(sweep.gain, GAIN, rtol=1e-11)
    assert sweep.sign is sign
    told = next(decision for decision in sweep.decisions if decision.topic == "loop gain")
    assert told.choice.startswith(said)
    assert told.concern is Concern.RESULT


def test_sign_that_is_stated_is_taken() -> None:
    sweep = loop_from_receivers(FREQ_HZ[-3:], ERROR[-3:], RETURN[-3:], sign=Sign.INVERTED)
    np.testing.assert_allclose(sweep.gain, -GAIN[-3:], rtol=1e-12)


def test_real_and_imaginary_parts_of_a_table(tmp_path: Path) -> None:
    sweep = read_receivers(table(tmp_path, ri_rows(ERROR, -RETURN)), columns=RI)
    np.testing.assert_allclose(sweep.gain, GAIN, rtol=1e-11)
    assert sweep.origin.trace == "(c, d)/(a, b)"
    assert sweep.origin.form == "receivers"
    assert len(sweep.origin.sha256 or "") == 64


def test_magnitude_and_phase_of_a_table(tmp_path: Path) -> None:
    size, angle = np.abs, np.angle
    rows: list[tuple[object, ...]] = [
        (f / 1e3, 20 * np.log10(size(e)), np.degrees(angle(e)), size(r), angle(r))
        for f, e, r in zip(FREQ_HZ, ERROR, RETURN, strict=True)
    ]
    columns = "f=1:kHz error_mag=2:dB error_phase=3:deg return_mag=4:linear return_phase=5:rad"
    sweep = read_receivers(table(tmp_path, rows), columns=columns)
    np.testing.assert_allclose(sweep.gain, GAIN, rtol=1e-10)


def test_complex_cells_of_a_table(tmp_path: Path) -> None:
    rows: list[tuple[object, ...]] = [
        (f, f"{e.real!r}{e.imag:+.17g}j", f"{r.real!r}{r.imag:+.17g}j")
        for f, e, r in zip(FREQ_HZ.tolist(), ERROR.tolist(), RETURN.tolist(), strict=True)
    ]
    sweep = read_receivers(table(tmp_path, rows, "f (Hz),in,out"), columns="f=1 error=in return='out'")
    np.testing.assert_allclose(sweep.gain, GAIN, rtol=1e-11)


def test_point_that_one_receiver_lacks_is_left_out_with_its_reason(tmp_path: Path) -> None:
    rows = ri_rows(ERROR, RETURN)
    rows[7] = (rows[7][0], "OVL", *rows[7][2:])
    sweep = read_receivers(table(tmp_path, rows), columns=RI)
    assert len(sweep) == len(FREQ_HZ) - 1
    (left,) = sweep.left_out
    assert left.f_hz == FREQ_HZ[7]
    assert "no reading" in left.reason


def test_drive_that_changes_is_a_caution() -> None:
    drive = 1 + 3 * (FREQ_HZ > 1e6)
    cautions = [d for d in loop_from_receivers(FREQ_HZ, ERROR * drive, RETURN * drive).decisions if d.topic == "drive"]
    assert [d.concern for d in cautions] == [Concern.CAUTION]
    assert cautions[0].choice.startswith("from 0.2 to 0.8 along the band")
    steady = [d for d in loop_from_receivers(FREQ_HZ, ERROR, -RETURN).decisions if d.topic == "drive"]
    assert [d.concern for d in steady] == [Concern.READING]


def test_silent_error_receiver_is_refused() -> None:
    silent = ERROR.copy()
    silent[3] = 0
    with pytest.raises(SweepError, match=r"point 4 \(11\.89 Hz\): the error receiver reads 0, and return/error is no"):
        loop_from_receivers(FREQ_HZ, silent, RETURN)


def test_columns_of_both_receivers_are_understood() -> None:
    found = ReceiverColumns.parse("f='Freq':MHz error_mag=2:dB error_phase=3:deg return_re=re return_im=5")
    assert found.error.columns[Quantity.FREQUENCY].unit is Unit.MHZ
    assert found.error.columns[Quantity.MAGNITUDE].column == 2
    assert found.returned.columns[Quantity.REAL].column == "re"


@pytest.mark.parametrize(
    ("columns", "told"),
    [
        ("f=1:Hz error_re=2 error_im=3", "--columns does not say where the return receiver is; as in"),
        ("f=1:Hz error_re=2 return=3", "error receiver: --columns names f re; expected f with re and im"),
        ("f=1:Hz mag=2:dB", "--columns: cannot read 'mag'; expected something like"),
        ("f=1:Hz error=2 return", "--columns: cannot read 'return'"),
        ("error=2 return=3", "error receiver: --columns names complex"),
        ("f=1:Hz error_mag=2:deg error_phase=3:deg return=4", "gives mag the unit 'deg'; expected one of dB, linear"),
    ],
)
def test_columns_that_do_not_say_it_are_refused(columns: str, told: str) -> None:
    with pytest.raises(UsageError, match=told):
        ReceiverColumns.parse(columns)


def test_standard_input_is_read_once_for_both(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    content = table(tmp_path, ri_rows(ERROR, RETURN)).read_bytes()
    monkeypatch.setattr("sys.stdin", io.TextIOWrapper(io.BytesIO(content)))
    np.testing.assert_allclose(read_receivers("-", columns=RI).gain, GAIN, rtol=1e-11)


def test_touchstone_holds_no_receivers(tmp_path: Path) -> None:
    path = tmp_path / "a.s1p"
    path.write_text("# Hz S RI R 50\n1 2 3\n", encoding="utf-8")
    with pytest.raises(UsageError, match=r"a\.s1p: receivers come as a text table"):
        read_receivers(path, columns=RI)


def test_fit_agrees_with_that_of_the_loop_gain_itself() -> None:
    rng = np.random.default_rng(5)
    returned = -(RETURN + 0.2 * scatter(2e-5, rng)) * (1 + scatter(1e-3, rng))
    fit = fit_sweep(loop_from_receivers(FREQ_HZ, ERROR + 0.2 * scatter(2e-5, rng), returned))
    direct = fit_sweep(record(GAIN, "direct.csv", rng=rng))
    assert fit.adequacy.adequate
    for name in ("pole1_hz", "pole2_hz", "zero_time_s"):
        one, other = getattr(fit.parameters, name), getattr(direct.parameters, name)
        # Two independent records: within 3 joint standard errors, and neither much less certain.
        assert abs(one.value - other.value) < 3 * np.hypot(one.stderr, other.stderr)
        assert one.stderr < 1.5 * other.stderr
    assert fit.noise.error_channel == pytest.approx(NOISE.error_channel, rel=0.3)
