"""Binary formats: good files give the numbers written into them, broken ones a sentence.

Fixtures are made by the formats' own libraries, so each expected value comes from the other side of the door.
"""

from __future__ import annotations

import sys
import warnings
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from springlife.duty.formats import READERS, arrays
from springlife.duty.record import Recording, RecordSpec, open_record
from springlife.errors import GapError, InputError, MissingExtraError

T = np.arange(6) * 0.1
X = np.array([5.25, 12.0, -6.5, 15.0, 5.0, 10.125])  # mm; exact in 32-bit floats too


def read(path: Path, **spec: object) -> tuple[np.ndarray, Recording]:
    """Read a channel as recorded in mm."""
    recording = open_record(RecordSpec(path, **spec))  # type: ignore[arg-type]
    return np.concatenate(list(recording.blocks(4))) * 1e3, recording


def npy(folder: Path) -> Path:
    np.save(folder / "x.npy", X)
    return folder / "x.npy"


def npy_columns(folder: Path) -> Path:
    np.save(folder / "x.npy", np.column_stack([T, X]))
    return folder / "x.npy"


def npy_fields(folder: Path) -> Path:
    table = np.zeros(6, dtype=[("t", "f8"), ("travel", "f4")])
    table["t"], table["travel"] = T, X
    np.save(folder / "x.npy", table)
    return folder / "x.npy"


def npz(folder: Path) -> Path:
    np.savez(folder / "x.npz", t=T, travel=X[:, None], other=np.zeros(3))
    return folder / "x.npz"


def npz_packed(folder: Path) -> Path:
    np.savez_compressed(folder / "x.npz", t=T, travel=X)
    return folder / "x.npz"


def mat(folder: Path) -> Path:
    from scipy.io import savemat

    content = {"t": T, "travel": X[:, None], "m": np.column_stack([T, X]), "log": {"t": T, "travel": X}, "name": "A"}
    savemat(folder / "x.mat", content)
    return folder / "x.mat"


def hdf5(folder: Path) -> Path:
    import h5py

    with h5py.File(folder / "x.h5", "w") as file:
        file["run/t"] = T
        file["run/t"].attrs["units"] = "s"
        file["run/travel"] = X
        file["run/travel"].attrs["unit"] = np.bytes_("mm")
        file["run/all"] = np.column_stack([T, X])
        file["run/log"] = np.rec.fromarrays([T, X], names="t,travel")
        file["run/name"] = "bench"
        file["run/ok"] = np.ones(6, dtype=bool)
    return folder / "x.h5"


def matlab_73(folder: Path) -> Path:
    import h5py

    # As MATLAB 7.3 writes it: a 512-byte text block before the HDF5 part, and every matrix turned round.
    with h5py.File(folder / "x.mat", "w", userblock_size=512) as file:
        for name, value in (("t", T[None, :]), ("travel", X[None, :]), ("m", np.vstack([T, X]))):
            file[name] = value
            file[name].attrs["MATLAB_class"] = np.bytes_("double")
        file["name"] = np.array([[65, 66]], dtype="u2")
        file["name"].attrs["MATLAB_class"] = np.bytes_("char")
    with (folder / "x.mat").open("r+b") as raw:
        raw.write(b"MATLAB 7.3 MAT-file, Platform: PCWIN64".ljust(124) + b"\x00\x02IM")
    return folder / "x.mat"


def parquet(folder: Path) -> Path:
    import pyarrow as pa
    import pyarrow.parquet as pq

    stamps = pa.array((np.datetime64("2025-03-31T14:00") + (T * 1e9).round().astype("m8[ns]")), type=pa.timestamp("ns"))
    fields = [
        pa.field("t", pa.float64(), metadata={"unit": "s"}), pa.field("travel", pa.float32(), metadata={"unit": "mm"}),
        pa.field("when", stamps.type), pa.field("n", pa.int32()), pa.field("gaps", pa.int16()),
        pa.field("name", pa.string()), pa.field("price", pa.decimal128(9, 2)), pa.field("pair", pa.list_(pa.int8())),
        pa.field("zone", pa.timestamp("us", tz="UTC")),
    ]  # fmt: skip
    data = [
        T, X, stamps, range(6), [1, 2, None, 4, 5, 6], list("abcdef"), [1] * 6, [[1]] * 6, stamps.cast(fields[-1].type)
    ]  # fmt: skip
    table = pa.table([pa.array(d, f.type) for d, f in zip(data, fields, strict=True)], schema=pa.schema(fields))
    pq.write_table(table, folder / "x.parquet", row_group_size=4)
    return folder / "x.parquet"


