import pytest

RATE = ("--sample-rate", "1 MHz")


@pytest.fixture
def made(call, recipe, tmp_path):
    assert call("make", recipe()).status == 0
    return tmp_path / "output" / "pier"


def test_a_recording(call, noise):
    said = call("show", noise(), *RATE)
    assert said.status == 0
    assert "raw cf32_le" in said.out
    assert "1 MHz" in said.out
    assert "5 ms, 5000 samples" in said.out
    assert "wavegen measure" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
    document = call("show", noise(), *RATE, "--json").json()
    assert (document["is"], document["n_samples"]) == ("recording", 5000)


def test_hints_are_heeded(call, tmp_path):
    (tmp_path / "x.iq").write_bytes(bytes(48))
    options = ("--format", "ci16_le", "--bits", "12", "--align", "left", "--channel", "1")
    document = call("show", "x.iq", *RATE, *options, "--json").json()
    assert (document["n_samples"], document["channel"]) == (6, 1)
    assert (document["bits"], document["align"]) == (12, "left")
    assert "12 bits, left" in call("show", "x.iq", *RATE, *options).out


def test_a_stimulus_its_folder_and_its_sidecar(call, made):
    said = call("show", made / "pier")
    assert "SHA-512 equal" in said.out
    assert "agrees" in said.out
    assert "pier.ccdf.json" in said.out
    for path in (made, made / "pier.ccdf.json"):
        said = call("show", path)
        assert said.status == 0
        assert "there" in said.out
        assert "Pier link" in said.out
    (made / "pier.sigmf-data").unlink()
    assert "MISSING" in call("show", made).out
    assert call("show", made / "pier.sigmf-data").status == 4


def test_a_curve(call, made):
    said = call("show", made / "pier.ccdf.csv")
    assert said.status == 0
    assert "CCDF" in said.out
    assert call("show", made / "pier.ccdf.csv", "--json").json()["is"] == "ccdf curve"


def test_a_recipe(call, recipe):
    said = call("show", recipe(), "--set", "signal.count=4")
    assert said.status == 0
    assert "count 4" in said.out
    assert "8000 samples" in said.out
    assert call("show", "power-reference-carrier", "--json").json()["is"] == "recipe"
    assert call("show", recipe("wavegen: 2\n")).status == 3
    assert call("show", "missing.yaml").status == 3


def test_roundings_are_told(call, recipe):
    said = call("show", recipe(), "--set", "duration=2.001 ms")
    assert said.status == 0
    assert "asked 2001 us" in said.err


@pytest.mark.parametrize(
    "option",
    [("--format", "wav"), RATE, ("--channel", "0"), ("--full-scale", "2"), ("--variable", "x")],
)
def test_options_without_a_file_to_read(call, recipe, made, option):
    assert call("show", recipe(), *option).status == 2
    assert call("show", made, *option).status == 2


def test_set_without_a_recipe(call, noise):
    assert call("show", noise(), *RATE, "--set", "seed=2").status == 2


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("x.wav", b"RIFF"),
        ("x.iq", b""),
        ("x.bin", b"\1\2\3"),
        ("x.sigmf-meta", b"{"),
        ("x.ccdf.json", b"{"),
        ("x.csv", b"level_db,ccdf\n1,2\n"),
        ("x.csv", b"level_db,ccdf\n1,0.5\n0,0.7\n1,0.1\n"),
        ("x.csv", b"\xff\xfe\0"),
        ("x.npy", b"\x93NUMPY"),
        ("x.mat", b"MATLAB"),
    ],
)
def test_hostile_files(call, tmp_path, name, content):
    (tmp_path / name).write_bytes(content)
    said = call("show", name)
    assert said.status == 4
    assert said.out == ""
    assert name in said.err


def test_nothing_there(call, tmp_path):
    assert call("show", "missing.wav").status == 4
    assert call("show", tmp_path).status == 4
    assert call("show", "no/such/folder/x.wav").status == 4
    assert call("show", "x" * 300 + ".wav").status == 4
