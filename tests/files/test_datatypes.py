import pickle

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.errors import SignalError
from wavegen.files.datatypes import (
    CF32_LE,
    CF64_LE,
    CI8,
    CI16_BE,
    CI16_LE,
    CI24_LE,
    CI32_LE,
    CU8,
    DATATYPES,
    RI16_LE,
    decode,
    encode,
    first_misfit,
    first_not_finite,
    join_channels,
    quantised,
    real_of,
    takes_words,
    word_in,
)

INTEGER = [item for item in DATATYPES.values() if item.is_integer and not item.is_real]
REAL = [item for item in DATATYPES.values() if item.is_real]
WORDS = [
    word_in(item, bits=bits, align=align)
    for item in (CI16_LE, CI16_BE, RI16_LE)
    for bits in (12, 14)
    for align in ("left", "right")
]


def gaussian(n, scale=0.2):
    rng = np.random.default_rng(5)
    return (scale * (rng.standard_normal(n) + 1j * rng.standard_normal(n))).astype(np.complex64)


@pytest.mark.parametrize("datatype", INTEGER, ids=lambda item: item.name)
def test_codes_are_those_of_plain_arithmetic(datatype):
    samples = gaussian(70_001, scale=0.5)  # more than two blocks; 1 in 20 saturates
    before = samples.copy()
    codes, n_saturated = encode(samples, datatype)
    exact = samples.view(np.float32).astype(np.float64) * datatype.full_scale
    rounded = np.rint(exact + datatype.offset).reshape(-1, 2)
    wanted = np.clip(rounded, datatype.lowest, datatype.highest)
    if datatype is CU8:  # its scale is no power of two: float32 may fall on the other side of .5
        assert np.abs(codes.astype(float) - wanted).max() <= 1
        assert np.count_nonzero(codes != wanted) < 10
    else:
        np.testing.assert_array_equal(codes, wanted)
        assert n_saturated == np.count_nonzero(rounded != wanted)
    assert n_saturated > 1000
    assert codes.dtype == datatype.dtype
    np.testing.assert_array_equal(samples, before)


@pytest.mark.parametrize("datatype", [CI8, CI16_LE, CI16_BE, CI24_LE], ids=lambda item: item.name)
def test_half_rounds_to_even(datatype):
    steps = np.array([0.5, 1.5, 2.5, -0.5, -1.5, -2.5, 3.5, -3.5])
    samples = (steps / datatype.full_scale).astype(np.complex64)
    codes, _ = encode(samples, datatype)
    np.testing.assert_array_equal(codes[:, 0], [0, 2, 2, 0, -2, -2, 4, -4])


def test_ends_of_the_scale():
    codes, n_saturated = encode(np.array([1 - 1j, 2 - 2j, 32767 / 32768], np.complex64), CI16_LE)
    np.testing.assert_array_equal(codes, [[32767, -32768], [32767, -32768], [32767, 0]])
    assert n_saturated == 3  # +1.0 by one code, then both rails of 2 - 2j; -1.0 is a code


def test_just_below_half_a_code_above_the_top_does_not_saturate():
    codes, n_saturated = encode(np.array([32767.4 / 32768], np.complex64), CI16_LE)
    assert (codes[0, 0], n_saturated) == (32767, 0)


@pytest.mark.parametrize(
    "datatype", [CI8, CI16_LE, CI16_BE, CU8, CF32_LE], ids=lambda item: item.name
)
def test_every_code_survives_decode_and_encode(datatype):
    if datatype.is_integer:
        rail = np.arange(datatype.lowest, datatype.highest + 1)
    else:
        rail = np.linspace(-2, 2, 999)
    codes = np.stack([rail, rail[::-1]], axis=1).astype(datatype.dtype)
    back, n_saturated = encode(decode(codes, datatype), datatype)
    np.testing.assert_array_equal(back, codes)
    assert n_saturated == 0


def test_codes_of_24_bits_survive():
    rng = np.random.default_rng(3)
    codes = rng.integers(-(2**23), 2**23, (10_000, 2), dtype=np.int32)
    codes[0] = [-(2**23), 2**23 - 1]
    back, n_saturated = encode(decode(codes, CI24_LE), CI24_LE)
    np.testing.assert_array_equal(back, codes)
    assert n_saturated == 0


def test_unsigned_codes_follow_the_common_practice():
    # common practice of receivers with 8-bit unsigned samples: (u - 127.5) / 127.5
    codes = np.array([[0, 255], [127, 128]], np.uint8)
    np.testing.assert_allclose(
        decode(codes, CU8), [-1 + 1j, (-0.5 + 0.5j) / 127.5], rtol=1e-6, atol=0
    )


@given(
    value=st.complex_numbers(max_magnitude=0.99, allow_nan=False),
    datatype=st.sampled_from([CI8, CI16_LE, CI16_BE, CI24_LE, CU8]),
)
def test_quantising_errs_at_most_half_a_step(value, datatype):
    sample = np.array([value], np.complex64)
    error = quantised(sample, datatype).astype(complex) - sample.astype(complex)
    # half a code, and one float32 rounding where the scale is no power of two
    most = (0.5 + 1e-4) / datatype.full_scale
    assert max(abs(error.real[0]), abs(error.imag[0])) <= most


@pytest.mark.parametrize("datatype", INTEGER, ids=lambda item: item.name)
@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
def test_integers_refuse_what_is_not_finite(datatype, bad):
    samples = gaussian(40_000)
    samples[35_000] = complex(0, bad)
    with pytest.raises(SignalError) as caught:
        encode(samples, datatype)
    assert "35000" in caught.value.where
    assert first_not_finite(samples) == 35_000
    assert first_not_finite(samples[:35_000]) is None