def mdf(folder: Path) -> Path:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from asammdf import MDF, Signal

        with MDF(version="4.10") as file:
            file.append([Signal(X, T, name="travel", unit="mm"), Signal(X * 2, T, name="twice", unit="mm")])
            bad = np.array([0, 0, 1, 0, 0, 0], dtype=bool)
            file.append([Signal(X, T * 2, name="slow", unit="mm", invalidation_bits=bad)])
            file.append([Signal(X, T * 3, name="travel", unit="mm")])
            file.append([Signal(np.array([b"a"] * 6), T, name="text", encoding="utf-8")])
            file.save(folder / "x.mf4")
    return folder / "x.mf4"


def tdms(folder: Path) -> Path:
    from nptdms import ChannelObject, TdmsWriter

    steps = {"wf_increment": 0.1, "unit_string": "mm"}
    with TdmsWriter(folder / "x.tdms") as file:
        for part in (slice(0, 4), slice(4, 6)):
            file.write_segment([
                ChannelObject("run", "travel", X[part], properties=steps), ChannelObject("run", "t", T[part]),
                ChannelObject("still", "travel", X[part]), ChannelObject("still", "name", list("abcdef")[part]),
            ])  # fmt: skip
    return folder / "x.tdms"


def wav(folder: Path, dtype: str = "<i2") -> Path:
    from scipy.io import wavfile

    counts = np.column_stack([X * 8, -X * 8])
    wavfile.write(folder / "x.wav", 10, counts.astype(dtype))
    return folder / "x.wav"


def wav_24(folder: Path) -> Path:
    import wave

    counts = (X * 8).astype("<i4") * 1000
    with wave.open(str(folder / "x.wav"), "wb") as file:
        file.setnchannels(1)
        file.setsampwidth(3)
        file.setframerate(10)
        file.writeframes(counts.view("u1").reshape(-1, 4)[:, :3].tobytes())
    return folder / "x.wav"


def wav_8(folder: Path) -> Path:
    from scipy.io import wavfile

    wavfile.write(folder / "x.wav", 10, (X * 4 + 128).astype("u1"))
    return folder / "x.wav"


