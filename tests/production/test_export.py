import hashlib

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.core.render import samples_of
from wavegen.files import FORMATS
from wavegen.files.datatypes import CI8, CI16_LE
from wavegen.files.format import FileFacts
from wavegen.production import export as room
from wavegen.production.export import Channel, Written, brief, export


@pytest.fixture
def write(tmp_path, monkeypatch):
    def run(signal, datatype=CI16_LE, gain=0.25, workers=1, strip=1 << 19, **options):
        monkeypatch.setattr(room, "STRIP_SAMPLES", strip)
        facts = FileFacts(
            sample_rate_hz=signal.sample_rate_hz, n_samples=signal.n_samples, datatype=datatype
        )
        path = tmp_path / "draft"
        form = FORMATS.load("raw")()
        bursts = options.pop("bursts", None)
        made = export(
            [Channel(signal=signal, bursts=bursts)],
            gain=gain,
            form=form,
            facts=facts,
            names=("x.raw",),
            drafts=(path,),
            workers=workers,
            **options,
        )
        return made, path

    return run


@pytest.mark.parametrize("workers", [1, 3])
@pytest.mark.parametrize("strip", [1 << 10, 3000, 1 << 19])
def test_the_file_and_its_figures_do_not_depend_on_strips_or_workers(lab, write, workers, strip):
    signal = lab.held(lab.SINGLE)
    made, path = write(signal, workers=workers, strip=strip)
    plain, _ = write(signal)
    assert made.sha512 == plain.sha512 == hashlib.sha512(path.read_bytes()).hexdigest()
    assert made.statistics.mean == plain.statistics.mean
    assert np.array_equal(made.statistics.counts, plain.statistics.counts)
    assert made.peak == plain.peak


def test_codes_are_the_scaled_samples_rounded_half_to_even(lab, write):
    signal = lab.held(lab.SINGLE)
    made, path = write(signal, CI8, gain=1.25)
    rails = np.fromfile(path, "i1")
    exact = samples_of(signal).view(np.float32) * np.float32(1.25) * 128
    assert np.array_equal(rails, np.clip(np.rint(exact), -128, 127))
    assert made.n_saturated == np.count_nonzero(np.abs(np.rint(exact) + 0.5) > 128) > 0


def test_figures_are_those_of_the_codes_not_of_the_samples(lab, write):
    made, path = write(lab.held(lab.CARRIER), CI8, gain=0.0199)
    assert set(np.fromfile(path, "i1")) == {3, 0}  # 2.547 codes
    assert made.statistics.mean == (3 / 128) ** 2
    assert made.peak.power == pytest.approx((3 / 128) ** 2, rel=1e-12)


def test_the_written_signal_is_what_will_be_read(lab):
    source = lab.held(lab.SINGLE)
    written = Written(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        gain=0.25,
        datatype=CI16_LE,
    )
    codes = samples_of(written).view(np.float32) * 32768
    assert np.array_equal(codes, np.rint(codes))
    assert np.array_equal(samples_of(written, 100, 300), samples_of(written)[100:300])


def test_progress_counts_up_to_the_end(lab, write):
    seen = []
    write(
        lab.held(lab.SINGLE),
        strip=3000,
        progress=lambda task, done, total: seen.append((task, done, total)),
    )
    assert seen == [("writing x.raw", n, 8000) for n in (3000, 6000, 8000)]


def test_a_writer_that_fails_is_closed_and_its_error_told(lab, write, monkeypatch):
    closed = []

    class Full:
        sha512 = ""

        def write(self, codes):
            raise FileError(where="x", problem="is full", allowed="room", remedy="Free some disk.")

        def close(self):
            closed.append(True)

    monkeypatch.setattr(FORMATS.load("raw"), "writer", lambda *_: Full())
    with pytest.raises(FileError, match="is full"):
        write(lab.held(lab.SINGLE))
    assert closed == [True]


def test_brief_holds_what_the_codes_measure(lab, write):
    made, path = write(lab.held(lab.SINGLE))
    power = np.abs(lab.read_ci16(path)) ** 2
    found = brief(made.statistics, made.peak)
    assert found["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=2e-6)
    assert found["peak_dbfs"] == pytest.approx(10 * np.log10(power.max()), abs=2e-6)
    assert found["papr_db"] == pytest.approx(found["peak_dbfs"] - found["mean_dbfs"], abs=2e-6)
    # 8000 samples resolve 10 % to 0.1 % only with ten beyond the level: 8 are too few.
    assert [row["probability"] for row in found["levels"]] == [0.1, 0.01]
