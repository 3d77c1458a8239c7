"""The checks that every Signal of every member must pass, and who they are run on."""

import hashlib
import importlib.util
import itertools
import pickle
import sys
from concurrent.futures import ThreadPoolExecutor
from fractions import Fraction
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate, order
from wavegen.core.render import render, samples_of
from wavegen.core.site import Site


def _load_examples():
    name = "contract_examples"
    if name not in sys.modules:
        path = Path(__file__).with_name("examples.py")
        spec = importlib.util.spec_from_file_location(name, path)
        module = importlib.util.module_from_spec(spec)
        sys.modules[name] = module
        spec.loader.exec_module(module)
    return sys.modules[name]


EXAMPLES = _load_examples()


def pytest_generate_tests(metafunc):
    for fixture, table in (
        ("source_example", EXAMPLES.SOURCE_EXAMPLES),
        ("stage_example", EXAMPLES.STAGE_EXAMPLES),
    ):
        if fixture in metafunc.fixturenames:
            cases = [
                pytest.param(example, id=f"{kind}-{number}")
                for kind, examples in table.items()
                for number, example in enumerate(examples)
            ]
            metafunc.parametrize(fixture, cases, scope="module")


def site(n_samples, *, seed=1, label="part", path="signal", rate_hz=EXAMPLES.RATE_HZ):
    return Site(sample_rate_hz=rate_hz, n_samples=n_samples, seed=seed, label=label, path=path)


def loop_of(example, *, times=1):
    """Return the number of samples of a loop of whole cycles."""
    cycle = example.settings.cycle(EXAMPLES.RATE_HZ, "signal").n_samples
    return cycle * -(-example.least_samples // cycle) * times


def digest(signal, **options):
    found = hashlib.sha256()
    render(signal, sink=found.update, **options)
    return found.hexdigest()


def check_form(signal, *, n_samples, rate_hz):
    """Length, rate, type and finiteness, as declared; exact rates all the way down."""
    samples = samples_of(signal)
    assert (signal.n_samples, signal.sample_rate_hz) == (n_samples, rate_hz)
    assert samples.shape == (n_samples,)
    assert samples.dtype == np.complex64
    assert np.isfinite(samples).all()
    for item in order([signal]):
        assert isinstance(item.sample_rate_hz, Fraction)
        assert item.n_samples >= 1
        assert item.step >= 1


def check_cells(signal):
    """Each node: inputs untouched, contiguous complex64 of the right length, bits repeat."""
    for item in order([signal]):
        cell = min(item.step, item.n_samples)
        last = (item.n_samples - 1) // item.step * item.step
        for start, stop in {(0, cell), (last, item.n_samples)}:
            ranges = item.needs(start, stop)
            arrays = []
            for source, (low, high) in zip(item.inputs, ranges, strict=True):
                array = np.array(evaluate({source: (low, high)})[source])
                array.flags.writeable = False
                arrays.append(array)
            before = [array.tobytes() for array in arrays]
            first = item.compute(start, stop, *arrays)
            assert first.shape == (stop - start,), type(item).__name__
            assert first.dtype == np.complex64, type(item).__name__
            assert [array.tobytes() for array in arrays] == before
            kept = first.tobytes()
            if first.flags.writeable and not any(np.shares_memory(first, x) for x in arrays):
                first[:] = 7  # owned by the caller: nothing else may feel it
            assert item.compute(start, stop, *arrays).tobytes() == kept, type(item).__name__


def check_workers_and_strips(signal):
    """Same bytes for any number of workers and any strip length."""
    n = signal.n_samples
    want = hashlib.sha256(samples_of(signal)).hexdigest()
    for workers, strip in ((1, None), (2, n // 3 + 1), (5, n // 7 + 1), (2, 4_096)):
        strip_samples = None if strip is None else max(strip, n // 50 + 1)
        assert digest(signal, workers=workers, strip_samples=strip_samples) == want
    with ThreadPoolExecutor(2) as pool:
        assert digest(signal, workers=2, executor=pool, strip_samples=n // 2 + 1) == want


def check_cuts(signal):
    """Same bits for random cuts, single samples, negative indices and several periods."""
    n = signal.n_samples
    whole = samples_of(signal)
    rng = np.random.default_rng(20)
    edges = [0, *sorted(rng.integers(0, n + 1, 5).tolist()), n]
    pieces = [samples_of(signal, low, high) for low, high in itertools.pairwise(edges)]
    assert np.concatenate(pieces).tobytes() == whole.tobytes()
    ranges = [(-1, 1), (n - 1, n), (-5, 2 * n + 5), (7 * n, 7 * n + 1), (-3 * n - 1, 2 - 3 * n)]
    ranges += [(start, start + count) for start, count in rng.integers(-n, n, (6, 2)).tolist()]
    for start, stop in ranges:
        want = whole[np.arange(start, stop) % n]
        assert samples_of(signal, start, stop).tobytes() == want.tobytes(), (start, stop)


def check_pickles(signal):
    """A worker process gets the same signal, and gets it cheaply."""
    before = samples_of(signal, 0, min(signal.n_samples, 100))
    packed = pickle.dumps(signal)
    assert len(packed) < 2_000_000
    again = pickle.loads(packed)  # noqa: S301 - our own bytes
    assert samples_of(again, 0, before.size).tobytes() == before.tobytes()


def check_mean(signal, *, want, is_exact):
    """Mean power over the loop: exact, or within six standard errors of a mean.

    The standard error comes from 32 stretches of the record itself; six of them are passed by
    a sound source once in 10^5 draws of Student's t with 31 degrees of freedom. Exact means
    float32: roundings of 2^-24 a sample, which average out; 1e-5 is far above.
    """
    samples = samples_of(signal).astype(np.complex128)
    power = np.abs(samples) ** 2
    if is_exact:
        assert power.mean() == pytest.approx(want, rel=1e-5)
        return
    stretches = [piece.mean() for piece in np.array_split(power, 32)]
    error = float(np.std(stretches, ddof=1)) / np.sqrt(32)
    assert power.mean() == pytest.approx(want, abs=6 * error + 1e-5 * want)
    assert error < 0.1 * want, "too short a loop to tell anything"


@pytest.fixture(scope="session")
def contract():
    return SimpleNamespace(
        examples=EXAMPLES,
        site=site,
        loop_of=loop_of,
        check_form=check_form,
        check_cells=check_cells,
        check_workers_and_strips=check_workers_and_strips,
        check_cuts=check_cuts,
        check_pickles=check_pickles,
        check_mean=check_mean,
    )