MM = {"unit": "mm"}
GOOD: dict[str, tuple[Callable[[Path], Path], dict[str, object], float | None]] = {
    "one NumPy column": (npy, MM, None),
    "one NumPy column at a rate": (npy, MM | {"sample_rate": 10.0}, 10),
    "NumPy columns": (npy_columns, MM | {"channel": 2, "time": 1}, 10),
    "NumPy fields": (npy_fields, MM | {"channel": "travel", "time": "t"}, 10),
    "NumPy archive": (npz, MM | {"channel": "travel", "time": "t"}, 10),
    "NumPy archive, packed": (npz_packed, MM | {"channel": "travel", "time": "t"}, 10),
    "MATLAB vectors": (mat, MM | {"channel": "travel", "time": "t"}, 10),
    "MATLAB matrix": (mat, MM | {"channel": "m(:,2)", "time": "m(:,1)"}, 10),
    "MATLAB struct": (mat, MM | {"channel": "log.travel", "time": "log.t"}, 10),
    "MATLAB by number": (mat, MM | {"channel": 2, "time": 1}, 10),
    "HDF5 with units": (hdf5, {"channel": "run/travel", "time": "run/t"}, 10),
    "HDF5 by the last part": (hdf5, {"channel": "/run/travel", "time": "/run/t"}, 10),
    "HDF5 matrix": (hdf5, MM | {"channel": "run/all(:,2)", "time": "run/all(:,1)"}, 10),
    "HDF5 compound": (hdf5, MM | {"channel": "run/log.travel", "time": "run/log.t"}, 10),
    "MATLAB 7.3 vectors": (matlab_73, MM | {"channel": "travel", "time": "t"}, 10),
    "MATLAB 7.3 matrix": (matlab_73, MM | {"channel": "m(:,2)", "time": "m(:,1)"}, 10),
    "Parquet with units": (parquet, {"channel": "travel", "time": "t"}, 10),
    "Parquet date-times": (parquet, {"channel": "travel", "time": "when"}, 10),
    "Parquet date-times in a zone": (parquet, {"channel": "travel", "time": "zone"}, 10),
    "Parquet at a rate": (parquet, {"channel": "travel", "sample_rate": 10.0}, 10),
    "Parquet, no time": (parquet, {"channel": "travel"}, None),
    "MDF": (mdf, {"channel": 1}, 10),
    "MDF, another time base": (mdf, {"channel": 4}, 10 / 3),
    "MDF, master named": (mdf, {"channel": 1, "time": "time"}, 10),
    "TDMS": (tdms, {"channel": "run/travel"}, 10),
    "TDMS with a time channel": (tdms, {"channel": "run/travel", "time": "run/t"}, 10),
    "TDMS without a rate": (tdms, MM | {"channel": "still/travel"}, None),
    "WAV, 16 bits": (wav, MM | {"channel": 1, "scale": 0.125}, 10),
    "WAV, second channel": (wav, MM | {"channel": "channel 2", "scale": -0.125}, 10),
    "WAV, 24 bits": (wav_24, MM | {"scale": 0.000125}, 10),
    "WAV, 8 bits": (wav_8, MM | {"scale": 0.25}, 10),
    "WAV, 32 bits": (lambda folder: wav(folder, "<i4"), MM | {"channel": 1, "scale": 0.125}, 10),
    "WAV, floats": (lambda folder: wav(folder, "<f4"), MM | {"channel": 1, "scale": 0.125}, 10),
    "WAV, rate repeated": (wav, MM | {"channel": 1, "scale": 0.125, "sample_rate": 10.0}, 10),
}  # fmt: skip


