from wavegen.meters.fault import Fault, stretch_text


def test_a_row_holds_every_field():
    fault = Fault(
        kind="fill",
        text="fill words",
        size=1.234567,
        unit="dB",
        where="sample 0",
        effect="lifts the mean",
        remedy="Cut it off.",
        first_sample=0,
        stop_sample=1,
    )
    row = fault.row()
    assert (row["kind"], row["fault"], row["size"]) == ("fill", "fill words", 1.2346)
    assert (row["first_sample"], row["stop_sample"]) == (0, 1)


def test_a_stretch_is_named_by_its_first_and_last_sample():
    assert [stretch_text(3, 4), stretch_text(3, 6)] == ["sample 3", "samples 3 to 5"]