@pytest.mark.parametrize("datatype", [CF32_LE, CF64_LE], ids=lambda item: item.name)
def test_floats_keep_every_bit(datatype):
    samples = gaussian(1000, scale=3)
    codes, n_saturated = encode(samples, datatype)
    np.testing.assert_array_equal(decode(codes, datatype), samples)
    assert n_saturated == 0


def test_decoded_samples_are_the_callers():
    codes = np.zeros((4, 2), np.float32)
    decode(codes, CF32_LE)[:] = 1
    assert not codes.any()


def test_doubles_beyond_float32_read_as_infinite():
    assert np.isinf(decode(np.array([[1e300, 0]]), CF64_LE)[0])


def test_codes_of_32_bits_are_rounded_to_float32():
    value = decode(np.array([[2**31 - 1, -(2**31)]], np.int32), CI32_LE)[0]
    assert value == 1 - 1j


@pytest.mark.parametrize("datatype", DATATYPES.values(), ids=lambda item: item.name)
def test_codes_go_where_they_are_told(datatype):
    samples = gaussian(5000)
    out = np.empty((5000, datatype.n_rails), datatype.dtype)
    codes, _ = encode(samples, datatype, out)
    assert np.shares_memory(codes, out)
    np.testing.assert_array_equal(out, encode(samples, datatype)[0])


def test_no_samples():
    for datatype in DATATYPES.values():
        codes, n_saturated = encode(np.empty(0, np.complex64), datatype)
        assert codes.shape == (0, datatype.n_rails)
        assert n_saturated == 0
        assert decode(codes, datatype).shape == (0,)


def test_names_match_and_datatypes_travel():
    for name, datatype in DATATYPES.items():
        assert datatype.name == name
        assert pickle.loads(pickle.dumps(datatype)) == datatype  # noqa: S301 (our own bytes)
        packed = 3 if datatype.n_bits == 24 else datatype.dtype.itemsize
        assert datatype.bytes_per_sample == datatype.n_rails * packed
        assert datatype.container is datatype


@pytest.mark.parametrize("datatype", REAL, ids=lambda item: item.name)
def test_real_codes_are_those_of_the_i_rail(datatype):
    alike = DATATYPES["c" + datatype.name[1:]]
    assert real_of(alike) is datatype
    samples = gaussian(40_000, scale=0.5)
    codes, n_saturated = encode(samples, datatype)
    wanted, n_wanted = encode(samples.real.astype(np.complex64), alike)
    np.testing.assert_array_equal(codes, wanted[:, :1])
    assert (codes.shape, n_saturated) == ((40_000, 1), n_wanted)
    np.testing.assert_array_equal(decode(codes, datatype), decode(wanted, alike).real)
    if datatype.is_integer:
        samples[35_000] = np.nan
        with pytest.raises(SignalError, match="35000"):
            encode(samples, datatype)


@pytest.mark.parametrize("word", WORDS, ids=lambda item: item.label)
def test_words_in_their_containers(word):
    samples = gaussian(40_000, scale=0.5)
    codes, n_saturated = encode(samples, word)
    rails = np.stack([samples.real, samples.imag][: word.n_rails], axis=1).astype(float)
    low, high = -(2 ** (word.n_bits - 1)), 2 ** (word.n_bits - 1) - 1
    rounded = np.rint(rails * 2 ** (word.n_bits - 1))
    plain = np.clip(rounded, low, high)
    step = 2 ** (16 - word.n_bits) if word.align == "left" else 1
    np.testing.assert_array_equal(codes, plain * step)
    assert n_saturated == np.count_nonzero(rounded != plain) > 100
    assert first_misfit(codes, word) is None
    read = decode(codes, word)
    np.testing.assert_array_equal(read.real, plain[:, 0] / 2 ** (word.n_bits - 1))
    back, _ = encode(read, word)
    np.testing.assert_array_equal(back, codes)
    assert (word.container, word.bytes_per_sample) == (
        DATATYPES[word.name],
        DATATYPES[word.name].bytes_per_sample,
    )
    assert pickle.loads(pickle.dumps(word)) == word  # noqa: S301 (our own bytes)


@pytest.mark.parametrize("word", WORDS, ids=lambda item: item.label)
def test_codes_that_are_no_words(word):
    codes = np.zeros((10, 2), word.dtype)
    codes[7, 1] = 1 if word.align == "left" else 2 ** (word.n_bits - 1)
    assert first_misfit(codes, word) == (7, int(codes[7, 1]))
    codes[5, 0] = -1 if word.align == "left" else -(2 ** (word.n_bits - 1)) - 1
    assert first_misfit(codes, word) == (5, int(codes[5, 0]))
    assert first_misfit(codes, word.container) is None


def test_words_only_in_16_bit_integers():
    assert [item.name for item in DATATYPES.values() if takes_words(item)] == [
        "ci16_le",
        "ci16_be",
        "ri16_le",
        "ri16_be",
    ]
    assert word_in(CI16_LE, bits=16, align="left") is CI16_LE
    for datatype, bits in ((CI8, 12), (CF32_LE, 12), (CI16_LE, 8), (CI16_LE, 13)):
        with pytest.raises(ValueError, match=str(bits)):
            word_in(datatype, bits=bits, align="left")


def test_channels_side_by_side():
    one, two = (encode(gaussian(10, scale), CI16_LE)[0] for scale in (0.1, 0.2))
    both = join_channels(one, two)
    np.testing.assert_array_equal(both[:, 2:], two)
    assert both.dtype == CI16_LE.dtype