@pytest.mark.parametrize("chunk", [4, 1 << 20])
@pytest.mark.parametrize("name", GOOD)
def test_numbers_come_back(name: str, chunk: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for module in ("arrays", "parquet", "loggers", "wav"):
        monkeypatch.setattr(sys.modules[f"springlife.duty.formats.{module}"], "CHUNK", chunk)
    make, spec, rate = GOOD[name]
    values, recording = read(make(tmp_path), **spec)
    # 8-bit counts keep quarters of a millimetre; everything else is exact but for the step to metres and back.
    expected = (X * 4).astype(int) / 4 if "8 bits" in name else X
    np.testing.assert_allclose(values, expected, rtol=1e-14)
    assert recording.sample_rate == (None if rate is None else pytest.approx(rate))
    named = "HDF5" if name.startswith("MATLAB 7.3") else name.replace("one ", "").split()[0].strip(",")
    assert recording.provenance[0].startswith(named)


BROKEN: dict[str, tuple[Callable[[Path], Path], dict[str, object], list[str]]] = {
    "columns not named": (npy_columns, MM, ["name the channel", "2 columns"]),
    "field unknown": (npy_fields, MM | {"channel": "travle"}, ["did you mean 'travel'"]),
    "array unknown": (npz, MM | {"channel": "force"}, ["'force'", "valid: t, travel, other"]),
    "array of another length": (npz, MM | {"channel": "other", "time": "t"}, ["has 3 samples", "'t' has 6"]),
    "MATLAB name unknown": (mat, MM | {"channel": "travle", "time": "t"}, ["'travle'", "did you mean 'travel'"]),
    "MATLAB text": (mat, MM | {"channel": "name"}, ["'name'", "valid"]),
    "HDF5 path unknown": (hdf5, MM | {"channel": "run/travle"}, ["did you mean 'run/travel'"]),
    "HDF5 unit contradicted": (hdf5, {"channel": "run/travel", "unit": "in"}, ["'mm' in the file", "'in' in the case"]),
    "HDF5 time unit contradicted": (
        hdf5, {"channel": "run/travel", "time": "run/t", "time_unit": "ms"}, ["'s' in the file", "'ms' in the case"],
    ),
    "Parquet text": (parquet, MM | {"channel": "name"}, ["'name'", "string", "float64"]),
    "Parquet decimal": (parquet, MM | {"channel": "price"}, ["'price'", "decimal128(9, 2)"]),
    "Parquet nested": (parquet, MM | {"channel": "pair"}, ["'pair'", "list"]),
    "Parquet date-time as channel": (parquet, MM | {"channel": "when"}, ["'when'", "timestamp"]),
    "Parquet without a unit": (parquet, {"channel": "n"}, ["'n'", "neither the file nor the case"]),
    "MDF ambiguous": (mdf, {"channel": "travel"}, ["ambiguous", "columns 1 and 4", "number"]),
    "MDF text": (mdf, MM | {"channel": "text"}, ["'text'", "not real numbers"]),
    "MDF rate given": (mdf, {"channel": 1, "sample_rate": 10.0}, ["its own times", "leave out sample_rate"]),
    "MDF time column": (mdf, {"channel": 1, "time": "twice"}, ["own time base", "leave out"]),
    "TDMS ambiguous": (tdms, {"channel": "travel"}, ["ambiguous", "columns 1 and 3"]),
    "TDMS text": (tdms, MM | {"channel": "still/name"}, ["'still/name'", "not real numbers"]),
    "TDMS time of another group": (tdms, MM | {"channel": "still/travel", "time": "run/t"}, ["different groups"]),
    "TDMS rate contradicted": (tdms, {"channel": "run/travel", "sample_rate": 20.0}, ["10 Hz in the file", "20"]),
    "WAV without a scale": (wav, MM | {"channel": 1}, ["'counts' in the file", "scale"]),
    "WAV without a unit": (wav, {"channel": 1, "scale": 0.1}, ["'counts'"]),
    "WAV with a time column": (wav, MM | {"channel": 1, "scale": 2.0, "time": "t"}, ["no time column"]),
    "WAV rate contradicted": (wav, MM | {"channel": 1, "scale": 2.0, "sample_rate": 20.0}, ["10 Hz in the file"]),
    "WAV channel past the end": (wav, MM | {"channel": 3, "scale": 2.0}, ["number 3", "1 to 2"]),
}  # fmt: skip


@pytest.mark.parametrize("name", BROKEN)
def test_what_does_not_fit_is_said_in_one_sentence(name: str, tmp_path: Path) -> None:
    make, spec, words = BROKEN[name]
    path = make(tmp_path)
    with pytest.raises(InputError) as caught:
        read(path, **spec)
    message = str(caught.value)
    assert path.name in message and all(word in message for word in words), message
    assert "\n" not in message, message


def test_missing_values_are_gaps(tmp_path: Path) -> None:
    path = parquet(tmp_path)
    with pytest.raises(GapError, match=r"'gaps', row 3: the value is missing"):
        read(path, channel="gaps", **MM)
    values, _ = read(path, channel="gaps", gaps="split", **MM)
    np.testing.assert_allclose(values, [1, 2, np.nan, 4, 5, 6])


def test_invalid_samples_are_gaps_not_left_out(tmp_path: Path) -> None:
    path = mdf(tmp_path)
    with pytest.raises(GapError, match=r"'slow', sample 3: the value is missing"):
        read(path, channel="slow")
    values, recording = read(path, channel="slow", gaps="split")
    np.testing.assert_allclose(values, [5.25, 12, np.nan, 15, 5, 10.125])
    assert recording.gaps_found == 1


MAKERS = [npy, npz, mat, hdf5, matlab_73, parquet, mdf, tdms, wav]


@pytest.mark.parametrize("make", MAKERS)
@pytest.mark.parametrize("keep", [0.15, 0.5, 0.9])
def test_a_file_cut_short_is_an_error(make: Callable[[Path], Path], keep: float, tmp_path: Path) -> None:
    path = make(tmp_path)
    data = path.read_bytes()
    path.write_bytes(data[: int(len(data) * keep)])
    spec: dict[str, object] = {"channel": 1, "unit": "mm", "scale": 2.0}
    try:
        values, _ = read(path, **spec)
    except InputError as error:
        assert path.name in str(error) and "\n" not in str(error), error
    else:  # what was cut off is not the channel: its numbers are whole
        assert values.size == 6


@pytest.mark.parametrize("make", MAKERS)
def test_damaged_bytes_never_end_in_a_traceback(make: Callable[[Path], Path], tmp_path: Path) -> None:
    path = make(tmp_path)
    data = np.frombuffer(path.read_bytes(), dtype="u1")
    rng = np.random.default_rng(7)
    for _ in range(8):
        broken = data.copy()
        broken[rng.integers(8, data.size, max(4, data.size // 50))] = rng.integers(0, 256, max(4, data.size // 50))
        path.write_bytes(broken.tobytes())
        try:
            read(path, channel=1, unit="mm", scale=2.0, gaps="split")
        except InputError as error:
            assert path.name in str(error), error


def test_pickled_objects_are_never_loaded(tmp_path: Path) -> None:
    objects = np.array([print, 1.0], dtype=object)
    np.save(tmp_path / "x.npy", objects, allow_pickle=True)
    np.savez(tmp_path / "x.npz", x=objects)
    for name in ("x.npy", "x.npz"):
        with pytest.raises(InputError, match=rf"{name}.*pickled Python objects, which are never loaded"):
            read(tmp_path / name, channel=1, **MM)


def test_a_spreadsheet_is_sent_back(tmp_path: Path) -> None:
    import zipfile

    with zipfile.ZipFile(tmp_path / "x.xlsx", "w") as archive:
        archive.writestr("xl/workbook.xml", "<workbook/>")
    with pytest.raises(InputError, match="export the sheet as CSV"):
        read(tmp_path / "x.xlsx", channel=1, **MM)


@pytest.mark.parametrize("ending", [ending for kind in READERS.values() for ending in kind.endings])
def test_text_with_the_ending_of_a_binary_format_is_refused(ending: str, tmp_path: Path) -> None:
    (tmp_path / f"x{ending}").write_text("t,x\n0,1\n1,2\n")
    with pytest.raises(InputError, match=f"ends in {ending} but does not begin like"):
        read(tmp_path / f"x{ending}", channel=1, **MM)


def test_the_first_bytes_tell_the_format_whatever_the_ending(tmp_path: Path) -> None:
    path = npy(tmp_path).rename(tmp_path / "x.csv")
    values, _ = read(path, **MM)
    np.testing.assert_allclose(values, X, rtol=1e-14)


def test_more_columns_than_rows_is_refused(tmp_path: Path) -> None:
    np.save(tmp_path / "x.npy", np.zeros((2, 50)))
    with pytest.raises(InputError, match="2 rows and 50 columns; save it with one row a sample"):
        read(tmp_path / "x.npy", channel=1, **MM)


@pytest.mark.parametrize(("module", "make"), [("h5py", hdf5), ("asammdf", mdf), ("nptdms", tdms)])
def test_a_missing_library_is_named_with_the_way_to_install_it(
    module: str, make: Callable[[Path], Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = make(tmp_path)
    monkeypatch.setitem(sys.modules, module, None)
    with pytest.raises(MissingExtraError, match=rf"{module}.*pip install \"springlife\[formats\]\""):
        read(path, channel=1, **MM)


def test_a_mapped_array_is_read_in_pieces(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(arrays, "CHUNK", 2)
    recording = open_record(RecordSpec(npy(tmp_path), unit="mm"))
    assert [chunk.values.size for chunk in recording._table.chunks()] == [2, 2, 2]
