import shutil

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.core.evaluate import evaluate
from wavegen.core.render import render
from wavegen.core.stored import Scratch, Stored


def scratch_of(tmp_path, lab, n_samples):
    return Scratch(folder=tmp_path, sample_rate_hz=lab.rate_hz, n_samples=n_samples)


class TestScratch:
    def test_a_render_comes_back_as_a_signal(self, lab, tmp_path):
        source = lab.filtered(lab.white(10_007))
        with scratch_of(tmp_path, lab, 10_007) as scratch:
            render(source, sink=scratch.write, strip_samples=1_000)
            stored = scratch.signal()
            assert (stored.n_samples, stored.sample_rate_hz) == (10_007, lab.rate_hz)
            assert stored.mean_power is None
            for start, stop in ((0, 10_007), (-300, 300), (5, 6)):
                got = evaluate({source: (start, stop), stored: (start, stop)})
                assert got[stored].tobytes() == got[source].tobytes()

    def test_is_gone_afterwards(self, lab, tmp_path):
        with scratch_of(tmp_path, lab, 10) as scratch:
            assert [item.name for item in tmp_path.iterdir()] == [scratch.path.name]
            scratch.write(np.ones(10, np.complex64))
        assert list(tmp_path.iterdir()) == []

    def test_is_gone_after_an_error(self, lab, tmp_path):
        with pytest.raises(ZeroDivisionError), scratch_of(tmp_path, lab, 10):
            _ = 1 / 0
        assert list(tmp_path.iterdir()) == []

    def test_being_gone_already_is_no_error(self, lab, tmp_path):
        with scratch_of(tmp_path, lab, 10) as scratch:
            scratch.path.unlink()

    def test_two_at_once_have_names_of_their_own(self, lab, tmp_path):
        with scratch_of(tmp_path, lab, 1) as first, scratch_of(tmp_path, lab, 1) as second:
            assert first.path != second.path

    def test_a_full_disk_is_seen_before_anything_is_written(self, lab, tmp_path):
        free = shutil.disk_usage(tmp_path).free
        with pytest.raises(FileError) as caught:
            scratch_of(tmp_path, lab, free)  # eight times what is free
        assert caught.value.where == str(tmp_path)
        assert list(tmp_path.iterdir()) == []

    def test_a_disk_that_fails_later_is_named_and_nothing_stays(self, lab, tmp_path, monkeypatch):
        class Full:
            def write(self, data):
                raise OSError(28, "No space left on device")

            def close(self):
                raise OSError(28, "No space left on device")

        with scratch_of(tmp_path, lab, 10) as scratch:
            scratch._file.close()
            monkeypatch.setattr(scratch, "_file", Full())
            with pytest.raises(FileError) as caught:
                scratch.write(np.ones(10, np.complex64))
        assert caught.value.where == str(tmp_path)
        assert "No space left" in caught.value.problem
        assert list(tmp_path.iterdir()) == []


class TestStored:
    def stored(self, lab, path, n_samples):
        return Stored(sample_rate_hz=lab.rate_hz, n_samples=n_samples, path=path)

    def test_reads_complex_float32(self, lab, tmp_path):
        path = tmp_path / "x.cf32"
        np.arange(20, dtype=np.float32).tofile(path)
        got = self.stored(lab, path, 10).compute(3, 5)
        assert got.dtype == np.complex64
        assert got.tolist() == [6 + 7j, 8 + 9j]

    def test_a_file_that_became_shorter(self, lab, tmp_path):
        path = tmp_path / "x.cf32"
        np.zeros(7, np.complex64).tofile(path)
        with pytest.raises(FileError) as caught:
            self.stored(lab, path, 10).compute(4, 10)
        assert caught.value.where == str(path)
        assert caught.value.problem == "ends after sample 7"

    def test_a_file_that_is_gone(self, lab, tmp_path):
        path = tmp_path / "x.cf32"
        with pytest.raises(FileError) as caught:
            self.stored(lab, path, 10).compute(0, 10)
        assert caught.value.where == str(path)
