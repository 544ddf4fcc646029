"""MAT 5 as scipy writes it, of every type and shape; and every way of cutting it short."""

import struct

import numpy as np
import pytest
import scipy.io

from twlocate.errors import RecordError
from twlocate.records.mat5 import variables

DTYPES = ("i1", "u1", "i2", "u2", "i4", "u4", "i8", "u8", "f4", "f8")


def saved(folder, content, **how):
    scipy.io.savemat(folder / "m.mat", content, **how)
    return (folder / "m.mat").read_bytes()


@pytest.mark.parametrize("dtype", DTYPES)
@pytest.mark.parametrize("compressed", [False, True])
@pytest.mark.parametrize("shape", [(1, 1), (1, 3), (7, 1), (4, 5), (2, 3, 4)])
def test_numbers_of_every_type(tmp_path, dtype, compressed, shape):
    values = (np.random.default_rng(1).uniform(0, 100, shape)).astype(dtype)
    content = saved(tmp_path, {"x": values, "y": values * 0}, do_compression=compressed)
    found = dict(variables(content))
    np.testing.assert_array_equal(found["x"], values)
    assert found["y"].shape == shape


def test_text_and_structures(tmp_path):
    inner = {"p": np.arange(5.0), "unit": "kPa", "deep": {"q": np.arange(3)}}
    found = dict(variables(saved(tmp_path, {"log": inner, "name": "Süd", "empty": np.zeros((0, 0))})))
    assert found["name"] == "Süd"
    assert found["log.unit"] == "kPa"
    np.testing.assert_array_equal(np.squeeze(found["log.p"]), np.arange(5.0))
    np.testing.assert_array_equal(np.squeeze(found["log.deep.q"]), np.arange(3))
    assert found["empty"].size == 0


def test_what_a_recording_does_not_need_is_passed_over(tmp_path):
    content = saved(tmp_path, {"z": np.array([1 + 2j]), "cell": np.array([1, "a"], dtype=object), "x": np.arange(3.0)})
    assert list(dict(variables(content))) == ["x"]


@pytest.mark.parametrize("compressed", [False, True])
def test_cut_at_every_length_it_is_refused_or_shorter(tmp_path, compressed):
    content = saved(tmp_path, {"x": np.arange(6.0), "s": {"p": np.arange(4.0)}}, do_compression=compressed)
    whole = list(dict(variables(content)))
    for length in range(len(content)):
        try:
            assert set(dict(variables(content[:length]))) <= set(whole)
        except RecordError as error:
            assert any(word in str(error) for word in ("cut", "damaged", "version 5")), error  # noqa: PT017


def damaged(content, old, new):
    assert old in content
    return content.replace(old, new, 1)


def test_damage_is_named(tmp_path):
    content = saved(tmp_path, {"x": np.arange(6.0)}, do_compression=False)
    with pytest.raises(RecordError, match="not a MAT file of version 5"):
        list(variables(b"MATLAB 4" + bytes(200)))
    shape = struct.pack("<II", 1, 6)
    with pytest.raises(RecordError, match="'x' holds 6 numbers, not the 1000000 of its shape"):
        list(variables(damaged(content, shape, struct.pack("<II", 1000, 1000))))
    with pytest.raises(RecordError, match="unknown data type 99"):
        list(variables(damaged(content, struct.pack("<II", 9, 48), struct.pack("<II", 99, 48))))
    packed = saved(tmp_path, {"x": np.arange(600.0)}, do_compression=True)
    with pytest.raises(RecordError, match="a compressed variable is damaged"):
        list(variables(packed[:200] + b"\0\0\0\0" + packed[204:]))


def test_big_endian():
    """The header's "MI" and every word swapped: built by hand from the format's description."""
    element = struct.pack(">IIII", 6, 8, 6, 0) + struct.pack(">IIii", 5, 8, 1, 3)
    element += struct.pack(">HH", 1, 1) + b"x\0\0\0" + struct.pack(">II3d", 9, 24, 1.0, 2.0, 3.0)
    content = bytes(124) + struct.pack(">H", 0x0100) + b"MI" + struct.pack(">II", 14, len(element)) + element
    np.testing.assert_array_equal(dict(variables(content))["x"], [[1.0, 2.0, 3.0]])
